//! The pictures of the report, each with the caption that says how to read it.

use super::error::RecordError;
use super::facts::residual_size;
use super::overlay::start_frame;
use super::page::{escape, figure};
use super::picture::data_url;
use super::plots;
use super::streak::{streak_png_close, streak_png_for_page};
use crate::measurement::Measurement;

/// The start frame and the streak; nothing for a table.
pub(super) fn film_pictures(measurement: &Measurement) -> Result<String, RecordError> {
    let Some(film) = &measurement.film else {
        return Ok(String::new());
    };
    let mut html = figure(
        "Start frame with marker box, motion axis and scale bar",
        &start_frame(film, measurement.fit.amplitude_m)?,
        &format!(
            "Frame {} with the marker's box, the motion axis (x = 0 at the cross stroke, x grows towards the arrow) and the scale bar.",
            film.at_frame
        ),
    );
    if let Some(png) = streak_png_for_page(measurement)? {
        html.push_str(&figure(
            "Streak picture",
            &picture(&png, "The marker's track in time as the film saw it, with the fit over it"),
            "Streak: one line of every frame along the motion axis, side by side in time (to the right); x grows upwards. The fit lies over the \
             marker's track: its curve, or its amplitude alone where the cycles are too close to be told apart. The strip at the foot is dark where the marker was lost.",
        ));
    }
    if let Some(png) = streak_png_close(measurement)? {
        let name = "The first four cycles of the streak";
        html.push_str(&figure(name, &picture(&png, name), "The first four cycles of the streak: the curve should run along the middle of the track."));
    }
    Ok(html)
}

fn picture(png: &[u8], alt: &str) -> String {
    format!("<img src=\"{}\" alt=\"{}\">", data_url(png), escape(alt))
}

/// x(t) and its residuals.
pub(super) fn motion_plots(measurement: &Measurement) -> Result<String, RecordError> {
    let mut html = figure(
        "Position against time, readings and fit",
        &plots::motion(measurement)?,
        "Position against time: readings (circles or dots), readings left out (crosses), fitted x(t) = A e^(−γt) cos(ωt + φ) + c (line). Of a long record only a \
         part of the readings is drawn, here and below, with the extremes of every stretch.",
    );
    if let Some(close) = plots::motion_close(measurement)? {
        html.push_str(&figure(
            "The first cycles, readings and fit",
            &close,
            "The first four cycles of the same.",
        ));
    }
    html.push_str(&figure(
        "Residuals against time",
        &plots::residuals(measurement)?,
        &format!(
            "Residuals, reading minus fit: {} rms.",
            residual_size(measurement)
        ),
    ));
    Ok(html)
}

/// Amplitude and energy of each cycle; nothing where there are none.
pub(super) fn loss_plots(measurement: &Measurement) -> Result<String, RecordError> {
    let mut html = String::new();
    if let Some(envelope) = plots::envelope(measurement)? {
        let caption = "Amplitude of each cycle, fitted to its readings alone, with its 95 % bar; the line is A e^(−γt). On this axis viscous loss is \
                       a straight line, dry friction bends down, drag bends up.";
        html.push_str(&figure(
            "Amplitude of each cycle on a logarithmic axis",
            &envelope,
            caption,
        ));
    }
    if let Some(energy) = plots::energy(measurement)? {
        let caption = if measurement.energy.is_some() {
            "Energy ½kA² of each cycle with its 95 % bar; the line is the fit."
        } else {
            "Energy of each cycle over that of the cycle before, with its 95 % bar; the line is the fitted constant e^(−2δ)."
        };
        html.push_str(&figure("Energy per cycle", &energy, caption));
    }
    Ok(html)
}
