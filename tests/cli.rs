//! The tool itself: a folder, a command line, what comes out of it.

#[path = "cli/bad_input.rs"]
mod bad_input;
#[path = "cli/bench.rs"]
mod bench;
#[path = "cli/decoding.rs"]
mod decoding;
#[path = "cli/main_job.rs"]
mod main_job;
#[path = "cli/verbs.rs"]
mod verbs;
