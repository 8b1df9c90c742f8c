//! Zero-mean normalised cross-correlation against OpenCV 5.0.0 (`TM_CCOEFF_NORMED`), by `scripts/reference/zncc_opencv.py`.

use ebbmark::track::{Template, correlate};

/// OpenCV computes in 32-bit floats: the script finds its scores up to 1e-6 off the definition in 64 bits.
const TOLERANCE: f64 = 2e-6;

fn table(name: &str) -> (Vec<f64>, usize) {
    let path = format!(
        "{}/fixtures/reference/zncc/{name}.csv",
        env!("CARGO_MANIFEST_DIR")
    );
    let text = std::fs::read_to_string(&path).unwrap();
    let width = text.lines().next().unwrap().split(',').count();
    let values = text
        .lines()
        .flat_map(|line| line.split(',').map(|value| value.parse().unwrap()))
        .collect();
    (values, width)
}

fn luma(values: &[f64]) -> Vec<i16> {
    values.iter().map(|&value| value as i16).collect()
}

#[test]
fn scores_are_those_of_opencv() {
    for case in ["random", "smooth", "ramp"] {
        let (field, width) = table(&format!("{case}_field"));
        let (pattern, columns) = table(&format!("{case}_template"));
        let (wanted, wanted_width) = table(&format!("{case}_scores"));
        let template =
            Template::from_lowpassed(luma(&pattern), columns, pattern.len() / columns).unwrap();
        let scores = correlate(&luma(&field), width, field.len() / width, &template);
        assert_eq!(
            (scores.width, scores.values.len()),
            (wanted_width, wanted.len()),
            "{case}"
        );
        let worst = scores
            .values
            .iter()
            .zip(&wanted)
            .map(|(got, wanted)| (got - wanted).abs())
            .fold(0.0, f64::max);
        println!(
            "{case}: {} scores, largest difference {worst:.1e}",
            wanted.len()
        );
        assert!(worst < TOLERANCE, "{case}: {worst}");
    }
}
