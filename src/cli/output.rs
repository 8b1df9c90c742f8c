//! Where results go and what is said of them.

use super::outcome::{Failure, print};
use crate::measurement::Measurement;
use crate::record;
use std::path::{Path, PathBuf};

/// Where results go and what is said.
#[derive(Debug, clap::Args)]
pub(super) struct OutputArguments {
    /// Folder for the results [default: the clip's or table's name with .ebbmark, in the current folder]
    #[arg(long, value_name = "DIR")]
    out: Option<PathBuf>,
    /// Print result.json to stdout, and nothing else there
    #[arg(long)]
    json: bool,
    /// Print nothing but errors
    #[arg(long)]
    pub(super) quiet: bool,
}

impl OutputArguments {
    /// The folder for the results of a file.
    pub(super) fn folder(&self, source: &Path) -> PathBuf {
        let default = || {
            let stem = source.file_stem().map_or_else(
                || "result".into(),
                |stem| stem.to_string_lossy().into_owned(),
            );
            PathBuf::from(format!("{stem}.ebbmark"))
        };
        self.out.clone().unwrap_or_else(default)
    }

    /// Writes the folder and says what is in it.
    pub(super) fn deliver(
        &self,
        measurement: &Measurement,
        run_toml: &str,
        folder: &Path,
    ) -> Result<(), Failure> {
        record::write(measurement, run_toml, folder)?;
        if self.json {
            return print(&record::result_json_text(measurement));
        }
        if self.quiet {
            return Ok(());
        }
        print(&format!(
            "{}\nReport: {}\n",
            record::summary(measurement).trim_end(),
            folder.join("report.html").display()
        ))
    }
}
