//! Opening a clip: the file is checked before FFmpeg sees it, and FFmpeg may read nothing but that file.

use super::capture_rate::capture_rate_from_metadata;
use super::{FootageError, Orientation, StreamFacts};
use ffmpeg_next::codec::threading;
use ffmpeg_next::{Dictionary, codec, decoder, format, media};
use std::path::{Path, PathBuf};

/// What a clip may cost at most.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Limits {
    /// Size of the file, bytes.
    pub max_bytes: u64,
    /// Width × height of a coded picture, px.
    pub max_picture_px: u64,
    /// Number of frames.
    pub max_frames: usize,
    /// Decoder threads; 0 takes one for each processor.
    pub threads: usize,
    /// What is done at damage.
    pub damage: Damage,
}

/// What is done where a packet or a picture is damaged.
///
/// A patched picture made by several threads depends on which of them was faster, and with it every picture that refers to it. So damage
/// is only looked for while several threads decode, and patched by one.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Damage {
    /// [`FootageError::Damaged`] at the first: decode again with [`Damage::Patch`].
    Stop,
    /// One thread whatever `threads` says; damaged pictures are patched up, marked and counted.
    Patch,
}

impl Default for Limits {
    /// 64 GiB, 8192 × 8192 px, 500 000 frames (more than two hours at 60 Hz), a thread for each processor, stop at damage.
    fn default() -> Self {
        Self {
            max_bytes: 64 << 30,
            max_picture_px: 8192 * 8192,
            max_frames: 500_000,
            threads: 0,
            damage: Damage::Stop,
        }
    }
}

/// A stream that is ready to be decoded.
pub(super) struct OpenClip {
    pub(super) path: PathBuf,
    pub(super) input: format::context::Input,
    pub(super) decoder: decoder::Video,
    pub(super) stream_index: usize,
    pub(super) facts: StreamFacts,
}

/// Checks the file, opens it and its best video stream.
pub(super) fn open(path: &Path, limits: &Limits) -> Result<OpenClip, FootageError> {
    let absolute = check_file(path, limits)?;
    let path = path.to_path_buf();
    // Registers the words of FFmpeg's errors; it cannot fail with the parts that are used here.
    let _ = ffmpeg_next::init();
    // Messages of FFmpeg's own would stand between ours on stderr; what matters comes back as an error or a count.
    ffmpeg_next::log::set_level(ffmpeg_next::log::Level::Quiet);
    let not_a_film = |error: ffmpeg_next::Error| FootageError::NotAFilm {
        path: path.clone(),
        reason: error.to_string(),
    };
    let mut options = Dictionary::new();
    // A playlist or a reference movie inside the file could otherwise make FFmpeg open other files or the network.
    options.set("protocol_whitelist", "file");
    options.set("format_whitelist", FORMATS);
    let input = format::input_with_dictionary(&absolute, options).map_err(not_a_film)?;
    let (stream_index, decoder, facts) = {
        let stream = input
            .streams()
            .best(media::Type::Video)
            // The cover of a piece of music is a picture, not a film.
            .filter(|stream| {
                !stream
                    .disposition()
                    .contains(format::stream::Disposition::ATTACHED_PIC)
            })
            .ok_or_else(|| FootageError::NoVideo { path: path.clone() })?;
        let decoder = open_decoder(&stream, limits, &path)?;
        let orientation = orientation(&stream, &decoder)
            .ok_or_else(|| FootageError::OddTurn { path: path.clone() })?;
        let time_base = stream.time_base();
        let facts = StreamFacts {
            container: input.format().name().to_owned(),
            codec: stream.parameters().id().name().to_owned(),
            pixel_format: decoder
                .format()
                .descriptor()
                .map_or("unknown", |descriptor| descriptor.name())
                .to_owned(),
            orientation,
            time_base: [
                i64::from(time_base.numerator()),
                i64::from(time_base.denominator()),
            ],
            n_frames_promised: usize::try_from(stream.frames()).ok().filter(|&n| n > 0),
            capture_rate_metadata: capture_rate_from_metadata(
                input.metadata().iter().chain(stream.metadata().iter()),
            ),
        };
        (stream.index(), decoder, facts)
    };
    Ok(OpenClip {
        path,
        input,
        decoder,
        stream_index,
        facts,
    })
}

/// A decoder with frame threads for a stream whose pictures are within the limits.
fn open_decoder(
    stream: &format::stream::Stream<'_>,
    limits: &Limits,
    path: &Path,
) -> Result<decoder::Video, FootageError> {
    let parameters = stream.parameters();
    let codec_name = parameters.id().name().to_owned();
    let refused = |reason: String| FootageError::Codec {
        path: path.to_path_buf(),
        codec: codec_name.clone(),
        reason,
    };
    let Some(found) = decoder::find(parameters.id()) else {
        return Err(refused(
            "no decoder is built into the system's FFmpeg".to_owned(),
        ));
    };
    let mut context = codec::context::Context::from_parameters(parameters)
        .map_err(|error| refused(error.to_string()))?
        .decoder();
    context.set_threading(threading::Config {
        kind: threading::Type::Frame,
        count: thread_count(limits),
        ..threading::Config::default()
    });
    context.set_packet_time_base(stream.time_base());
    let mut options = Dictionary::new();
    options.set("max_pixels", &limits.max_picture_px.to_string());
    if limits.damage == Damage::Stop {
        // Without this a decoder patches in silence, and tells of it too late to be relied on.
        options.set("err_detect", "explode");
    }
    let decoder = context
        .open_as_with(found, options)
        .and_then(decoder::Opened::video)
        .map_err(|error| refused(error.to_string()))?;
    let (width, height) = (decoder.width(), decoder.height());
    if width == 0 || height == 0 {
        return Err(refused("the stream gives no picture size".to_owned()));
    }
    if u64::from(width) * u64::from(height) > limits.max_picture_px {
        let (path, limit_px) = (path.to_path_buf(), limits.max_picture_px);
        return Err(FootageError::PictureTooLarge {
            path,
            width,
            height,
            limit_px,
        });
    }
    Ok(decoder)
}

/// Containers that hold one film in one file. Playlists, picture series, devices and text with pictures are not among
/// them: they would name other files, or decode a text file into pictures of its letters.
const FORMATS: &str = "mov,mp4,m4a,3gp,3g2,mj2,matroska,webm,avi,mpegts,mpeg,mpegvideo,flv,asf,ogg,mxf,nut,ivf,h264,hevc,m4v,obu,yuv4mpegpipe,dv,rm,gif,apng";

fn thread_count(limits: &Limits) -> usize {
    match limits.threads {
        _ if limits.damage == Damage::Patch => 1,
        0 => std::thread::available_parallelism()
            .map_or(1, usize::from)
            .min(16),
        count => count,
    }
}

/// Everything that can be known about the file without reading it as a film; returns its absolute path.
fn check_file(path: &Path, limits: &Limits) -> Result<PathBuf, FootageError> {
    let path_buf = || path.to_path_buf();
    let unreadable = |error: std::io::Error| match error.kind() {
        std::io::ErrorKind::NotFound => FootageError::Missing { path: path_buf() },
        _ => FootageError::Unreadable {
            path: path_buf(),
            reason: error.to_string(),
        },
    };
    // The absolute path begins with a slash or a drive, so that no name can be taken for a protocol.
    let absolute = std::fs::canonicalize(path).map_err(unreadable)?;
    let metadata = std::fs::metadata(&absolute).map_err(unreadable)?;
    if metadata.is_dir() {
        return Err(FootageError::Folder { path: path_buf() });
    }
    if !metadata.is_file() {
        return Err(FootageError::NotAFile { path: path_buf() });
    }
    if metadata.len() == 0 {
        return Err(FootageError::Empty { path: path_buf() });
    }
    if metadata.len() > limits.max_bytes {
        return Err(FootageError::TooLarge {
            path: path_buf(),
            bytes: metadata.len(),
            limit: limits.max_bytes,
        });
    }
    std::fs::File::open(&absolute).map_err(unreadable)?;
    if absolute.to_str().is_none() {
        return Err(FootageError::NameNotText { path: path_buf() });
    }
    Ok(absolute)
}

fn orientation(
    stream: &format::stream::Stream<'_>,
    decoder: &decoder::Video,
) -> Option<Orientation> {
    let aspect = decoder.aspect_ratio();
    let part = |value: i32| u32::try_from(value).unwrap_or(0);
    let matrix = stream
        .side_data()
        .find(|data| data.kind() == codec::packet::side_data::Type::DisplayMatrix)
        .and_then(|data| {
            let bytes = data.data();
            let entry = |index: usize| {
                bytes
                    .get(4 * index..4 * index + 4)?
                    .try_into()
                    .ok()
                    .map(i32::from_ne_bytes)
            };
            // Rows of three: a b u, c d v, x y w.
            Some([entry(0)?, entry(1)?, entry(3)?, entry(4)?])
        });
    Orientation::new(
        decoder.width(),
        decoder.height(),
        [part(aspect.numerator()), part(aspect.denominator())],
        matrix,
    )
}
