//! Which readings do not belong to the motion.
//!
//! In: readings and starts. Out: a robust sinusoid and a mark on every reading that stands too far off it. The marked ones are left out of the
//! final, plain fit: its statistics are then the textbook's, which a reweighted fit's are not.

use super::MotionError;
use super::guess::Guess;
use super::least_squares::{LeastSquaresError, advance, refine};
use super::readings::{Readings, median};
use super::sinusoid::{Sinusoid, SinusoidProblem};
use crate::stats::{normal_quantile, student_t_quantile};

/// Tukey's constant: 95 % efficiency for Gaussian noise.
const BIWEIGHT: f64 = 4.685;
/// Reweighting steps; five settle a record with a tenth of wild values.
const MAX_STEPS: usize = 12;
/// Reweighting ends when the scale changes by less than this part: a hundredth of its own uncertainty at 10⁴ readings.
const SCALE_SETTLED_REL: f64 = 1e-4;
/// Expected false marks in a record of Gaussian noise, whatever its length.
const FALSE_MARKS_PER_RECORD: f64 = 0.01;
/// The median absolute deviation knows a Gaussian scale as well as a standard deviation of 0.37 times as many readings would.
const MAD_EFFICIENCY: f64 = 0.37;
/// Scatter below this part of the record's spread is rounding, not noise, and marks nothing.
const ROUNDING_REL: f64 = 1e-11;
/// A residual beyond this many scales counts the same as one at it when two robust fits are compared.
const TRUNCATION: f64 = 3.0;
/// Readings in a neighbourhood.
const NEIGHBOURHOOD: usize = 31;
/// How far a law that does not fit may miss the motion, as a part of its amplitude: dry friction taken for viscous misses by 4 % where
/// half the amplitude is lost in a record. A glider that is touched or a marker that is mislaid goes farther off.
const MISSED_REL: f64 = 0.05;
/// Distance from the neighbours' cubic, in robust scales of that distance, up to which a reading goes with its neighbours.
const SHARED_SCALES: f64 = 6.0;
/// Stated uncertainties that differ by more than this factor get a first round with equal weights.
const MIXED_WEIGHTS: f64 = 4.0;

/// The motion that most readings agree on.
#[derive(Clone, Debug)]
pub(super) struct Majority {
    pub(super) sinusoid: Sinusoid,
    /// True for every reading that belongs to it.
    pub(super) belongs: Vec<bool>,
}

/// The best of the starts, fitted robustly (Tukey's biweight, scale by the median absolute deviation), and the marks.
///
/// A reading is marked where |residual|/σ exceeds the Student t quantile that lets [`FALSE_MARKS_PER_RECORD`] of Gaussian noise
/// through, times the robust scale: 4.9 scales for 10⁴ readings, more for few, whose scale is known less well.
///
/// # Errors
/// Not fitted where there is no start; too many outliers where more than a third would be marked.
///
/// # Source
/// [Huber 1981](crate::sources::Huber81).
pub(super) fn majority(readings: &Readings, starts: &[Guess]) -> Result<Majority, MotionError> {
    let fits: Vec<Reweighted> = starts
        .iter()
        .map(|start| reweighted(readings, start.sinusoid))
        .collect();
    let smallest = fits
        .iter()
        .map(|fit| fit.scale)
        .fold(f64::INFINITY, f64::min);
    let cost = |fit: &Reweighted| {
        fit.normalised
            .iter()
            .map(|z| (z.abs() / smallest).min(TRUNCATION).powi(2))
            .sum::<f64>()
    };
    let best = fits
        .into_iter()
        .min_by(|a, b| cost(a).total_cmp(&cost(b)))
        .ok_or(LeastSquaresError::NotFinite)?;
    let n = readings.len() as f64;
    let degrees_of_freedom = n - best.sinusoid.parameters().len() as f64;
    let scale = best.scale * (n / degrees_of_freedom).sqrt();
    let limit = scale
        * student_t_quantile(
            1.0 - 0.5 * FALSE_MARKS_PER_RECORD / n,
            MAD_EFFICIENCY * degrees_of_freedom,
        );
    let mut belongs: Vec<bool> = best.normalised.iter().map(|z| z.abs() <= limit).collect();
    let sigma_m = best.sinusoid.sigma_m(readings);
    let near_m = MISSED_REL * best.sinusoid.amplitude_m;
    spare_what_its_neighbours_share(&best.normalised, &sigma_m, near_m, &mut belongs);
    let n_outliers = belongs.iter().filter(|b| !**b).count();
    if 3 * n_outliers > readings.len() {
        return Err(MotionError::TooManyOutliers {
            n_outliers,
            n_positions: readings.len(),
        });
    }
    Ok(Majority {
        sinusoid: best.sinusoid,
        belongs,
    })
}

/// Where the law itself misses the motion, residuals are large and smooth, and their spread is no measure of the noise: a
/// reading within `near_m` of the motion then stays a reading of it unless it also stands off the cubic through its four neighbours.
fn spare_what_its_neighbours_share(
    normalised: &[f64],
    sigma_m: &[f64],
    near_m: f64,
    belongs: &mut [bool],
) {
    // In metres: neighbours share the law's miss, not the weights.
    let residual_m: Vec<f64> = normalised.iter().zip(sigma_m).map(|(z, s)| z * s).collect();
    let off: Vec<f64> = residual_m
        .windows(5)
        .zip(&sigma_m[2.min(sigma_m.len())..])
        .map(|(r, s)| (r[2] - (4.0 * (r[1] + r[3]) - r[0] - r[4]) / 6.0) / s)
        .collect();
    // A marker at rest is copied from frame to frame and scatters less than one that moves: the scale is the neighbourhood's. A single
    // wild reading shows in five places of a window, so that its median stays that of the others.
    let scale_around = |at: usize| {
        let from = at.saturating_sub(NEIGHBOURHOOD / 2);
        let to = (from + NEIGHBOURHOOD).min(off.len());
        median(off[from.min(to)..to].iter().map(|off| off.abs()).collect()) / normal_quantile(0.75)
    };
    for (at, off) in off.iter().enumerate() {
        let miss = !belongs[at + 2];
        if miss
            && off.abs() <= SHARED_SCALES * scale_around(at)
            && residual_m[at + 2].abs() <= near_m
        {
            belongs[at + 2] = true;
        }
    }
    // The ends stand against the cubic through the four beyond them, which errs six times as much.
    let n = residual_m.len();
    if n >= 6 {
        for (end, step) in [(0, 1), (1, 1), (n - 1, -1), (n - 2, -1)] {
            let r = |k: isize| residual_m[end.saturating_add_signed(k * step)];
            let beyond = 4.0 * r(1) - 6.0 * r(2) + 4.0 * r(3) - r(4);
            let scale = scale_around(end.saturating_sub(2));
            let shared = (r(0) - beyond).abs() <= 6.0 * SHARED_SCALES * scale * sigma_m[end];
            if shared && r(0).abs() <= near_m {
                belongs[end] = true;
            }
        }
    }
}

struct Reweighted {
    sinusoid: Sinusoid,
    /// Robust standard deviation of `normalised`.
    scale: f64,
    /// Residuals over their σ.
    normalised: Vec<f64>,
}

fn reweighted(readings: &Readings, start: Sinusoid) -> Reweighted {
    let sigma = start.sigma_m(readings);
    let (least, most) = sigma
        .iter()
        .fold((f64::INFINITY, 0.0_f64), |(least, most), s| {
            (least.min(*s), most.max(*s))
        });
    let mut sinusoid = start;
    if most > MIXED_WEIGHTS * least {
        // From the guess even the best readings lie many of their σ off, and the majority by stated weights would be the poor ones.
        sinusoid = settle(readings, sinusoid, |_| vec![most; readings.len()]).sinusoid;
    }
    let mut state = settle(readings, sinusoid, |sinusoid| sinusoid.sigma_m(readings));
    state.scale = state.scale.max(rounding_floor(readings));
    state
}

/// Reweights until the scale settles, with σ by `sigma_of` the current motion.
fn settle(
    readings: &Readings,
    start: Sinusoid,
    sigma_of: impl Fn(&Sinusoid) -> Vec<f64>,
) -> Reweighted {
    let mut state = judge(readings, start, &sigma_of(&start));
    for _ in 0..MAX_STEPS {
        if state.scale <= rounding_floor(readings) {
            break;
        }
        let sigma = sigma_of(&state.sinusoid);
        let weights: Vec<f64> = state
            .normalised
            .iter()
            .zip(&sigma)
            .map(|(z, s)| (1.0 - (z / (BIWEIGHT * state.scale)).powi(2)).max(0.0) / s)
            .collect();
        let problem = SinusoidProblem {
            readings,
            weight_per_m: &weights,
            held_decay_rate_per_s: None,
        };
        let from = state.sinusoid.parameters();
        let scale = state.sinusoid.scale(readings.span_s());
        let stopped = refine(&problem, &from).map_or_else(
            |_| advance(&problem, &from, &scale),
            |solution| solution.parameters,
        );
        let found = Sinusoid::from_parameters(problem.all_parameters(&stopped));
        let next = judge(readings, found, &sigma_of(&found));
        let settled = (next.scale / state.scale - 1.0).abs() < SCALE_SETTLED_REL;
        state = next;
        if settled {
            break;
        }
    }
    state
}

fn judge(readings: &Readings, sinusoid: Sinusoid, sigma_m: &[f64]) -> Reweighted {
    let normalised: Vec<f64> = readings
        .tau_s
        .iter()
        .zip(&readings.x_m)
        .zip(sigma_m)
        .map(|((tau, x), s)| (x - sinusoid.position_m(*tau)) / s)
        .collect();
    let scale = median(normalised.iter().map(|z| z.abs()).collect()) / normal_quantile(0.75);
    Reweighted {
        sinusoid,
        scale,
        normalised,
    }
}

/// The scale below which residuals are rounding errors.
fn rounding_floor(readings: &Readings) -> f64 {
    let spread = readings
        .x_m
        .iter()
        .fold(0.0_f64, |most, x| most.max(x.abs()))
        + f64::EPSILON * readings.x_ref_m.abs() / ROUNDING_REL;
    ROUNDING_REL * spread / median(readings.u_x_m.clone())
}
