//! The residual of a fitted motion, regressed on steps of the time.

use crate::motion::fit::MotionFit;
use crate::motion::{PositionRecord, PositionUse};
use nalgebra::{DMatrix, DVector};
use std::f64::consts::TAU;

/// Slips that are looked for at the most: more would be another kind of clock.
const MOST_SLIPS: usize = 12;
/// Smallest step that is taken up, in frames. Evenly spaced slips look like a slower motion, and each by itself like a third of a frame.
const LEAST_FRAMES: f64 = 0.15;
/// Standard scores a step must stand out by. Noise alone reaches 5 in no place of a million.
const LEAST_SCORE: f64 = 8.0;
/// Distance from the neighbours' cubic, in noise of a reading, up to which a reading off the motion still takes part.
const NEIGHBOUR_SCORES: f64 = 8.0;
/// Largest standard uncertainty of a step, in frames, at which it can be told from its neighbours.
const MOST_U_FRAMES: f64 = 0.07;
/// A step that takes off less than this part of what the best one did is left to the next round.
const MINOR_SHARE: f64 = 0.05;

/// A step of the time at a place.
#[derive(Clone, Copy)]
pub(super) struct Step {
    /// Index in the record.
    pub(super) at: usize,
    pub(super) frames: f64,
}

/// What the regressions on steps have in common: the used readings, the motion's slopes there, and what is left over.
pub(super) struct Regression {
    /// Index of each used reading in the record.
    index: Vec<usize>,
    t_s: Vec<f64>,
    residual_m: DVector<f64>,
    /// Change of the position for a step of one frame, m.
    per_frame_m: Vec<f64>,
    /// One row a reading, [`N_SLOPES`] columns.
    slopes: DMatrix<f64>,
    /// Noise of a reading, m.
    sigma_m: f64,
}

impl Regression {
    pub(super) fn of(
        records: &[PositionRecord],
        motion: &MotionFit,
        frame_interval_s: f64,
    ) -> Option<Self> {
        let sigma_m = noise_m(&motion.residual_m);
        // Behind a large slip the readings lie far off the motion that was fitted before it, but go with their neighbours.
        let takes_part = |at: &usize| {
            motion.uses[*at] == PositionUse::Used
                || goes_with_neighbours(&motion.residual_m, *at, NEIGHBOUR_SCORES * sigma_m)
        };
        let index: Vec<usize> = (0..records.len()).filter(takes_part).collect();
        let t_s: Vec<f64> = index.iter().map(|&at| records[at].t_s).collect();
        let rows: Vec<[f64; N_SLOPES]> = t_s.iter().map(|&t_s| slopes(motion, t_s)).collect();
        let slopes = DMatrix::from_fn(rows.len(), N_SLOPES, |row, column| rows[row][column]);
        let per_frame_m = t_s
            .iter()
            .map(|&t_s| velocity_m_per_s(motion, t_s) * frame_interval_s)
            .collect();
        let residual_m: Vec<f64> = index.iter().map(|&at| motion.residual_m[at]).collect();
        let residual_m = DVector::from_vec(residual_m);
        (sigma_m > 0.0).then_some(Self {
            index,
            t_s,
            residual_m,
            per_frame_m,
            slopes,
            sigma_m,
        })
    }

    /// What is left of the known steps, and further ones that stand out: found one after another, then each placed anew beside the others.
    pub(super) fn steps(&self, known: &[usize]) -> Vec<Step> {
        let mut places: Vec<usize> = known.to_vec();
        let mut most = 0.0_f64;
        while places.len() < MOST_SLIPS {
            let Some((gain, place)) = self.best_place(&places) else {
                break;
            };
            // A large step bends what it leaves; that is looked at in the next round, when it has been taken off.
            if gain < MINOR_SHARE * most {
                break;
            }
            most = most.max(gain);
            places.push(place);
        }
        for at in (known.len()..places.len()).chain(known.len()..places.len()) {
            let place = places.remove(at);
            let anew = self.best_place(&places).map_or(place, |(_, place)| place);
            places.insert(at, anew);
        }
        let frames = self.estimates(&places).unwrap_or_default();
        places
            .into_iter()
            .zip(frames)
            .map(|(at, frames)| Step { at, frames })
            .collect()
    }

    /// Columns of the slopes and of a step at each place.
    fn design(&self, places: &[usize]) -> DMatrix<f64> {
        DMatrix::from_fn(self.t_s.len(), N_SLOPES + places.len(), |row, column| {
            if column < N_SLOPES {
                self.slopes[(row, column)]
            } else if self.index[row] >= places[column - N_SLOPES] {
                self.per_frame_m[row]
            } else {
                0.0
            }
        })
    }

    /// How much a further step takes off the sum of squares, and its place, where it takes most; None where none stands out or is known
    /// well enough.
    fn best_place(&self, places: &[usize]) -> Option<(f64, usize)> {
        let basis = self.design(places).qr().q();
        let rest = &self.residual_m - &basis * (basis.transpose() * &self.residual_m);
        let (mut with_rest, mut square) = (0.0, 0.0);
        let mut with_basis = DVector::zeros(basis.ncols());
        let mut best: Option<(f64, usize)> = None;
        for at in (1..self.t_s.len()).rev() {
            let h = self.per_frame_m[at];
            with_rest += h * rest[at];
            square += h * h;
            with_basis += h * basis.row(at).transpose();
            // What of the step the other columns cannot take up.
            let free = square - with_basis.norm_squared();
            if free <= (self.sigma_m / MOST_U_FRAMES).powi(2) || places.contains(&self.index[at]) {
                continue;
            }
            let gain = with_rest * with_rest / free;
            let frames = (with_rest / free).abs();
            let stands_out = frames >= LEAST_FRAMES && gain.sqrt() >= LEAST_SCORE * self.sigma_m;
            if stands_out && best.is_none_or(|(other, _)| gain > other) {
                best = Some((gain, self.index[at]));
            }
        }
        best
    }

    /// The step at each place, in frames, all estimated together; None where they cannot be told apart.
    pub(super) fn estimates(&self, places: &[usize]) -> Option<Vec<f64>> {
        let design = self.design(places);
        // Columns to unit length: amplitudes and rates differ by orders of magnitude.
        let scale = DVector::from_fn(design.ncols(), |column, _| {
            design.column(column).norm().recip()
        });
        let scaled = &design * DMatrix::from_diagonal(&scale);
        let normal = (scaled.transpose() * &scaled).cholesky()?;
        let solution = normal.solve(&(scaled.transpose() * &self.residual_m));
        let inverse = normal.inverse();
        let steps = N_SLOPES..design.ncols();
        let u_frames = |at: usize| inverse[(at, at)].sqrt() * scale[at] * self.sigma_m;
        let known = steps.clone().all(|at| u_frames(at) <= 2.0 * MOST_U_FRAMES);
        known.then(|| steps.map(|at| solution[at] * scale[at]).collect())
    }

    /// Phase left over, cycle by cycle, in frames, rms.
    pub(super) fn phase_left_frames(&self, motion: &MotionFit) -> f64 {
        let period_s = TAU / motion.damped_angular_frequency_rad_per_s;
        let (mut sum, mut n, mut from) = (0.0, 0.0, 0);
        while from < self.t_s.len() {
            let end_s = self.t_s[from] + period_s;
            let to = from + self.t_s[from..].partition_point(|&t_s| t_s < end_s).max(1);
            let product: f64 = (from..to)
                .map(|at| self.per_frame_m[at] * self.residual_m[at])
                .sum();
            let square: f64 = self.per_frame_m[from..to].iter().map(|h| h * h).sum();
            if square > 0.0 {
                sum += (product / square).powi(2);
                n += 1.0;
            }
            from = to;
        }
        if n > 0.0 {
            f64::sqrt(sum / n)
        } else {
            f64::INFINITY
        }
    }
}

/// Columns beside the steps: ∂x/∂(A, φ, γ, ω, c), and the amplitude's course in three powers of time more.
///
/// A law of loss that does not fit bends the amplitude, smoothly; without these columns steps of the time would imitate that.
const N_SLOPES: usize = 8;

fn slopes(motion: &MotionFit, t_s: f64) -> [f64; N_SLOPES] {
    let tau = t_s - motion.t_ref_s;
    let envelope_m = motion.envelope_m(t_s);
    let (sin, cos) = (motion.damped_angular_frequency_rad_per_s * tau + motion.phase_rad).sin_cos();
    // Legendre's polynomials over the record: powers of time would be nearly the same column five times.
    let u = 2.0 * tau / motion.duration_s() - 1.0;
    let (u2, u3) = (u * u, u * u * u);
    let in_phase = |polynomial: f64| envelope_m * cos * polynomial;
    [
        in_phase(1.0),
        -envelope_m * sin,
        in_phase(u),
        -tau * envelope_m * sin,
        1.0,
        in_phase(1.5 * u2 - 0.5),
        in_phase(2.5 * u3 - 1.5 * u),
        in_phase((35.0 * u2 * u2 - 30.0 * u2 + 3.0) / 8.0),
    ]
}

fn velocity_m_per_s(motion: &MotionFit, t_s: f64) -> f64 {
    let tau = t_s - motion.t_ref_s;
    let omega = motion.damped_angular_frequency_rad_per_s;
    let (sin, cos) = (omega * tau + motion.phase_rad).sin_cos();
    -motion.envelope_m(t_s) * (motion.decay_rate_per_s * cos + omega * sin)
}

/// True where a residual lies within `limit_m` of the cubic through its four neighbours; an end has none.
fn goes_with_neighbours(residual_m: &[f64], at: usize, limit_m: f64) -> bool {
    let around = at
        .checked_sub(2)
        .and_then(|from| residual_m.get(from..from + 5));
    around.is_some_and(|r| (r[2] - (4.0 * (r[1] + r[3]) - r[0] - r[4]) / 6.0).abs() <= limit_m)
}

/// Noise of a reading from third differences, whose variance is 20 times a reading's: neither a step of the phase nor a law that
/// does not fit gets into nine tenths of them. Their ninth decile, 1.645 standard deviations, is that of the noisier parts: a marker at
/// rest is copied from frame to frame and seems to scatter less than one that moves.
fn noise_m(residual_m: &[f64]) -> f64 {
    let mut third: Vec<f64> = residual_m
        .windows(4)
        .map(|r| (r[3] - 3.0 * r[2] + 3.0 * r[1] - r[0]).abs())
        .collect();
    third.sort_by(f64::total_cmp);
    let decile = third
        .get(9 * third.len() / 10)
        .copied()
        .unwrap_or(f64::INFINITY);
    decile / 1.645 / 20.0_f64.sqrt()
}
