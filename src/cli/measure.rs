//! `ebbmark measure CLIP|RUN.toml`

use super::fit_flags::{FitArguments, over};
use super::numbers::{four, one};
use super::outcome::Failure;
use super::output::OutputArguments;
use super::progress::Progress;
use super::{refit, repeat, small_text};
use crate::measurement::measure;
use crate::record;
use crate::run_sheet::RunSheet;
use std::path::{Path, PathBuf};

/// What was typed after `measure`.
#[derive(Debug, clap::Args)]
pub(super) struct Arguments {
    /// The film, or a run sheet (.toml) that names one
    #[arg(value_name = "CLIP|RUN.toml")]
    source: PathBuf,
    /// Box around the marker in the start frame (needed for a clip; `ebbmark inspect CLIP --stills DIR` shows where): left,
    /// top, width, height, display px
    #[arg(long, value_name = "X,Y,W,H", value_parser = four, allow_hyphen_values = true)]
    marker: Option<[f64; 4]>,
    /// The two ends of a bar of known length (needed for a clip), display px
    #[arg(long, value_name = "X1,Y1,X2,Y2", value_parser = four, allow_hyphen_values = true)]
    scale_bar: Option<[f64; 4]>,
    /// Length of the bar in metres (needed for a clip): 0.5, not 500
    #[arg(long, value_name = "METRES", value_parser = one, allow_hyphen_values = true)]
    length: Option<f64>,
    /// Standard uncertainty of the length, m [default: 0.29 mm, said to be assumed]
    #[arg(long, value_name = "METRES", value_parser = one, allow_hyphen_values = true)]
    length_u: Option<f64>,
    /// Standard uncertainty of reading one end of the bar, px [default: 0.58, said to be assumed]
    #[arg(long, value_name = "PX", value_parser = one, allow_hyphen_values = true)]
    end_u: Option<f64>,
    /// Frame the boxes were drawn in, from 0 [default: 0]
    #[arg(long, value_name = "N", allow_hyphen_values = true)]
    at_frame: Option<usize>,
    /// A patch that stands still, to take camera shake off
    #[arg(long, value_name = "X,Y,W,H", value_parser = four, allow_hyphen_values = true)]
    steady: Option<[f64; 4]>,
    /// Rate the frames were captured at, for slow motion [default: what the file says]
    #[arg(long, value_name = "HZ", value_parser = one, allow_hyphen_values = true)]
    capture_rate: Option<f64>,
    /// Time the sensor takes from a picture's first row to its last, ms
    #[arg(long, value_name = "MS", value_parser = one, allow_hyphen_values = true)]
    readout_ms: Option<f64>,
    #[command(flatten)]
    fit: FitArguments,
    #[command(flatten)]
    output: OutputArguments,
}

/// Measures, writes the folder, says what came out.
pub(super) fn run(arguments: &Arguments) -> Result<(), Failure> {
    let (mut sheet, base) = sheet_of(&arguments.source)?;
    arguments.lay_over(&mut sheet);
    if let Some(table) = &sheet.positions {
        let table = base.join(table);
        return refit::run_on(&table, &sheet, &arguments.output);
    }
    let Some(clip) = &sheet.clip else {
        return Err(Failure::usage(format!(
            "{}: names no film; give `clip = \"NAME.mp4\"`",
            arguments.source.display()
        )));
    };
    let clip = base.join(clip);
    let folder = arguments.output.folder(&clip);
    record::check_destination(&folder)?;
    let measurement = {
        let bar = Progress::new(arguments.output.quiet);
        measure(&clip, &sheet, &mut |done, of| bar.tell(done, of))
            .map_err(|error| Failure::of_file(&error, &clip))?
    };
    let run_toml = repeat::film_sheet(&sheet, &clip, &folder)?;
    arguments.output.deliver(&measurement, &run_toml, &folder)
}

/// The sheet behind a path: the file itself, or one that names the film; and the folder its paths start from.
fn sheet_of(source: &Path) -> Result<(RunSheet, PathBuf), Failure> {
    if source
        .extension()
        .is_none_or(|extension| !extension.eq_ignore_ascii_case("toml"))
    {
        if source
            .extension()
            .is_some_and(|extension| extension.eq_ignore_ascii_case("csv"))
        {
            return Err(Failure::usage(format!(
                "{}: this is a table; use `ebbmark refit`",
                source.display()
            )));
        }
        let Some(clip) = source.to_str() else {
            return Err(Failure::input(format!(
                "{}: the file's name is not valid UTF-8; rename the clip",
                source.display()
            )));
        };
        return Ok((RunSheet::default().with_source(clip), PathBuf::new()));
    }
    let text = small_text::read(source, "run sheet")?;
    let sheet = RunSheet::from_toml(&text)
        .map_err(|error| Failure::usage(format!("{}: {error}", source.display())))?;
    Ok((
        sheet,
        source.parent().map(Path::to_path_buf).unwrap_or_default(),
    ))
}

impl Arguments {
    fn lay_over(&self, sheet: &mut RunSheet) {
        over(&mut sheet.marker.box_px, self.marker);
        over(&mut sheet.scale.bar_px, self.scale_bar);
        over(&mut sheet.scale.length_m, self.length);
        over(&mut sheet.scale.u_length_m, self.length_u);
        over(&mut sheet.scale.u_end_px, self.end_u);
        over(&mut sheet.steady.box_px, self.steady);
        over(&mut sheet.time.capture_rate_hz, self.capture_rate);
        over(&mut sheet.time.readout_ms, self.readout_ms);
        if let Some(at_frame) = self.at_frame {
            sheet.marker.at_frame = at_frame;
        }
        self.fit.lay_over(sheet);
    }
}
