//! What the stamps say about the clock that made them.
//!
//! In: the stamps of all frames, in ticks. Out: a diagnosis and a time for every frame. A *steady* clock is one whose
//! stamps lie within one rounding step of a uniform grid; the grid's times are used and the rounding noise is gone. A
//! *variable* clock keeps its stamps and passes their uncertainty on.

use super::FootageError;
use std::path::Path;

/// How even the clock of the stamps is.
#[derive(Clone, Debug, PartialEq)]
pub struct FrameClock {
    /// True: the stamps lie within one rounding step of a uniform grid, and the grid's times are used.
    pub steady: bool,
    /// Frame interval of the grid (steady) or median interval (variable), in file time, s.
    pub interval_s: f64,
    /// One tick of the container's time base, s.
    pub tick_s: f64,
    /// Step to which the stamps are rounded, s; at least one tick.
    pub rounding_step_s: f64,
    /// RMS deviation of the stamps from the uniform grid, s.
    pub jitter_rms_s: f64,
    /// Frames missing from the grid: gaps in the stamps.
    pub n_dropped: usize,
    /// Frames whose stamp does not lie after the one before.
    pub n_repeated: usize,
    /// Standard uncertainty of a frame's time, in capture time, s: 0 for a steady clock.
    pub u_t_s: f64,
    /// Capture time over file time: 1 for ordinary film; 1/8 for 240 Hz in a 30 Hz file.
    pub time_scale: f64,
}

/// A time for every frame.
#[derive(Clone, Debug, PartialEq)]
pub struct FrameTimes {
    /// Times in capture time, s, one a frame.
    pub t_s: Vec<f64>,
    /// True where the frame's stamp does not lie after the one before: its time means nothing.
    pub repeated: Vec<bool>,
}

/// A steady clock's deviations are those of rounding: uniform in one step, so 1/√12 = 0.29 of a step rms. More than this
/// share of a step is jitter that rounding cannot explain.
const MAX_ROUNDING_RMS_STEPS: f64 = 0.4;

/// Diagnoses the stamps of a film and gives every frame its time, in file time (`time_scale` 1).
///
/// * `stamps`: ticks in presentation order; `time_base`: s per tick as a fraction.
/// * The grid's first frame keeps its own stamp up to rounding, so that start offsets are honoured.
///
/// # Errors
/// [`FootageError::NoStamps`] where fewer than two frames carry a stamp, a stamp is missing, or none lies after another.
pub fn frame_clock(
    stamps: &[Option<i64>],
    time_base: [i64; 2],
    path: &Path,
) -> Result<(FrameClock, FrameTimes), FootageError> {
    let no_stamps = |reason: String| FootageError::NoStamps {
        path: path.to_path_buf(),
        reason,
    };
    if time_base[0] <= 0 || time_base[1] <= 0 {
        return Err(no_stamps(format!(
            "the time base is {}/{} s",
            time_base[0], time_base[1]
        )));
    }
    if let Some(frame) = stamps.iter().position(Option::is_none) {
        return Err(no_stamps(format!("frame {frame} has no stamp")));
    }
    let ticks: Vec<i64> = stamps.iter().flatten().copied().collect();
    let repeated = repeated_frames(&ticks);
    let kept: Vec<i64> = ticks
        .iter()
        .zip(&repeated)
        .filter(|(_, repeated)| !**repeated)
        .map(|(&tick, _)| tick)
        .collect();
    if kept.len() < 2 {
        return Err(no_stamps(
            "fewer than two frames have stamps of their own".to_owned(),
        ));
    }
    let tick_s = to_f64(time_base[0]) / to_f64(time_base[1]);
    let grid = Grid::through(&kept);
    let steady = grid.is_steady();
    let median_s = median_interval(&kept) * tick_s;
    let rounding_step_s = to_f64(grid.rounding_step) * tick_s;
    let clock = FrameClock {
        steady,
        interval_s: if steady {
            grid.interval * tick_s
        } else {
            median_s
        },
        tick_s,
        rounding_step_s,
        jitter_rms_s: grid.rms * tick_s,
        n_dropped: if steady {
            grid.n_dropped()
        } else {
            long_intervals(&kept)
        },
        n_repeated: repeated.iter().filter(|repeated| **repeated).count(),
        // A variable clock's stamp is rounded to its step: rectangular, half-width half a step.
        u_t_s: if steady {
            0.0
        } else {
            rounding_step_s / 12.0_f64.sqrt()
        },
        time_scale: 1.0,
    };
    let mut grid_times = grid.times();
    let t_s = ticks
        .iter()
        .zip(&repeated)
        .map(|(&tick, &repeated)| match (repeated, steady) {
            (false, true) => grid_times.next().unwrap_or(to_f64(tick)) * tick_s,
            // Divided last: numerator and tick are whole, so that a stamp such as 3003/90000 is rounded once only.
            _ => to_f64(tick) * to_f64(time_base[0]) / to_f64(time_base[1]),
        })
        .collect();
    Ok((clock, FrameTimes { t_s, repeated }))
}

/// True for each frame whose stamp does not lie after every stamp before it.
fn repeated_frames(ticks: &[i64]) -> Vec<bool> {
    let mut latest = None;
    ticks
        .iter()
        .map(|&tick| {
            let repeated = latest.is_some_and(|latest| tick <= latest);
            latest = latest.max(Some(tick));
            repeated
        })
        .collect()
}

/// The uniform grid nearest to a series of stamps, in ticks.
struct Grid {
    first_tick: i64,
    /// Position of the grid's frame 0, ticks from `first_tick`.
    origin: f64,
    interval: f64,
    /// Each frame's number on the grid.
    numbers: Vec<i64>,
    rounding_step: i64,
    /// Largest and rms deviation of a stamp from the grid, ticks.
    largest: f64,
    rms: f64,
}

impl Grid {
    fn through(ticks: &[i64]) -> Self {
        let first_tick = ticks[0];
        let offsets: Vec<f64> = ticks
            .iter()
            .map(|&tick| to_f64(tick.saturating_sub(first_tick)))
            .collect();
        let rounding_step = ticks
            .windows(2)
            .fold(0, |step, pair| gcd(step, pair[1].saturating_sub(pair[0])))
            .max(1);
        let mut interval = near_median_mean(&offsets);
        let mut numbers = numbers_by_steps(&offsets, interval);
        let mut origin = 0.0;
        // Numbers found by adding up steps can slip where intervals are uneven; the line through them puts that right.
        for _ in 0..3 {
            (origin, interval) = line(&numbers, &offsets);
            let next: Vec<i64> = offsets
                .iter()
                .map(|offset| round((offset - origin) / interval))
                .collect();
            if next == numbers {
                break;
            }
            numbers = next;
        }
        let step = to_f64(rounding_step);
        if let Some((exact_origin, exact_interval)) =
            rounded_line(&numbers, &offsets, interval, step)
        {
            (origin, interval) = (exact_origin, exact_interval);
        }
        let deviations: Vec<f64> = numbers
            .iter()
            .zip(&offsets)
            .map(|(&number, offset)| offset - origin - interval * to_f64(number))
            .collect();
        let largest = deviations
            .iter()
            .fold(0.0_f64, |largest, deviation| largest.max(deviation.abs()));
        let rms = (deviations
            .iter()
            .map(|deviation| deviation * deviation)
            .sum::<f64>()
            / count(deviations.len()))
        .sqrt();
        Self {
            first_tick,
            origin,
            interval,
            numbers,
            rounding_step,
            largest,
            rms,
        }
    }

    fn is_steady(&self) -> bool {
        let step = to_f64(self.rounding_step);
        let distinct = self.numbers.windows(2).all(|pair| pair[1] > pair[0]);
        distinct && self.largest <= step && self.rms <= MAX_ROUNDING_RMS_STEPS * step
    }

    fn n_dropped(&self) -> usize {
        self.numbers
            .windows(2)
            .map(|pair| usize::try_from(pair[1].saturating_sub(pair[0]) - 1).unwrap_or(0))
            .sum()
    }

    /// Grid times of the frames, ticks.
    fn times(&self) -> impl Iterator<Item = f64> + '_ {
        self.numbers
            .iter()
            .map(|&number| to_f64(self.first_tick) + self.origin + self.interval * to_f64(number))
    }
}

/// Mean of the intervals that lie within half of the median: the frame interval, rounding averaged out, gaps left out.
fn near_median_mean(offsets: &[f64]) -> f64 {
    let intervals: Vec<f64> = offsets.windows(2).map(|pair| pair[1] - pair[0]).collect();
    let middle = median(intervals.clone());
    let near: Vec<f64> = intervals
        .into_iter()
        .filter(|interval| (interval / middle - 1.0).abs() < 0.5)
        .collect();
    near.iter().sum::<f64>() / count(near.len().max(1))
}

fn numbers_by_steps(offsets: &[f64], interval: f64) -> Vec<i64> {
    let mut number = 0_i64;
    let mut numbers = vec![0];
    for pair in offsets.windows(2) {
        number = number.saturating_add(round((pair[1] - pair[0]) / interval).max(1));
        numbers.push(number);
    }
    numbers
}

/// Least-squares line through (number, offset): origin and interval.
fn line(numbers: &[i64], offsets: &[f64]) -> (f64, f64) {
    let n = count(numbers.len());
    let mean_number = numbers.iter().map(|&number| to_f64(number)).sum::<f64>() / n;
    let mean_offset = offsets.iter().sum::<f64>() / n;
    let (mut square, mut product) = (0.0, 0.0);
    for (&number, offset) in numbers.iter().zip(offsets) {
        let distance = to_f64(number) - mean_number;
        square += distance * distance;
        product += distance * (offset - mean_offset);
    }
    let interval = product / square;
    (mean_offset - interval * mean_number, interval)
}

/// The middle of all lines from which every offset can come by rounding to `step`; `None` where there is no such line.
///
/// Rounding leaves a slow saw-tooth, not noise, and least squares turns a saw-tooth into a wrong interval (11 ppm for
/// 59.94 Hz in sixths of a hundredth of a second, 15 s). The lines that explain every stamp differ by far less.
///
/// For a slope p the offsets minus p·number spread over w(p), a convex function; the slopes with w(p) ≤ `step` are an
/// interval, found by ternary search for the least w and bisection for its ends.
fn rounded_line(
    numbers: &[i64],
    offsets: &[f64],
    near_slope: f64,
    step: f64,
) -> Option<(f64, f64)> {
    let extremes = |slope: f64| {
        numbers.iter().zip(offsets).fold(
            (f64::INFINITY, f64::NEG_INFINITY),
            |(low, high), (&number, offset)| {
                let rest = offset - slope * to_f64(number);
                (low.min(rest), high.max(rest))
            },
        )
    };
    let spread = |slope: f64| {
        let (low, high) = extremes(slope);
        high - low
    };
    let reach = 4.0 * step / count(numbers.len());
    let (mut low, mut high) = (near_slope - reach, near_slope + reach);
    for _ in 0..SLOPE_SEARCH_STEPS {
        let third = (high - low) / 3.0;
        if spread(low + third) <= spread(high - third) {
            high -= third;
        } else {
            low += third;
        }
    }
    let least = f64::midpoint(low, high);
    // A stamp may stand exactly on the edge between two steps; the slack lets it count as either.
    let allowed = step * (1.0 + 1e-9);
    if spread(least) > allowed {
        return None;
    }
    let edge = |outside: f64| {
        let (mut inside, mut outside) = (least, outside);
        for _ in 0..SLOPE_SEARCH_STEPS {
            let middle = f64::midpoint(inside, outside);
            if spread(middle) <= allowed {
                inside = middle;
            } else {
                outside = middle;
            }
        }
        inside
    };
    let slope = f64::midpoint(edge(near_slope - reach), edge(near_slope + reach));
    let (low, high) = extremes(slope);
    Some((f64::midpoint(low, high), slope))
}

/// Halvings (or cuts by a third) of the search for a slope: 60 bring a reach of one step below the resolution of `f64`.
const SLOPE_SEARCH_STEPS: usize = 60;

fn median_interval(ticks: &[i64]) -> f64 {
    median(
        ticks
            .windows(2)
            .map(|pair| to_f64(pair[1].saturating_sub(pair[0])))
            .collect(),
    )
}

/// Frames that seem missing from a variable clock: whole median intervals beyond the first in each gap.
fn long_intervals(ticks: &[i64]) -> usize {
    let middle = median_interval(ticks);
    ticks
        .windows(2)
        .map(|pair| {
            usize::try_from(
                round(to_f64(pair[1].saturating_sub(pair[0])) / middle).saturating_sub(1),
            )
            .unwrap_or(0)
        })
        .sum()
}

fn median(mut values: Vec<f64>) -> f64 {
    values.sort_by(f64::total_cmp);
    let middle = values.len() / 2;
    if values.len() % 2 == 1 {
        values[middle]
    } else {
        f64::midpoint(values[middle - 1], values[middle])
    }
}

fn gcd(a: i64, b: i64) -> i64 {
    if b == 0 { a } else { gcd(b, a % b) }
}

#[expect(
    clippy::cast_precision_loss,
    reason = "ticks of a film are far below 2^53"
)]
fn to_f64(ticks: i64) -> f64 {
    ticks as f64
}

#[expect(
    clippy::cast_precision_loss,
    reason = "the number of frames is limited"
)]
fn count(n: usize) -> f64 {
    n as f64
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "`as` saturates, and a grid number beyond i64 cannot be"
)]
fn round(value: f64) -> i64 {
    value.round() as i64
}

#[cfg(test)]
mod tests {
    use super::*;

    fn clock_of(ticks: &[i64], time_base: [i64; 2]) -> (FrameClock, FrameTimes) {
        let stamps: Vec<Option<i64>> = ticks.iter().copied().map(Some).collect();
        frame_clock(&stamps, time_base, Path::new("clip")).unwrap()
    }

    #[test]
    fn stamps_rounded_to_a_six_hundredth_become_the_uniform_grid_they_came_from() {
        let interval = 600.0 * 1001.0 / 60000.0;
        let ticks: Vec<i64> = (0..900).map(|k| round(interval * to_f64(k))).collect();
        let (clock, times) = clock_of(&ticks, [1, 600]);
        assert!(clock.steady);
        assert!(
            (clock.interval_s * 60000.0 / 1001.0 - 1.0).abs() < 1e-6,
            "{}",
            clock.interval_s
        );
        let worst = (0..900)
            .map(|k| (times.t_s[k] - count(k) * 1001.0 / 60000.0).abs())
            .fold(0.0, f64::max);
        // The rounding is ±0.83 ms; that every one of 900 stamps comes from one grid leaves a hundredth of it.
        assert!(worst < 1e-5, "{worst}");
    }

    #[test]
    fn milliseconds_in_a_microsecond_time_base_are_found_as_the_step() {
        let ticks: Vec<i64> = (0..400)
            .map(|k| 1000 * round(to_f64(k) * 1000.0 / 29.967))
            .collect();
        let (clock, _) = clock_of(&ticks, [1, 1_000_000]);
        assert!(clock.steady);
        assert!(
            (clock.rounding_step_s - 1e-3).abs() < 1e-12 && (clock.tick_s - 1e-6).abs() < 1e-15
        );
        assert!(
            clock.jitter_rms_s > 2e-4 && clock.jitter_rms_s < 4e-4,
            "{}",
            clock.jitter_rms_s
        );
    }

    #[test]
    fn a_dropped_frame_is_a_gap_in_a_steady_grid() {
        let ticks: Vec<i64> = (0..100)
            .filter(|k| *k != 40 && *k != 41)
            .map(|k| 512 * k + 1024)
            .collect();
        let (clock, times) = clock_of(&ticks, [1, 15360]);
        assert!(clock.steady);
        assert_eq!(clock.n_dropped, 2);
        assert!((times.t_s[0] - 1024.0 / 15360.0).abs() < 1e-12);
        assert!((times.t_s[97] - (99.0 * 512.0 + 1024.0) / 15360.0).abs() < 1e-12);
    }

    #[test]
    fn real_jitter_is_kept_and_passed_on() {
        // ±3 ms of a deterministic, uneven pattern on 33.3 ms, in a 1/90000 s time base.
        let ticks: Vec<i64> = (0..300)
            .map(|k| 3000 * k + (k * k * 37 % 541) - 270)
            .collect();
        let (clock, times) = clock_of(&ticks, [1, 90000]);
        assert!(!clock.steady);
        assert!(clock.u_t_s > 0.0);
        for (t_s, tick) in times.t_s.iter().zip(&ticks) {
            assert!((t_s - to_f64(*tick) / 90000.0).abs() < 1e-12);
        }
    }

    #[test]
    fn a_repeated_stamp_is_marked_and_does_not_bend_the_grid() {
        let mut ticks: Vec<i64> = (0..50).map(|k| 100 * k).collect();
        ticks.insert(20, 1900);
        let (clock, times) = clock_of(&ticks, [1, 3000]);
        assert!(clock.steady);
        assert_eq!(clock.n_repeated, 1);
        assert!(times.repeated[20] && !times.repeated[19]);
        assert!((times.t_s[50] - 4900.0 / 3000.0).abs() < 1e-12);
    }

    #[test]
    fn stamps_that_say_nothing_are_refused() {
        let path = Path::new("clip");
        for stamps in [
            vec![],
            vec![Some(3)],
            vec![None, None],
            vec![Some(1), None, Some(3)],
            vec![Some(5); 9],
        ] {
            assert!(
                matches!(
                    frame_clock(&stamps, [1, 30], path),
                    Err(FootageError::NoStamps { .. })
                ),
                "{stamps:?}"
            );
        }
        assert!(frame_clock(&[Some(0), Some(1)], [0, 1], path).is_err());
        assert!(frame_clock(&[Some(i64::MIN), Some(i64::MAX)], [1, 1], path).is_ok());
    }
}
