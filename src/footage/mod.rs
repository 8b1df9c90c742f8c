//! Footage: a file becomes frames with true times.
//!
//! In: a path. Out: [`Frame`]s in presentation order, each a view of the decoder's own luma, the [`StreamFacts`], and
//! from all stamps together the [`FrameClock`] with a time for every frame.

mod capture_rate;
mod decode;
mod error;
mod facts;
mod frame_clock;
mod grid;
mod luma;
mod open;
mod orientation;
mod patience;
mod raw;

pub use capture_rate::{CaptureRate, capture_rate_from_metadata, time_scale};
pub use decode::{Footage, Frame, FrameSource, PictureKind};
pub use error::FootageError;
pub use facts::{ClipFacts, StreamFacts};
pub use frame_clock::{FrameClock, FrameTimes, even_times, frame_clock};
pub use luma::{GreyPicture, LumaCopy, LumaView};
pub use open::{Damage, Limits};
pub use orientation::Orientation;
pub use patience::with_patience;
