//! The streak picture: position against time as the film saw it, with the fit drawn through the marker's track.
//!
//! Time runs to the right and x upwards, as in the plots below it in the report. A column shows the mean of the frames that
//! fall into it, so that a long film is averaged and a short one repeated; the strip at the foot is dark where the marker
//! was lost.

use super::brush::{Brush, span};
use super::error::RecordError;
use super::field::{Bounds, Field};
use super::picture::{coarsen, mean, png_from_rgb};
use super::stretch::{Span, first_cycles, period_s};
use crate::measurement::{FilmPart, Measurement, RecordRow, RowStatus, Streak};
use crate::motion::MotionFit;

const PART: &str = "streak.png";

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
/// With fewer columns a cycle the curve would cover the picture like paint.
const LEAST_COLUMNS_PER_CYCLE: f64 = 10.0;

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
    let mut canvas = painted(&field, streak);
    if bounds.coarse {
        coarsen(&mut canvas);
    }
    draw_fit(&field, &mut canvas, &measurement.fit, film);
    canvas.extend(strip(&field, &measurement.rows));
    png_from_rgb(
        &canvas,
        field.width,
        field.height + STRIP_GAP_PX + STRIP_PX,
        PART,
    )
    .map(Some)
}

/// The picture in grey, as RGB.
fn painted(field: &Field, streak: &Streak) -> Vec<u8> {
    let mut canvas = vec![BACKGROUND[0]; field.width * field.height * 3];
    for column in 0..field.width {
        let lines = field.lines_in(column, &streak.t_s);
        if lines.is_empty() {
            continue;
        }
        for row in 0..field.height {
            let samples = field.samples_in(row, streak.width);
            let values = lines.clone().flat_map(|line| {
                let start = line * streak.width;
                &streak.lines[start + samples.start..start + samples.end]
            });
            let at = (row * field.width + column) * 3;
            canvas[at..at + 3].fill(mean(values));
        }
    }
    canvas
}

/// Lays the fit over the picture, between the first and the last reading used: the curve, or the amplitude to both sides
/// of the centre where the cycles are too close to be told apart.
fn draw_fit(field: &Field, canvas: &mut [u8], fit: &MotionFit, film: &FilmPart) {
    let mut brush = Brush::new(field.width, field.height);
    if period_s(fit) / field.column_s >= LEAST_COLUMNS_PER_CYCLE {
        brush.line(points(field, fit, film, |t_s| fit.position_m(t_s)));
    } else {
        brush.line(points(field, fit, film, |t_s| {
            fit.centre_m + fit.envelope_m(t_s)
        }));
        brush.line(points(field, fit, film, |t_s| {
            fit.centre_m - fit.envelope_m(t_s)
        }));
    }
    brush.lay_over(canvas);
}

/// A course of positions in m as columns and rows of the field.
fn points(
    field: &Field,
    fit: &MotionFit,
    film: &FilmPart,
    position_m: impl Fn(f64) -> f64,
) -> impl Iterator<Item = [f64; 2]> {
    let columns = (0..=field.width * CURVE_POINTS_PER_COLUMN)
        .map(|i| i as f64 / CURVE_POINTS_PER_COLUMN as f64);
    columns.filter_map(move |column| {
        let t_s = field.time_s(column);
        let sample =
            (position_m(t_s) / film.scale.m_per_px - film.streak.first_px) / film.streak.step_px;
        let drawn = t_s >= fit.t_ref_s && t_s <= fit.t_end_s && sample.is_finite();
        drawn.then(|| [column - 0.5, field.row_of(sample)])
    })
}

/// The strip at the foot: dark in the columns in which a frame lost the marker.
fn strip(field: &Field, rows: &[RecordRow]) -> Vec<u8> {
    let mut strip = vec![STRIP_FOUND; field.width];
    for row in rows.iter().filter(|row| row.status == RowStatus::Lost) {
        let left = (row.t_s - 0.5 * field.line_s - field.start_s) / field.column_s;
        let columns = span(
            left,
            left + field.line_s / field.column_s - 1.0,
            0.0,
            field.width,
        );
        strip[columns].fill(STRIP_LOST);
    }
    let gap = std::iter::repeat_n(BACKGROUND, field.width * STRIP_GAP_PX);
    let lines = (0..STRIP_PX).flat_map(|_| strip.iter().copied());
    gap.chain(lines).flatten().collect()
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
    fn a_short_streak_is_repeated_with_x_upwards() {
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
        let canvas = painted(&field, &streak(4, 2));
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
        let canvas = painted(&field, &gappy);
        let white = canvas.chunks(3).filter(|pixel| pixel[0] == 255).count();
        // Columns of 1/12 s from −0.05 s: six have their centre further than 75 ms from both 0.1 s and 0.8 s.
        assert_eq!(white, 6);
    }
}
