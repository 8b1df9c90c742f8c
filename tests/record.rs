//! The record from the outside: files that a person, a spreadsheet and a program can read.
//!
//! Every test starts from a [`double::Double`], a measurement whose figures are known in closed form.

mod double;
mod folder;
mod json;
mod page;
mod streak;
mod tables;
