//! `result.json`, schema 1: everything a program may want to read of a measurement.
//!
//! Keys stand in a fixed order, floats are written with the fewest digits that read back to the same value, and a number
//! that is not there, or not finite, is `null`. Units are UCUM codes.

mod film;

use serde_json::{Map, Value, json};

use self::film::{axis, clip, frames, scale};
use super::quantities::named;
use crate::measurement::{EnergyFigures, FilmPart, Measurement};
use crate::motion::{LawTrial, MotionFit, ResidualDiagnosis};
use crate::uncertainty::{BudgetRow, Evaluation, Quantity};
use crate::verdict::Verdict;

/// The version of the layout; a key that changes its meaning or goes away raises it.
const SCHEMA: u32 = 1;

/// The measurement as JSON, schema 1.
///
/// `clip`, `frames`, `scale`, `axis`; the eleven quantities as `{"value", "u", "unit", "interval95"}`; `budget`, `residual`,
/// `laws`, `loss_law` (every law that the data leave standing: never one where two fit), `verdicts`, `warnings`,
/// `provenance`; `energy` where a mass was given. For a table of positions `scale`, `axis` and the frame clock are `null`.
#[must_use]
pub fn result_json(measurement: &Measurement) -> Value {
    // Taken apart by name, so that a new field breaks the build and not the file format.
    let Measurement {
        source_name,
        source_sha256,
        sheet_toml,
        film,
        rows: _,
        fit,
        quantities,
        cycles: _,
        energy,
        verdicts,
        warnings,
    } = measurement;
    let film = film.as_ref();
    let mut result = Map::new();
    let mut put = |key: &str, value: Value| {
        result.insert(key.to_owned(), value);
    };
    put("schema", json!(SCHEMA));
    put(
        "clip",
        film.map_or_else(
            || json!({"file_name": source_name, "sha256": source_sha256}),
            |film| clip(&film.clip),
        ),
    );
    put("frames", frames(measurement));
    put("scale", film.map_or(Value::Null, |film| scale(&film.scale)));
    put("axis", film.map_or(Value::Null, axis));
    for (words, figure) in named(quantities) {
        put(words.key, quantity(figure));
    }
    if let Some(energy) = energy {
        put("energy", energies(energy));
    }
    put("fit", fit_facts(fit));
    put("budget", quantities.budget.iter().map(budget_row).collect());
    put("residual", residual(&fit.residual, film));
    put("laws", fit.laws.iter().map(law).collect());
    put(
        "loss_law",
        fit.laws
            .iter()
            .filter(|law| !law.excluded)
            .map(|law| json!(law.law))
            .collect(),
    );
    put("verdicts", verdicts.iter().map(verdict).collect());
    put(
        "warnings",
        warnings
            .iter()
            .map(|warning| json!({"key": warning.key, "sentence": warning.sentence}))
            .collect(),
    );
    put(
        "provenance",
        json!({"program": "ebbmark", "version": env!("CARGO_PKG_VERSION"), "clip_sha256": source_sha256, "sheet": sheet_toml}),
    );
    Value::Object(result)
}

/// What it takes to draw the fitted curve: the reference time at which amplitude and phase hold, and the part it covers.
fn fit_facts(fit: &MotionFit) -> Value {
    json!({
        "t_ref_s": number(fit.t_ref_s),
        "t_end_s": number(fit.t_end_s),
        "phase_rad": number(fit.phase_rad),
        "degrees_of_freedom": number(fit.degrees_of_freedom),
    })
}

/// [`result_json`] as text: indented, with a newline at the end.
#[must_use]
pub fn result_json_text(measurement: &Measurement) -> String {
    format!("{:#}\n", result_json(measurement))
}

/// A float, `null` where it is not finite; adding 0 turns −0 into 0.
fn number(value: f64) -> Value {
    Value::from(value + 0.0)
}

fn optional(value: Option<f64>) -> Value {
    value.map_or(Value::Null, number)
}

fn numbers(values: &[f64]) -> Value {
    values.iter().copied().map(number).collect()
}

fn quantity(quantity: &Quantity) -> Value {
    let Quantity {
        value,
        u,
        unit,
        interval95: [low, high],
    } = quantity;
    json!({"value": optional(*value), "u": optional(*u), "unit": unit, "interval95": [optional(*low), optional(*high)]})
}

fn energies(energy: &EnergyFigures) -> Value {
    let EnergyFigures {
        mass_kg,
        u_mass_kg,
        stiffness,
        energy_at_start,
        energy_lost_first_cycle,
    } = energy;
    json!({
        "mass": {"value": number(*mass_kg), "u": optional(*u_mass_kg), "unit": "kg"},
        "stiffness": quantity(stiffness),
        "energy_at_start": quantity(energy_at_start),
        "energy_lost_first_cycle": quantity(energy_lost_first_cycle),
    })
}

fn budget_row(row: &BudgetRow) -> Value {
    let BudgetRow {
        quantity,
        source,
        evaluation,
        u,
        unit,
        sensitivity,
        contribution,
        degrees_of_freedom,
        assumed,
    } = row;
    json!({
        "quantity": quantity,
        "source": source,
        "type": evaluation_letter(*evaluation),
        "u": number(*u),
        "unit": unit,
        "sensitivity": number(*sensitivity),
        "contribution": number(*contribution),
        "degrees_of_freedom": optional(*degrees_of_freedom),
        "assumed": assumed,
    })
}

/// The letter the GUM gives an evaluation.
pub(super) fn evaluation_letter(evaluation: Evaluation) -> &'static str {
    match evaluation {
        Evaluation::A => "A",
        Evaluation::B => "B",
    }
}

fn residual(residual: &ResidualDiagnosis, film: Option<&FilmPart>) -> Value {
    let ResidualDiagnosis {
        rms_m,
        autocorrelation_lag1,
        variance_enlargement,
        n_used,
        n_effective,
        runs_z,
        runs_p,
    } = residual;
    json!({
        "rms_m": number(*rms_m),
        "rms_px": optional(film.map(|film| rms_m / film.scale.m_per_px)),
        "autocorrelation": number(*autocorrelation_lag1),
        "variance_enlargement": number(*variance_enlargement),
        "n_used": n_used,
        "n_effective": number(*n_effective),
        "runs_test": {"z": number(*runs_z), "p": number(*runs_p)},
    })
}

fn law(trial: &LawTrial) -> Value {
    let LawTrial {
        law,
        parameters,
        rms_m,
        aicc,
        excluded,
        reason,
    } = trial;
    let parameters: Value = parameters
        .iter()
        .map(|(name, value, u, unit)| json!({"name": name, "value": number(*value), "u": optional(*u), "unit": unit}))
        .collect();
    json!({"law": law, "parameters": parameters, "rms_m": number(*rms_m), "aicc": number(*aicc), "excluded": excluded, "reason": reason})
}

fn verdict(verdict: &Verdict) -> Value {
    let Verdict {
        question,
        asked,
        answer,
        ratio,
        ratio_of,
        sentence,
    } = verdict;
    json!({
        "question": question,
        "asked": asked,
        "answer": answer.word(),
        "ratio": number(*ratio),
        "ratio_of": ratio_of,
        "sentence": sentence,
    })
}
