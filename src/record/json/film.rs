//! What `result.json` says of the film: clip, frames, clock, scale and axis.

use serde_json::{Value, json};

use super::{number, numbers};
use crate::footage::{ClipFacts, FrameClock};
use crate::measurement::{FilmPart, FrameSlip, Measurement, RowStatus, ScaleFacts};

/// Facts of the stream.
pub(super) fn clip(clip: &ClipFacts) -> Value {
    let ClipFacts {
        file_name,
        sha256,
        container,
        codec,
        pixel_format,
        coded_size_px,
        display_size_px,
        rotation_deg,
        mirrored,
        pixel_aspect,
        time_base,
        capture_rate_metadata,
        n_frames: _,
        n_frames_promised: _,
        n_damaged: _,
        n_interlaced: _,
    } = clip;
    json!({
        "file_name": file_name,
        "sha256": sha256,
        "container": container,
        "codec": codec,
        "pixel_format": pixel_format,
        "coded_size_px": coded_size_px,
        "display_size_px": numbers(display_size_px),
        "rotation_deg": rotation_deg,
        "mirrored": mirrored,
        "pixel_aspect": pixel_aspect,
        "time_base": time_base,
        "capture_rate_metadata": capture_rate_metadata.as_ref().map(|(rate_hz, key)| json!({"rate_hz": number(*rate_hz), "key": key})),
    })
}

/// Frames by what became of them, and the frame clock.
pub(super) fn frames(measurement: &Measurement) -> Value {
    let count = |status| {
        measurement
            .rows
            .iter()
            .filter(|row| row.status == status)
            .count()
    };
    let film = measurement.film.as_ref();
    json!({
        "n_frames": film.map_or(measurement.rows.len(), |film| film.clip.n_frames),
        "n_used": count(RowStatus::Used),
        "n_lost": count(RowStatus::Lost),
        "n_outlier": count(RowStatus::Outlier),
        "n_outside": count(RowStatus::Outside),
        "n_damaged": film.map_or(0, |film| film.clip.n_damaged),
        "n_interlaced": film.map_or(0, |film| film.clip.n_interlaced),
        "n_promised": film.and_then(|film| film.clip.n_frames_promised),
        "slips": film.map_or_else(Vec::new, |film| film.slips.iter().map(slip).collect()),
        "doubtful_phase": film.is_some_and(|film| film.doubtful_phase),
        "n_unsteady": film.map_or(0, |film| film.n_unsteady),
        "clock": film.map(|film| frame_clock(&film.frame_clock)),
    })
}

fn slip(slip: &FrameSlip) -> Value {
    let FrameSlip {
        before_frame,
        n_frames,
        estimate_frames,
    } = slip;
    json!({"before_frame": before_frame, "n_frames": n_frames, "estimate_frames": number(*estimate_frames)})
}

fn frame_clock(clock: &FrameClock) -> Value {
    let FrameClock {
        steady,
        interval_s,
        tick_s,
        rounding_step_s,
        jitter_rms_s,
        n_dropped,
        n_repeated,
        u_t_s,
        time_scale,
    } = clock;
    json!({
        "steady": steady,
        "interval_s": number(*interval_s),
        "tick_s": number(*tick_s),
        "rounding_step_s": number(*rounding_step_s),
        "jitter_rms_s": number(*jitter_rms_s),
        "n_dropped": n_dropped,
        "n_repeated": n_repeated,
        "u_t_s": number(*u_t_s),
        "time_scale": number(*time_scale),
    })
}

/// The bar and the length of a pixel.
pub(super) fn scale(scale: &ScaleFacts) -> Value {
    json!({
        "bar_px": scale.bar_px.iter().map(|end| numbers(end)).collect::<Value>(),
        "length": {"value": number(scale.length_m), "u": number(scale.u_length_m), "unit": "m"},
        "u_end_px": number(scale.u_end_px),
        "m_per_px": number(scale.m_per_px),
        "u_rel": number(scale.u_scale_rel),
        "assumed": scale.assumed,
    })
}

/// The motion axis and what was pointed out on the film.
pub(super) fn axis(film: &FilmPart) -> Value {
    let scale = &film.scale;
    json!({
        "origin_px": numbers(&scale.origin_px),
        "direction": numbers(&scale.direction),
        "off_axis_rms_m": number(scale.off_axis_rms_m),
        "bar_angle_rad": number(scale.bar_angle_rad),
        "marker_box_px": numbers(&film.marker_box_px),
        "at_frame": film.at_frame,
        "steady_box_px": film.steady_box_px.as_ref().map(|box_px| numbers(box_px)),
    })
}
