//! A rigid body drawn once, finely, as the sensor's pixels would integrate it, to be looked up at any sub-pixel place.
//!
//! In: a grey at every point. Out: light and coverage, averaged over the square of a pixel and blurred by the lens, on a grid of
//! [`PER_PX`] samples a pixel along and across the axis. A lookup between samples is bilinear: what it interpolates is already
//! smooth over a whole pixel, and it moves with the body, so that its error is the same at every phase of the pixel grid.

/// Samples a pixel, each way.
pub(super) const PER_PX: f64 = 8.0;

/// Light and coverage about the body's centre.
#[derive(Clone, Debug)]
pub(super) struct Sprite {
    /// (grey · coverage, coverage), row-major.
    samples: Vec<[f32; 2]>,
    n_along: usize,
    n_across: usize,
    /// Half the extent that is not empty, px.
    pub(super) half_along_px: f64,
    /// The same across the axis.
    pub(super) half_across_px: f64,
}

/// A sampling of one pixel's square: offset along and across in samples, and weight.
type Tap = (isize, isize, f32);

impl Sprite {
    /// Draws a body.
    ///
    /// * `half_px`: half its length and height. `blur_px`: standard deviation of the lens. `pixel_width_px`: width of a stored pixel
    ///   in display pixels. `angle_rad`: turn of the axis, which is the turn of the pixel's square as the body sees it.
    /// * `grey`: at (along, across) in px from the centre, None where the body is not.
    pub(super) fn new(
        half_px: [f64; 2],
        blur_px: f64,
        pixel_width_px: f64,
        angle_rad: f64,
        grey: impl Fn(f64, f64) -> Option<f64>,
    ) -> Self {
        let margin_px = 0.75 * pixel_width_px + 0.75 + 3.5 * blur_px + 2.0 / PER_PX;
        let [half_along_px, half_across_px] = half_px.map(|half| half + margin_px);
        let (centre_along, centre_across) = (samples(half_along_px), samples(half_across_px));
        let (n_along, n_across) = (2 * centre_along + 1, 2 * centre_across + 1);
        let place_px = |index: usize, centre: usize| (as_f64(index) - as_f64(centre)) / PER_PX;
        let mut raw = vec![[0.0_f32; 2]; n_along * n_across];
        for (row, line) in raw.chunks_exact_mut(n_along).enumerate() {
            for (column, sample) in line.iter_mut().enumerate() {
                if let Some(grey) =
                    grey(place_px(column, centre_along), place_px(row, centre_across))
                {
                    *sample = [to_f32(grey), 1.0];
                }
            }
        }
        let blurred = if blur_px > 0.0 {
            gaussian(&raw, n_along, n_across, blur_px * PER_PX)
        } else {
            raw
        };
        let samples = gathered(
            &blurred,
            n_along,
            n_across,
            &pixel_taps(pixel_width_px, angle_rad),
        );
        Self {
            samples,
            n_along,
            n_across,
            half_along_px,
            half_across_px,
        }
    }

    /// Light and coverage of a pixel, averaged over where the body was.
    ///
    /// * `u_px`, `v_px`: pixel's place along and across the axis. `path_px`: places of the body's centre along the axis.
    pub(super) fn seen(&self, u_px: f64, v_px: f64, path_px: &[f64]) -> [f32; 2] {
        let Some((row, below)) = split(v_px, self.n_across) else {
            return [0.0; 2];
        };
        let (upper, lower) = (
            &self.samples[row * self.n_along..],
            &self.samples[(row + 1) * self.n_along..],
        );
        let mut sum = [0.0_f32; 2];
        for place_px in path_px {
            if let Some((column, right)) = split(u_px - place_px, self.n_along) {
                let (a, b) = (upper[column], upper[column + 1]);
                let (c, d) = (lower[column], lower[column + 1]);
                for i in 0..2 {
                    let top = a[i] + right * (b[i] - a[i]);
                    let foot = c[i] + right * (d[i] - c[i]);
                    sum[i] += top + below * (foot - top);
                }
            }
        }
        #[expect(
            clippy::cast_precision_loss,
            reason = "at most some thousands of places"
        )]
        let share = 1.0 / path_px.len().max(1) as f32;
        sum.map(|total| total * share)
    }
}

/// Sample before a place and how far beyond it the place lies; None outside the grid.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "checked to lie inside the grid"
)]
fn split(px: f64, n: usize) -> Option<(usize, f32)> {
    let place = px * PER_PX + as_f64(n / 2);
    if place >= 0.0 && place < as_f64(n - 1) {
        let before = place as usize;
        Some((before, to_f32(place - as_f64(before))))
    } else {
        None
    }
}

/// The square of a pixel on the sample grid, each sample weighted by the part of its cell that lies inside.
fn pixel_taps(width_px: f64, angle_rad: f64) -> Vec<Tap> {
    /// Points that decide how much of a cell lies inside, each way. Even, so that none lies on the edge of an upright pixel.
    const POINTS: i32 = 8;
    let (sin, cos) = angle_rad.sin_cos();
    let reach = (0.75 * (width_px + 1.0) * PER_PX).ceil();
    #[expect(clippy::cast_possible_truncation, reason = "a few pixels")]
    let reach = reach as i32;
    let inside = |along: f64, across: f64| {
        let (x, y) = (along * cos - across * sin, along * sin + across * cos);
        x.abs() <= 0.5 * width_px * PER_PX && y.abs() <= 0.5 * PER_PX
    };
    let mut taps: Vec<Tap> = Vec::new();
    for across in -reach..=reach {
        for along in -reach..=reach {
            let sub = |cell: i32, point: i32| {
                f64::from(cell) + (f64::from(point) + 0.5) / f64::from(POINTS) - 0.5
            };
            let hits = (0..POINTS * POINTS)
                .filter(|p| inside(sub(along, p % POINTS), sub(across, p / POINTS)))
                .count();
            if hits > 0 {
                taps.push((along as isize, across as isize, to_f32(as_f64(hits))));
            }
        }
    }
    let total: f32 = taps.iter().map(|tap| tap.2).sum();
    taps.iter_mut().for_each(|tap| tap.2 /= total);
    taps
}

/// Every sample becomes the weighted sum of its neighbours; beyond the grid there is nothing.
fn gathered(from: &[[f32; 2]], n_along: usize, n_across: usize, taps: &[Tap]) -> Vec<[f32; 2]> {
    let mut to = vec![[0.0_f32; 2]; from.len()];
    for (row, line) in to.chunks_exact_mut(n_along).enumerate() {
        for &(along, across, weight) in taps {
            let Some(source_row) = row
                .checked_add_signed(across)
                .filter(|source| *source < n_across)
            else {
                continue;
            };
            let source = &from[source_row * n_along..(source_row + 1) * n_along];
            let first = usize::try_from(-along).unwrap_or(0);
            let last = n_along - usize::try_from(along).unwrap_or(0);
            let shifted = &source[first.saturating_add_signed(along)..];
            for (sample, neighbour) in line[first..last].iter_mut().zip(shifted) {
                sample[0] += weight * neighbour[0];
                sample[1] += weight * neighbour[1];
            }
        }
    }
    to
}

/// Blur by a normal distribution, one way and then the other.
fn gaussian(from: &[[f32; 2]], n_along: usize, n_across: usize, sigma: f64) -> Vec<[f32; 2]> {
    let kernel = normal_weights(sigma);
    #[expect(clippy::cast_possible_wrap, reason = "a few dozen taps")]
    let offset = |index: usize| index as isize - (kernel.len() / 2) as isize;
    let along: Vec<Tap> = kernel
        .iter()
        .enumerate()
        .map(|(i, weight)| (offset(i), 0, *weight))
        .collect();
    let across: Vec<Tap> = kernel
        .iter()
        .enumerate()
        .map(|(i, weight)| (0, offset(i), *weight))
        .collect();
    gathered(
        &gathered(from, n_along, n_across, &along),
        n_along,
        n_across,
        &across,
    )
}

/// Weights of a normal distribution on whole numbers, cut at 3.5 standard deviations; their sum is 1.
pub(super) fn normal_weights(sigma: f64) -> Vec<f32> {
    let reach = samples_of(3.5 * sigma);
    let raw: Vec<f64> = (0..=2 * reach)
        .map(|i| (-0.5 * ((as_f64(i) - as_f64(reach)) / sigma).powi(2)).exp())
        .collect();
    let total: f64 = raw.iter().sum();
    raw.iter().map(|weight| to_f32(weight / total)).collect()
}

fn samples(px: f64) -> usize {
    samples_of(px * PER_PX)
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "extents of a picture, not negative"
)]
fn samples_of(extent: f64) -> usize {
    extent.ceil() as usize
}

#[expect(clippy::cast_precision_loss, reason = "places on a sample grid")]
fn as_f64(count: usize) -> f64 {
    count as f64
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "greys and weights: f32 inside pixel kernels"
)]
fn to_f32(number: f64) -> f32 {
    number as f32
}
