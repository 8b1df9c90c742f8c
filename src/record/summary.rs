//! The short text for the terminal.

use super::facts::{counted, residual_size};
use super::quantities::find;
use super::shown::shown;
use crate::measurement::Measurement;

/// What a terminal shows of the eleven quantities: enough to judge the run, the rest is in the files.
const SHOWN_KEYS: [&str; 5] = [
    "period",
    "damping_ratio",
    "quality_factor",
    "energy_loss_per_cycle",
    "amplitude",
];
/// Verdicts and warnings that are told in full, so that the text stays within 17 lines.
const MAX_VERDICTS: usize = 4;
const MAX_WARNINGS: usize = 2;

/// Verdicts, key figures with their expanded uncertainty, residual and warnings, in at most 17 lines.
///
/// Every line ends with a newline. Control characters of file names and sentences are left out, so that a hostile name
/// cannot steer the terminal.
#[must_use]
pub fn summary(measurement: &Measurement) -> String {
    let mut lines = vec![measurement.source_name.clone()];
    lines.extend(
        measurement
            .verdicts
            .iter()
            .take(MAX_VERDICTS)
            .map(|verdict| {
                format!(
                    "{} {}: {}",
                    verdict.asked,
                    verdict.answer.word(),
                    verdict.sentence
                )
            }),
    );
    lines.push("Figures with their 95 % uncertainty:".to_owned());
    for (words, quantity) in SHOWN_KEYS
        .iter()
        .filter_map(|key| find(&measurement.quantities, key))
    {
        let text = shown(quantity, words.percent);
        let relative = if text.relative.is_empty() {
            String::new()
        } else {
            format!("  ({})", text.relative)
        };
        lines.push(format!("  {:<26}{}{relative}", words.title, text.line()));
    }
    lines.push(format!(
        "  {:<26}{} rms over {}",
        "Residual",
        residual_size(measurement),
        counted(measurement.fit.residual.n_used, "reading")
    ));
    lines.push(counted(measurement.warnings.len(), "warning"));
    lines.extend(
        measurement
            .warnings
            .iter()
            .take(MAX_WARNINGS)
            .map(|warning| format!("  {}", warning.sentence)),
    );
    if let Some(n_more) = measurement
        .warnings
        .len()
        .checked_sub(MAX_WARNINGS)
        .filter(|&n| n > 0)
    {
        lines.push(format!("  and {n_more} more in the report"));
    }
    lines
        .iter()
        .map(|line| format!("{}\n", line.replace(char::is_control, "").trim_end()))
        .collect()
}
