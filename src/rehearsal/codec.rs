//! What each codec and container is told: sample layout, quality, effort, silence; and greys into its codes.
use ffmpeg_next::codec::{self, encoder, threading};
use ffmpeg_next::format::Pixel;
use ffmpeg_next::{Dictionary, Rational, color};

use super::Picture;
use super::scene::Scene;
use super::storage::{CodecName, CodecScene, PixelFormat, Preset};

/// FFmpeg's constant quality is in units of λ: its λ of quantiser 1.
const LAMBDA_OF_ONE: u32 = 118;

/// Code values of a sample layout.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Codes {
    /// Code of black.
    black: f32,
    /// Codes from black to white.
    swing: f32,
    /// Largest code.
    largest: f32,
}

/// One luma plane in stored layout, 8 or 10 bits in 16.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Luma {
    pub(super) width: usize,
    pub(super) samples: Vec<u16>,
}

impl CodecScene {
    /// The sample layout: the scene's, or the codec's usual one.
    #[must_use]
    pub fn layout(&self) -> PixelFormat {
        self.pixel_format.unwrap_or(match self.name {
            CodecName::Mjpeg => PixelFormat::Yuvj420p,
            CodecName::Prores => PixelFormat::Yuv422p10,
            CodecName::H264 | CodecName::Hevc | CodecName::Vp9 | CodecName::Mpeg4 => {
                PixelFormat::Yuv420p
            }
        })
    }

    /// FFmpeg's name of the encoder.
    #[must_use]
    pub fn encoder(&self) -> &'static str {
        match self.name {
            CodecName::H264 => "libx264",
            CodecName::Hevc => "libx265",
            CodecName::Mjpeg => "mjpeg",
            CodecName::Vp9 => "libvpx-vp9",
            CodecName::Prores => "prores_ks",
            CodecName::Mpeg4 => "mpeg4",
        }
    }
}

impl PixelFormat {
    pub(super) fn pixel(self) -> Pixel {
        match self {
            Self::Yuv420p => Pixel::YUV420P,
            Self::Yuvj420p => Pixel::YUVJ420P,
            Self::Yuv422p => Pixel::YUV422P,
            Self::Yuvj422p => Pixel::YUVJ422P,
            Self::Yuv420p10 => Pixel::YUV420P10LE,
            Self::Yuv422p10 => Pixel::YUV422P10LE,
        }
    }

    fn is_full_range(self) -> bool {
        matches!(self, Self::Yuvj420p | Self::Yuvj422p)
    }

    pub(super) fn is_deep(self) -> bool {
        matches!(self, Self::Yuv420p10 | Self::Yuv422p10)
    }

    /// Codes of black and white.
    ///
    /// # Source
    /// [BT.709](crate::sources::ItuRBt709): 16…235 in 8 bits, four times that in 10; full range 0…255.
    pub(super) fn codes(self) -> Codes {
        match (self.is_full_range(), self.is_deep()) {
            (true, _) => Codes {
                black: 0.0,
                swing: 255.0,
                largest: 255.0,
            },
            (false, false) => Codes {
                black: 16.0,
                swing: 219.0,
                largest: 255.0,
            },
            (false, true) => Codes {
                black: 64.0,
                swing: 876.0,
                largest: 1023.0,
            },
        }
    }
}

impl Luma {
    /// Turns a picture back into the layout it is stored in, and its greys into codes.
    ///
    /// `rotation_deg`: the clockwise turn that display will apply.
    pub(super) fn stored(picture: &Picture, rotation_deg: u32, codes: Codes) -> Self {
        let Picture {
            width,
            height,
            grey,
        } = picture;
        let code = |grey: f32| {
            #[expect(
                clippy::cast_possible_truncation,
                clippy::cast_sign_loss,
                reason = "cut to 0…1023 before the casts; by way of i32, because only that cast has a vector instruction"
            )]
            let code = (codes.black + codes.swing / 255.0 * grey + 0.5).clamp(0.0, codes.largest)
                as i32 as u16;
            code
        };
        let stored_width = if rotation_deg.is_multiple_of(180) {
            *width
        } else {
            *height
        };
        // Display (x, y) of stored (i, j): 90: (h−1−j, i), 180: (w−1−i, h−1−j), 270: (j, w−1−i), w × h the stored size.
        let samples = match rotation_deg {
            90 => (0..grey.len())
                .map(|at| code(grey[(at % height) * width + (width - 1 - at / height)]))
                .collect(),
            180 => grey.iter().rev().map(|grey| code(*grey)).collect(),
            270 => (0..grey.len())
                .map(|at| code(grey[(height - 1 - at % height) * width + at / height]))
                .collect(),
            _ => grey.iter().map(|grey| code(*grey)).collect(),
        };
        Self {
            width: stored_width,
            samples,
        }
    }
}

pub(super) fn configure(
    video: &mut encoder::video::Video,
    scene: &Scene,
    time_base: Rational,
    headers_apart: bool,
) {
    let (camera, codec) = (&scene.camera, &scene.codec);
    let [wide, high] = camera.pixel_aspect;
    let upright = [camera.width_px * high / wide, camera.height_px];
    let [width, height] = if camera.rotation_deg.is_multiple_of(180) {
        upright
    } else {
        [upright[1], upright[0]]
    };
    video.set_width(width);
    video.set_height(height);
    video.set_format(codec.layout().pixel());
    video.set_time_base(time_base);
    let [num, den] = rate(scene);
    video.set_frame_rate(Some(Rational::new(num, den)));
    video.set_aspect_ratio(Rational::new(wide.cast_signed(), high.cast_signed()));
    video.set_gop(codec.gop);
    video.set_max_b_frames(codec.b_frames as usize);
    video.set_colorspace(color::Space::BT709);
    video.set_color_primaries(color::Primaries::BT709);
    video.set_color_transfer_characteristic(color::TransferCharacteristic::BT709);
    video.set_color_range(range(codec.layout()));
    // Several pictures at once, not several slices of one: phones write one slice, and x264 is as repeatable.
    let kind = threading::Type::Frame;
    video.set_threading(threading::Config {
        count: codec.threads as usize,
        ..threading::Config::kind(kind)
    });
    let mut flags = codec::Flags::BITEXACT;
    if headers_apart {
        flags |= codec::Flags::GLOBAL_HEADER;
    }
    if let Some(bit_rate) = codec.bit_rate {
        video.set_bit_rate(usize::try_from(bit_rate).unwrap_or(usize::MAX));
    } else if matches!(codec.name, CodecName::Mjpeg | CodecName::Mpeg4) {
        flags |= codec::Flags::QSCALE;
        video.set_global_quality((codec.crf.unwrap_or(3).max(1) * LAMBDA_OF_ONE).cast_signed());
    }
    video.set_flags(flags);
}

/// Options of each encoder: quality, effort, silence, and one order of work.
pub(super) fn codec_options(codec: &CodecScene) -> Dictionary<'static> {
    let (threads, quality) = (
        codec.threads.to_string(),
        codec.crf.map(|crf| crf.to_string()),
    );
    let mut options = match codec.name {
        CodecName::H264 => {
            dictionary(&[("preset", preset(codec.preset)), ("x264-params", "log=-1")])
        }
        CodecName::Hevc => {
            let pools = if codec.threads == 1 { "none" } else { &threads };
            // Closed groups: an open one would make a key picture lean on its neighbours.
            let own = format!("log-level=none:frame-threads=1:open-gop=0:pools={pools}");
            dictionary(&[("preset", preset(codec.preset)), ("x265-params", &own)])
        }
        CodecName::Vp9 => dictionary(&[("deadline", "good"), ("cpu-used", "5"), ("row-mt", "0")]),
        CodecName::Mjpeg | CodecName::Prores | CodecName::Mpeg4 => dictionary(&[]),
    };
    if matches!(
        codec.name,
        CodecName::H264 | CodecName::Hevc | CodecName::Vp9
    ) && codec.bit_rate.is_none()
    {
        options.set("crf", quality.as_deref().unwrap_or("20"));
    }
    options
}

/// Options of the container. Those that a muxer does not know it leaves alone.
pub(super) fn container_options(scene: &Scene) -> Dictionary<'static> {
    let ticks = scene.ticks_per_s().to_string();
    let mut options = dictionary(&[("fflags", "+bitexact"), ("video_track_timescale", &ticks)]);
    if scene.codec.capture_fps.is_some() {
        options.set("movflags", "use_metadata_tags");
    }
    options
}

pub(super) fn dictionary(entries: &[(&str, &str)]) -> Dictionary<'static> {
    let mut dictionary = Dictionary::new();
    entries
        .iter()
        .for_each(|(key, value)| dictionary.set(key, value));
    dictionary
}

pub(super) fn rate(scene: &Scene) -> [i32; 2] {
    scene
        .camera
        .rate_hz
        .fraction()
        .unwrap_or([1, 1])
        .map(u32::cast_signed)
}

pub(super) fn range(format: PixelFormat) -> color::Range {
    if format.is_full_range() {
        color::Range::JPEG
    } else {
        color::Range::MPEG
    }
}

fn preset(preset: Preset) -> &'static str {
    match preset {
        Preset::Ultrafast => "ultrafast",
        Preset::Superfast => "superfast",
        Preset::Veryfast => "veryfast",
        Preset::Faster => "faster",
        Preset::Fast => "fast",
        Preset::Medium => "medium",
        Preset::Slow => "slow",
        Preset::Slower => "slower",
        Preset::Veryslow => "veryslow",
    }
}
