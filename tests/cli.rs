//! The tool itself: a folder, a command line, what comes out of it.

mod bad_input;
mod bench;
mod decoding;
mod main_job;
mod readme;
mod verbs;
