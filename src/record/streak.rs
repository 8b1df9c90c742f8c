//! The streak picture: position against time as the film saw it, with the fitted curve drawn through the marker's track.
//!
//! Time runs to the right and x upwards, as in the plots below it in the report. A column shows the mean of the frames that
//! fall into it, so that a long film is averaged and a short one repeated; the strip at the foot is dark where the marker
//! was lost.

use super::error::RecordError;
use super::picture::{mean, png_from_rgb};
use crate::measurement::{FilmPart, Measurement, RecordRow, RowStatus, Streak};
use crate::motion::MotionFit;

const PART: &str = "streak.png";

/// Largest size of the picture's field, px.
#[derive(Clone, Copy, Debug)]
pub(super) struct Bounds {
    width: usize,
    height: usize,
}

/// For the file: as wide as a large screen.
const FILE_BOUNDS: Bounds = Bounds { width: 1600, height: 720 };
/// For the page, where the picture is 17 cm wide and every byte counts a third more.
const PAGE_BOUNDS: Bounds = Bounds { width: 1000, height: 400 };

/// Height of the strip that marks lost frames, px, and of the white line above it.
const STRIP_PX: usize = 8;
const STRIP_GAP_PX: usize = 3;
const BACKGROUND: [u8; 3] = [255, 255, 255];
const STRIP_FOUND: [u8; 3] = [226, 226, 226];
const STRIP_LOST: [u8; 3] = [20, 20, 20];

/// The curve: lighter than the accent of the page, because it must stand out from black, grey and white alike.
const CURVE: [u8; 3] = [255, 92, 20];
/// Half the curve's width, px.
const CURVE_HALF_WIDTH_PX: f64 = 0.8;
/// How much of the curve's colour covers the picture: the track must stay visible beneath.
const CURVE_OPACITY: f64 = 0.72;
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
pub(super) fn streak_png_for_page(measurement: &Measurement) -> Result<Option<Vec<u8>>, RecordError> {
    drawn(measurement, PAGE_BOUNDS)
}

fn drawn(measurement: &Measurement, bounds: Bounds) -> Result<Option<Vec<u8>>, RecordError> {
    let Some(film) = &measurement.film else { return Ok(None) };
    let Some(field) = Field::new(&film.streak, bounds)? else { return Ok(None) };
    let mut canvas = field.painted(&film.streak);
    field.draw_curve(&mut canvas, &measurement.fit, film);
    canvas.extend(field.strip(&measurement.rows));
    png_from_rgb(&canvas, field.width, field.height + STRIP_GAP_PX + STRIP_PX, PART).map(Some)
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
            let reason = format!("{} samples for {n_lines} lines of {}", streak.lines.len(), streak.width);
            return Err(RecordError::Compose { part: PART, reason });
        }
        let (Some(&first_s), Some(&last_s)) = (streak.t_s.first(), streak.t_s.last()) else { return Ok(None) };
        // Also false for a time that is not a number.
        let runs_forward = last_s > first_s;
        if n_lines < 2 || streak.width == 0 || !runs_forward {
            return Ok(None);
        }
        let line_s = (last_s - first_s) / as_f64(n_lines - 1);
        let width = stretched(n_lines, bounds.width);
        let height = stretched(streak.width, bounds.height);
        Ok(Some(Self {
            width,
            height,
            start_s: first_s - 0.5 * line_s,
            column_s: (last_s - first_s + line_s) / as_f64(width),
            line_s,
            px_per_sample: as_f64(height) / as_f64(streak.width),
        }))
    }

    fn time_s(&self, column: f64) -> f64 {
        self.start_s + column * self.column_s
    }

    /// Row of a sample's centre, counted from the top; x grows upwards.
    fn row_of(&self, sample: f64) -> f64 {
        as_f64(self.height) - (sample + 0.5) * self.px_per_sample - 0.5
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
        let centre_s = self.time_s(as_f64(column) + 0.5);
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
        let mut coverage = vec![0.0f64; self.width * self.height];
        let n_points = self.width * CURVE_POINTS_PER_COLUMN;
        let points = (0..=n_points).map(|i| as_f64(i) / as_f64(CURVE_POINTS_PER_COLUMN)).filter_map(|column| {
            let t_s = self.time_s(column);
            let sample = (fit.position_m(t_s) / film.scale.m_per_px - film.streak.first_px) / film.streak.step_px;
            (t_s >= fit.t_ref_s && t_s <= fit.t_end_s && sample.is_finite()).then(|| [column - 0.5, self.row_of(sample)])
        });
        let mut last = None;
        for point in points {
            if let Some(last) = last {
                self.cover(&mut coverage, last, point);
            }
            last = Some(point);
        }
        for (pixel, share) in canvas.chunks_exact_mut(3).zip(&coverage) {
            for (channel, colour) in pixel.iter_mut().zip(CURVE) {
                let weight = share * CURVE_OPACITY;
                *channel = luma(f64::from(*channel) * (1.0 - weight) + f64::from(colour) * weight);
            }
        }
    }

    /// Raises the coverage of the pixels near a segment: 1 inside the line, falling to 0 over one pixel at its edge.
    fn cover(&self, coverage: &mut [f64], from: [f64; 2], to: [f64; 2]) {
        let reach = CURVE_HALF_WIDTH_PX + 1.0;
        let columns = span(from[0], to[0], reach, self.width);
        let rows = span(from[1], to[1], reach, self.height);
        for row in rows {
            for column in columns.clone() {
                let distance = distance_to_segment([as_f64(column), as_f64(row)], from, to);
                let share = (CURVE_HALF_WIDTH_PX + 0.5 - distance).clamp(0.0, 1.0);
                let cell = &mut coverage[row * self.width + column];
                *cell = cell.max(share);
            }
        }
    }

    /// The strip at the foot: dark in the columns in which a frame lost the marker.
    fn strip(&self, rows: &[RecordRow]) -> Vec<u8> {
        let mut strip = vec![STRIP_FOUND; self.width];
        for row in rows.iter().filter(|row| row.status == RowStatus::Lost) {
            let left = (row.t_s - 0.5 * self.line_s - self.start_s) / self.column_s;
            let columns = span(left, left + self.line_s / self.column_s - 1.0, 0.0, self.width);
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

/// Whole pixels from `reach` before the smaller to `reach` beyond the larger of two places, inside 0…n.
fn span(a: f64, b: f64, reach: f64, n: usize) -> std::ops::Range<usize> {
    let low = (a.min(b) - reach).floor();
    let high = (a.max(b) + reach).ceil() + 1.0;
    let start = whole(low, n);
    start..whole(high, n).max(start)
}

/// A place as a pixel count inside 0…n.
#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to 0…n on the same line")]
fn whole(place: f64, n: usize) -> usize {
    place.clamp(0.0, as_f64(n)) as usize
}

#[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "clamped to 0…255 on the same line")]
fn luma(value: f64) -> u8 {
    value.round().clamp(0.0, 255.0) as u8
}

fn as_f64(n: usize) -> f64 {
    n as f64
}

fn distance_to_segment(p: [f64; 2], a: [f64; 2], b: [f64; 2]) -> f64 {
    let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
    let length2 = dx * dx + dy * dy;
    let along = if length2 > 0.0 { (((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / length2).clamp(0.0, 1.0) } else { 0.0 };
    (p[0] - a[0] - along * dx).hypot(p[1] - a[1] - along * dy)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn streak(n_lines: usize, width: usize) -> Streak {
        Streak {
            width,
            lines: (0..n_lines * width).map(|i| if i % width == 0 { 200 } else { 100 }).collect(),
            t_s: (0..n_lines).map(|i| 0.1 * as_f64(i)).collect(),
            first_px: 0.0,
            step_px: 1.0,
        }
    }

    #[test]
    fn a_short_streak_is_repeated_and_a_long_one_is_averaged() {
        assert_eq!(stretched(3, 10), 9);
        assert_eq!(stretched(25, 10), 10);
        let field = Field::new(&streak(4, 2), Bounds { width: 8, height: 2 }).unwrap().unwrap();
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
        let field = Field::new(&gappy, Bounds { width: 12, height: 1 }).unwrap().unwrap();
        let canvas = field.painted(&gappy);
        let white = canvas.chunks(3).filter(|pixel| pixel[0] == 255).count();
        assert!((1..12).contains(&white), "{white} white columns");
    }

    #[test]
    fn sample_centres_and_rows_agree() {
        let field = Field::new(&streak(4, 5), Bounds { width: 4, height: 10 }).unwrap().unwrap();
        // Two rows a sample: sample 0 covers rows 8 and 9, its centre lies between them.
        assert!((field.row_of(0.0) - 8.5).abs() < 1e-12, "{}", field.row_of(0.0));
        assert_eq!(field.samples_in(9, 5), 0..1);
        assert_eq!(field.samples_in(0, 5), 4..5);
    }

    #[test]
    fn lines_that_do_not_fit_their_width_are_refused() {
        let mut short = streak(4, 5);
        short.lines.pop();
        assert!(matches!(Field::new(&short, FILE_BOUNDS), Err(RecordError::Compose { .. })));
        assert!(Field::new(&streak(1, 5), FILE_BOUNDS).unwrap().is_none());
    }
}
