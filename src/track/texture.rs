//! What the texture of a box tells of its place: the bound on a shift, and the noise that blurs it.

use super::lowpass::{LOWPASS_REACH_PX, LOWPASS_SIGMA_PX};

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

/// Covariance of a shift for low-passed noise of unit variance: H⁻¹ M H⁻¹ with H = Σ g gᵀ and M = ΣΣ g(p) g(q)ᵀ ρ(p − q).
///
/// ρ is the correlation that the low-pass leaves in white noise, a Gaussian of √2 times its width. None where H is singular.
pub(super) fn shift_covariance(luma: &[i16], width: usize, height: usize) -> Option<[f64; 3]> {
    let value = |x: usize, y: usize| f64::from(luma[y * width + x]);
    let (inner_width, inner_height) = (width - 2, height - 2);
    let mut gradient = [
        Vec::with_capacity(luma.len()),
        Vec::with_capacity(luma.len()),
    ];
    for y in 1..=inner_height {
        for x in 1..=inner_width {
            gradient[0].push((value(x + 1, y) - value(x - 1, y)) / 2.0);
            gradient[1].push((value(x, y + 1) - value(x, y - 1)) / 2.0);
        }
    }
    let [gx, gy] = &gradient;
    let (sx, sy) = (spread(gx, inner_width), spread(gy, inner_width));
    let dot = |a: &[f64], b: &[f64]| a.iter().zip(b).map(|(a, b)| a * b).sum::<f64>();
    let [hxx, hxy, hyy] = [dot(gx, gx), dot(gx, gy), dot(gy, gy)];
    let [mxx, mxy, myy] = [dot(gx, &sx), dot(gx, &sy), dot(gy, &sy)];
    let determinant = hxx * hyy - hxy * hxy;
    // A stripe leaves rounding in the weak direction; such a box must not look as if it told a shift along it.
    if determinant.is_nan() || determinant <= 1e-6 * (hxx + hyy).powi(2) {
        return None;
    }
    let [ixx, ixy, iyy] = [hyy / determinant, -hxy / determinant, hxx / determinant];
    // K = H⁻¹ M, then K H⁻¹.
    let (kxx, kxy) = (ixx * mxx + ixy * mxy, ixx * mxy + ixy * myy);
    let (kyx, kyy) = (ixy * mxx + iyy * mxy, ixy * mxy + iyy * myy);
    Some([
        kxx * ixx + kxy * ixy,
        kxx * ixy + kxy * iyy,
        kyx * ixy + kyy * iyy,
    ])
}

/// Convolution of a plane with the noise's correlation, zero outside.
fn spread(plane: &[f64], width: usize) -> Vec<f64> {
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

#[expect(clippy::cast_precision_loss, reason = "sizes in pixels")]
fn to_f64(n: usize) -> f64 {
    n as f64
}
