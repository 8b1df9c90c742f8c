//! What the film and its tracking were like, as pairs of a name and a sentence.

use super::page::escape;
use super::rounding::{relative, rounded, significant};
use crate::footage::{ClipFacts, FrameClock};
use crate::measurement::{FilmPart, Measurement, RowStatus, ScaleFacts};

/// The facts of film, clock, tracking and scale as an HTML list; a table of positions has fewer.
pub(super) fn facts_html(measurement: &Measurement) -> String {
    let mut facts = Vec::new();
    if let Some(film) = &measurement.film {
        facts.push(("Film", film_words(&film.clip)));
        facts.push(("Frame clock", clock_words(&film.frame_clock)));
        facts.push(("Speed", speed_words(&film.frame_clock, &film.clip)));
    }
    facts.push(("Readings", readings_words(measurement)));
    if let Some(film) = &measurement.film {
        facts.push(("Marker", marker_words(film)));
        facts.push(("Scale", scale_words(&film.scale)));
        facts.push(("Motion axis", axis_words(&film.scale)));
    }
    facts.push(("Residuals", residual_words(measurement)));
    facts.push(("SHA-256 of the source", measurement.source_sha256.clone()));
    let rows: String = facts
        .iter()
        .map(|(name, words)| format!("<dt>{}</dt><dd>{}</dd>\n", escape(name), escape(words)))
        .collect();
    format!("<dl>\n{rows}</dl>\n")
}

fn film_words(clip: &ClipFacts) -> String {
    let [width, height] = clip.display_size_px;
    let turn = if clip.rotation_deg == 0 {
        String::new()
    } else {
        format!(", turned by {}° for display", clip.rotation_deg)
    };
    let mirror = if clip.mirrored { ", mirrored" } else { "" };
    format!(
        "{} frames of {width:.0} × {height:.0} px as displayed{turn}{mirror}; {} in {}, {}",
        clip.n_frames, clip.codec, clip.container, clip.pixel_format
    )
}

fn clock_words(clock: &FrameClock) -> String {
    let step_us = significant(clock.rounding_step_s * 1e6, 4);
    let interval_ms = significant(clock.interval_s * 1e3, 6);
    let jitter_us = significant(clock.jitter_rms_s * 1e6, 2);
    let kind = if clock.steady {
        format!(
            "steady: every stamp lies within one rounding step ({step_us} µs) of a uniform grid of {interval_ms} ms, so the grid's times are used"
        )
    } else {
        let u_us = significant(clock.u_t_s * 1e6, 2);
        format!(
            "variable: median interval {interval_ms} ms, stamps rounded to {step_us} µs; the stamps are used, each with u = {u_us} µs"
        )
    };
    format!(
        "{kind}. Stamps stray from the grid by {jitter_us} µs rms; {} missing from the grid, {} out of order.",
        counted(clock.n_dropped, "frame"),
        counted(clock.n_repeated, "stamp")
    )
}

fn speed_words(clock: &FrameClock, clip: &ClipFacts) -> String {
    let metadata = match &clip.capture_rate_metadata {
        Some((rate_hz, key)) => format!(
            "the file names a capture rate of {} Hz ({key})",
            significant(*rate_hz, 5)
        ),
        None => "the file names no capture rate".to_owned(),
    };
    let as_filmed = (clock.time_scale - 1.0).abs() < 1e-9;
    let scale = if as_filmed {
        "taken as filmed at the speed it plays".to_owned()
    } else {
        format!(
            "one second of play is {} s of motion",
            significant(clock.time_scale, 6)
        )
    };
    format!("{scale}; {metadata}")
}

fn readings_words(measurement: &Measurement) -> String {
    let count = |status| {
        measurement
            .rows
            .iter()
            .filter(|row| row.status == status)
            .count()
    };
    let damaged = measurement.film.as_ref().map_or(String::new(), |film| {
        format!(", {} damaged in the file", film.clip.n_damaged)
    });
    format!(
        "{} in all: {} used, {} lost, {} left out as outliers, {} outside the chosen time{damaged}",
        measurement.rows.len(),
        count(RowStatus::Used),
        count(RowStatus::Lost),
        count(RowStatus::Outlier),
        count(RowStatus::Outside)
    )
}

fn marker_words(film: &FilmPart) -> String {
    let [left, top, width, height] = film.marker_box_px;
    let steady = if film.steady_box_px.is_some() {
        "a steady patch removed the camera's shake"
    } else {
        "no steady patch given, so that camera shake is not taken off"
    };
    format!(
        "box {left:.0}, {top:.0}, {width:.0} × {height:.0} px in frame {}; {steady}",
        film.at_frame
    )
}

fn scale_words(scale: &ScaleFacts) -> String {
    let (length, u_length) = rounded(scale.length_m * 1e3, scale.u_length_m * 1e3);
    let assumed = if scale.assumed {
        ", partly assumed"
    } else {
        ""
    };
    format!(
        "{} mm per px from a bar of {length} mm (u = {u_length} mm, each end to {} px{assumed}); u of the scale {}",
        significant(scale.m_per_px * 1e3, 5),
        significant(scale.u_end_px, 2),
        relative(scale.u_scale_rel)
    )
}

fn axis_words(scale: &ScaleFacts) -> String {
    format!(
        "through ({:.1}, {:.1}) px, {}° from the bar; the marker strays from it by {} mm rms",
        scale.origin_px[0],
        scale.origin_px[1],
        significant(scale.bar_angle_rad.to_degrees(), 2),
        significant(scale.off_axis_rms_m * 1e3, 2)
    )
}

fn residual_words(measurement: &Measurement) -> String {
    let residual = &measurement.fit.residual;
    format!(
        "{} rms. Neighbouring residuals correlate by {}; the variances of the fit are enlarged {} times for it, so that {} readings count as {:.0}. \
         Runs test: z = {}, p = {}.",
        residual_size(measurement),
        significant(residual.autocorrelation_lag1, 2),
        significant(residual.variance_enlargement, 3),
        residual.n_used,
        residual.n_effective,
        significant(residual.runs_z, 2),
        significant(residual.runs_p, 2)
    )
}

/// The size of the residuals in mm, and in px where there is a film.
pub(super) fn residual_size(measurement: &Measurement) -> String {
    let rms_m = measurement.fit.residual.rms_m;
    let mm = format!("{} mm", significant(rms_m * 1e3, 2));
    match &measurement.film {
        Some(film) => format!("{mm} = {} px", significant(rms_m / film.scale.m_per_px, 2)),
        None => mm,
    }
}

/// `1 frame`, `2 frames`, `no frames`.
pub(super) fn counted(n: usize, what: &str) -> String {
    match n {
        0 => format!("no {what}s"),
        1 => format!("1 {what}"),
        n => format!("{n} {what}s"),
    }
}
