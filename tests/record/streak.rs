//! The streak picture: the curve lies on the track, and lost frames are marked where they are.

use ebbmark::measurement::{Measurement, RowStatus};
use ebbmark::record::streak_png;
use image::RgbImage;

use crate::record::double::Double;

const N_FRAMES: usize = 600;
/// 600 lines of 420 samples: two columns a line, one row a sample, as the picture may be 1600 × 720 at most.
const COLUMNS_PER_LINE: usize = 2;

fn picture(measurement: &Measurement) -> RgbImage {
    let png = streak_png(measurement).unwrap().unwrap();
    image::load_from_memory_with_format(&png, image::ImageFormat::Png)
        .unwrap()
        .into_rgb8()
}

/// The left one of a line's two columns.
fn column_of(frame: usize) -> u32 {
    u32::try_from(frame * COLUMNS_PER_LINE).unwrap()
}

/// The row in which a position lies: x grows upwards, sample 0 is the lowest row.
fn row_of(measurement: &Measurement, x_m: f64) -> f64 {
    let film = measurement.film.as_ref().unwrap();
    let sample = (x_m / film.scale.m_per_px - film.streak.first_px) / film.streak.step_px;
    (film.streak.width - 1) as f64 - sample
}

/// Mean row of the pixels that are more red than blue: the curve.
fn curve_row(picture: &RgbImage, column: u32, n_rows: u32) -> Option<f64> {
    let coloured = (0..n_rows).map(|row| (f64::from(row), picture.get_pixel(column, row).0));
    let weights: Vec<(f64, f64)> = coloured
        .map(|(row, [r, _, b])| (row, f64::from(r) - f64::from(b)))
        .collect();
    let total: f64 = weights.iter().map(|(_, w)| w).sum();
    (total > 0.0).then(|| weights.iter().map(|(row, w)| row * w).sum::<f64>() / total)
}

#[test]
fn the_curve_lies_on_the_fitted_position() {
    let measurement = Double::film(N_FRAMES).build();
    let picture = picture(&measurement);
    assert_eq!(picture.dimensions(), (1200, 420 + 11));
    for frame in (40..N_FRAMES - 10).step_by(37) {
        // The boundary of the line's two columns shows its own time: the curve there is the mean of both columns.
        let left = column_of(frame);
        let got = [left, left + 1].map(|column| curve_row(&picture, column, 420).unwrap());
        let wanted = row_of(
            &measurement,
            measurement.fit.position_m(measurement.rows[frame].t_s),
        );
        let got = 0.5 * (got[0] + got[1]);
        assert!(
            (got - wanted).abs() < 0.6,
            "frame {frame}: wanted row {wanted}, got {got}"
        );
    }
}

#[test]
fn the_track_lies_where_the_marker_was() {
    let mut measurement = Double::film(N_FRAMES).build();
    // A fit that begins after the film's end draws no curve over the track.
    measurement.fit.t_ref_s = 1e6;
    let picture = picture(&measurement);
    for (frame, row) in measurement
        .rows
        .iter()
        .enumerate()
        .step_by(41)
        .filter(|(_, row)| row.status == RowStatus::Used)
    {
        let brightest = (0..420u32)
            .max_by_key(|&y| picture.get_pixel(column_of(frame), y)[0])
            .unwrap();
        let wanted = row_of(&measurement, row.x_m.unwrap());
        assert!(
            (f64::from(brightest) - wanted).abs() < 3.0,
            "frame {frame}: wanted row {wanted}, got {brightest}"
        );
    }
}

#[test]
fn lost_frames_are_dark_in_the_strip_and_nowhere_else() {
    let measurement = Double::film(N_FRAMES).build();
    let picture = picture(&measurement);
    let dark: Vec<u32> = (0..1200)
        .filter(|&column| picture.get_pixel(column, 430)[0] < 128)
        .collect();
    let (first, last) = (
        dark[0] as usize / COLUMNS_PER_LINE,
        dark[dark.len() - 1] as usize / COLUMNS_PER_LINE,
    );
    assert!(
        first.abs_diff(140) <= 1 && last.abs_diff(148) <= 1,
        "lines {first} to {last}"
    );
}

#[test]
fn a_long_film_is_averaged_into_a_wide_screen() {
    assert_eq!(
        picture(&Double::film(3600).build()).dimensions(),
        (1600, 431)
    );
    assert!(streak_png(&Double::table(300).build()).unwrap().is_none());
}

#[test]
fn where_cycles_run_together_the_amplitude_is_drawn_and_the_middle_left_free() {
    // 275 cycles in 1600 columns: a curve would cover everything between its turning points.
    let measurement = Double::film(20_000).build();
    let picture = picture(&measurement);
    let column = 100;
    let coloured = |row: u32| {
        let [r, _, b] = picture.get_pixel(column, row).0;
        r > b.saturating_add(20)
    };
    let rows: Vec<u32> = (0..420).filter(|&row| coloured(row)).collect();
    let t_s = (f64::from(column) + 0.5) * 20_000.0 / 60.0 / 1600.0;
    for side in [-1.0, 1.0] {
        let wanted = row_of(
            &measurement,
            measurement.fit.centre_m + side * measurement.fit.envelope_m(t_s),
        );
        assert!(
            rows.iter()
                .any(|&row| (f64::from(row) - wanted).abs() < 1.5),
            "wanted row {wanted}, got {rows:?}"
        );
    }
    assert!(rows.len() < 12, "two thin lines, got {rows:?}");
}
