//! ebbmark turns a phone clip of a free oscillation into a number that its user can defend.
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
