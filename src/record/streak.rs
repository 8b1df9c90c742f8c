//! The streak picture: position against time as the film saw it, with the fitted curve drawn through the marker's track.
//!
//! Time runs to the right and x upwards, as in the plots below it in the report. A column shows the mean of the frames that
//! fall into it, so that a long film is averaged and a short one repeated; the strip at the foot is dark where the marker
//! was lost.

use super::brush::{Brush, span};
use super::error::RecordError;
use super::picture::{coarsen, mean, png_from_rgb};
use super::stretch::{Span, first_cycles};
use crate::measurement::{FilmPart, Measurement, RecordRow, RowStatus, Streak};
use crate::motion::MotionFit;

const PART: &str = "streak.png";

/// Largest size of the picture's field, px.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bounds {
    width: usize,
    height: usize,
    /// Whether 64 greys do.
    coarse: bool,
}

/// For the file: as wide as a large screen.
const FILE_BOUNDS: Bounds = Bounds {
    width: 1600,
    height: 720,
    coarse: false,
};
/// For the page, where the picture is 17 cm wide and every byte counts a third more.
const PAGE_BOUNDS: Bounds = Bounds {
    width: 1000,
    height: 400,
    coarse: true,
};

/// Height of the strip that marks lost frames, px, and of the white line above it.
const STRIP_PX: usize = 8;
const STRIP_GAP_PX: usize = 3;
const BACKGROUND: [u8; 3] = [255, 255, 255];
const STRIP_FOUND: [u8; 3] = [226, 226, 226];
const STRIP_LOST: [u8; 3] = [20, 20, 20];

/// Points of the curve in a column, so that a steep stroke is still a smooth line.
const CURVE_POINTS_PER_COLUMN: usize = 4;

/// `streak.png`; `None` for a table, or where the film gave no lines.
///
/// At most 1600 px wide. Time to the right from the first to the last line, x upwards.
///
/// # Errors
/// [`RecordError::Compose`] where the lines do not fit their width, or the PNG encoder gives up.
pub fn streak_png(measurement: &Measurement) -> Result<Option<Vec<u8>>, RecordError> {
    drawn(measurement, FILE_BOUNDS)
}

/// The same picture at a size for the page.
pub(super) fn streak_png_for_page(
    measurement: &Measurement,
) -> Result<Option<Vec<u8>>, RecordError> {
    drawn(measurement, PAGE_BOUNDS)
}

/// The first cycles alone, where the whole film is too dense to see the track beside the curve; `None` where it is not.
pub(super) fn streak_png_close(measurement: &Measurement) -> Result<Option<Vec<u8>>, RecordError> {
    match (&measurement.film, first_cycles(&measurement.fit)) {
        (Some(film), Some(span)) => {
            drawn_lines(measurement, film, &part_of(&film.streak, span), PAGE_BOUNDS)
        }
        _ => Ok(None),
    }
}

/// The lines of a streak inside a span of time.
fn part_of(streak: &Streak, span: Span) -> Streak {
    let within = span.range_in(&streak.t_s);
    let samples = within.start * streak.width..within.end * streak.width;
    let lines = streak.lines.get(samples).unwrap_or_default().to_vec();
    Streak {
        width: streak.width,
        lines,
        t_s: streak.t_s[within].to_vec(),
        first_px: streak.first_px,
        step_px: streak.step_px,
    }
}

fn drawn(measurement: &Measurement, bounds: Bounds) -> Result<Option<Vec<u8>>, RecordError> {
    match &measurement.film {
        Some(film) => drawn_lines(measurement, film, &film.streak, bounds),
        None => Ok(None),
    }
}

fn drawn_lines(
    measurement: &Measurement,
    film: &FilmPart,
    streak: &Streak,
    bounds: Bounds,
) -> Result<Option<Vec<u8>>, RecordError> {
    let Some(field) = Field::new(streak, bounds)? else {
        return Ok(None);
    };
    let mut canvas = field.painted(streak);
    if bounds.coarse {
        coarsen(&mut canvas);
    }
    field.draw_curve(&mut canvas, &measurement.fit, film);
    canvas.extend(field.strip(&measurement.rows));
    png_from_rgb(
        &canvas,
        field.width,
        field.height + STRIP_GAP_PX + STRIP_PX,
        PART,
    )
    .map(Some)
}

/// The picture's geometry: which time a column shows, and where on it a sample lies.
#[derive(Clone, Copy, Debug)]
struct Field {
    width: usize,
    height: usize,
    start_s: f64,
    column_s: f64,
    /// Typical distance of two lines in time, s.
    line_s: f64,
    /// Pixels a sample (1, 2, … where a narrow streak is spread, ½, ⅓, … where a wide one is averaged).
    px_per_sample: f64,
}

impl Field {
    /// `None` for fewer than two lines, or none with time between them.
    fn new(streak: &Streak, bounds: Bounds) -> Result<Option<Self>, RecordError> {
        let n_lines = streak.t_s.len();
        if streak.lines.len() != n_lines * streak.width {
            let reason = format!(
                "{} samples for {n_lines} lines of {}",
                streak.lines.len(),
                streak.width
            );
            return Err(RecordError::Compose { part: PART, reason });
        }
        let (Some(&first_s), Some(&last_s)) = (streak.t_s.first(), streak.t_s.last()) else {
            return Ok(None);
        };
        // Also false for a time that is not a number.
        let runs_forward = last_s > first_s;
        if n_lines < 2 || streak.width == 0 || !runs_forward {
            return Ok(None);
        }
        let line_s = (last_s - first_s) / (n_lines - 1) as f64;
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

    fn time_s(&self, column: f64) -> f64 {
        self.start_s + column * self.column_s
    }

    /// Row of a sample's centre, counted from the top; x grows upwards.
    fn row_of(&self, sample: f64) -> f64 {
        self.height as f64 - (sample + 0.5) * self.px_per_sample - 0.5
    }

    /// The samples that a row shows, as a range.
    fn samples_in(&self, row: usize, n_samples: usize) -> std::ops::Range<usize> {
        let from_foot = self.height - 1 - row;
        let start = from_foot * n_samples / self.height;
        let end = ((from_foot + 1) * n_samples / self.height).max(start + 1);
        start..end.min(n_samples)
    }

    /// The lines whose frame interval overlaps a column; empty where frames are missing.
    fn lines_in(&self, column: usize, t_s: &[f64]) -> std::ops::Range<usize> {
        let reach_s = 0.5 * self.line_s.max(self.column_s);
        let centre_s = self.time_s(column as f64 + 0.5);
        let start = t_s.partition_point(|&t| t < centre_s - reach_s);
        let end = t_s.partition_point(|&t| t < centre_s + reach_s);
        start..end.max(start)
    }

    /// The picture in grey, as RGB.
    fn painted(&self, streak: &Streak) -> Vec<u8> {
        let mut canvas = vec![BACKGROUND[0]; self.width * self.height * 3];
        for column in 0..self.width {
            let lines = self.lines_in(column, &streak.t_s);
            if lines.is_empty() {
                continue;
            }
            for row in 0..self.height {
                let samples = self.samples_in(row, streak.width);
                let values = lines.clone().flat_map(|line| {
                    let start = line * streak.width;
                    &streak.lines[start + samples.start..start + samples.end]
                });
                let at = (row * self.width + column) * 3;
                canvas[at..at + 3].fill(mean(values));
            }
        }
        canvas
    }

    /// Lays the fitted curve over the picture, between the first and the last reading used.
    fn draw_curve(&self, canvas: &mut [u8], fit: &MotionFit, film: &FilmPart) {
        let mut brush = Brush::new(self.width, self.height);
        let n_points = self.width * CURVE_POINTS_PER_COLUMN;
        let points = (0..=n_points)
            .map(|i| i as f64 / CURVE_POINTS_PER_COLUMN as f64)
            .filter_map(|column| {
                let t_s = self.time_s(column);
                let sample = (fit.position_m(t_s) / film.scale.m_per_px - film.streak.first_px)
                    / film.streak.step_px;
                (t_s >= fit.t_ref_s && t_s <= fit.t_end_s && sample.is_finite())
                    .then(|| [column - 0.5, self.row_of(sample)])
            });
        brush.line(points);
        brush.lay_over(canvas);
    }

    /// The strip at the foot: dark in the columns in which a frame lost the marker.
    fn strip(&self, rows: &[RecordRow]) -> Vec<u8> {
        let mut strip = vec![STRIP_FOUND; self.width];
        for row in rows.iter().filter(|row| row.status == RowStatus::Lost) {
            let left = (row.t_s - 0.5 * self.line_s - self.start_s) / self.column_s;
            let columns = span(
                left,
                left + self.line_s / self.column_s - 1.0,
                0.0,
                self.width,
            );
            strip[columns].fill(STRIP_LOST);
        }
        let gap = std::iter::repeat_n(BACKGROUND, self.width * STRIP_GAP_PX);
        let lines = (0..STRIP_PX).flat_map(|_| strip.iter().copied());
        gap.chain(lines).flatten().collect()
    }
}

/// The size to draw `n` at: the largest whole multiple up to `limit`, or the limit itself where `n` is larger.
fn stretched(n: usize, limit: usize) -> usize {
    if n > limit { limit } else { n * (limit / n) }
}

#[cfg(test)]
mod tests {
    use super::*;

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
    fn a_short_streak_is_repeated_and_a_long_one_is_averaged() {
        assert_eq!(stretched(3, 10), 9);
        assert_eq!(stretched(25, 10), 10);
        let field = Field::new(
            &streak(4, 2),
            Bounds {
                width: 8,
                height: 2,
                coarse: false,
            },
        )
        .unwrap()
        .unwrap();
        assert_eq!((field.width, field.height), (8, 2));
        // x grows upwards: sample 0 (200) is the lower row.
        let canvas = field.painted(&streak(4, 2));
        let grey: Vec<u8> = canvas.chunks(3).map(|pixel| pixel[0]).collect();
        assert_eq!(grey, [[100; 8], [200; 8]].concat());
    }

    #[test]
    fn missing_frames_leave_a_white_gap() {
        let mut gappy = streak(4, 1);
        gappy.t_s = vec![0.0, 0.1, 0.8, 0.9];
        let field = Field::new(
            &gappy,
            Bounds {
                width: 12,
                height: 1,
                coarse: false,
            },
        )
        .unwrap()
        .unwrap();
        let canvas = field.painted(&gappy);
        let white = canvas.chunks(3).filter(|pixel| pixel[0] == 255).count();
        assert!((1..12).contains(&white), "{white} white columns");
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
            Field::new(&short, FILE_BOUNDS),
            Err(RecordError::Compose { .. })
        ));
        assert!(Field::new(&streak(1, 5), FILE_BOUNDS).unwrap().is_none());
    }
}
