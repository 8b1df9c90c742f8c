//! The first guess: where in (γ, ω) a damped sinusoid removes most of the record's scatter.
//!
//! In: [`Readings`], which may have gaps, an uneven clock, one cycle and a half, and a tenth of wild values. Out: starts for the fit.
//!
//! For every γ of a ladder and every ω of a grid the model is linear in (A cos φ, A sin φ, c), so the least sum of squares
//! follows from five sums over the readings, and over all ω at once these sums are Fourier transforms (variable projection).
//! A plain periodogram would do for many cycles; with one and a half its peak is pulled by the unknown centre, and a trend taken off
//! beforehand would take half the motion with it. Cells without a reading weigh nothing, so gaps need no filling.

use super::readings::{Readings, median};
use super::sinusoid::Sinusoid;
use nalgebra::{Matrix3, Vector3};
use rustfft::{FftPlanner, num_complex::Complex64};

/// Fewest cycles that are looked for, so that a record that is too short can be told how short.
const MIN_CYCLES: f64 = 0.4;
/// Largest γ/ω looked for: ζ up to 0.4.
const MAX_DECAY_REL: f64 = 0.45;
/// Points of the ω grid per 1/span, for short and for long records: an eighth of a cycle matters in one and a half, not in a thousand.
const GRID_FINE: usize = 8;
/// See [`GRID_FINE`].
const GRID_COARSE: usize = 4;
/// Records of up to this many cells get the fine grid.
const FINE_UP_TO_CELLS: usize = 1024;
/// Cells at most: a record with a gap of a year must not take all memory.
const MAX_CELLS: usize = 1 << 19;
/// Readings off an even clock by more than this part of its interval get cells of half the interval.
const EVEN_CLOCK_TOL_REL: f64 = 0.1;
/// Clip level in units of the 80 % quantile of |x − median|; a sinusoid's peak is 1.05 of it, so a clean record is not clipped.
const CLIP: f64 = 1.5;
/// Least part of cos² and sin² that must be left after the centre is taken out: below it the two cannot be told apart.
const MIN_DETERMINANT_REL: f64 = 1e-9;
/// Steps of the reweighted linear solution.
const LINEAR_STEPS: usize = 8;

/// What a scan found.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Guess {
    /// Start of the fit.
    pub(super) sinusoid: Sinusoid,
    /// Part of the scanned record's sum of squares about its mean that the model removes, 0…1.
    pub(super) explained: f64,
}

/// Starts for the fit, the most promising first: from the record as it is and, where that changes anything, with its extremes clipped.
///
/// Wild values would own the spectrum, and clipping does not move a frequency; but of a strongly damped motion it keeps little more
/// than the signs, so both are tried and the fit decides.
pub(super) fn guesses(readings: &Readings) -> Vec<Guess> {
    let mut spread: Vec<f64> = readings.x_m.iter().map(|x| x.abs()).collect();
    spread.sort_by(f64::total_cmp);
    let limit = CLIP * spread[spread.len() * 4 / 5];
    let clipped: Vec<f64> = readings
        .x_m
        .iter()
        .map(|x| x.clamp(-limit, limit))
        .collect();
    let mut scans = Vec::from_iter(scan(readings, &readings.x_m));
    if limit > 0.0 && clipped != readings.x_m {
        scans.extend(scan(readings, &clipped));
    }
    scans
        .into_iter()
        .map(|(gamma, omega, explained)| Guess {
            sinusoid: linear_part(readings, gamma, omega),
            explained,
        })
        .collect()
}

/// Start at a held γ and ω.
///
/// A, φ and c by linear least squares, reweighted towards the sum of absolute values, so that wild readings do not own it.
pub(super) fn linear_part(readings: &Readings, gamma: f64, omega: f64) -> Sinusoid {
    let rows: Vec<Vector3<f64>> = readings
        .tau_s
        .iter()
        .map(|tau| {
            let (envelope, (sin, cos)) = ((-gamma * tau).exp(), (omega * tau).sin_cos());
            Vector3::new(envelope * cos, -envelope * sin, 1.0)
        })
        .collect();
    let mut weights = vec![1.0; rows.len()];
    let mut best = Vector3::zeros();
    for _ in 0..LINEAR_STEPS {
        let (mut normal, mut right) = (Matrix3::zeros(), Vector3::zeros());
        for ((row, x), w) in rows.iter().zip(&readings.x_m).zip(&weights) {
            normal += row * row.transpose() * *w;
            right += row * (*x * *w);
        }
        let Some(next) = normal.lu().solve(&right) else {
            break;
        };
        best = next;
        let residuals: Vec<f64> = rows
            .iter()
            .zip(&readings.x_m)
            .map(|(row, x)| (x - row.dot(&best)).abs())
            .collect();
        let floor = median(residuals.clone());
        if floor <= 0.0 {
            break;
        }
        for (w, r) in weights.iter_mut().zip(&residuals) {
            *w = floor / r.max(floor);
        }
    }
    Sinusoid::from_parameters([
        best[0].hypot(best[1]),
        best[1].atan2(best[0]),
        gamma,
        omega,
        best[2],
    ])
}

/// The record as weights and sums in even cells.
struct Cells {
    width_s: f64,
    /// Length of the transform: the cells and zeros after them.
    n_transform: usize,
    count: Vec<f64>,
    sum: Vec<f64>,
}

impl Cells {
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "a quotient of checked times, ≥ 0 and at most MAX_CELLS"
    )]
    fn new(readings: &Readings, x_m: &[f64]) -> Self {
        let interval = readings.interval_s();
        let even = readings
            .tau_s
            .iter()
            .all(|tau| (tau / interval - (tau / interval).round()).abs() < EVEN_CLOCK_TOL_REL);
        let width_s = (if even { interval } else { 0.5 * interval })
            .max(readings.span_s() / (MAX_CELLS - 1) as f64);
        let n_cells = (readings.span_s() / width_s).round() as usize + 1;
        let grid = if n_cells <= FINE_UP_TO_CELLS {
            GRID_FINE
        } else {
            GRID_COARSE
        };
        let mean = x_m.iter().sum::<f64>() / x_m.len() as f64;
        let (mut count, mut sum) = (vec![0.0; n_cells], vec![0.0; n_cells]);
        for (tau, x) in readings.tau_s.iter().zip(x_m) {
            let cell = ((tau / width_s).round() as usize).min(n_cells - 1);
            count[cell] += 1.0;
            sum[cell] += x - mean;
        }
        Self {
            width_s,
            n_transform: (grid * n_cells).next_power_of_two(),
            count,
            sum,
        }
    }

    fn omega(&self, m: usize) -> f64 {
        std::f64::consts::TAU * m as f64 / (self.n_transform as f64 * self.width_s)
    }
}

/// The (γ, ω) that explains most of `x_m`, and the part it explains; None where nothing could be scanned (all readings equal).
fn scan(readings: &Readings, x_m: &[f64]) -> Option<(f64, f64, f64)> {
    let cells = Cells::new(readings, x_m);
    let mean = x_m.iter().sum::<f64>() / x_m.len() as f64;
    let total: f64 = x_m.iter().map(|x| (x - mean).powi(2)).sum();
    let transform = FftPlanner::new().plan_fft_forward(cells.n_transform);
    let span = readings.span_s();
    let highest = std::f64::consts::PI / readings.interval_s();
    let grid: Vec<(usize, f64)> = (1..cells.n_transform / 2)
        .map(|m| (m, cells.omega(m)))
        .filter(|(_, omega)| {
            *omega * span >= std::f64::consts::TAU * MIN_CYCLES && *omega <= highest
        })
        .collect();
    let mut best: Option<(f64, f64, f64)> = None;
    let ladder = std::iter::once(0.0)
        .chain((0..).map(|k| f64::from(k).exp2() / span))
        .take_while(|gamma| *gamma <= MAX_DECAY_REL * highest);
    let mut sums = Sums::new(&cells);
    for gamma in ladder {
        sums.take(&cells, gamma, transform.as_ref());
        for &(m, omega) in grid
            .iter()
            .filter(|(_, omega)| gamma <= MAX_DECAY_REL * *omega)
        {
            let explained = sums.removed_at(m) / total;
            if explained.is_finite() && best.is_none_or(|(_, _, most)| explained > most) {
                best = Some((gamma, omega, explained));
            }
        }
    }
    best
}

/// For one γ, the sums of variable projection at every ω of the grid.
struct Sums {
    n: f64,
    /// Σ e^(−2γτ).
    envelope2: f64,
    /// Σ x.
    x: f64,
    /// Transform of e^(−γτ) (count + i x): two real sequences in one.
    first: Vec<Complex64>,
    /// Transform of e^(−2γτ) count.
    second: Vec<Complex64>,
    scratch: Vec<Complex64>,
}

impl Sums {
    /// Room for the sums; one set serves the whole ladder, because clearing fresh pages would cost as much as the transforms.
    fn new(cells: &Cells) -> Self {
        let empty = || vec![Complex64::default(); cells.n_transform];
        Self {
            n: cells.count.iter().sum(),
            envelope2: 0.0,
            x: cells.sum.iter().sum(),
            first: empty(),
            second: empty(),
            scratch: empty(),
        }
    }

    fn take(&mut self, cells: &Cells, gamma: f64, transform: &dyn rustfft::Fft<f64>) {
        self.first.fill(Complex64::default());
        self.second.fill(Complex64::default());
        self.scratch
            .resize(transform.get_inplace_scratch_len(), Complex64::default());
        self.envelope2 = 0.0;
        for (i, (count, sum)) in cells.count.iter().zip(&cells.sum).enumerate() {
            let envelope = (-gamma * i as f64 * cells.width_s).exp();
            self.first[i] = Complex64::new(count * envelope, sum * envelope);
            self.second[i] = Complex64::new(count * envelope * envelope, 0.0);
            self.envelope2 += count * envelope * envelope;
        }
        transform.process_with_scratch(&mut self.first, &mut self.scratch);
        transform.process_with_scratch(&mut self.second, &mut self.scratch);
    }

    /// Sum of squares removed by e^(−γτ)(a cos ωτ + b sin ωτ) beyond what the mean removes.
    fn removed_at(&self, m: usize) -> f64 {
        let len = self.first.len();
        let (here, mirror) = (self.first[m], self.first[len - m].conj());
        // The two real sequences' transforms, told apart by their symmetry; the transform's sine has a minus sign.
        let (weight, x) = (
            (here + mirror) * 0.5,
            (here - mirror) * Complex64::new(0.0, -0.5),
        );
        let double = self.second[(2 * m) % len];
        let (c1, s1, cy, sy) = (weight.re, -weight.im, x.re, -x.im);
        let cc = 0.5 * (self.envelope2 + double.re) - c1 * c1 / self.n;
        let ss = 0.5 * (self.envelope2 - double.re) - s1 * s1 / self.n;
        let cs = -0.5 * double.im - c1 * s1 / self.n;
        let (cy, sy) = (cy - c1 * self.x / self.n, sy - s1 * self.x / self.n);
        let determinant = cc * ss - cs * cs;
        if determinant <= MIN_DETERMINANT_REL * self.envelope2 * self.envelope2 {
            return 0.0;
        }
        (cy * cy * ss - 2.0 * cy * sy * cs + sy * sy * cc) / determinant
    }
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;
    use crate::motion::PositionRecord;

    fn readings(
        n: u32,
        rate_hz: f64,
        truth: Sinusoid,
        wild: impl Fn(u32) -> f64,
        kept: impl Fn(u32) -> bool,
    ) -> Readings {
        let records: Vec<PositionRecord> = (0..n)
            .filter(|i| kept(*i))
            .map(|i| {
                let t_s = f64::from(i) / rate_hz;
                PositionRecord {
                    t_s,
                    u_t_s: 0.0,
                    x_m: truth.position_m(t_s) + wild(i),
                    u_x_m: 1e-4,
                }
            })
            .collect();
        Readings::new(&records).expect("a sound record")
    }

    /// The fit finds its way from half a cycle off over the record; the grid must do better.
    fn assert_found(readings: &Readings, truth: Sinusoid, what: &str) {
        let off = guesses(readings)
            .iter()
            .map(|g| (g.sinusoid.omega_rad_per_s - truth.omega_rad_per_s).abs())
            .fold(f64::INFINITY, f64::min);
        let tolerance = (1.0 / readings.span_s()).max(truth.decay_rate_per_s);
        assert!(
            off < tolerance,
            "{what}: ω off by {off} rad/s, tolerance {tolerance}"
        );
    }

    fn truth(cycles_per_s: f64, zeta: f64) -> Sinusoid {
        let omega = std::f64::consts::TAU * cycles_per_s;
        Sinusoid {
            amplitude_m: 0.1,
            phase_rad: 0.4,
            decay_rate_per_s: zeta * omega,
            omega_rad_per_s: omega,
            centre_m: 0.03,
        }
    }

    #[test]
    fn from_one_and_a_half_cycles_to_a_thousand_the_frequency_is_found() {
        for (n, frequency) in [
            (60, 1.5),
            (60, 2.2),
            (600, 0.83),
            (4000, 17.0),
            (20_000, 3.1),
        ] {
            let motion = truth(frequency, 3e-4);
            assert_found(
                &readings(n, 60.0, motion, |_| 0.0, |_| true),
                motion,
                &format!("{n} readings, {frequency} Hz"),
            );
        }
    }

    #[test]
    fn strong_damping_is_found_in_a_long_record() {
        for zeta in [0.02, 0.1, 0.2] {
            let motion = truth(1.2, zeta);
            assert_found(
                &readings(1500, 60.0, motion, |_| 0.0, |_| true),
                motion,
                &format!("ζ = {zeta}"),
            );
        }
    }

    #[test]
    fn gaps_and_a_tenth_of_wild_values_do_not_hide_it() {
        let motion = truth(0.83, 0.005);
        let wild = |i: u32| {
            if i % 10 == 3 {
                40.0 * f64::from(i * 7919 % 13) - 200.0
            } else {
                0.0
            }
        };
        assert_found(
            &readings(900, 60.0, motion, wild, |i| !(200..420).contains(&i)),
            motion,
            "gap and wild values",
        );
    }
}
