//! The geometry of the streak picture: its size, which time a column shows, which samples a row shows.

use std::ops::Range;

use super::error::RecordError;
use crate::measurement::Streak;

/// How far a line may be stretched to meet its neighbour, in intervals between lines; half of one is its own share.
const STRETCH: f64 = 0.75;

/// Largest size of the picture's field, px.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bounds {
    /// Most columns, px.
    pub(super) width: usize,
    /// Most rows, px.
    pub(super) height: usize,
    /// Whether 64 greys do.
    pub(super) coarse: bool,
}

/// The picture's geometry: which time a column shows, and where on it a sample lies.
#[derive(Clone, Copy, Debug)]
pub(super) struct Field {
    /// Columns, px.
    pub(super) width: usize,
    /// Rows, px.
    pub(super) height: usize,
    /// Time of the left edge, s.
    pub(super) start_s: f64,
    /// Time that a column spans, s.
    pub(super) column_s: f64,
    /// Median distance of two lines in time, s: a gap must not widen every line.
    pub(super) line_s: f64,
    /// Pixels a sample (1, 2, … where a narrow streak is spread, ½, ⅓, … where a wide one is averaged).
    px_per_sample: f64,
}

impl Field {
    /// `None` for fewer than two lines, or none with time between them.
    pub(super) fn new(streak: &Streak, bounds: Bounds) -> Result<Option<Self>, RecordError> {
        let n_lines = streak.t_s.len();
        if streak.lines.len() != n_lines * streak.width {
            let reason = format!(
                "{} samples for {n_lines} lines of {}",
                streak.lines.len(),
                streak.width
            );
            return Err(RecordError::Compose {
                part: "streak.png",
                reason,
            });
        }
        let (Some(&first_s), Some(&last_s)) = (streak.t_s.first(), streak.t_s.last()) else {
            return Ok(None);
        };
        // Also false for a time that is not a number.
        let runs_forward = last_s > first_s;
        if n_lines < 2 || streak.width == 0 || !runs_forward {
            return Ok(None);
        }
        let line_s = median_step(&streak.t_s);
        let width = stretched(n_lines, bounds.width);
        let height = stretched(streak.width, bounds.height);
        Ok(Some(Self {
            width,
            height,
            start_s: first_s - 0.5 * line_s,
            column_s: (last_s - first_s + line_s) / width as f64,
            line_s,
            px_per_sample: height as f64 / streak.width as f64,
        }))
    }

    /// Time at a place along the picture, s; column n begins at n and ends at n + 1.
    pub(super) fn time_s(&self, column: f64) -> f64 {
        self.start_s + column * self.column_s
    }

    /// Row of a sample's centre, counted from the top; x grows upwards.
    pub(super) fn row_of(&self, sample: f64) -> f64 {
        self.height as f64 - (sample + 0.5) * self.px_per_sample - 0.5
    }

    /// The samples that a row shows, as a range.
    pub(super) fn samples_in(&self, row: usize, n_samples: usize) -> Range<usize> {
        let from_foot = self.height - 1 - row;
        let start = from_foot * n_samples / self.height;
        let end = ((from_foot + 1) * n_samples / self.height).max(start + 1);
        start..end.min(n_samples)
    }

    /// The lines that a column shows: those within half an interval of its centre, or else the nearest one within three
    /// quarters, so that an uneven clock leaves no slits; empty where frames are missing.
    pub(super) fn lines_in(&self, column: usize, t_s: &[f64]) -> Range<usize> {
        let reach_s = 0.5 * self.line_s.max(self.column_s);
        let centre_s = self.time_s(column as f64 + 0.5);
        let start = t_s.partition_point(|&t| t < centre_s - reach_s);
        let end = t_s.partition_point(|&t| t < centre_s + reach_s);
        if start < end {
            return start..end;
        }
        let distance = |line: usize| {
            t_s.get(line)
                .map_or(f64::INFINITY, |t| (t - centre_s).abs())
        };
        let before = start.saturating_sub(1);
        let nearest = if distance(before) <= distance(start) {
            before
        } else {
            start
        };
        if distance(nearest) <= STRETCH * self.line_s {
            nearest..nearest + 1
        } else {
            start..start
        }
    }
}

/// The size to draw `n` at: the largest whole multiple up to `limit`, or the limit itself where `n` is larger.
fn stretched(n: usize, limit: usize) -> usize {
    if n > limit { limit } else { n * (limit / n) }
}

/// The median of the steps between neighbouring times, s; 0 of fewer than two.
fn median_step(t_s: &[f64]) -> f64 {
    let mut steps: Vec<f64> = t_s.windows(2).map(|pair| pair[1] - pair[0]).collect();
    steps.sort_by(f64::total_cmp);
    steps.get(steps.len() / 2).copied().unwrap_or(0.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    const BOUNDS: Bounds = Bounds {
        width: 1600,
        height: 720,
        coarse: false,
    };

    fn streak(n_lines: usize, width: usize) -> Streak {
        Streak {
            width,
            lines: (0..n_lines * width)
                .map(|i| if i % width == 0 { 200 } else { 100 })
                .collect(),
            t_s: (0..n_lines).map(|i| 0.1 * i as f64).collect(),
            first_px: 0.0,
            step_px: 1.0,
        }
    }

    #[test]
    fn a_short_series_is_spread_by_a_whole_factor_and_a_long_one_squeezed() {
        assert_eq!(stretched(3, 10), 9);
        assert_eq!(stretched(25, 10), 10);
    }

    #[test]
    fn an_uneven_clock_leaves_no_slits() {
        let mut uneven = streak(5, 1);
        uneven.t_s = vec![0.0, 0.1, 0.23, 0.3, 0.4];
        let field = Field::new(&uneven, BOUNDS).unwrap().unwrap();
        let empty = (0..field.width)
            .filter(|&column| field.lines_in(column, &uneven.t_s).is_empty())
            .count();
        assert_eq!(empty, 0);
    }

    #[test]
    fn sample_centres_and_rows_agree() {
        let field = Field::new(
            &streak(4, 5),
            Bounds {
                width: 4,
                height: 10,
                coarse: false,
            },
        )
        .unwrap()
        .unwrap();
        // Two rows a sample: sample 0 covers rows 8 and 9, its centre lies between them.
        assert!(
            (field.row_of(0.0) - 8.5).abs() < 1e-12,
            "{}",
            field.row_of(0.0)
        );
        assert_eq!(field.samples_in(9, 5), 0..1);
        assert_eq!(field.samples_in(0, 5), 4..5);
    }

    #[test]
    fn lines_that_do_not_fit_their_width_are_refused() {
        let mut short = streak(4, 5);
        short.lines.pop();
        assert!(matches!(
            Field::new(&short, BOUNDS),
            Err(RecordError::Compose { .. })
        ));
        assert!(Field::new(&streak(1, 5), BOUNDS).unwrap().is_none());
    }
}
