//! What the residuals are like, and how much more the fit is uncertain because frames' errors are not independent.
//!
//! In: normalised residuals, their times, and an orthonormal basis of what the fit has taken out of them. Out: the
//! [`ResidualDiagnosis`] and the factors by which the covariance grows.
//!
//! A, φ, γ and ω are sums over the residual that oscillate at ω, so of the residual's spectrum only its level near ω matters to them:
//! slow drift does not, nor do harmonics of ω from an imperfect lens. c is the same at frequency 0.

use crate::stats::{coverage_factor, normal_two_sided};
use nalgebra::DMatrix;
use std::f64::consts::TAU;

/// The band reaches from 0.25 ω to 1.75 ω: wide, because every bin adds two degrees of freedom; short of 2ω, where harmonics stand.
const BAND_HALF_WIDTH_REL: f64 = 0.75;
/// But no further than this many bins of 1/span: 120 degrees of freedom leave Student's t within 1 % of the normal, and the
/// spectrum need only be even over so much.
const BAND_HALF_WIDTH_BINS: f64 = 30.0;
/// Or three half-widths γ of the motion's own line, where that is wider.
const BAND_HALF_WIDTH_LINES: f64 = 3.0;
/// For c the band ends here, in ω: the spectrum of slow errors falls steeply, and a wider mean would be too low.
const SLOW_BAND_REL: f64 = 0.3;
/// At least this many bins to each side, for records of few cycles.
const MIN_HALF_WIDTH_BINS: f64 = 3.0;
/// Lowest frequency that counts as oscillating, in 1/span: below it lies what the centre has taken out.
const LOWEST_BIN: f64 = 0.5;
/// Fewer free ordinates than this say nothing about a level.
const MIN_ORDINATES: f64 = 1.0;

/// The residuals of the used positions.
#[derive(Clone, Debug, PartialEq)]
pub struct ResidualDiagnosis {
    /// Root mean square, in m.
    pub rms_m: f64,
    /// Lag-1 autocorrelation.
    pub autocorrelation_lag1: f64,
    /// Residual spectrum near ω over its mean: the factor by which the covariance was enlarged (≥ 1).
    pub variance_enlargement: f64,
    /// Number of positions used.
    pub n_used: usize,
    /// n_used / variance_enlargement.
    pub n_effective: f64,
    /// Wald–Wolfowitz runs test: standard score; negative for too few runs, as slow errors make.
    pub runs_z: f64,
    /// Two-sided probability of so extreme a number of runs if the residuals were independent.
    pub runs_p: f64,
}

/// Lag-1 autocorrelation from which residuals are motion that the law misses, not noise: errors of a compressed film reach 0.3, those of
/// a smoothed sensor 0.6. (A hand that holds the camera reaches 0.9 too, but far below ω.)
pub(super) const STRUCTURED_LAG1: f64 = 0.7;

impl ResidualDiagnosis {
    /// True where the residuals follow one another so closely that they are no noise.
    #[must_use]
    pub fn is_structured(&self) -> bool {
        self.autocorrelation_lag1 > STRUCTURED_LAG1
    }
}

/// By how much the covariance grows.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Enlargement {
    /// Variance factor of A, φ, γ and ω, ≥ 1.
    pub(super) near_omega: f64,
    /// Variance factor of c, ≥ 1.
    pub(super) near_zero: f64,
    /// Degrees of freedom of the variance near ω.
    pub(super) degrees_of_freedom: f64,
}

/// Normalised residuals with what is needed to judge them.
#[derive(Debug)]
pub(super) struct Residue<'a> {
    /// Times, s.
    pub(super) tau_s: &'a [f64],
    /// Residuals over σ, in order of time.
    pub(super) normalised: &'a [f64],
    /// Orthonormal columns spanning the tangent plane of the fit, n × p.
    pub(super) basis: &'a DMatrix<f64>,
    /// Σ residual²/(n − p).
    pub(super) variance: f64,
    /// n − p.
    pub(super) degrees_of_freedom: f64,
}

/// The level of the residual spectrum near ω and near 0, over that of independent residuals, floored at 1.
///
/// Direct Fourier sums over the actual times, so gaps need no filling, at ω + 2πk/span. The fit has removed part of each ordinate; what white
/// noise would leave of it, 1 − h, follows from the fit's basis, and Σ I/Σ(1 − h) is then unbiased for white noise however short the record.
/// Each ordinate brings 2(1 − h) degrees of freedom. The floor makes the intervals of independent errors a little too wide,
/// never too narrow: half of all records would otherwise be narrowed by chance.
///
/// # Source
/// Our form of the remedy of [Newey and West 1987](crate::sources::NeweyWest87), at one frequency; coverage is tested by simulation.
pub(super) fn enlargement(residue: &Residue, omega: f64, decay_rate: f64) -> Enlargement {
    let span = residue.tau_s.last().copied().unwrap_or(0.0)
        - residue.tau_s.first().copied().unwrap_or(0.0);
    let cycles = omega * span / TAU;
    let widest = BAND_HALF_WIDTH_BINS.max(BAND_HALF_WIDTH_LINES * decay_rate.abs() * span / TAU);
    let half_width = (BAND_HALF_WIDTH_REL * cycles)
        .min(widest)
        .max(MIN_HALF_WIDTH_BINS)
        .floor();
    let n = residue.tau_s.len() as f64;
    let highest = 0.5 * n;
    let around = bins(cycles - half_width, cycles + half_width, highest);
    // The two sides of ω count alike: of a spectrum that falls, the side below is higher, and in few cycles the fit has taken most of it.
    let (lower, upper): (Vec<f64>, Vec<f64>) = around.iter().partition(|bin| **bin <= cycles);
    let sides = [lower, upper].map(|side| spectrum_level(residue, TAU / span, &side));
    let (level, ordinates) = joined(sides);
    let below = bins(
        1.0,
        (SLOW_BAND_REL * cycles).clamp(2.0, BAND_HALF_WIDTH_BINS),
        highest,
    );
    let (level_zero, ordinates_zero) = spectrum_level(residue, TAU / span, &below);
    if residue.variance <= 0.0 || ordinates < MIN_ORDINATES {
        return Enlargement {
            near_omega: 1.0,
            near_zero: 1.0,
            degrees_of_freedom: residue.degrees_of_freedom,
        };
    }
    let near_omega = (level / residue.variance).max(1.0);
    let degrees_of_freedom = residue.degrees_of_freedom.min(2.0 * ordinates);
    // The level near 0 rests on fewer ordinates than the one whose degrees of freedom the fit states: the ratio of the coverage factors
    // makes up for it. Slow errors are rarely weaker than those near ω, and few ordinates must not say so.
    let near_zero = if ordinates_zero < MIN_ORDINATES {
        near_omega
    } else {
        let factor = |nu| coverage_factor(0.95, nu);
        let ratio =
            factor(degrees_of_freedom.min(2.0 * ordinates_zero)) / factor(degrees_of_freedom);
        (level_zero / residue.variance).max(near_omega) * ratio * ratio
    };
    Enlargement {
        near_omega,
        near_zero,
        degrees_of_freedom,
    }
}

/// Mean of two levels and the ordinates it is worth: var = (L₁²/n₁ + L₂²/n₂)/4 for levels alike; a side without ordinates does not count.
fn joined(sides: [(f64, f64); 2]) -> (f64, f64) {
    let [(level_1, n_1), (level_2, n_2)] = sides;
    if n_1 < 0.5 * MIN_ORDINATES {
        return (level_2, n_2);
    }
    if n_2 < 0.5 * MIN_ORDINATES {
        return (level_1, n_1);
    }
    (0.5 * (level_1 + level_2), 4.0 / (1.0 / n_1 + 1.0 / n_2))
}

/// Frequencies in units of 1/span: `from`, `from` + 1, … up to `to`, those between the lowest that counts and half the rate of readings.
fn bins(from: f64, to: f64, highest: f64) -> Vec<f64> {
    (0..)
        .map(|k| from + f64::from(k))
        .take_while(|bin| *bin <= to + 1e-9)
        .filter(|bin| *bin >= LOWEST_BIN && *bin < highest)
        .collect()
}

/// Mean level of the periodogram at the bins, per ordinate left over by the fit, and the number of these: Σ I/Σ(1 − h), Σ(1 − h).
fn spectrum_level(residue: &Residue, bin_rad_per_s: f64, bins: &[f64]) -> (f64, f64) {
    let Some(first) = bins.first() else {
        return (0.0, 0.0);
    };
    let n_columns = residue.basis.ncols();
    // Sums for each bin: the residual's, then each basis column's, as cosine and sine parts.
    let mut sums = vec![[0.0; 2]; bins.len() * (n_columns + 1)];
    let mut row = vec![0.0; n_columns + 1];
    for (i, tau) in residue.tau_s.iter().enumerate() {
        row[0] = residue.normalised[i];
        for j in 0..n_columns {
            row[j + 1] = residue.basis[(i, j)];
        }
        // From one bin to the next the phase turns by the same angle: a product instead of a sine.
        let (mut sin, mut cos) = (bin_rad_per_s * first * tau).sin_cos();
        let (step_sin, step_cos) = (bin_rad_per_s * tau).sin_cos();
        for sums in sums.chunks_exact_mut(n_columns + 1) {
            for (sum, value) in sums.iter_mut().zip(&row) {
                sum[0] += value * cos;
                sum[1] += value * sin;
            }
            (sin, cos) = (
                sin * step_cos + cos * step_sin,
                cos * step_cos - sin * step_sin,
            );
        }
    }
    let n = residue.tau_s.len() as f64;
    let (mut power, mut ordinates) = (0.0, 0.0);
    for sums in sums.chunks_exact(n_columns + 1) {
        let square = |sum: &[f64; 2]| (sum[0] * sum[0] + sum[1] * sum[1]) / n;
        power += square(&sums[0]);
        ordinates += 1.0 - sums[1..].iter().map(square).sum::<f64>();
    }
    (
        if ordinates > 0.0 {
            power / ordinates
        } else {
            0.0
        },
        ordinates,
    )
}

/// Lag-1 autocorrelation Σ(zᵢ − z̄)(zᵢ₊₁ − z̄)/Σ(zᵢ − z̄)², −1…1; 0 where all are equal.
pub(super) fn autocorrelation_lag1(values: &[f64]) -> f64 {
    let mean = values.iter().sum::<f64>() / values.len() as f64;
    let total: f64 = values.iter().map(|v| (v - mean).powi(2)).sum();
    let lagged: f64 = values
        .windows(2)
        .map(|pair| (pair[0] - mean) * (pair[1] - mean))
        .sum();
    if total > 0.0 { lagged / total } else { 0.0 }
}

/// Runs above and below a level: standard score of their number and its two-sided probability, normal approximation.
///
/// A value at the level counts as above it. (0, 1) where all lie on one side.
///
/// # Source
/// [Wald and Wolfowitz 1940](crate::sources::WaldWolfowitz40). Checked against the NIST/SEMATECH handbook's case.
pub(super) fn runs_test(values: &[f64], level: f64) -> (f64, f64) {
    let above = values.iter().filter(|v| **v >= level).count() as f64;
    let (n, below) = (values.len() as f64, values.len() as f64 - above);
    let runs = 1.0
        + values
            .windows(2)
            .filter(|pair| (pair[0] >= level) != (pair[1] >= level))
            .count() as f64;
    let expected = 2.0 * above * below / n + 1.0;
    let variance = (expected - 1.0) * (expected - 2.0) / (n - 1.0);
    if variance > 0.0 {
        let z = (runs - expected) / variance.sqrt();
        (z, normal_two_sided(z))
    } else {
        (0.0, 1.0)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn lew() -> Vec<f64> {
        let text = include_str!("../../fixtures/reference/strd/univariate/Lew.dat");
        let data = text.rfind("\nData:").map_or("", |at| &text[at + 1..]);
        data.lines()
            .skip(1)
            .filter_map(|line| line.trim().parse().ok())
            .collect()
    }

    #[test]
    fn the_handbooks_runs_test_comes_out() {
        // NIST/SEMATECH e-Handbook 1.3.5.13: Z = 2.6938 about the median, −162.
        let readings = lew();
        assert_eq!(readings.len(), 200);
        let (z, p) = runs_test(&readings, -162.0);
        assert!((z - 2.693_782_590_793_965_4).abs() < 1e-12, "z = {z}");
        assert!((p - 0.007_065).abs() < 1e-5, "p = {p}");
    }

    #[test]
    fn the_certified_autocorrelation_of_the_beam_comes_out() {
        // NIST StRD, Lew: −0.307304800605679, 14 digits certified.
        let r1 = autocorrelation_lag1(&lew());
        assert!(
            (r1 / -0.307_304_800_605_679 - 1.0).abs() < 1e-12,
            "r1 = {r1}"
        );
    }

    #[test]
    fn six_runs_by_eye() {
        // + + − + − − + −: 4 above, 4 below, 6 runs; expected 5, variance 4·3/7.
        let (z, _) = runs_test(&[1.0, 1.0, -1.0, 1.0, -1.0, -1.0, 1.0, -1.0], 0.0);
        assert!((z - 1.0 / (12.0_f64 / 7.0).sqrt()).abs() < 1e-14, "z = {z}");
    }

    /// The basis of a fit that takes out a constant, a cosine and a sine at bin `bin` of n readings: orthonormal as it stands.
    fn basis(n: usize, bin: f64) -> DMatrix<f64> {
        let norm = (2.0 / n as f64).sqrt();
        let angle = |i: usize| TAU * bin * i as f64 / n as f64;
        DMatrix::from_fn(n, 3, |i, j| match j {
            0 => norm / 2.0_f64.sqrt(),
            1 => norm * angle(i).cos(),
            _ => norm * angle(i).sin(),
        })
    }

    /// Mean level near ω of the residuals of 400 records of 256 readings, bin 10, whose neighbours correlate by `lag1`, over their variance.
    fn mean_level(lag1: f64) -> f64 {
        use rand::SeedableRng;
        use rand_distr::{Distribution, StandardNormal};
        let (n, bin, records) = (256, 10.0, 400);
        let (basis, tau_s) = (basis(n, bin), (0..n).map(|i| i as f64).collect::<Vec<_>>());
        let mut rng = rand_chacha::ChaCha8Rng::seed_from_u64(5);
        let bins: Vec<f64> = (3..18).map(f64::from).collect();
        let mut sum = 0.0;
        for _ in 0..records {
            let mut last: f64 = StandardNormal.sample(&mut rng);
            let noise = nalgebra::DVector::from_fn(n, |_, _| {
                let fresh: f64 = StandardNormal.sample(&mut rng);
                last = lag1 * last + (1.0 - lag1 * lag1).sqrt() * fresh;
                last
            });
            let left = &noise - &basis * (basis.transpose() * &noise);
            let degrees_of_freedom = (n - 3) as f64;
            let variance = left.norm_squared() / degrees_of_freedom;
            let residue = Residue {
                tau_s: &tau_s,
                normalised: left.as_slice(),
                basis: &basis,
                variance,
                degrees_of_freedom,
            };
            sum += spectrum_level(&residue, TAU / n as f64, &bins).0 / variance;
        }
        sum / f64::from(records)
    }

    #[test]
    fn the_spectrum_of_independent_errors_is_one_although_the_fit_has_taken_part_of_it() {
        // 14 ordinates of 2 degrees of freedom and 400 records: the mean is known to 1/√(14·400) = 1.3 %; four times that is allowed.
        let level = mean_level(0.0);
        assert!((level - 1.0).abs() < 0.054, "{level}");
    }

    #[test]
    fn the_spectrum_of_correlated_errors_is_the_one_of_theory() {
        // (1 − a²)/(1 − 2a cos ω + a²), mean over the bins 3…17 without 10, ω = 2π·bin/256, a = 0.6.
        let a: f64 = 0.6;
        let theory = |bin: i32| {
            (1.0 - a * a) / (1.0 - 2.0 * a * (TAU * f64::from(bin) / 256.0).cos() + a * a)
        };
        let want = (3..18).filter(|bin| *bin != 10).map(theory).sum::<f64>() / 14.0;
        let level = mean_level(a);
        assert!((level / want - 1.0).abs() < 0.06, "{level} against {want}");
    }
}
