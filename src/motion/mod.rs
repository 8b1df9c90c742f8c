//! The motion: from a position–time record to a damped sinusoid with honest uncertainties.
//!
//! In: [`PositionRecord`]s. Out: a [`MotionFit`], the [`MotionQuantities`] derived from it, and a row per [`Cycle`].

pub mod least_squares;
mod position;
mod types;

pub use position::{PositionRecord, PositionUse};
pub use types::*;
