//! Outside checks of the motion room: results that other people certified.

#[path = "motion/dual.rs"]
mod dual;
#[path = "motion/nist_strd.rs"]
mod nist_strd;
