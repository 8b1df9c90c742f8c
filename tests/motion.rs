//! Outside checks of the motion room: results that other people certified, and records with a known motion.

mod coverage;
mod dual;
mod nist_strd;
mod planted;
mod record;
