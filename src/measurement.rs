//! The pipeline: it reads as a table of contents.
//!
//! In: a run sheet and the folder its paths start from. Out: a [`Measurement`], plain data that the record room writes down.

mod clip;
mod energy;
mod error;
mod film;
mod part;
mod parts;
mod still;
mod table;
mod warnings;

pub use error::{Fault, MeasureError};
pub use parts::{
    EnergyFigures, FilmPart, FrameSlip, Measurement, RecordRow, RowStatus, ScaleFacts, Still,
    Streak, Warning,
};

use crate::motion::{self, ExternalTerms, PositionRecord, PositionUse};
use crate::run_sheet::{FitRun, RunSheet};
use crate::scale::ScaleBar;
use crate::uncertainty::Quantity;
use crate::verdict;
use std::path::Path;

/// Measures a film.
///
/// * `clip`: the film; `sheet`: what to look for in it. `progress` is told how many frames are done, of how many if known.
///
/// # Errors
/// [`MeasureError`]: what is wrong, where, and what to do; [`MeasureError::fault`] says who can mend it.
pub fn measure(
    clip: &Path,
    sheet: &RunSheet,
    progress: &mut dyn FnMut(usize, Option<usize>),
) -> Result<Measurement, MeasureError> {
    let run = sheet.film_run()?;
    let bar = ScaleBar::new(run.bar_px, run.length_m, run.u_length_m, run.u_end_px)?;
    let (walked, sha256) = std::thread::scope(|scope| {
        let sum = scope.spawn(|| clip::sha256(clip));
        let walked = clip::walk(clip, &run, progress);
        (walked, sum.join())
    });
    let (track, footage) = walked?;
    let facts = clip::clip_facts(&footage, clip, &track, sha256)?;
    let film = film::Film::new(&run, bar, footage.facts(), track, clip)?;
    let mut rows = film.rows(&run)?;
    let part = fit_rows(&mut rows, &run.fit, Some(film.terms()))?;
    let film_part = film.into_part(facts, &run, &rows, &part.slips, part.doubtful_phase);
    part.into_measurement(
        &sheet.with_source(&film_part.clip.file_name),
        Some(film_part),
        rows,
    )
}

/// The same fit and verdicts from a table of positions and times, whoever made it.
///
/// * `table`: CSV with a header that names at least `t_s` and `x_m`; `u_t_s`, `u_x_m` and `status` are used where they stand.
///   Rows without a position are lost, rows with status `outside` stay out.
///
/// # Errors
/// [`MeasureError`], as for [`measure`]; [`MeasureError::Table`] names the row.
pub fn refit(table: &Path, sheet: &RunSheet) -> Result<Measurement, MeasureError> {
    let run = sheet.fit_run()?;
    let (mut rows, file_name, sha256) = table::read(table)?;
    part::mark_outside(&mut rows, &run)?;
    let part = fit_rows(&mut rows, &run, None)?;
    let mut measurement = part.into_measurement(&sheet.with_table(&file_name), None, rows)?;
    measurement.source_sha256 = sha256;
    Ok(measurement)
}

/// What fitting gives, film or table.
struct FittedPart {
    slips: Vec<FrameSlip>,
    doubtful_phase: bool,
    fit: motion::MotionFit,
    quantities: motion::MotionQuantities,
    cycles: Vec<motion::Cycle>,
    energy: Option<EnergyFigures>,
    verdicts: Vec<verdict::Verdict>,
    run: FitRun,
}

/// Fits the rows that take part, and writes fit, residual and status back into them.
fn fit_rows(
    rows: &mut [RecordRow],
    run: &FitRun,
    film: Option<film::FilmTerms>,
) -> Result<FittedPart, MeasureError> {
    let taking_part: Vec<usize> = (0..rows.len())
        .filter(|&at| rows[at].status == RowStatus::Used)
        .collect();
    let records: Vec<PositionRecord> = taking_part
        .iter()
        .filter_map(|&at| record(&rows[at]))
        .collect();
    let search = look_for_slips(&records, film.as_ref())?;
    let slips = move_rows(rows, &taking_part, &search, film.as_ref());
    let (fit, records) = (search.fit, search.records);
    for (at, &row) in taking_part.iter().enumerate() {
        let row = &mut rows[row];
        row.fit_m = Some(fit.fit_m[at]);
        row.residual_m = Some(fit.residual_m[at]);
        if fit.uses[at] == PositionUse::Outlier {
            row.status = RowStatus::Outlier;
        }
    }
    let external = ExternalTerms {
        u_clock_rel: run.clock.u_rel(),
        clock_assumed: run.clock.assumed,
        u_scale_rel: film.map(|film| film.u_scale_rel),
        scale_assumed: film.is_some_and(|film| film.scale_assumed),
        longest_exposure_s: film.map(|film| film.frame_interval_s),
    };
    let quantities = motion::quantities(&fit, &external);
    let cycles = motion::cycles(&records, &fit);
    let verdicts = verdict::verdicts(&fit, &quantities);
    let energy = energy::figures(&quantities, run);
    Ok(FittedPart {
        slips,
        doubtful_phase: search.doubtful,
        fit,
        quantities,
        cycles,
        energy,
        verdicts,
        run: run.clone(),
    })
}

/// Fits a record; on a film whose stamps are even, frames that are missing behind them are looked for first.
fn look_for_slips(
    records: &[PositionRecord],
    film: Option<&film::FilmTerms>,
) -> Result<motion::SlipSearch, MeasureError> {
    match film {
        Some(film) if film.even_stamps => {
            Ok(motion::fit_with_slips(records, film.frame_interval_s)?)
        }
        _ => {
            let fit = motion::fit(records)?;
            Ok(motion::SlipSearch {
                slips: Vec::new(),
                doubtful: false,
                records: records.to_vec(),
                fit,
            })
        }
    }
}

/// Moves the times of all rows behind each slip, and names its frame.
fn move_rows(
    rows: &mut [RecordRow],
    taking_part: &[usize],
    search: &motion::SlipSearch,
    film: Option<&film::FilmTerms>,
) -> Vec<FrameSlip> {
    let interval_s = film.map_or(0.0, |film| film.frame_interval_s);
    let named = search.slips.iter().map(|slip| {
        let row = taking_part[slip.at];
        for row in &mut rows[row..] {
            row.t_s += f64::from(slip.n_frames) * interval_s;
        }
        FrameSlip {
            before_frame: row,
            n_frames: slip.n_frames,
            estimate_frames: slip.estimate_frames,
        }
    });
    named.collect()
}

/// The row as the fit takes it; None where it has no position.
fn record(row: &RecordRow) -> Option<PositionRecord> {
    Some(PositionRecord {
        t_s: row.t_s,
        u_t_s: row.u_t_s,
        x_m: row.x_m?,
        u_x_m: row.u_x_m.unwrap_or(1.0),
    })
}

impl FittedPart {
    fn into_measurement(
        self,
        sheet: &RunSheet,
        film: Option<FilmPart>,
        rows: Vec<RecordRow>,
    ) -> Result<Measurement, MeasureError> {
        let Self {
            slips: _,
            doubtful_phase: _,
            fit,
            quantities,
            cycles,
            energy,
            verdicts,
            run,
        } = self;
        let mut measurement = Measurement {
            source_name: sheet.source_name().to_owned(),
            source_sha256: film
                .as_ref()
                .map_or_else(String::new, |film| film.clip.sha256.clone()),
            sheet_toml: sheet.to_toml()?,
            film,
            rows,
            fit,
            quantities,
            cycles,
            energy,
            verdicts,
            warnings: Vec::new(),
        };
        measurement.warnings = warnings::warnings(&measurement, &run);
        Ok(measurement)
    }
}

/// Relative standard uncertainty of a quantity; None where it has no value or no uncertainty.
fn u_rel(quantity: &Quantity) -> Option<f64> {
    Some(quantity.u? / quantity.value?.abs())
}
