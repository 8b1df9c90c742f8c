//! Everything that is tested from outside the crate, one module a room; one binary, so that it links once.
#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    clippy::print_stdout,
    clippy::float_cmp,
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    clippy::disallowed_methods,
    reason = "a test says what went wrong by stopping there, prints figures for the reader, and lays out files of its own"
)]

mod cli;
mod motion;
mod record;
mod rehearsal;
mod track;
