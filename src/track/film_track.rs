//! What to follow, and what came of it.

use super::sighting::SightingOutcome;
use super::streak_line::StreakLines;
use super::template::PixelBox;
use crate::footage::{GreyPicture, PictureKind};

/// What to follow through a film, in coded pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Plan {
    /// Box around the marker.
    pub marker: PixelBox,
    /// Frame the boxes were drawn in, from 0.
    pub at_frame: usize,
    /// Box around a patch that stands still, to take camera shake off.
    pub steady: Option<PixelBox>,
    /// Direction of the motion as far as it is known beforehand, any length: that of the scale bar.
    pub along: [f64; 2],
}

/// What the decoder said of one frame.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct FrameNote {
    /// Presentation stamp, ticks.
    pub stamp: Option<i64>,
    /// How the picture was coded.
    pub kind: PictureKind,
    /// True where the picture had to be patched up.
    pub damaged: bool,
    /// True where the picture is made of two fields.
    pub interlaced: bool,
}

/// The path of the marker through a film, in coded pixels.
#[derive(Clone, Debug, PartialEq)]
pub struct FilmTrack {
    /// One note a frame.
    pub notes: Vec<FrameNote>,
    /// One outcome a frame.
    pub marker: Vec<SightingOutcome>,
    /// One outcome a frame for the steady patch, where there is one.
    pub steady: Option<Vec<SightingOutcome>>,
    /// Lines along `Plan::along`, and across it.
    pub streaks: [StreakLines; 2],
    /// The start frame, coded px, made smaller by `start_shrunk_by`.
    pub start_picture: GreyPicture,
    /// Coded px per pixel of `start_picture`.
    pub start_shrunk_by: usize,
}

impl FilmTrack {
    /// Takes the outcomes and lines before `at_frame` from a walk backwards.
    pub(super) fn take_beginning(&mut self, back: Self, at_frame: usize) {
        let replace = |own: &mut Vec<SightingOutcome>, other: &[SightingOutcome]| {
            for (own, other) in own.iter_mut().zip(other).take(at_frame) {
                *own = *other;
            }
        };
        replace(&mut self.marker, &back.marker);
        if let (Some(own), Some(other)) = (self.steady.as_mut(), back.steady.as_ref()) {
            replace(own, other);
        }
        for (own, other) in self.streaks.iter_mut().zip(back.streaks) {
            for (line, other) in own.lines.iter_mut().zip(other.lines).take(at_frame) {
                *line = other;
            }
        }
    }
}
