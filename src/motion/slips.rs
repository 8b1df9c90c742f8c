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

mod regression;

use self::regression::Regression;
use super::fit::{MotionFit, fit};
use super::{MotionError, PositionRecord};

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

/// Rounds of regression, rounding and fitting.
const MOST_ROUNDS: usize = 8;
/// Rounds in which the places are looked at anew, and how far each may move, in readings.
const PLACING_ROUNDS: usize = 2;
const PLACING_REACH: usize = 12;
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
