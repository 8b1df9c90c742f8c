//! Tracking: frames become the path of a marker.
//!
//! In: a source of frames, a box around the marker in one frame. Out: for every frame a [`Sighting`] or the reason why
//! there is none. Matching is by zero-mean normalised cross-correlation on low-passed luma in coded pixels; the lens,
//! the scale and the display's turn are other rooms' business.

mod align;
mod correlate;
mod error;
mod film_track;
mod follow;
mod kernel;
mod lowpass;
mod refine;
mod search;
mod sighting;
mod streak_line;
mod template;
mod texture;
mod walk;

pub use correlate::{Scores, correlate};
pub use error::TrackError;
pub use film_track::{FilmTrack, FrameNote, Plan};
pub use follow::Follower;
pub use lowpass::{LOWPASS_SIGMA_PX, lowpass};
pub use refine::{Peak, quadratic_peak};
pub use sighting::{Sighting, SightingOutcome};
pub use streak_line::StreakLines;
pub use template::{PixelBox, Template};
pub use walk::walk;
