//! Footage: a file becomes frames with true times.
mod facts;
pub use facts::*;
