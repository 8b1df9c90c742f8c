//! `result.json` against the contract: schema 1 of the design.

use ebbmark::record::{result_json, result_json_text};
use serde_json::Value;

use crate::record::double::Double;

const QUANTITY_KEYS: [&str; 11] = [
    "period",
    "damped_angular_frequency",
    "undamped_period",
    "decay_rate",
    "damping_ratio",
    "log_decrement",
    "quality_factor",
    "energy_loss_per_cycle",
    "amplitude",
    "half_life",
    "centre",
];

fn keys(value: &Value) -> Vec<&str> {
    value
        .as_object()
        .unwrap()
        .keys()
        .map(String::as_str)
        .collect()
}

#[test]
fn the_keys_stand_in_the_order_of_the_contract() {
    let result = result_json(&Double::film(300).build());
    let mut wanted = vec!["schema", "clip", "frames", "scale", "axis"];
    wanted.extend(QUANTITY_KEYS);
    wanted.extend([
        "fit",
        "budget",
        "residual",
        "laws",
        "loss_law",
        "verdicts",
        "warnings",
        "provenance",
    ]);
    assert_eq!(keys(&result), wanted);
    assert_eq!(result["schema"], 1);
    assert!(keys(&result_json(&Double::film(300).with_mass().build())).contains(&"energy"));
}

#[test]
fn every_quantity_has_value_u_unit_and_interval() {
    let measurement = Double::film(300).build();
    let result = result_json(&measurement);
    for key in QUANTITY_KEYS {
        let quantity = &result[key];
        assert_eq!(
            keys(quantity),
            ["value", "u", "unit", "interval95"],
            "{key}"
        );
        assert!(
            quantity["value"].is_f64() && quantity["u"].is_f64() && quantity["unit"].is_string(),
            "{key}: {quantity}"
        );
        assert_eq!(quantity["interval95"].as_array().unwrap().len(), 2, "{key}");
    }
    assert_eq!(
        result["period"]["value"].as_f64(),
        measurement.quantities.period.value
    );
    assert_eq!(result["decay_rate"]["unit"], "s-1");
}

#[test]
fn a_bound_is_null_with_an_open_end() {
    let result = result_json(&Double::film(300).with_open_bounds().build());
    let q = &result["quality_factor"];
    assert!(q["value"].is_null() && q["u"].is_null(), "{q}");
    assert!(
        q["interval95"][0].is_f64() && q["interval95"][1].is_null(),
        "{q}"
    );
}

#[test]
fn two_laws_that_fit_are_both_named() {
    let result = result_json(&Double::film(300).build());
    assert_eq!(
        result["loss_law"],
        serde_json::json!(["viscous", "viscous_dry"])
    );
    let law = &result["laws"][1];
    assert_eq!(
        keys(law),
        ["law", "parameters", "rms_m", "aicc", "excluded", "reason"]
    );
    assert_eq!(keys(&law["parameters"][0]), ["name", "value", "u", "unit"]);
}

#[test]
fn rows_of_budget_verdicts_and_residual_carry_what_the_contract_names() {
    let result = result_json(&Double::film(300).build());
    let row = [
        "quantity",
        "source",
        "type",
        "u",
        "unit",
        "sensitivity",
        "contribution",
        "degrees_of_freedom",
        "assumed",
    ];
    assert_eq!(keys(&result["budget"][0]), row);
    assert_eq!(result["budget"][0]["type"], "B");
    assert!(
        result["budget"][0]["degrees_of_freedom"].is_null(),
        "infinitely many have no number"
    );
    assert_eq!(
        keys(&result["verdicts"][0]),
        [
            "question", "asked", "answer", "ratio", "ratio_of", "sentence"
        ]
    );
    assert_eq!(result["verdicts"][0]["answer"], "yes");
    assert_eq!(keys(&result["warnings"][0]), ["key", "sentence"]);
    let residual = [
        "rms_m",
        "rms_px",
        "autocorrelation",
        "variance_enlargement",
        "n_used",
        "n_effective",
        "runs_test",
    ];
    assert_eq!(keys(&result["residual"]), residual);
    let rms_px = result["residual"]["rms_px"].as_f64().unwrap();
    assert!(
        (rms_px - 0.024).abs() < 1e-12,
        "12 µm at 0.5 mm a pixel, got {rms_px}"
    );
    assert_eq!(
        keys(&result["provenance"]),
        ["program", "version", "clip_sha256", "sheet"]
    );
}

#[test]
fn frames_are_counted_by_what_became_of_them() {
    let frames = &result_json(&Double::film(300).build())["frames"];
    let count = |key: &str| frames[key].as_u64().unwrap();
    assert_eq!(
        (
            count("n_frames"),
            count("n_lost"),
            count("n_outlier"),
            count("n_outside")
        ),
        (300, 9, 1, 30)
    );
    assert_eq!(count("n_used"), 260);
    assert_eq!(frames["clock"]["steady"], true);
}

#[test]
fn a_table_has_no_scale_axis_clock_or_pixels() {
    let result = result_json(&Double::table(300).build());
    assert!(
        result["scale"].is_null()
            && result["axis"].is_null()
            && result["frames"]["clock"].is_null()
    );
    assert!(result["residual"]["rms_px"].is_null());
    assert_eq!(keys(&result["clip"]), ["file_name", "sha256"]);
}

/// Every number of a value, depth first: the order in which it is written.
fn numbers(value: &Value) -> Vec<f64> {
    match value {
        Value::Number(number) => vec![number.as_f64().unwrap()],
        Value::Array(items) => items.iter().flat_map(numbers).collect(),
        Value::Object(entries) => entries.values().flat_map(numbers).collect(),
        _ => Vec::new(),
    }
}

/// The value with every number replaced by null.
fn without_numbers(value: &Value) -> Value {
    match value {
        Value::Number(_) => Value::Null,
        Value::Array(items) => items.iter().map(without_numbers).collect(),
        Value::Object(entries) => Value::Object(
            entries
                .iter()
                .map(|(key, value)| (key.clone(), without_numbers(value)))
                .collect(),
        ),
        other => other.clone(),
    }
}

/// The numbers are read with the standard library: serde_json's own reader is off by a last bit now and then.
#[test]
fn what_is_written_reads_back_the_same() {
    let measurement = Double::film(300).with_mass().build();
    let (value, text) = (result_json(&measurement), result_json_text(&measurement));
    assert!(text.ends_with("}\n"));
    let read: Value = serde_json::from_str(&text).unwrap();
    assert_eq!(without_numbers(&read), without_numbers(&value));
    let token = |line: &str| {
        line.trim()
            .trim_end_matches(',')
            .rsplit(": ")
            .next()
            .unwrap()
            .parse()
            .ok()
    };
    let written: Vec<f64> = text.lines().filter_map(token).collect();
    assert_eq!(written, numbers(&value));
}

#[test]
fn a_number_that_is_not_finite_is_null_and_minus_zero_is_zero() {
    let mut measurement = Double::film(300).build();
    measurement.verdicts[0].ratio = f64::INFINITY;
    measurement.fit.residual.runs_p = f64::NAN;
    measurement.quantities.centre.value = Some(-0.0);
    let result = result_json(&measurement);
    assert!(result["verdicts"][0]["ratio"].is_null());
    assert!(result["residual"]["runs_test"]["p"].is_null());
    let text = result_json_text(&measurement);
    assert!(!text.contains("-0.0,"), "{text}");
}
