//! Pictures into a file: samples, codec, container, stamps.
//!
//! In: luma planes in stored layout with stamps in ticks. Out: a finished file. Everything that could differ from run to run is
//! switched off: creation time, writing library, and threads whose timing could decide.
use std::path::{Path, PathBuf};

use ffmpeg_next::codec::{Context, encoder};
use ffmpeg_next::format::{self, context::Output};
use ffmpeg_next::frame::Video as VideoFrame;
use ffmpeg_next::{Packet, Rational};

use super::RehearsalError;
use super::codec::{self, Luma, rate};
use super::matrix;
use super::scene::Scene;
use super::storage::PixelFormat;

/// A file being written.
pub(super) struct Encoder {
    path: PathBuf,
    output: Output,
    codec: encoder::video::Encoder,
    format: PixelFormat,
    tint: [i32; 2],
    time_base: Rational,
    interval_ticks: i64,
}

impl Encoder {
    /// Opens encoder and file.
    ///
    /// # Errors
    /// [`RehearsalError::EncoderMissing`], [`RehearsalError::ClipName`] for an unknown container, [`RehearsalError::Ffmpeg`].
    pub(super) fn create(path: &Path, scene: &Scene) -> Result<Self, RehearsalError> {
        let doing = |doing: &'static str| {
            move |source| RehearsalError::Ffmpeg {
                doing,
                path: path.to_path_buf(),
                source,
            }
        };
        ffmpeg_next::init().map_err(doing("start"))?;
        // Encoders announce themselves on stderr, which belongs to whoever called us.
        ffmpeg_next::util::log::set_level(ffmpeg_next::util::log::Level::Fatal);
        let name = scene.codec.encoder();
        let found =
            encoder::find_by_name(name).ok_or(RehearsalError::EncoderMissing { encoder: name })?;
        let mut output = format::output(path).map_err(|_| RehearsalError::ClipName {
            path: path.to_path_buf(),
        })?;
        let headers_apart = output
            .format()
            .flags()
            .contains(format::Flags::GLOBAL_HEADER);
        let time_base = Rational::new(1, scene.ticks_per_s().cast_signed());
        let mut video = Context::new_with_codec(found)
            .encoder()
            .video()
            .map_err(doing("set up the encoder"))?;
        codec::configure(&mut video, scene, time_base, headers_apart);
        let encoder = video
            .open_with(codec::codec_options(&scene.codec))
            .map_err(doing("open the encoder"))?;
        let mut stream = output
            .add_stream_with(&encoder)
            .map_err(doing("add a stream"))?;
        stream.set_time_base(time_base);
        let [num, den] = rate(scene);
        stream.set_avg_frame_rate(Rational::new(num, den));
        let turn = scene.camera.rotation_deg;
        let turned =
            (turn != 0).then(|| matrix::display_matrix(turn, encoder.width(), encoder.height()));
        matrix::dress_stream(&mut output, turned, scene.camera.pixel_aspect)
            .map_err(doing("write the display matrix"))?;
        if let Some(capture_fps) = scene.codec.capture_fps {
            output.set_metadata(codec::dictionary(&[(
                "com.android.capture.fps",
                &format!("{capture_fps:.6}"),
            )]));
        }
        output
            .write_header_with(codec::container_options(scene))
            .map(drop)
            .map_err(doing("write the header"))?;
        Ok(Self {
            path: path.to_path_buf(),
            output,
            codec: encoder,
            format: scene.codec.layout(),
            tint: scene.background.tint,
            time_base,
            interval_ticks: i64::from(scene.ticks_per_s()) * i64::from(den) / i64::from(num),
        })
    }

    /// Encodes one picture under its stamp.
    ///
    /// # Errors
    /// [`RehearsalError::Ffmpeg`].
    pub(super) fn write(&mut self, luma: &Luma, stamp_ticks: i64) -> Result<(), RehearsalError> {
        // A new frame each time: the encoder may still hold the one before.
        let mut frame =
            VideoFrame::new(self.format.pixel(), self.codec.width(), self.codec.height());
        let deep = self.format.is_deep();
        fill(&mut frame, 0, deep, luma.width, &luma.samples);
        for plane in 1..3 {
            let neutral = if deep {
                512 + 4 * self.tint[plane - 1]
            } else {
                128 + self.tint[plane - 1]
            };
            let width = frame.plane_width(plane) as usize;
            let samples = vec![
                u16::try_from(neutral).unwrap_or(0);
                width * frame.plane_height(plane) as usize
            ];
            fill(&mut frame, plane, deep, width, &samples);
        }
        frame.set_pts(Some(stamp_ticks));
        frame.set_color_range(codec::range(self.format));
        self.codec
            .send_frame(&frame)
            .map_err(|source| self.failed("encode a picture", source))?;
        self.drain()
    }

    /// Writes what the encoder still holds, and closes the file.
    ///
    /// # Errors
    /// [`RehearsalError::Ffmpeg`].
    pub(super) fn finish(mut self) -> Result<(), RehearsalError> {
        self.codec
            .send_eof()
            .map_err(|source| self.failed("finish encoding", source))?;
        self.drain()?;
        self.output
            .write_trailer()
            .map_err(|source| self.failed("close the file", source))
    }

    fn drain(&mut self) -> Result<(), RehearsalError> {
        let mut packet = Packet::empty();
        // The muxer may have chosen another time base than was asked for (Matroska: milliseconds).
        let muxed = self
            .output
            .stream(0)
            .map_or(self.time_base, |stream| stream.time_base());
        loop {
            match self.codec.receive_packet(&mut packet) {
                Ok(()) => {}
                Err(
                    ffmpeg_next::Error::Eof
                    | ffmpeg_next::Error::Other {
                        errno: ffmpeg_next::error::EAGAIN,
                    },
                ) => return Ok(()),
                Err(source) => return Err(self.failed("fetch an encoded picture", source)),
            }
            packet.set_stream(0);
            packet.set_duration(self.interval_ticks);
            packet.rescale_ts(self.time_base, muxed);
            packet
                .write_interleaved(&mut self.output)
                .map_err(|source| self.failed("write a packet", source))?;
        }
    }

    fn failed(&self, doing: &'static str, source: ffmpeg_next::Error) -> RehearsalError {
        RehearsalError::Ffmpeg {
            doing,
            path: self.path.clone(),
            source,
        }
    }
}

/// Copies samples into a plane, line by line, because FFmpeg pads its lines.
fn fill(frame: &mut VideoFrame, plane: usize, deep: bool, width: usize, samples: &[u16]) {
    let stride = frame.stride(plane);
    for (line, from) in frame
        .data_mut(plane)
        .chunks_mut(stride)
        .zip(samples.chunks_exact(width))
    {
        if deep {
            line.chunks_exact_mut(2)
                .zip(from)
                .for_each(|(to, sample)| to.copy_from_slice(&sample.to_le_bytes()));
        } else {
            // An 8-bit code fits by construction: Codes::largest is 255 there.
            line.iter_mut()
                .zip(from)
                .for_each(|(to, sample)| *to = sample.to_le_bytes()[0]);
        }
    }
}
