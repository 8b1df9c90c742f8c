//! The motion cycle by cycle, each from its own readings.
//!
//! In: the record and its fit. Out: a [`Cycle`] for every complete one. The fit serves three purposes only: it says where to look, which
//! readings are outliers, and (by ω, γ, c) the shape over a quarter of a cycle. A period that changes with amplitude, or a jump, therefore shows
//! here while the fit averages over it.

use super::least_squares::refine;
use super::readings::Readings;
use super::sinusoid::{Sinusoid, SinusoidProblem};
use super::{MotionFit, PositionRecord, PositionUse};
use nalgebra::{DMatrix, DVector, Matrix2, Vector2};
use std::f64::consts::{FRAC_PI_2, TAU};

/// Readings this far from a passage make it, in periods: the straight part of the motion, where each tells the time best.
const PASSAGE_HALF_WIDTH: f64 = 0.125;
/// Where these are too few, twice as far.
const PASSAGE_HALF_WIDTH_SPARSE: f64 = 0.25;
/// Two unknowns, and one reading more.
const MIN_READINGS_AT_PASSAGE: usize = 3;
/// Four unknowns, and two readings more.
const MIN_READINGS_IN_CYCLE: usize = 6;
/// A hole of more than this part of a period leaves a turning point unseen.
const MAX_HOLE: f64 = 0.3;

/// One cycle of the motion, from one upward passage through the centre to the next.
#[derive(Clone, Debug, PartialEq)]
pub struct Cycle {
    /// 1, 2, …
    pub index: usize,
    /// Upward passage through the centre that starts the cycle, from the local readings, s.
    pub start_s: f64,
    /// Interval to the next upward passage, s, and its standard uncertainty.
    pub period_crossings_s: f64,
    /// Standard uncertainty of `period_crossings_s`, s.
    pub u_period_crossings_s: f64,
    /// Period of a sinusoid fitted to the readings of this cycle alone, s; None where there are too few.
    pub period_local_s: Option<f64>,
    /// Standard uncertainty of `period_local_s`, s.
    pub u_period_local_s: Option<f64>,
    /// Amplitude of this cycle at its middle, m, from a sinusoid of the common ω fitted to its readings alone.
    pub amplitude_m: Option<f64>,
    /// Standard uncertainty of `amplitude_m`, m.
    pub u_amplitude_m: Option<f64>,
    /// (amplitude/amplitude of the previous cycle)²; None for the first cycle.
    pub energy_ratio: Option<f64>,
    /// Standard uncertainty of `energy_ratio`, 1.
    pub u_energy_ratio: Option<f64>,
}

/// The complete cycles of a record.
///
/// * `records`: those that `fit` was made from, in the same order.
///
/// A passage is located by a sinusoid of the fit's ω, γ and c through the readings within an eighth of a period of it (a quarter where these
/// are fewer than three), its phase and size free; it needs readings on both sides. A passage without them is missing, and **the cycles on both sides of
/// it are left out**; `index` goes on counting, so a gap shows as skipped numbers. Within a cycle, period and amplitude are `None` where
/// fewer than six readings, or a hole of more than 0.3 periods, are left by lost readings and outliers. Cycles cut by the record's ends are left out.
///
/// Uncertainties come from the fit's residual scatter with its enlargement for autocorrelation. A shift of c moves all upward passages alike
/// and is not part of them.
#[must_use]
pub fn cycles(records: &[PositionRecord], fit: &MotionFit) -> Vec<Cycle> {
    let used: Vec<&PositionRecord> = records
        .iter()
        .zip(&fit.uses)
        .filter(|(_, u)| **u == PositionUse::Used)
        .map(|(r, _)| r)
        .collect();
    let local = Local {
        used,
        fit,
        variance: normalised_variance(records, fit) * fit.residual.variance_enlargement,
    };
    let passages = local.passages();
    let mut cycles: Vec<Cycle> = Vec::new();
    for (i, pair) in passages.windows(2).enumerate() {
        let [Some(start), Some(end)] = pair else {
            continue;
        };
        let index = i + 1;
        let within = local.between(start.t_s, end.t_s);
        let (amplitude, period) = (local.amplitude(within), local.period(within));
        let before = cycles
            .last()
            .filter(|cycle| cycle.index + 1 == index)
            .and_then(|cycle| cycle.amplitude_m.zip(cycle.u_amplitude_m));
        let ratio = amplitude.zip(before).map(|((a, u), (a0, u0))| {
            (
                (a / a0).powi(2),
                2.0 * (a / a0).powi(2) * (u / a).hypot(u0 / a0),
            )
        });
        cycles.push(Cycle {
            index,
            start_s: start.t_s,
            period_crossings_s: end.t_s - start.t_s,
            u_period_crossings_s: end.u_s.hypot(start.u_s),
            period_local_s: period.map(|(value, _)| value),
            u_period_local_s: period.map(|(_, u)| u),
            amplitude_m: amplitude.map(|(value, _)| value),
            u_amplitude_m: amplitude.map(|(_, u)| u),
            energy_ratio: ratio.map(|(value, _)| value),
            u_energy_ratio: ratio.map(|(_, u)| u),
        });
    }
    cycles
}

/// An upward passage through the centre.
#[derive(Clone, Copy, Debug)]
struct Passage {
    t_s: f64,
    u_s: f64,
}

/// The used readings and the fit that says where to look.
struct Local<'a> {
    used: Vec<&'a PositionRecord>,
    fit: &'a MotionFit,
    /// Variance of a residual over its stated σ, enlarged.
    variance: f64,
}

/// Σ (residual/σ)²/(n − 5) of the used readings.
fn normalised_variance(records: &[PositionRecord], fit: &MotionFit) -> f64 {
    let used = || {
        records
            .iter()
            .zip(&fit.residual_m)
            .zip(&fit.uses)
            .filter(|(_, u)| **u == PositionUse::Used)
    };
    let sum: f64 = used()
        .map(|((record, residual), _)| (residual / sigma_m(record, fit)).powi(2))
        .sum();
    sum / (used().count() as f64 - 5.0).max(1.0)
}

/// √(u_x² + (v u_t)²) of a reading, m; 1 where the record states no uncertainty at all, as in the fit.
fn sigma_m(record: &PositionRecord, fit: &MotionFit) -> f64 {
    if record.u_x_m == 0.0 {
        return 1.0;
    }
    record
        .u_x_m
        .hypot(sinusoid(fit).velocity_m_per_s(record.t_s - fit.t_ref_s) * record.u_t_s)
}

fn sinusoid(fit: &MotionFit) -> Sinusoid {
    let (amplitude_m, phase_rad, decay_rate_per_s) =
        (fit.amplitude_m, fit.phase_rad, fit.decay_rate_per_s);
    Sinusoid {
        amplitude_m,
        phase_rad,
        decay_rate_per_s,
        omega_rad_per_s: fit.damped_angular_frequency_rad_per_s,
        centre_m: fit.centre_m,
    }
}

impl Local<'_> {
    /// Every upward passage that the fit expects within the record, `None` where the readings do not give it.
    fn passages(&self) -> Vec<Option<Passage>> {
        let omega = self.fit.damped_angular_frequency_rad_per_s;
        // cos θ rises through 0 at θ = −π/2 + 2πk.
        let first = ((self.fit.phase_rad + FRAC_PI_2) / TAU).ceil();
        (0..)
            .map(|k| {
                self.fit.t_ref_s
                    + (TAU * (first + f64::from(k)) - FRAC_PI_2 - self.fit.phase_rad) / omega
            })
            .take_while(|t_s| *t_s <= self.fit.t_end_s)
            .map(|t_s| {
                self.passage(t_s, PASSAGE_HALF_WIDTH)
                    .or_else(|| self.passage(t_s, PASSAGE_HALF_WIDTH_SPARSE))
            })
            .collect()
    }

    fn between(&self, from_s: f64, to_s: f64) -> &[&PositionRecord] {
        let start = self.used.partition_point(|r| r.t_s < from_s);
        let end = self.used.partition_point(|r| r.t_s < to_s);
        &self.used[start..end.max(start)]
    }

    /// The passage near `expected_s`: x − c = e^(−γs)(B sin ωs + D cos ωs), s = t − `expected_s`, is 0 at tan ωs = −D/B.
    fn passage(&self, expected_s: f64, half_width: f64) -> Option<Passage> {
        let omega = self.fit.damped_angular_frequency_rad_per_s;
        let reach_s = half_width * self.fit.period_s();
        let near = self.between(expected_s - reach_s, expected_s + reach_s);
        let n_before = near.iter().filter(|r| r.t_s < expected_s).count();
        if near.len() < MIN_READINGS_AT_PASSAGE || n_before == 0 || n_before == near.len() {
            return None;
        }
        let (mut normal, mut right) = (Matrix2::zeros(), Vector2::zeros());
        for record in near {
            let s = record.t_s - expected_s;
            let (sin, cos) = (omega * s).sin_cos();
            let row = Vector2::new(sin, cos) * (-self.fit.decay_rate_per_s * s).exp();
            let weight = sigma_m(record, self.fit).powi(-2);
            normal += row * row.transpose() * weight;
            right += row * ((record.x_m - self.fit.centre_m) * weight);
        }
        let inverse = normal.try_inverse()?;
        let [b, d] = (inverse * right).into();
        if b <= 0.0 {
            return None;
        }
        // ∂(−atan(D/B)/ω): the gradient with respect to (B, D).
        let gradient = Vector2::new(d, -b) / ((b * b + d * d) * omega);
        let u_s = (gradient.dot(&(inverse * gradient)) * self.variance).sqrt();
        Some(Passage {
            t_s: expected_s - (d / b).atan() / omega,
            u_s,
        })
    }

    /// True where the readings of a cycle leave no part of it unseen.
    fn dense(&self, within: &[&PositionRecord]) -> bool {
        let hole_s = within
            .windows(2)
            .map(|pair| pair[1].t_s - pair[0].t_s)
            .fold(0.0, f64::max);
        within.len() >= MIN_READINGS_IN_CYCLE && hole_s <= MAX_HOLE * self.fit.period_s()
    }

    /// Amplitude at the middle of the readings, by a linear fit of (a cos, b sin, c) with the fit's ω and γ, and its u.
    fn amplitude(&self, within: &[&PositionRecord]) -> Option<(f64, f64)> {
        if !self.dense(within) {
            return None;
        }
        let middle_s = 0.5 * (within[0].t_s + within[within.len() - 1].t_s);
        let omega = self.fit.damped_angular_frequency_rad_per_s;
        let mut rows = DMatrix::zeros(within.len(), 3);
        let mut right = DVector::zeros(within.len());
        for (i, record) in within.iter().enumerate() {
            let s = record.t_s - middle_s;
            let (sin, cos) = (omega * s).sin_cos();
            let (envelope, sigma) = (
                (-self.fit.decay_rate_per_s * s).exp(),
                sigma_m(record, self.fit),
            );
            rows.set_row(
                i,
                &(nalgebra::RowVector3::new(envelope * cos, envelope * sin, 1.0) / sigma),
            );
            right[i] = (record.x_m - self.fit.centre_m) / sigma;
        }
        let inverse = (rows.transpose() * &rows).try_inverse()?;
        let found = &inverse * rows.transpose() * right;
        let amplitude = found[0].hypot(found[1]);
        let gradient = DVector::from_vec(vec![found[0] / amplitude, found[1] / amplitude, 0.0]);
        Some((
            amplitude,
            (gradient.dot(&(&inverse * &gradient)) * self.variance).sqrt(),
        ))
    }

    /// Period of a sinusoid through these readings alone, only γ taken from the fit, and its u.
    fn period(&self, within: &[&PositionRecord]) -> Option<(f64, f64)> {
        if !self.dense(within) {
            return None;
        }
        let t_ref_s = within[0].t_s;
        let readings = Readings {
            t_ref_s,
            x_ref_m: 0.0,
            tau_s: within.iter().map(|r| r.t_s - t_ref_s).collect(),
            x_m: within.iter().map(|r| r.x_m).collect(),
            u_x_m: Vec::new(),
            u_t_s: Vec::new(),
        };
        let weight_per_m: Vec<f64> = within.iter().map(|r| 1.0 / sigma_m(r, self.fit)).collect();
        let held_decay_rate_per_s = Some(self.fit.decay_rate_per_s);
        let problem = SinusoidProblem {
            readings: &readings,
            weight_per_m: &weight_per_m,
            held_decay_rate_per_s,
        };
        let start = problem.free_parameters(
            sinusoid(self.fit)
                .counted_from(t_ref_s - self.fit.t_ref_s)
                .parameters(),
        );
        let solution = refine(&problem, &start).ok()?;
        let omega = solution.parameters[2];
        let u_omega = (solution.covariance_factor[(2, 2)] * self.variance).sqrt();
        Some((TAU / omega, TAU / omega.powi(2) * u_omega))
    }
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;
    use crate::motion::fit;

    const OMEGA: f64 = TAU / 1.2;

    fn record(n: u32, lost: impl Fn(f64) -> bool) -> Vec<PositionRecord> {
        let truth = Sinusoid {
            amplitude_m: 0.1,
            phase_rad: 0.3,
            decay_rate_per_s: 0.03,
            omega_rad_per_s: OMEGA,
            centre_m: 0.4,
        };
        let at = |i| PositionRecord {
            t_s: f64::from(i) / 60.0,
            u_t_s: 0.0,
            x_m: truth.position_m(f64::from(i) / 60.0),
            u_x_m: 1e-4,
        };
        (0..n).map(at).filter(|r| !lost(r.t_s)).collect()
    }

    #[test]
    fn every_whole_cycle_has_the_planted_period_and_energy_ratio() {
        // 10 s from φ = 0.3: the first upward passage is at (3π/2 − 0.3)/ω = 0.843 s, and seven periods of 1.2 s follow.
        let records = record(601, |_| false);
        let cycles = cycles(&records, &fit(&records).expect("a motion"));
        assert_eq!(cycles.len(), 7);
        assert!(
            (cycles[0].start_s - (1.5 * std::f64::consts::PI - 0.3) / OMEGA).abs() < 1e-9,
            "{}",
            cycles[0].start_s
        );
        for cycle in &cycles {
            assert!((cycle.period_crossings_s - 1.2).abs() < 1e-9, "{cycle:?}");
            assert!(
                cycle
                    .period_local_s
                    .is_some_and(|period| (period - 1.2).abs() < 1e-9),
                "{cycle:?}"
            );
        }
        // e^(−2·0.03·1.2); the middles of neighbouring cycles' readings lie one period apart to within a frame.
        let ratio = cycles[3].energy_ratio.expect("a cycle before");
        assert!(
            (ratio - (-0.072_f64).exp()).abs() < 2.0 * 0.03 / 60.0,
            "{ratio}"
        );
        assert_eq!(cycles[0].energy_ratio, None);
    }

    #[test]
    fn a_lost_passage_takes_the_cycles_on_both_its_sides_and_the_numbers_go_on() {
        let passage = (1.5 * std::f64::consts::PI - 0.3) / OMEGA + 3.0 * 1.2;
        let records = record(601, |t_s| (t_s - passage).abs() < 0.35);
        let cycles = cycles(&records, &fit(&records).expect("a motion"));
        let numbers: Vec<usize> = cycles.iter().map(|cycle| cycle.index).collect();
        assert_eq!(numbers, [1, 2, 5, 6, 7]);
        assert_eq!(cycles[2].energy_ratio, None, "its neighbour is missing");
    }

    #[test]
    fn a_hole_at_a_turning_point_leaves_the_cycle_without_an_amplitude() {
        let top = (1.5 * std::f64::consts::PI - 0.3) / OMEGA + 2.25 * 1.2;
        let records = record(601, |t_s| (t_s - top).abs() < 0.2);
        let cycles = cycles(&records, &fit(&records).expect("a motion"));
        assert_eq!(cycles.len(), 7);
        assert_eq!(
            (cycles[2].amplitude_m, cycles[2].period_local_s),
            (None, None)
        );
        assert!(cycles[1].amplitude_m.is_some() && cycles[3].energy_ratio.is_none());
    }
}
