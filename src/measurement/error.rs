//! Why there is no measurement, and whose fault it is.

use crate::footage::FootageError;
use crate::motion::MotionError;
use crate::run_sheet::SheetError;
use crate::scale::{BarError, ScaleError};
use crate::track::TrackError;
use std::path::PathBuf;

/// Who can mend it; decides the exit code.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Fault {
    /// The flags or the sheet: exit code 2.
    Usage,
    /// The file: exit code 3.
    Input,
    /// The file is sound, but what it shows cannot be measured: exit code 4.
    NotMeasurable,
}

/// Why there is no measurement.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum MeasureError {
    /// The sheet or the flags.
    #[error(transparent)]
    Sheet(#[from] SheetError),
    /// The scale bar.
    #[error(transparent)]
    Bar(#[from] BarError),
    /// The film.
    #[error(transparent)]
    Footage(#[from] FootageError),
    /// The marker.
    #[error(transparent)]
    Track(#[from] TrackError),
    /// The axis.
    #[error(transparent)]
    Scale(#[from] ScaleError),
    /// The motion.
    #[error(transparent)]
    Motion(#[from] MotionError),
    /// The marker stays where it is.
    #[error(
        "the marker does not move: its path is {extent_px:.2} px long, and at least {least_px} px are needed; film the swing, and draw the box around what swings"
    )]
    NoMotion {
        /// Length of the path along its axis, display px.
        extent_px: f64,
        /// Least length, display px.
        least_px: f64,
    },
    /// The marker went away and did not come back.
    #[error(
        "the marker was lost at frame {frame} ({t_s:.2} s) and not found again in the {n_after} frames after it; give --to {t_s:.2} to measure the part before, or film with the whole travel in view"
    )]
    MarkerLeft {
        /// First frame without it, from 0.
        frame: usize,
        /// Its time in the film, s.
        t_s: f64,
        /// Frames from there to the end of the part to be fitted.
        n_after: usize,
    },
    /// The marker was found in too few frames.
    #[error(
        "the marker was found in {n_seen} of {n_frames} frames only (lost first at frame {first_lost}); mark a patch with more contrast, keep it in view, or choose the part with --from and --to"
    )]
    MarkerLost {
        /// Frames it was found in.
        n_seen: usize,
        /// Frames of the part to be fitted.
        n_frames: usize,
        /// First frame without it, from 0.
        first_lost: usize,
    },
    /// No frame lies between `--from` and `--to`.
    #[error("no reading lies in the part asked for ({}); the record runs from {first_s:.2} s to {last_s:.2} s, choose --from and --to within it", part_in_words(*from_s, *to_s))]
    EmptyPart {
        /// Start of the part asked for, s.
        from_s: f64,
        /// End of the part asked for, s.
        to_s: f64,
        /// Time of the first frame, s.
        first_s: f64,
        /// Time of the last frame, s.
        last_s: f64,
    },
    /// A readout that would last longer than a frame.
    #[error(
        "a readout of {readout_ms} ms cannot be: the frames are {interval_ms:.2} ms apart; give the time from the first row of a picture to its last, such as 12"
    )]
    Readout {
        /// The readout given, ms.
        readout_ms: f64,
        /// Time from frame to frame, ms of capture time.
        interval_ms: f64,
    },
    /// A table of positions cannot be read.
    #[error("{}: {reason}", path.display())]
    Table {
        /// The table.
        path: PathBuf,
        /// What is wrong, where, and what to do.
        reason: String,
    },
}

/// A part in words; an end that is infinite was not given.
fn part_in_words(from_s: f64, to_s: f64) -> String {
    match (from_s.is_finite(), to_s.is_finite()) {
        (true, true) => format!("{from_s} s to {to_s} s"),
        (true, false) => format!("from {from_s} s on"),
        _ => format!("up to {to_s} s"),
    }
}

impl MeasureError {
    /// Whose fault it is.
    #[must_use]
    pub fn fault(&self) -> Fault {
        match self {
            Self::Sheet(_) | Self::Bar(_) | Self::EmptyPart { .. } | Self::Readout { .. } => {
                Fault::Usage
            }
            Self::Motion(
                MotionError::NotFinite { .. }
                | MotionError::UnusableUncertainty { .. }
                | MotionError::TimeNotIncreasing { .. }
                | MotionError::AbsurdSpan { .. },
            ) => Fault::Input,
            Self::Footage(FootageError::CaptureRate { .. }) => Fault::Usage,
            Self::Footage(_) | Self::Table { .. } => Fault::Input,
            Self::Track(error) => track_fault(error),
            Self::Scale(_)
            | Self::NoMotion { .. }
            | Self::Motion(_)
            | Self::MarkerLeft { .. }
            | Self::MarkerLost { .. } => Fault::NotMeasurable,
        }
    }
    /// True where the message names the file it concerns.
    #[must_use]
    pub fn names_file(&self) -> bool {
        match self {
            Self::Footage(FootageError::CaptureRate { .. }) => false,
            Self::Footage(_) | Self::Table { .. } | Self::Track(TrackError::Footage(_)) => true,
            // What was typed is wrong whatever the file.
            Self::Sheet(_) | Self::Bar(_) => true,
            _ => false,
        }
    }
}

fn track_fault(error: &TrackError) -> Fault {
    match error {
        TrackError::Footage(_) => Fault::Input,
        TrackError::OutsidePicture { .. }
        | TrackError::TooSmall { .. }
        | TrackError::TooLarge { .. }
        | TrackError::NoSuchFrame { .. } => Fault::Usage,
        // What the box shows is the film's doing: it can be read, but not measured there.
        _ => Fault::NotMeasurable,
    }
}
