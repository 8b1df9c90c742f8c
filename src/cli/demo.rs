//! `ebbmark demo`: the main job on the clip inside the program.

use super::outcome::{Failure, print};
use super::progress::Progress;
use super::repeat;
use crate::measurement::measure;
use crate::record;
use crate::run_sheet::RunSheet;
use std::path::PathBuf;

/// The clip: Alder Row, rail 7, a rehearsal whose truth lies beside it in the repository.
const CLIP: &[u8] = include_bytes!("../../fixtures/demo/rail-7.mp4");
/// Marker, scale bar and mass, as a user would have marked them.
const SHEET: &str = include_str!("../../fixtures/sheets/rail-7.toml");
const CLIP_NAME: &str = "rail-7.mp4";

/// What was typed after `demo`.
#[derive(Debug, clap::Args)]
pub(super) struct Arguments {
    /// Folder for the clip and its results
    #[arg(long, value_name = "DIR", default_value = "ebbmark-demo")]
    out: PathBuf,
    /// Print nothing but errors
    #[arg(long)]
    quiet: bool,
}

/// Unpacks the clip, measures it, says where the report is.
pub(super) fn run(arguments: &Arguments) -> Result<(), Failure> {
    let clip = arguments.out.join(CLIP_NAME);
    let folder = arguments.out.join("rail-7.ebbmark");
    record::create_folder(&arguments.out)?;
    record::check_destination(&folder)?;
    let same = std::fs::metadata(&clip).map(|facts| facts.len() == CLIP.len() as u64);
    match same {
        Ok(false) => {
            let folder = arguments.out.display();
            return Err(Failure::usage(format!(
                "{folder}: holds a {CLIP_NAME} of your own; choose another --out"
            )));
        }
        Ok(true) => {}
        Err(_) => record::write_file(&clip, CLIP)?,
    }
    let sheet = RunSheet::from_toml(SHEET).map_err(crate::measurement::MeasureError::from)?;
    let measurement = {
        let bar = Progress::new(arguments.quiet);
        measure(&clip, &sheet, &mut |done, of| bar.tell(done, of))
            .map_err(|error| Failure::of_file(&error, &clip))?
    };
    record::write(
        &measurement,
        &repeat::film_sheet(&sheet, &clip, &folder)?,
        &folder,
    )?;
    if arguments.quiet {
        return Ok(());
    }
    let sheet = folder.join("run.toml");
    print(&format!(
        "{}\nReport: {}\nRepeat it: ebbmark measure {}\n",
        record::summary(&measurement).trim_end(),
        folder.join("report.html").display(),
        sheet.display()
    ))
}
