//! Why a marker could not be tracked.

use crate::footage::FootageError;

/// What is wrong with the marker, the box or the film, and what to do.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum TrackError {
    /// The film itself failed.
    #[error(transparent)]
    Footage(#[from] FootageError),
    /// The box is not inside the picture.
    #[error(
        "the {what} box {left:.0},{top:.0},{width:.0},{height:.0} reaches outside the picture of {picture_width:.0} × {picture_height:.0} px; draw it inside"
    )]
    OutsidePicture {
        /// `marker` or `steady`.
        what: &'static str,
        /// Left edge, display px.
        left: f64,
        /// Top edge, display px.
        top: f64,
        /// Width, display px.
        width: f64,
        /// Height, display px.
        height: f64,
        /// Width of the picture, display px.
        picture_width: f64,
        /// Height of the picture, display px.
        picture_height: f64,
    },
    /// The box is too small to be matched.
    #[error(
        "the {what} box is {width} × {height} px and must be at least {least} px each way; draw it around the whole marker, or film from nearer"
    )]
    TooSmall {
        /// `marker` or `steady`.
        what: &'static str,
        /// Width, coded px.
        width: usize,
        /// Height, coded px.
        height: usize,
        /// Least side, px.
        least: usize,
    },
    /// The box is too large to be a marker.
    #[error(
        "the {what} box is {width} × {height} px and may be at most {most} px each way; draw it around the marker alone"
    )]
    TooLarge {
        /// `marker` or `steady`.
        what: &'static str,
        /// Width, coded px.
        width: usize,
        /// Height, coded px.
        height: usize,
        /// Largest side, px.
        most: usize,
    },
    /// Nothing in the box tells where it is.
    #[error(
        "the {what} box in frame {frame} has too little texture along the motion: its place could be told only to {u_px:.2} px, and {limit_px:.2} px or better is needed; choose a patch with strong edges across the motion, or stick on a marker"
    )]
    TooLittleTexture {
        /// `marker` or `steady`.
        what: &'static str,
        /// Frame number, from 0.
        frame: usize,
        /// Bound on the standard uncertainty of a shift along the motion, px.
        u_px: f64,
        /// The largest that is accepted, px.
        limit_px: f64,
    },
    /// The start frame lies beyond the end.
    #[error("frame {frame} was named for the marker box, but the film has {n_frames} frames (0 to {}); give a smaller --at-frame", n_frames.saturating_sub(1))]
    NoSuchFrame {
        /// Frame number asked for.
        frame: usize,
        /// Number of frames.
        n_frames: usize,
    },
    /// The start frame could not be decoded without patching.
    #[error(
        "frame {frame}, named for the marker box, is damaged; draw the box in another frame (--at-frame)"
    )]
    DamagedStart {
        /// Frame number, from 0.
        frame: usize,
    },
}
