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
