//! The record: what leaves the house.
//!
//! In: a [`Measurement`](crate::measurement::Measurement). Out: a folder that appears whole or not at all, with
//! `result.json`, `positions.csv`, `cycles.csv`, `report.html`, `streak.png` and `run.toml`; and a short text for the terminal.
//! The same measurement gives the same bytes.

mod axis;
mod brush;
mod budget;
mod canvas;
mod error;
mod facts;
mod field;
mod folder;
mod illustrations;
mod json;
mod laws;
mod overlay;
mod page;
mod picture;
mod plots;
mod quantities;
mod report;
mod rounding;
mod shown;
mod single;
mod still_grid;
mod streak;
mod stretch;
mod summary;
mod tables;
mod thin;

pub use error::RecordError;
pub use folder::{check_destination, write};
pub use json::{result_json, result_json_text};
pub use report::report_html;
pub use single::{create_folder, write_file};
pub use still_grid::write_still;
pub use streak::streak_png;
pub use summary::summary;
pub use tables::{cycles_csv, positions_csv};
