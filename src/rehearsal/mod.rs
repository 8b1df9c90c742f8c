//! Films with known truth.
