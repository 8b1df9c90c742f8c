//! The noise in a box: how strong it is, and what the low-pass makes of it.

use super::lowpass::{LOWPASS_REACH_PX, LOWPASS_SIGMA_PX};
use crate::number::to_f64;

/// Standard deviation of the low-passed part of white noise of unit standard deviation: 1/(2√π σ).
pub(super) fn lowpassed_noise_gain() -> f64 {
    1.0 / (2.0 * std::f64::consts::PI.sqrt() * LOWPASS_SIGMA_PX)
}

/// Noise of a window of luma, on the 8-bit scale: the median of |second differences both ways|, which edges hardly touch.
///
/// For white noise of standard deviation σ the operator (1 −2 1)ᵀ(1 −2 1) gives 6 σ; the median of |N(0, 1)| is 0.6745.
pub(super) fn noise(window: &[i16], width: usize) -> f64 {
    let rows: Vec<&[i16]> = window.chunks_exact(width).collect();
    let mut differences: Vec<i32> = Vec::with_capacity(window.len());
    for three in rows.windows(3) {
        let across = |row: &[i16], at: usize| {
            i32::from(row[at - 1]) - 2 * i32::from(row[at]) + i32::from(row[at + 1])
        };
        differences.extend((1..width - 1).map(|at| {
            (across(three[0], at) - 2 * across(three[1], at) + across(three[2], at)).abs()
        }));
    }
    differences.sort_unstable();
    let median = differences.get(differences.len() / 2).copied().unwrap_or(0);
    f64::from(median) / 6.0 / 0.6745 / 16.0
}

/// Convolution of a plane with the noise's correlation, zero outside.
pub(super) fn spread(plane: &[f64], width: usize) -> Vec<f64> {
    let variance = 2.0 * LOWPASS_SIGMA_PX * LOWPASS_SIGMA_PX;
    let reach = 4 * LOWPASS_REACH_PX / 3;
    let weight = |distance: usize| (-0.5 * to_f64(distance).powi(2) / variance).exp();
    let weights: Vec<f64> = (0..=reach).map(weight).collect();
    let height = plane.len() / width;
    let run = |at: usize, n: usize| at.saturating_sub(reach)..(at + reach + 1).min(n);
    let mut across = vec![0.0; plane.len()];
    for (at, sum) in across.iter_mut().enumerate() {
        let (x, y) = (at % width, at / width);
        *sum = run(x, width)
            .map(|other| weights[other.abs_diff(x)] * plane[y * width + other])
            .sum();
    }
    let mut both = vec![0.0; plane.len()];
    for (at, sum) in both.iter_mut().enumerate() {
        let (x, y) = (at % width, at / width);
        *sum = run(y, height)
            .map(|other| weights[other.abs_diff(y)] * across[other * width + x])
            .sum();
    }
    both
}
