//! The uniform grid behind a series of rounded stamps.

/// A steady clock's deviations are those of rounding: uniform in one step, so 1/√12 = 0.29 of a step rms. More than this
/// share of a step is jitter that rounding cannot explain.
const MAX_ROUNDING_RMS_STEPS: f64 = 0.4;

/// The uniform grid nearest to a series of stamps, in ticks.
pub(super) struct Grid {
    first_tick: i64,
    /// Position of the grid's frame 0, ticks from `first_tick`.
    origin: f64,
    pub(super) interval: f64,
    /// Each frame's number on the grid.
    numbers: Vec<i64>,
    pub(super) rounding_step: i64,
    /// Largest and rms deviation of a stamp from the grid, ticks.
    largest: f64,
    pub(super) rms: f64,
}

impl Grid {
    pub(super) fn through(ticks: &[i64]) -> Self {
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

    pub(super) fn is_steady(&self) -> bool {
        let step = to_f64(self.rounding_step);
        let distinct = self.numbers.windows(2).all(|pair| pair[1] > pair[0]);
        distinct && self.largest <= step && self.rms <= MAX_ROUNDING_RMS_STEPS * step
    }

    pub(super) fn n_dropped(&self) -> usize {
        self.numbers
            .windows(2)
            .map(|pair| usize::try_from(pair[1].saturating_sub(pair[0]) - 1).unwrap_or(0))
            .sum()
    }

    /// Grid times of the frames, ticks.
    pub(super) fn times(&self) -> impl Iterator<Item = f64> + '_ {
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

pub(super) fn median(mut values: Vec<f64>) -> f64 {
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
pub(super) fn to_f64(ticks: i64) -> f64 {
    ticks as f64
}

#[expect(
    clippy::cast_precision_loss,
    reason = "the number of frames is limited"
)]
pub(super) fn count(n: usize) -> f64 {
    n as f64
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "`as` saturates, and a grid number beyond i64 cannot be"
)]
pub(super) fn round(value: f64) -> i64 {
    value.round() as i64
}
