//! The record from the outside: files that a person, a spreadsheet and a program can read.
//!
//! Every test starts from a [`double::Double`], a measurement whose figures are known in closed form.

#![allow(
    clippy::unwrap_used,
    clippy::expect_used,
    clippy::panic,
    reason = "in a test a panic is the message"
)]

#[path = "record/double.rs"]
mod double;
#[path = "record/folder.rs"]
mod folder;
#[path = "record/json.rs"]
mod json;
#[path = "record/page.rs"]
mod page;
#[path = "record/streak.rs"]
mod streak;
#[path = "record/tables.rs"]
mod tables;
