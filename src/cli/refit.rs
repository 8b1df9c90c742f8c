//! `ebbmark refit POSITIONS.csv`

use super::fit_flags::FitArguments;
use super::outcome::Failure;
use super::output::OutputArguments;
use super::repeat;
use crate::measurement::refit;
use crate::record;
use crate::run_sheet::RunSheet;
use std::path::{Path, PathBuf};

/// What was typed after `refit`.
#[derive(Debug, clap::Args)]
pub(super) struct Arguments {
    /// A table with a header line and at least the columns t_s and x_m
    #[arg(value_name = "POSITIONS.csv")]
    table: PathBuf,
    #[command(flatten)]
    fit: FitArguments,
    #[command(flatten)]
    output: OutputArguments,
}

/// Fits the table, writes the folder, says what came out.
pub(super) fn run(arguments: &Arguments) -> Result<(), Failure> {
    let mut sheet = RunSheet::default();
    arguments.fit.lay_over(&mut sheet);
    run_on(&arguments.table, &sheet, &arguments.output)
}

/// The same for a table that a run sheet names.
pub(super) fn run_on(
    table: &Path,
    sheet: &RunSheet,
    output: &OutputArguments,
) -> Result<(), Failure> {
    let folder = output.folder(table);
    record::check_destination(&folder)?;
    let measurement = refit(table, sheet).map_err(|error| Failure::of_file(&error, table))?;
    let run_toml = repeat::table_sheet(sheet, table, &folder)?;
    output.deliver(&measurement, &run_toml, &folder)
}
