//! The streak: one line of every frame along the motion axis.

use crate::footage::LumaView;
use crate::number::{byte, to_f64};

/// Largest number of samples kept of a frame.
const MOST_SAMPLES: usize = 1024;

/// Lines of luma gathered while the film runs past, one a frame.
///
/// Every line runs through the marker of its own frame, so that the axis need not be known before the film has been
/// seen; positions along it are counted from a common origin.
#[derive(Clone, Debug, PartialEq)]
pub struct StreakLines {
    /// Samples a line.
    pub width: usize,
    /// Distance of neighbouring samples, coded px along the direction.
    pub step_px: f64,
    /// Position of sample 0, coded px from the origin along the direction.
    pub first_px: f64,
    /// Point from which positions are counted, coded px.
    pub origin_px: [f64; 2],
    /// Unit vector along the lines, coded px.
    pub direction: [f64; 2],
    /// Lines in order of frames; a frame not yet seen is None.
    pub lines: Vec<Option<Vec<u8>>>,
}

impl StreakLines {
    /// Lines along `direction` (any length) through a picture of `width` × `height` px, counted from `origin_px`.
    #[must_use]
    pub fn new(origin_px: [f64; 2], direction: [f64; 2], width: usize, height: usize) -> Self {
        let length = direction[0].hypot(direction[1]);
        let direction = if length > 0.0 {
            [direction[0] / length, direction[1] / length]
        } else {
            [1.0, 0.0]
        };
        let (first, last) = inside(
            origin_px,
            direction,
            [to_f64(width) - 1.0, to_f64(height) - 1.0],
        );
        let step_px = ((last - first) / to_f64(MOST_SAMPLES - 1)).max(1.0);
        let width = whole((last - first) / step_px) + 1;
        Self {
            width,
            step_px,
            first_px: first,
            origin_px,
            direction,
            lines: Vec::new(),
        }
    }

    /// Keeps the line of a frame that runs through `p_px`.
    pub fn keep(&mut self, frame: usize, luma: &LumaView<'_>, p_px: [f64; 2]) {
        let [dx, dy] = self.direction;
        let along = (p_px[0] - self.origin_px[0]) * dx + (p_px[1] - self.origin_px[1]) * dy;
        let line = (0..self.width)
            .map(|at| {
                let distance = self.first_px + self.step_px * to_f64(at) - along;
                let value = luma.sample([p_px[0] + distance * dx, p_px[1] + distance * dy]);
                byte(value)
            })
            .collect();
        if self.lines.len() <= frame {
            self.lines.resize(frame + 1, None);
        }
        self.lines[frame] = Some(line);
    }
}

/// Where a line through `p` enters and leaves the picture, as distances along `d`.
fn inside(p: [f64; 2], d: [f64; 2], most: [f64; 2]) -> (f64, f64) {
    let (mut first, mut last) = (f64::NEG_INFINITY, f64::INFINITY);
    for axis in [0, 1] {
        if d[axis].abs() > 1e-9 {
            let (a, b) = (-p[axis] / d[axis], (most[axis] - p[axis]) / d[axis]);
            first = first.max(a.min(b));
            last = last.min(a.max(b));
        }
    }
    if first < last {
        (first, last)
    } else {
        (0.0, 0.0)
    }
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "not negative, at most MOST_SAMPLES"
)]
fn whole(value: f64) -> usize {
    value.floor().max(0.0) as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_line_along_a_row_is_that_row_whatever_the_marker_does_along_it() {
        let grey: Vec<u8> = (0..200).map(|at: u8| at).collect();
        let view = LumaView::from_grey(&grey, 20, 10).unwrap();
        let mut streak = StreakLines::new([7.0, 4.0], [2.0, 0.0], 20, 10);
        assert_eq!(streak.width, 20);
        streak.keep(1, &view, [15.0, 3.0]);
        assert_eq!(streak.lines[0], None);
        assert_eq!(streak.lines[1].as_deref().unwrap(), &grey[60..80]);
    }

    #[test]
    fn a_slanted_line_stays_inside_and_a_wide_picture_is_sampled_coarsely() {
        let streak = StreakLines::new([1000.0, 500.0], [1.0, 1.0], 3840, 2160);
        assert!(streak.width <= 1024 && streak.step_px > 1.0);
        let end = streak.first_px + streak.step_px * (streak.width - 1) as f64;
        for distance in [streak.first_px, end] {
            let p = [
                1000.0 + distance * streak.direction[0],
                500.0 + distance * streak.direction[1],
            ];
            assert!(
                p[0] > -1.0 && p[0] < 3840.0 && p[1] > -1.0 && p[1] < 2160.0,
                "{p:?}"
            );
        }
    }
}
