//! ebbmark turns a phone clip of a free oscillation into a number that its user can defend: period, damping ratio, Q and
//! energy loss per cycle, each with an honest uncertainty.
//!
//! The floors, from the top; a room uses only rooms below it:
//!
//! * [`cli`]: one file a verb.
//! * [`record`]: what leaves the house: tables, JSON, report, plots, streak.
//! * [`measurement`]: the pipeline. Start reading at [`measurement::measure`].
//! * [`verdict`]: answers, with the figures behind each.
//! * [`motion`]: x(t): guess, fit, noise, laws, cycles, lost frames.
//! * [`scale`]: pixels to metres along the motion axis.
//! * [`track`]: frames to the path of a marker.
//! * [`footage`]: a file to frames with true times.
//! * [`rehearsal`]: films with known truth; nothing in the pipeline uses it.
//! * [`run_sheet`], [`uncertainty`], [`stats`]: what everyone may use.
//!
//! A record of positions, whoever made it, is fitted without a film:
//!
//! ```
//! use ebbmark::motion::{MotionError, PositionRecord, fit};
//!
//! let records: Vec<PositionRecord> = (0..600)
//!     .map(|frame| {
//!         let t_s = f64::from(frame) / 60.0;
//!         let x_m = 0.1 * (-0.02 * t_s).exp() * (4.8 * t_s).cos();
//!         let error_m = 1e-5 * (f64::from(frame) * 2.4).sin();
//!         PositionRecord { t_s, u_t_s: 0.0, x_m: x_m + error_m, u_x_m: 1e-5 }
//!     })
//!     .collect();
//! let motion = fit(&records)?;
//! let period_s = std::f64::consts::TAU / 4.8;
//! assert!((motion.period_s() / period_s - 1.0).abs() < 1e-5);
//! # Ok::<(), MotionError>(())
//! ```

pub mod cli;
pub mod footage;
pub mod measurement;
pub mod motion;
mod number;
pub mod record;
pub mod rehearsal;
pub mod run_sheet;
pub mod scale;
#[cfg(doc)]
pub mod sources;
pub mod stats;
pub mod track;
pub mod uncertainty;
pub mod verdict;
