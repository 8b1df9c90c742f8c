//! From packets to frames, one at a time, each a view of the decoder's own memory.

use super::luma::{LumaView, Sample};
use super::open::{OpenClip, open};
use super::{Damage, FootageError, Limits, StreamFacts, raw};
use ffmpeg_next::software::scaling;
use ffmpeg_next::{Error, Packet, Rescale, format, frame, picture};
use std::path::Path;

/// How a picture was coded; intra pictures locate the marker best.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PictureKind {
    /// Coded by itself.
    Intra,
    /// Predicted from earlier pictures.
    Predicted,
    /// Predicted from both sides.
    Bidirectional,
    /// The decoder does not say.
    Unknown,
}

/// One frame, borrowed until the next is asked for.
#[derive(Debug)]
pub struct Frame<'a> {
    /// Number in presentation order, from 0.
    pub index: usize,
    /// Presentation stamp, ticks of the stream's time base; None where the container gives none.
    pub stamp: Option<i64>,
    /// The picture's luma, coded pixels.
    pub luma: LumaView<'a>,
    /// How the picture was coded.
    pub kind: PictureKind,
    /// True where the decoder reports that it had to patch the picture up.
    pub damaged: bool,
    /// True where the picture is made of two fields taken one after the other.
    pub interlaced: bool,
}

/// Where frames come from: a decoder, or pictures in memory.
pub trait FrameSource {
    /// The next frame in presentation order, or `None` at the end.
    ///
    /// # Errors
    /// [`FootageError`] where the film cannot go on; a damaged packet is no error but a frame that is missing or marked.
    fn next_frame(&mut self) -> Result<Option<Frame<'_>>, FootageError>;

    /// Goes back so that the next frames start at or before the frame with this stamp. From then on frames are told by
    /// their stamps: their numbers start at 0 again.
    ///
    /// # Errors
    /// [`FootageError::Seek`] where the container cannot be searched; `frame` is named in it.
    fn go_to(&mut self, stamp: i64, frame: usize) -> Result<(), FootageError>;
}

/// Longest run of packets in a row that may be unreadable before the rest of the file is given up.
const MAX_DAMAGED_RUN: usize = 2000;

/// A clip being decoded.
pub struct Footage {
    clip: OpenClip,
    picture: frame::Video,
    grey: frame::Video,
    converter: Option<scaling::Context>,
    n_frames: usize,
    n_damaged: usize,
    draining: bool,
    limits: Limits,
}

impl Footage {
    /// Opens the best video stream of a file on disk.
    ///
    /// # Errors
    /// [`FootageError`]: what is wrong with the file, or which limit it breaks.
    pub fn open(path: &Path, limits: Limits) -> Result<Self, FootageError> {
        let clip = open(path, &limits)?;
        Ok(Self {
            clip,
            picture: frame::Video::empty(),
            grey: frame::Video::empty(),
            converter: None,
            n_frames: 0,
            n_damaged: 0,
            draining: false,
            limits,
        })
    }

    /// Facts of the stream.
    #[must_use]
    pub fn facts(&self) -> &StreamFacts {
        &self.clip.facts
    }

    /// Packets and pictures reported as damaged so far.
    #[must_use]
    pub fn n_damaged(&self) -> usize {
        self.n_damaged
    }

    /// Decodes until `picture` holds the next frame; false at the end.
    fn decode_next(&mut self) -> bool {
        let mut damaged_run = 0;
        while damaged_run < MAX_DAMAGED_RUN {
            match self.clip.decoder.receive_frame(&mut self.picture) {
                Ok(()) => return true,
                Err(Error::Eof) => return false,
                Err(Error::Other {
                    errno: ffmpeg_next::util::error::EAGAIN,
                }) => {}
                Err(_) => {
                    self.n_damaged += 1;
                    damaged_run += 1;
                    continue;
                }
            }
            if self.draining {
                return false;
            }
            match self.feed() {
                Ok(()) => {}
                Err(()) => {
                    self.n_damaged += 1;
                    damaged_run += 1;
                }
            }
        }
        false
    }

    /// Hands the decoder its next packet, or tells it that there is none; an error stands for a damaged packet.
    fn feed(&mut self) -> Result<(), ()> {
        loop {
            let mut packet = Packet::empty();
            match packet.read(&mut self.clip.input) {
                Ok(()) if packet.stream() == self.clip.stream_index => {
                    return self.clip.decoder.send_packet(&packet).map_err(drop);
                }
                Ok(()) => {}
                Err(Error::InvalidData) => return Err(()),
                // The end, or a read error that FFmpeg repeats for ever: what was read so far still counts.
                Err(_) => {
                    self.draining = true;
                    return self.clip.decoder.send_eof().map_err(drop);
                }
            }
        }
    }

    fn damage_met(&self) -> FootageError {
        FootageError::Damaged {
            path: self.clip.path.clone(),
            frame: self.n_frames,
        }
    }

    fn check_picture(&self) -> Result<(), FootageError> {
        let [width, height] = self.clip.facts.orientation.coded_size_px();
        if (self.picture.width(), self.picture.height()) != (width, height) {
            return Err(FootageError::SizeChanged {
                path: self.clip.path.clone(),
                frame: self.n_frames,
                width: self.picture.width(),
                height: self.picture.height(),
            });
        }
        if self.n_frames >= self.limits.max_frames {
            return Err(FootageError::TooLong {
                path: self.clip.path.clone(),
                limit: self.limits.max_frames,
            });
        }
        Ok(())
    }

    /// Converts the picture to 8-bit grey where its luma cannot be read in place.
    fn convert(&mut self) -> Result<(), FootageError> {
        let path = &self.clip.path;
        let frame = self.n_frames;
        let failed = |error: Error| FootageError::Conversion {
            path: path.clone(),
            frame,
            reason: error.to_string(),
        };
        let (width, height) = (self.picture.width(), self.picture.height());
        let format = self.picture.format();
        let fits = self
            .converter
            .as_ref()
            .is_some_and(|converter| converter.input().format == format);
        if !fits {
            let grey = format::Pixel::GRAY8;
            self.converter = Some(
                scaling::Context::get(
                    format,
                    width,
                    height,
                    grey,
                    width,
                    height,
                    scaling::Flags::POINT | scaling::Flags::ACCURATE_RND,
                )
                .map_err(failed)?,
            );
        }
        if let Some(converter) = self.converter.as_mut() {
            converter
                .run(&self.picture, &mut self.grey)
                .map_err(failed)?;
        }
        Ok(())
    }
}

impl FrameSource for Footage {
    fn go_to(&mut self, stamp: i64, frame: usize) -> Result<(), FootageError> {
        let [numerator, denominator] = self.clip.facts.time_base;
        let part = |value: i64| i32::try_from(value).unwrap_or(i32::MAX);
        let wanted = stamp.rescale(
            (part(numerator), part(denominator)),
            ffmpeg_next::rescale::TIME_BASE,
        );
        self.clip
            .input
            .seek(wanted, ..wanted.saturating_add(1))
            .map_err(|error| FootageError::Seek {
                path: self.clip.path.clone(),
                frame,
                reason: error.to_string(),
            })?;
        self.clip.decoder.flush();
        self.draining = false;
        self.n_frames = 0;
        Ok(())
    }

    fn next_frame(&mut self) -> Result<Option<Frame<'_>>, FootageError> {
        let n_damaged = self.n_damaged;
        let more = self.decode_next();
        if self.n_damaged > n_damaged && self.limits.damage == Damage::Stop {
            return Err(self.damage_met());
        }
        if !more {
            return Ok(None);
        }
        self.check_picture()?;
        let in_place = raw::luma_sample(&self.picture);
        if in_place.is_none() {
            self.convert()?;
        }
        let index = self.n_frames;
        self.n_frames += 1;
        let damaged = self.picture.is_corrupt() || self.picture.has_decode_errors();
        if damaged && self.limits.damage == Damage::Stop {
            return Err(self.damage_met());
        }
        self.n_damaged += usize::from(damaged);
        let source = if in_place.is_some() {
            &self.picture
        } else {
            &self.grey
        };
        let (width, height) = (usize_from(source.width()), usize_from(source.height()));
        let luma = LumaView::new(
            source.data(0),
            source.stride(0),
            width,
            height,
            in_place.unwrap_or(Sample::Eight),
        )
        .ok_or_else(|| FootageError::Conversion {
            path: self.clip.path.clone(),
            frame: index,
            reason: "the decoder left too few bytes".to_owned(),
        })?;
        let kind = match self.picture.kind() {
            picture::Type::I | picture::Type::SI => PictureKind::Intra,
            picture::Type::P | picture::Type::SP | picture::Type::S => PictureKind::Predicted,
            picture::Type::B => PictureKind::Bidirectional,
            _ => PictureKind::Unknown,
        };
        Ok(Some(Frame {
            index,
            stamp: self.picture.timestamp(),
            luma,
            kind,
            damaged,
            interlaced: self.picture.is_interlaced(),
        }))
    }
}

fn usize_from(value: u32) -> usize {
    usize::try_from(value).unwrap_or(usize::MAX)
}
