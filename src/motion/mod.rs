//! The motion: from a position–time record to a damped sinusoid with honest uncertainties.
//!
//! In: [`PositionRecord`]s. Out: a [`MotionFit`], the [`MotionQuantities`] derived from it, and a row per [`Cycle`].

mod cycles;
mod error;
mod fit;
mod guess;
mod laws;
pub mod least_squares;
mod noise;
mod plain;
mod position;
mod profile;
mod quantities;
mod readings;
mod refusal;
mod relations;
mod robust;
mod sinusoid;
mod slips;

pub use cycles::{Cycle, cycles};
pub use error::MotionError;
pub use fit::{MotionFit, fit};
pub use laws::LawTrial;
pub use noise::ResidualDiagnosis;
pub use position::{PositionRecord, PositionUse};
pub use quantities::{ExternalTerms, MotionQuantities, quantities};
pub use refusal::MIN_CYCLES;
pub use relations::period_shift_s;
pub use slips::{Slip, SlipSearch, fit_with_slips};
