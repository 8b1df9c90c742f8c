//! Outside checks of the motion room: results that other people certified, and records with a known motion.

#![allow(
    clippy::expect_used,
    clippy::panic,
    clippy::print_stdout,
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    clippy::float_cmp,
    reason = "a failed expectation is a failed test; tables are printed; counts are small"
)]

#[path = "motion/coverage.rs"]
mod coverage;
#[path = "motion/dual.rs"]
mod dual;
#[path = "motion/nist_strd.rs"]
mod nist_strd;
#[path = "motion/planted.rs"]
mod planted;
#[path = "motion/record.rs"]
mod record;
