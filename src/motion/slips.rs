//! Frames that are missing without a trace in the stamps.
//!
//! A phone may lose frames and stamp the rest as if nothing had happened. The stamps stay even, and the phase of the motion steps by a
//! whole number of frame intervals. In: a record on an even clock, and its frame interval. Out: where the steps are, and the record with
//! its times put right; or that there is something of the kind that is no whole number, and then nothing is changed.
//!
//! Method: the residual of the fitted motion is regressed on a step of the time, v(t)·H(t − s), beside the motion's own parameters, for every
//! place s at once by running sums; the best place is taken into the regression, until none stands out, and each is then placed anew
//! beside the others. The times are moved by the nearest whole numbers of intervals, the motion is fitted anew, and what is left of each
//! step must be next to nothing.

use super::fit::{MotionFit, fit};
use super::{MotionError, PositionRecord, PositionUse};
use nalgebra::{DMatrix, DVector};
use std::f64::consts::TAU;

/// A place where frames are missing behind even stamps.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Slip {
    /// Index of the first record behind the gap.
    pub at: usize,
    /// Frames missing there (negative: frames too many).
    pub n_frames: i32,
    /// The same as estimated from the motion, before it was brought to a whole number.
    pub estimate_frames: f64,
}

/// A record whose times were looked through for slips.
#[derive(Clone, Debug, PartialEq)]
pub struct SlipSearch {
    /// The slips, in order of time; empty where there are none, or none that are certain.
    pub slips: Vec<Slip>,
    /// True where the phase steps, but not by whole frame intervals throughout: nothing was changed.
    pub doubtful: bool,
    /// The record, its times moved behind each slip.
    pub records: Vec<PositionRecord>,
    /// The motion fitted to it.
    pub fit: MotionFit,
}

/// Slips that are looked for at the most: more would be another kind of clock.
const MOST_SLIPS: usize = 12;
/// Rounds of regression, rounding and fitting.
const MOST_ROUNDS: usize = 8;
/// Rounds in which the places are looked at anew, and how far each may move, in readings.
const PLACING_ROUNDS: usize = 2;
const PLACING_REACH: usize = 12;
/// A step that takes off less than this part of what the best one did is left to the next round.
const MINOR_SHARE: f64 = 0.05;
/// Smallest step that is taken up, in frames. Evenly spaced slips look like a slower motion, and each by itself like a third of a frame.
const LEAST_FRAMES: f64 = 0.15;
/// Standard scores a step must stand out by. Noise alone reaches 5 in no place of a million.
const LEAST_SCORE: f64 = 8.0;
/// Distance from the neighbours' cubic, in noise of a reading, up to which a reading off the motion still takes part.
const NEIGHBOUR_SCORES: f64 = 8.0;
/// Largest standard uncertainty of a step, in frames, at which it can be told from its neighbours.
const MOST_U_FRAMES: f64 = 0.07;
/// Largest distance of an estimate from a whole number, in frames.
const WHOLE_WITHIN_FRAMES: f64 = 0.2;
/// Phase left in a cycle after the correction, in frames, rms: beyond it the steps do not explain the phase (a spring that stiffens
/// bends it smoothly, and steps would only imitate the bend).
const MOST_LEFT_FRAMES: f64 = 0.1;

/// Looks for slips in a record on an even clock, puts the times right where they are certain, and fits the motion.
///
/// * `frame_interval_s`: time from frame to frame, s, > 0.
///
/// # Errors
/// Those of [`fit`].
pub fn fit_with_slips(
    records: &[PositionRecord],
    frame_interval_s: f64,
) -> Result<SlipSearch, MotionError> {
    let plain = fit(records)?;
    let unchanged = |doubtful: bool| SlipSearch {
        slips: Vec::new(),
        doubtful,
        records: records.to_vec(),
        fit: plain.clone(),
    };
    let mut moved = records.to_vec();
    let mut motion = plain.clone();
    let mut places: Vec<(usize, i32)> = Vec::new();
    // Around the first, wrong fit the regression is linear only roughly: what it leaves is looked through again.
    for _ in 0..MOST_ROUNDS {
        let known: Vec<usize> = places.iter().map(|(at, _)| *at).collect();
        let Some(steps) =
            Regression::of(&moved, &motion, frame_interval_s).map(|r| r.steps(&known))
        else {
            break;
        };
        let whole: Vec<(usize, i32)> = steps
            .iter()
            .map(|step| (step.at, nearest_whole(step.frames)))
            .collect();
        if whole.iter().all(|(_, n_frames)| *n_frames == 0) {
            if places.is_empty() {
                return Ok(unchanged(!steps.is_empty()));
            }
            break;
        }
        places = merged([places, whole].concat());
        moved = shifted(records, &places, frame_interval_s);
        let forwards = moved.windows(2).all(|pair| pair[1].t_s > pair[0].t_s);
        match fit(&moved) {
            Ok(next) if forwards => motion = next,
            _ => return Ok(unchanged(true)),
        }
    }
    for _ in 0..PLACING_ROUNDS {
        place_anew(records, &motion, &mut places, frame_interval_s);
        moved = shifted(records, &places, frame_interval_s);
        match fit(&moved) {
            Ok(next) => motion = next,
            Err(_) => return Ok(unchanged(true)),
        }
    }
    match certain(&moved, &motion, &places, frame_interval_s) {
        Some(slips) => Ok(SlipSearch {
            slips,
            doubtful: false,
            records: moved,
            fit: motion,
        }),
        None => Ok(unchanged(!places.is_empty())),
    }
}

/// The record with its times moved behind every place.
fn shifted(
    records: &[PositionRecord],
    places: &[(usize, i32)],
    frame_interval_s: f64,
) -> Vec<PositionRecord> {
    let mut moved = records.to_vec();
    for &(at, n_frames) in places {
        for record in &mut moved[at..] {
            record.t_s += f64::from(n_frames) * frame_interval_s;
        }
    }
    moved
}

/// Moves each place to where the readings around it agree best with the motion before and behind it.
///
/// The regression is linear in the step; where several frames are missing at a turning point its place is a few frames off.
fn place_anew(
    records: &[PositionRecord],
    motion: &MotionFit,
    places: &mut [(usize, i32)],
    frame_interval_s: f64,
) {
    for this in 0..places.len() {
        let (at, n_frames) = places[this];
        let behind: i32 = places[..this].iter().map(|(_, n)| n).sum();
        let first = at
            .saturating_sub(PLACING_REACH)
            .max(this.checked_sub(1).map_or(1, |before| places[before].0 + 1));
        let next = places
            .get(this + 1)
            .map_or(records.len(), |(next, _)| *next);
        let last = (at + PLACING_REACH).min(next.saturating_sub(1));
        let miss = |record: &PositionRecord, n: i32| {
            let t_s = record.t_s + f64::from(n) * frame_interval_s;
            (record.x_m - motion.position_m(t_s)).powi(2)
        };
        // From one candidate to the next a single reading passes from behind the gap to before it.
        let (mut change, mut best) = (0.0, (0.0, first));
        let around = records.iter().enumerate().take(last).skip(first);
        for (candidate, record) in around {
            change += miss(record, behind) - miss(record, behind + n_frames);
            if change < best.0 {
                best = (change, candidate + 1);
            }
        }
        places[this].0 = best.1;
    }
}

/// Places in order of time, those that came out twice added up, those that cancelled left out.
fn merged(mut places: Vec<(usize, i32)>) -> Vec<(usize, i32)> {
    places.sort_unstable();
    let mut list: Vec<(usize, i32)> = Vec::new();
    for (at, n_frames) in places {
        match list.last_mut() {
            Some(last) if last.0 == at => last.1 += n_frames,
            _ => list.push((at, n_frames)),
        }
    }
    list.retain(|(_, n_frames)| *n_frames != 0);
    list
}

/// The slips, if every one is a whole number of frames and together they explain the phase.
fn certain(
    moved: &[PositionRecord],
    motion: &MotionFit,
    places: &[(usize, i32)],
    frame_interval_s: f64,
) -> Option<Vec<Slip>> {
    let regression = Regression::of(moved, motion, frame_interval_s)?;
    let at: Vec<usize> = places.iter().map(|(at, _)| *at).collect();
    let rests = regression.estimates(&at)?;
    let slips: Vec<Slip> = places
        .iter()
        .zip(rests)
        .map(|(&(at, n_frames), rest)| Slip {
            at,
            n_frames,
            estimate_frames: f64::from(n_frames) + rest,
        })
        .collect();
    let whole = slips
        .iter()
        .all(|slip| (slip.estimate_frames - f64::from(slip.n_frames)).abs() <= WHOLE_WITHIN_FRAMES);
    (whole && regression.phase_left_frames(motion) <= MOST_LEFT_FRAMES).then_some(slips)
}

/// A step of the time at a place.
#[derive(Clone, Copy)]
struct Step {
    /// Index in the record.
    at: usize,
    frames: f64,
}

/// What the regressions on steps have in common: the used readings, the motion's slopes there, and what is left over.
struct Regression {
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
    fn of(records: &[PositionRecord], motion: &MotionFit, frame_interval_s: f64) -> Option<Self> {
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
    fn steps(&self, known: &[usize]) -> Vec<Step> {
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
    fn estimates(&self, places: &[usize]) -> Option<Vec<f64>> {
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
    fn phase_left_frames(&self, motion: &MotionFit) -> f64 {
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

#[expect(
    clippy::cast_possible_truncation,
    reason = "`as` saturates, and a step of 2³¹ frames is none"
)]
fn nearest_whole(frames: f64) -> i32 {
    frames.round() as i32
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;

    const INTERVAL_S: f64 = 1.0 / 60.0;

    /// A record at 60 Hz of 15 s with frames lost behind even stamps: (first frame behind the gap, number lost).
    fn record(
        lost: &[(usize, i32)],
        x_m: impl Fn(f64) -> f64,
        noise_m: f64,
    ) -> Vec<PositionRecord> {
        let mut state = 12_345_u64;
        let mut uniform = || {
            state = state
                .wrapping_mul(6_364_136_223_846_793_005)
                .wrapping_add(1);
            (state >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
        };
        (0..900)
            .map(|k| {
                let behind: i32 = lost.iter().filter(|(at, _)| k >= *at).map(|(_, n)| n).sum();
                let t_true = (k as f64 + f64::from(behind)) * INTERVAL_S;
                // Sum of twelve uniforms: a Gaussian good to three standard deviations.
                let error: f64 = (0..12).map(|_| uniform()).sum();
                PositionRecord {
                    t_s: k as f64 * INTERVAL_S,
                    u_t_s: 0.0,
                    x_m: x_m(t_true) + noise_m * error,
                    u_x_m: 1e-5,
                }
            })
            .collect()
    }

    fn swing(t_s: f64) -> f64 {
        0.1 * (-0.02 * t_s).exp() * (4.8 * t_s + 0.4).cos()
    }

    #[test]
    fn lost_frames_are_found_counted_and_put_right() {
        for lost in [
            vec![(211, 1)],
            vec![(211, 1), (480, 1), (702, 1)],
            vec![(100, 2), (110, 1), (850, 4)],
            vec![(300, 1), (303, 1)],
        ] {
            let search = fit_with_slips(&record(&lost, swing, 1e-5), INTERVAL_S).expect("a fit");
            let found: i32 = search.slips.iter().map(|slip| slip.n_frames).sum();
            assert_eq!(
                found,
                lost.iter().map(|(_, n)| n).sum::<i32>(),
                "{lost:?}: {:?}",
                search.slips
            );
            assert!(!search.doubtful);
            let omega = search.fit.damped_angular_frequency_rad_per_s;
            assert!((omega / 4.8 - 1.0).abs() < 5e-6, "{lost:?}: {omega}");
        }
    }

    /// No clip of a hundred may be changed: here are a hundred without slips.
    #[test]
    fn noise_alone_is_no_slip() {
        for seed in 0..100 {
            let phase = 0.37 * f64::from(seed);
            let noise_m = 1e-6 * 10_f64.powi(seed % 4);
            let records = record(
                &[],
                |t_s| 0.1 * (-0.02 * t_s).exp() * (4.8 * t_s + phase).cos(),
                noise_m,
            );
            let search = fit_with_slips(&records, INTERVAL_S).expect("a fit");
            assert!(
                search.slips.is_empty() && !search.doubtful,
                "{seed}: {:?}",
                search.slips
            );
        }
    }

    #[test]
    fn a_spring_that_stiffens_is_no_slip() {
        // The frequency falls with the square of the amplitude: the phase bends by several frames, smoothly.
        let bent = |t_s: f64| {
            let turned = 4.8 * t_s + 0.03 * 4.8 * (1.0 - (-0.08 * t_s).exp()) / 0.08;
            0.1 * (-0.04 * t_s).exp() * turned.cos()
        };
        let search = fit_with_slips(&record(&[], bent, 1e-5), INTERVAL_S).expect("a fit");
        assert!(search.slips.is_empty(), "{:?}", search.slips);
    }

    #[test]
    fn a_step_of_half_a_frame_is_doubtful_and_nothing_is_changed() {
        let kicked = |t_s: f64| {
            swing(if t_s > 7.0 {
                t_s + 1.45 * INTERVAL_S
            } else {
                t_s
            })
        };
        let records = record(&[], kicked, 1e-5);
        let search = fit_with_slips(&records, INTERVAL_S).expect("a fit");
        assert!(search.doubtful && search.slips.is_empty());
        assert_eq!(search.records, records);
    }
}
