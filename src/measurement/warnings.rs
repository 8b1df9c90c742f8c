//! What the user should know of a result, put into words in one place.

use super::{FilmPart, Measurement, RowStatus, Warning};
use crate::footage::CaptureRate;
use crate::run_sheet::FitRun;

/// Cycles below which amplitude and frequency are hard to tell from drift.
const FEW_CYCLES: f64 = 5.0;
/// Share of the used frames beyond which outliers are worth a word.
const MANY_OUTLIERS_SHARE: f64 = 0.01;
/// Enlargement of the variance beyond which the law, the lens or the clock is more likely at fault than the noise.
const STRUCTURED_ENLARGEMENT: f64 = 20.0;
/// Share of the sensor's rows a marker may sweep before the order in which they are read shows.
const ROWS_SWEPT_REL: f64 = 0.05;
/// Angle between bar and axis beyond which they see the lens and the perspective differently, rad.
const BAR_ANGLE_RAD: f64 = 0.09;
/// Motion off the axis, as a share of the amplitude, that a straight rail does not explain.
const OFF_AXIS_SHARE: f64 = 0.02;

/// All warnings of a measurement, those that touch the result most first.
pub(super) fn warnings(measurement: &Measurement, run: &FitRun) -> Vec<Warning> {
    let mut list = Vec::new();
    let mut warn = |key: &'static str, applies: bool, sentence: String| {
        if applies {
            list.push(Warning { key, sentence });
        }
    };
    let fit = &measurement.fit;
    let n_cycles = (fit.t_end_s - fit.t_ref_s) * fit.damped_angular_frequency_rad_per_s
        / (2.0 * std::f64::consts::PI);
    let residual = &fit.residual;
    warn(
        "residuals_structured",
        residual.variance_enlargement > STRUCTURED_ENLARGEMENT || residual.is_structured(),
        format!(
            "What the fit leaves over is not noise (lag-1 autocorrelation {:.2}, variance near the period {:.0} times that of independent errors; the uncertainties were enlarged for it): the loss may not be viscous, the spring not straight, the camera not still, or the lens may bend the scale.",
            residual.autocorrelation_lag1, residual.variance_enlargement
        ),
    );
    let n_outliers = count(measurement, RowStatus::Outlier);
    warn(
        "outliers",
        share(n_outliers, residual.n_used) > MANY_OUTLIERS_SHARE,
        format!(
            "{n_outliers} positions stand so far off the motion that they were left out; look at them in positions.csv."
        ),
    );
    warn(
        "few_cycles",
        n_cycles < FEW_CYCLES,
        format!(
            "Only {n_cycles:.1} cycles were used; film at least ten for a loss that can be told from drift."
        ),
    );
    if let Some(film) = &measurement.film {
        film_warnings(film, measurement, &mut warn);
    }
    warn(
        "clock_assumed",
        run.clock.assumed,
        format!(
            "The clock's rate is assumed to be right within ±{} ppm; compare the phone with a reference and give --clock-ppm.",
            run.clock.limit_ppm
        ),
    );
    warn(
        "mass_without_uncertainty",
        run.mass_kg.is_some() && run.u_mass_kg.is_none(),
        "The mass was given without an uncertainty, so that the energies and the stiffness leave it out; give --mass-u.".to_owned(),
    );
    list
}

fn film_warnings(
    film: &FilmPart,
    measurement: &Measurement,
    warn: &mut dyn FnMut(&'static str, bool, String),
) {
    let clip = &film.clip;
    warn(
        "clip_damaged",
        clip.n_damaged > 0,
        format!(
            "{} damaged packets or pictures: what they showed is left out, and frames after them may be off until the next full picture; copy the clip again.",
            clip.n_damaged
        ),
    );
    let n_missing = clip
        .n_frames_promised
        .unwrap_or(0)
        .saturating_sub(clip.n_frames);
    // An edit list hides frames on purpose; a cut file loses a good part of them.
    warn(
        "clip_cut_short",
        share(n_missing, clip.n_frames) > 0.02,
        format!(
            "The file announces {} frames and {} could be decoded; the end may be missing.",
            clip.n_frames + n_missing,
            clip.n_frames
        ),
    );
    let n_lost = count(measurement, RowStatus::Lost);
    warn(
        "frames_lost",
        n_lost > 0,
        format!(
            "The marker was not found in {n_lost} of {} frames; they are empty rows in positions.csv and no part of the fit.",
            clip.n_frames
        ),
    );
    warn(
        "steady_patch_lost",
        film.n_unsteady > 0,
        format!(
            "The steady patch was lost in {} frames, which were left out.",
            film.n_unsteady
        ),
    );
    warn(
        "interlaced",
        clip.n_interlaced > 0,
        format!(
            "{} frames are interlaced: their two halves were exposed at different times; film progressively.",
            clip.n_interlaced
        ),
    );
    time_warnings(film, warn);
    scale_warnings(film, measurement, warn);
}

/// What the way of the marker over the picture and the bar leave to be said.
fn scale_warnings(
    film: &FilmPart,
    measurement: &Measurement,
    warn: &mut dyn FnMut(&'static str, bool, String),
) {
    let scale = &film.scale;
    let sweep_rel = film.rows_swept_rel;
    warn(
        "rolling_shutter",
        !film.readout_given && sweep_rel > ROWS_SWEPT_REL,
        format!(
            "The marker runs over {:.0} % of the sensor's rows, which most phones read one after another: that bends the record (a second harmonic, a change of amplitude) but not the mean period; give --readout-ms, or turn the phone so that the motion runs along the rows.",
            100.0 * sweep_rel
        ),
    );
    warn(
        "off_axis_motion",
        scale.off_axis_rms_m > OFF_AXIS_SHARE * measurement.fit.amplitude_m,
        format!(
            "The marker strays {:.2} mm rms from a straight axis; steady the camera (--steady) or check the rail.",
            scale.off_axis_rms_m * 1e3
        ),
    );
    warn(
        "bar_off_axis",
        scale.bar_angle_rad > BAR_ANGLE_RAD,
        format!(
            "The scale bar stands {:.1}° off the motion; lay it along the rail, in the marker's plane.",
            scale.bar_angle_rad.to_degrees()
        ),
    );
    warn(
        "scale_assumed",
        scale.assumed,
        format!(
            "The scale rests on assumed figures: the bar's length to {:.2} mm and its ends to {:.2} px (standard uncertainties); give --length-u and --end-u.",
            scale.u_length_m * 1e3,
            scale.u_end_px
        ),
    );
}

/// What the stamps and the rate of capture leave to be said.
fn time_warnings(film: &FilmPart, warn: &mut dyn FnMut(&'static str, bool, String)) {
    let clock = &film.frame_clock;
    let places: Vec<String> = film
        .slips
        .iter()
        .map(|slip| format!("{} before frame {}", slip.n_frames, slip.before_frame))
        .collect();
    warn(
        "frames_slipped",
        !places.is_empty(),
        format!(
            "The phase of the motion steps by whole frame intervals though the stamps are even: frames are missing ({}). The times behind them were moved accordingly.",
            places.join(", ")
        ),
    );
    warn(
        "phase_steps",
        film.doubtful_phase,
        "The phase is not that of one steady oscillation: it steps or bends by a part of a frame interval. A touch, a spring that stiffens, drag, or a rolling shutter can do that. Nothing was corrected; choose an undisturbed part with --from and --to.".to_owned(),
    );
    if let CaptureRate::FromMetadata(rate_hz, key) = &film.capture_rate {
        warn(
            "slow_motion",
            true,
            format!(
                "The file says it was captured at {rate_hz} Hz ({key}); times were multiplied by {:.6}. Give --capture-rate if that is wrong.",
                clock.time_scale
            ),
        );
    }
    if let CaptureRate::Given(rate_hz) = &film.capture_rate {
        warn(
            "capture_rate_given",
            (clock.time_scale - 1.0).abs() > 1e-6,
            format!(
                "The stamps run at {:.4} Hz and the capture rate was given as {rate_hz} Hz: times were multiplied by {:.6}.",
                1.0 / clock.interval_s,
                clock.time_scale
            ),
        );
    }
    warn(
        "variable_clock",
        !clock.steady,
        format!(
            "The frame stamps are uneven ({:.2} ms rms off an even grid): the stamps themselves were used, with an uncertainty of {:.3} ms each.",
            clock.jitter_rms_s * 1e3,
            clock.u_t_s * 1e3
        ),
    );
    warn(
        "frames_dropped",
        clock.n_dropped > 0,
        format!(
            "{} frames are missing from the stamps' grid; the times of the others allow for it.",
            clock.n_dropped
        ),
    );
    warn(
        "stamps_repeated",
        clock.n_repeated > 0,
        format!(
            "{} frames carry a stamp that does not lie after the one before; they were left out.",
            clock.n_repeated
        ),
    );
}

fn count(measurement: &Measurement, status: RowStatus) -> usize {
    measurement
        .rows
        .iter()
        .filter(|row| row.status == status)
        .count()
}

#[expect(clippy::cast_precision_loss, reason = "numbers of frames")]
fn share(part: usize, whole: usize) -> f64 {
    part as f64 / whole.max(1) as f64
}
