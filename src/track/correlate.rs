//! Zero-mean normalised cross-correlation.

use super::kernel::products;
use super::template::Template;

/// Scores of a template at every position in a window.
#[derive(Clone, Debug, PartialEq)]
pub struct Scores {
    /// Positions across.
    pub width: usize,
    /// Positions down.
    pub height: usize,
    /// Scores −1…1, row by row; element (v, u) belongs to the template's top-left pixel at (u, v).
    pub values: Vec<f64>,
    /// Contrast of the window under each position over the template's: √(Σ(f − f̄)² / Σ(t − t̄)²).
    pub contrasts: Vec<f64>,
}

impl Scores {
    /// The best score and its position (u, v); the first in reading order among equals. None where there are none.
    #[must_use]
    pub fn best(&self) -> Option<(usize, usize, f64)> {
        let mut best: Option<(usize, f64)> = None;
        for (at, &score) in self.values.iter().enumerate() {
            if best.is_none_or(|(_, other)| score > other) {
                best = Some((at, score));
            }
        }
        best.map(|(at, score)| (at % self.width, at / self.width, score))
    }

    /// Score at position (u, v).
    #[must_use]
    pub fn at(&self, u: usize, v: usize) -> f64 {
        self.values[v * self.width + u]
    }
}

/// Zero-mean normalised cross-correlation of a template with every window of a field.
///
/// r = Σ(f − f̄)(t − t̄) / √(Σ(f − f̄)² · Σ(t − t̄)²), in −1…1, f̄ the mean of f under the window.
///
/// * `field`: low-passed luma on the 12-bit scale, `height` × `width`, row-major, at least as large as the template.
/// * Returns (height−n+1) × (width−m+1) scores; none where the field is smaller than the template.
///
/// A window without contrast scores 0: its correlation is undefined and must not win.
///
/// # Source
/// [Lewis 1995](crate::sources::Lewis95). Checked against OpenCV (`scripts/reference/`).
#[must_use]
pub fn correlate(field: &[i16], width: usize, height: usize, template: &Template) -> Scores {
    let (columns, rows) = (template.width(), template.height());
    if width < columns || height < rows || field.len() < width * height {
        return Scores {
            width: 0,
            height: 0,
            values: Vec::new(),
            contrasts: Vec::new(),
        };
    }
    // Half the range is taken off so that a product fits the kernel's 32 bits; r does not change under an offset.
    let field: Vec<i16> = field.iter().map(|&value| value - 2048).collect();
    let (out_width, out_height) = (width - columns + 1, height - rows + 1);
    let mut sums = vec![0_i64; out_width * out_height];
    products(
        &field,
        width,
        template.centred(),
        columns,
        out_width,
        &mut sums,
    );
    let tables = RunningSums::of(&field, width, height);
    let n = to_f64(i64::try_from(columns * rows).unwrap_or(i64::MAX));
    let (mut values, mut contrasts) = (
        Vec::with_capacity(sums.len()),
        Vec::with_capacity(sums.len()),
    );
    for (at, &sum) in sums.iter().enumerate() {
        let (sum_f, sum_f2) = tables.under(at % out_width, at / out_width, columns, rows);
        let energy = to_f64(sum_f2) - to_f64(sum_f) * to_f64(sum_f) / n;
        // Rounding leaves a template mean of up to half a step; its product with f̄ is taken off here.
        let product = to_f64(sum) - to_f64(sum_f) * template.centred_sum() / n;
        // 12-bit luma in whole steps: a contrast below one step rms is the rounding's own.
        let plain = energy < n;
        values.push(if plain {
            0.0
        } else {
            (product / (energy * template.energy()).sqrt()).clamp(-1.0, 1.0)
        });
        contrasts.push((energy.max(0.0) / template.energy()).sqrt());
    }
    Scores {
        width: out_width,
        height: out_height,
        values,
        contrasts,
    }
}

/// Σf and Σf² over all rectangles from the top-left corner, so that any window's sums cost four look-ups.
struct RunningSums {
    stride: usize,
    sums: Vec<i64>,
    squares: Vec<i64>,
}

impl RunningSums {
    fn of(field: &[i16], width: usize, height: usize) -> Self {
        let stride = width + 1;
        let mut sums = vec![0_i64; stride * (height + 1)];
        let mut squares = vec![0_i64; stride * (height + 1)];
        for (row, values) in field.chunks_exact(width).take(height).enumerate() {
            let (mut sum, mut square) = (0_i64, 0_i64);
            for (column, &value) in values.iter().enumerate() {
                let value = i64::from(value);
                sum += value;
                square += value * value;
                let at = (row + 1) * stride + column + 1;
                sums[at] = sums[at - stride] + sum;
                squares[at] = squares[at - stride] + square;
            }
        }
        Self {
            stride,
            sums,
            squares,
        }
    }

    fn under(&self, u: usize, v: usize, columns: usize, rows: usize) -> (i64, i64) {
        let (top, bottom) = (v * self.stride + u, (v + rows) * self.stride + u);
        let of = |table: &[i64]| {
            table[bottom + columns] - table[bottom] - table[top + columns] + table[top]
        };
        (of(&self.sums), of(&self.squares))
    }
}

#[expect(
    clippy::cast_precision_loss,
    reason = "sums of 12-bit products over at most 512² pixels are below 2^53"
)]
fn to_f64(sum: i64) -> f64 {
    sum as f64
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// The definition, term by term.
    fn by_definition(
        field: &[i16],
        width: usize,
        u: usize,
        v: usize,
        template: &[i16],
        columns: usize,
    ) -> f64 {
        let rows = template.len() / columns;
        let window: Vec<f64> = (0..rows)
            .flat_map(|row| {
                (0..columns).map(move |column| f64::from(field[(v + row) * width + u + column]))
            })
            .collect();
        let template: Vec<f64> = template.iter().map(|&value| f64::from(value)).collect();
        let mean = |values: &[f64]| values.iter().sum::<f64>() / values.len() as f64;
        let (mean_f, mean_t) = (mean(&window), mean(&template));
        let cross: f64 = window
            .iter()
            .zip(&template)
            .map(|(f, t)| (f - mean_f) * (t - mean_t))
            .sum();
        let energy_f: f64 = window.iter().map(|f| (f - mean_f).powi(2)).sum();
        let energy_t: f64 = template.iter().map(|t| (t - mean_t).powi(2)).sum();
        cross / (energy_f * energy_t).sqrt()
    }

    /// Luma without order: a multiplicative generator, its upper bits.
    fn pattern(n: usize, seed: usize) -> Vec<i16> {
        let mut state = u64::try_from(seed).unwrap() + 12_345;
        let mut next = || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1_442_695_040_888_963_407);
            i16::try_from((state >> 33) % 4081).unwrap()
        };
        (0..n).map(|_| next()).collect()
    }

    #[test]
    fn fast_scores_are_those_of_the_definition() {
        let field = pattern(40 * 30, 1);
        let luma = pattern(13 * 9, 2);
        let template = Template::from_lowpassed(luma.clone(), 13, 9).unwrap();
        let scores = correlate(&field, 40, 30, &template);
        assert_eq!((scores.width, scores.height), (28, 22));
        for v in 0..scores.height {
            for u in 0..scores.width {
                let wanted = by_definition(&field, 40, u, v, &luma, 13);
                assert!(
                    (scores.at(u, v) - wanted).abs() < 1e-9,
                    "({u}, {v}): {} wanted {wanted}",
                    scores.at(u, v)
                );
            }
        }
    }

    #[test]
    fn a_plain_window_scores_nothing() {
        let template = Template::from_lowpassed(pattern(25, 3), 5, 5).unwrap();
        let scores = correlate(&[1234; 100], 10, 10, &template);
        assert!(scores.values.iter().all(|score| score.abs() < f64::EPSILON));
        assert!(correlate(&[0; 16], 4, 4, &template).values.is_empty());
    }

    proptest! {
        /// r is unchanged by f → a f + b, a > 0: a change of lighting does not move the marker (Lewis 1995).
        #[test]
        fn brightness_and_contrast_do_not_change_a_score(gain in 1_i16..4, offset in 0_i16..200, seed in 0_usize..1000) {
            let field: Vec<i16> = pattern(20 * 20, seed).iter().map(|value| value / 5).collect();
            let changed: Vec<i16> = field.iter().map(|value| gain * value + offset).collect();
            let template = Template::from_lowpassed(pattern(64, seed + 1), 8, 8).unwrap();
            let (plain, other) = (correlate(&field, 20, 20, &template), correlate(&changed, 20, 20, &template));
            for (a, b) in plain.values.iter().zip(&other.values) {
                prop_assert!((a - b).abs() < 1e-9, "{a} {b}");
            }
        }
    }
}
