//! Outside checks of the motion room: results that other people certified, and records with a known motion.

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
