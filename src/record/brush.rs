//! An anti-aliased line over a colour picture, half transparent.

use std::ops::Range;

/// The line's colour: lighter than the accent of the page, because it must stand out from black, grey and white alike.
const COLOUR: [u8; 3] = [255, 92, 20];
/// Half the line's width, px.
const HALF_WIDTH_PX: f64 = 0.8;
/// How much of the colour covers the picture: what lies beneath must stay visible.
const OPACITY: f64 = 0.72;

/// The share of each pixel that the line covers, 0…1, row by row.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Brush {
    width: usize,
    height: usize,
    coverage: Vec<f64>,
}

impl Brush {
    /// A brush for a picture of a size in px, with nothing painted yet.
    pub(super) fn new(width: usize, height: usize) -> Self {
        Self {
            width,
            height,
            coverage: vec![0.0; width * height],
        }
    }

    /// A line from point to point; a point is a column and a row, whole numbers being pixel centres.
    ///
    /// Where the line crosses itself it covers no more than where it does not: the largest share counts.
    pub(super) fn line(&mut self, points: impl Iterator<Item = [f64; 2]>) {
        let mut last = None;
        for point in points {
            if let Some(last) = last {
                self.segment(last, point);
            }
            last = Some(point);
        }
    }

    /// Coverage 1 inside the line, falling to 0 over one pixel at its edge.
    fn segment(&mut self, from: [f64; 2], to: [f64; 2]) {
        let reach = HALF_WIDTH_PX + 1.0;
        let columns = span(from[0], to[0], reach, self.width);
        for row in span(from[1], to[1], reach, self.height) {
            for column in columns.clone() {
                let distance = distance_to_segment([column as f64, row as f64], from, to);
                let share = (HALF_WIDTH_PX + 0.5 - distance).clamp(0.0, 1.0);
                let cell = &mut self.coverage[row * self.width + column];
                *cell = cell.max(share);
            }
        }
    }

    /// Mixes the line into a picture of the brush's size, three bytes a pixel.
    pub(super) fn lay_over(&self, rgb: &mut [u8]) {
        for (pixel, share) in rgb.chunks_exact_mut(3).zip(&self.coverage) {
            let weight = share * OPACITY;
            for (channel, colour) in pixel.iter_mut().zip(COLOUR) {
                *channel = byte(f64::from(*channel) * (1.0 - weight) + f64::from(colour) * weight);
            }
        }
    }
}

/// Whole pixels from `reach` before the smaller to `reach` beyond the larger of two places, inside 0…n.
pub(super) fn span(a: f64, b: f64, reach: f64, n: usize) -> Range<usize> {
    let start = whole((a.min(b) - reach).floor(), n);
    start..whole((a.max(b) + reach).ceil() + 1.0, n).max(start)
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "clamped to 0…n on the same line"
)]
fn whole(place: f64, n: usize) -> usize {
    place.clamp(0.0, n as f64) as usize
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "clamped to 0…255 on the same line"
)]
fn byte(value: f64) -> u8 {
    value.round().clamp(0.0, 255.0) as u8
}

fn distance_to_segment(p: [f64; 2], a: [f64; 2], b: [f64; 2]) -> f64 {
    let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
    let length2 = dx * dx + dy * dy;
    // A segment of no length is its end.
    let along = if length2 > 0.0 {
        (((p[0] - a[0]) * dx + (p[1] - a[1]) * dy) / length2).clamp(0.0, 1.0)
    } else {
        0.0
    };
    (p[0] - a[0] - along * dx).hypot(p[1] - a[1] - along * dy)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_level_line_covers_its_row_whole_and_its_neighbours_in_part() {
        let mut brush = Brush::new(5, 5);
        brush.line([[-3.0, 2.0], [9.0, 2.0]].into_iter());
        let column: Vec<f64> = (0..5).map(|row| brush.coverage[row * 5 + 2]).collect();
        for (got, wanted) in column.iter().zip([0.0, 0.3, 1.0, 0.3, 0.0]) {
            assert!((got - wanted).abs() < 1e-12, "{column:?}");
        }
    }

    #[test]
    fn a_line_far_outside_paints_nothing() {
        let mut brush = Brush::new(3, 3);
        brush.line([[1e9, -1e9], [1e9, 1e9]].into_iter());
        let mut rgb = vec![7; 27];
        brush.lay_over(&mut rgb);
        assert_eq!(rgb, vec![7; 27]);
    }
}
