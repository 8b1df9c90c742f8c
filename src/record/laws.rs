//! The table of the laws of loss that were tried.

use super::page::{Align, Table};
use super::rounding::{handy_unit, significant, with_u};
use crate::motion::LawTrial;

/// One row a law: whether it stands, its misfit, its criterion above the best, why.
pub(super) fn laws_table(laws: &[LawTrial]) -> String {
    use Align::{Left, Right};
    let columns = [
        ("Law", Left),
        ("Stands", Left),
        ("Misfit, mm", Right),
        ("AICc, above the best", Right),
        ("Why, and its parameters", Left),
    ];
    let mut table = Table::new("", &columns);
    let best = laws
        .iter()
        .map(|law| law.aicc)
        .fold(f64::INFINITY, f64::min);
    for law in laws {
        let parameters: Vec<String> = law.parameters.iter().map(parameter).collect();
        let stands = if law.excluded { "no" } else { "yes" };
        let why = format!("{} {}", law.reason, parameters.join("; "));
        table.row(&[
            law.law,
            stands,
            &significant(law.rms_m * 1e3, 2),
            &difference(law.aicc - best),
            &why,
        ]);
    }
    table.html()
}

/// A difference of criteria: tenths matter near 0 and nowhere else.
fn difference(delta: f64) -> String {
    if delta < 100.0 {
        format!("{delta:.1}")
    } else {
        format!("{delta:.0}")
    }
}

fn parameter((name, value, u, unit): &(&'static str, f64, Option<f64>, &'static str)) -> String {
    let (factor, unit) = handy_unit(unit, *value);
    let figure = match u {
        Some(u) => with_u(*value * factor, *u * factor),
        None => format!("{} (held)", significant(*value * factor, 4)),
    };
    format!("{} = {figure} {unit}", symbol(name))
        .trim_end()
        .to_owned()
}

/// The symbol of a parameter, as the glossary explains it.
fn symbol(name: &'static str) -> &'static str {
    match name {
        "amplitude" => "A",
        "phase" => "φ",
        "decay_rate" => "γ",
        "damped_angular_frequency" | "angular_frequency" => "ω",
        "centre" => "c",
        "friction_over_stiffness" => "F/k",
        other => other,
    }
}
