//! Laying the template over a window to a thousandth of a pixel.
//!
//! In: low-passed luma around a peak of the correlation. Out: the shift, with gain and offset of the light solved for on
//! the way, and what is left unexplained. Method: inverse-compositional Gauss–Newton for a pure shift
//! ([Baker & Matthews 2004](crate::sources::BakerMatthews04)), the light as in [Pan et al. 2013](crate::sources::Pan13).
//!
//! Pixels count less at the edge of the box: there the low-pass mixes in the surround, which need not move with the
//! marker. On a bare marker before a textured wall that brings 0.040 px rms down to 0.020 px; on a marker whose surround
//! does move with it, it costs a tenth of the precision.

use super::texture::spread;
use crate::number::to_f64;
use nalgebra::{Matrix4, Vector4};

/// Way over which the weight rises from 0 at the edge to 1, px: the reach of the low-pass, 1.6 standard deviations of it.
const RISE_PX: f64 = 2.5;
/// Least noise taken in a window, 12-bit steps: half a grey level before the low-pass. The start frame matches itself without rest, and is no better
/// known than others for that.
const LEAST_NOISE: f64 = 1.4;
/// A step below this ends the iteration, px: a tenth of the best sightings' uncertainty.
const SETTLED_PX: f64 = 5e-4;
/// Steps at the most; three are usual.
const MOST_STEPS: usize = 12;
/// Farthest from the correlation's peak, px: beyond it another peak was climbed.
const FARTHEST_PX: f64 = 1.5;
/// Smallest eigenvalue over the largest, of the scaled normal matrix, that tells a shift in every direction.
const LEAST_CONDITION: f64 = 1e-6;

/// What a template needs to be aligned, worked out once.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Aligner {
    /// Size of the inner part that takes part: a pixel is lost on every side to the gradients.
    width: usize,
    height: usize,
    /// For each pixel: weight times template, one, gradient right, gradient down.
    weighted: Vec<[f64; 4]>,
    /// The same without the weight.
    plain: Vec<[f64; 4]>,
    inverse: Matrix4<f64>,
    weight_sum: f64,
    /// Covariance of a shift (xx, xy, yy) for low-passed noise of unit variance, px² per (12-bit step)².
    shift_covariance: [f64; 3],
}

/// Where the template lies.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Aligned {
    /// Corner of the box in the field, px.
    pub(super) corner_px: [f64; 2],
    /// Covariance of the corner (xx, xy, yy), px².
    pub(super) covariance_px2: [f64; 3],
}

impl Aligner {
    /// The aligner of low-passed luma, row by row; None where a shift cannot be told in every direction.
    pub(super) fn of(luma: &[i16], width: usize, height: usize) -> Option<Self> {
        let value = |x: usize, y: usize| f64::from(luma[y * width + x]);
        let (inner_width, inner_height) = (width.checked_sub(2)?, height.checked_sub(2)?);
        let (across, down) = (rise(inner_width), rise(inner_height));
        let mean = luma.iter().map(|&value| f64::from(value)).sum::<f64>() / to_f64(luma.len());
        let (mut plain, mut weighted) = (Vec::new(), Vec::new());
        let mut normal = Matrix4::zeros();
        let mut weight_sum = 0.0;
        for y in 1..=inner_height {
            for x in 1..=inner_width {
                let right = (value(x + 1, y) - value(x - 1, y)) / 2.0;
                let below = (value(x, y + 1) - value(x, y - 1)) / 2.0;
                let columns = Vector4::new(value(x, y) - mean, 1.0, right, below);
                let weight = across[x - 1] * down[y - 1];
                normal += weight * columns * columns.transpose();
                weight_sum += weight;
                plain.push(columns.into());
                weighted.push((weight * columns).into());
            }
        }
        let inverse = inverse(&normal)?;
        let shift_covariance = shift_covariance(&weighted, inner_width, &inverse);
        Some(Self {
            width: inner_width,
            height: inner_height,
            weighted,
            plain,
            inverse,
            weight_sum,
            shift_covariance,
        })
    }

    /// Covariance of a shift (xx, xy, yy) for low-passed noise of unit variance, px² per (12-bit step)².
    pub(super) fn shift_covariance(&self) -> [f64; 3] {
        self.shift_covariance
    }

    /// Aligns with a field of low-passed luma, starting at a corner; None where it leaves the field, or another peak is climbed.
    pub(super) fn align(
        &self,
        field: &[i16],
        width: usize,
        height: usize,
        start_px: [f64; 2],
    ) -> Option<Aligned> {
        let mut corner_px = start_px;
        let mut shifted = Vec::new();
        for _ in 0..MOST_STEPS {
            // The inner part begins one pixel in.
            interpolate(
                field,
                width,
                height,
                [corner_px[0] + 1.0, corner_px[1] + 1.0],
                self.width,
                self.height,
                &mut shifted,
            )?;
            let mut moments = Vector4::zeros();
            for (value, columns) in shifted.iter().zip(&self.weighted) {
                moments += *value * Vector4::from(*columns);
            }
            let fitted = self.inverse * moments;
            let gain = fitted[0];
            if gain <= 0.0 {
                return None;
            }
            // F ≈ gain·T(x + δ) + offset with δ = fitted shift / gain; the box moves the other way.
            let step = [fitted[2] / gain, fitted[3] / gain];
            corner_px = [corner_px[0] - step[0], corner_px[1] - step[1]];
            let strayed = (corner_px[0] - start_px[0]).hypot(corner_px[1] - start_px[1]);
            if strayed.is_nan() || strayed > FARTHEST_PX {
                return None;
            }
            if step[0].hypot(step[1]) < SETTLED_PX {
                let noise2 = self
                    .unexplained(&shifted, &fitted)
                    .max(LEAST_NOISE * LEAST_NOISE)
                    / (gain * gain);
                return Some(Aligned {
                    corner_px,
                    covariance_px2: self.shift_covariance.map(|entry| entry * noise2),
                });
            }
        }
        None
    }

    /// Weighted mean square of what the fitted template does not explain, (12-bit steps)².
    fn unexplained(&self, shifted: &[f64], fitted: &Vector4<f64>) -> f64 {
        let mut sum = 0.0;
        for ((value, plain), weighted) in shifted.iter().zip(&self.plain).zip(&self.weighted) {
            let rest = value - fitted.dot(&Vector4::from(*plain));
            // The second column is one: its weighted form is the weight.
            sum += weighted[1] * rest * rest;
        }
        sum / self.weight_sum
    }
}

/// Weights that rise from near 0 at both ends to 1 inside, along a smooth half wave.
fn rise(n: usize) -> Vec<f64> {
    let reach = RISE_PX.min(to_f64(n) / 2.0);
    (0..n)
        .map(|at| {
            let from_edge = to_f64(at.min(n - 1 - at)) + 0.5;
            let share = (from_edge / reach).min(1.0);
            (0.5 * std::f64::consts::PI * share).sin().powi(2)
        })
        .collect()
}

/// Inverse of the normal matrix, scaled to unit diagonal; None where it is as good as singular.
fn inverse(normal: &Matrix4<f64>) -> Option<Matrix4<f64>> {
    let scale = Vector4::from_fn(|row, _| normal[(row, row)].sqrt().recip());
    if scale.iter().any(|scale| !scale.is_finite()) {
        return None;
    }
    let scaled = Matrix4::from_diagonal(&scale) * normal * Matrix4::from_diagonal(&scale);
    let eigenvalues = scaled.symmetric_eigenvalues();
    if eigenvalues.min() < LEAST_CONDITION * eigenvalues.max() {
        return None;
    }
    Some(Matrix4::from_diagonal(&scale) * scaled.try_inverse()? * Matrix4::from_diagonal(&scale))
}

/// Shift block of N⁻¹ (Cᵀ W R W C) N⁻¹, R the correlation that the low-pass leaves in white noise.
fn shift_covariance(weighted: &[[f64; 4]], width: usize, inverse: &Matrix4<f64>) -> [f64; 3] {
    let plane = |column: usize| {
        weighted
            .iter()
            .map(|columns| columns[column])
            .collect::<Vec<f64>>()
    };
    let planes: Vec<Vec<f64>> = (0..4).map(plane).collect();
    let spreads: Vec<Vec<f64>> = planes.iter().map(|plane| spread(plane, width)).collect();
    let middle = Matrix4::from_fn(|row, column| {
        planes[row]
            .iter()
            .zip(&spreads[column])
            .map(|(a, b)| a * b)
            .sum::<f64>()
    });
    let covariance = inverse * middle * inverse;
    [covariance[(2, 2)], covariance[(2, 3)], covariance[(3, 3)]]
}

/// The field between pixels by cubic convolution (Keys 1981, a = −½), `width` × `height` values from a corner on.
///
/// None where a value would need pixels outside the field.
fn interpolate(
    field: &[i16],
    field_width: usize,
    field_height: usize,
    corner_px: [f64; 2],
    width: usize,
    height: usize,
    out: &mut Vec<f64>,
) -> Option<()> {
    let (left, across) = taps(corner_px[0], width, field_width)?;
    let (top, down) = taps(corner_px[1], height, field_height)?;
    let mut rows = Vec::with_capacity(width * (height + 3));
    for y in top..top + height + 3 {
        let row = &field[y * field_width + left..y * field_width + left + width + 3];
        rows.extend(row.windows(4).map(|four| {
            four.iter()
                .zip(across)
                .map(|(&value, tap)| f64::from(value) * tap)
                .sum::<f64>()
        }));
    }
    out.clear();
    for y in 0..height {
        let four: [&[f64]; 4] =
            std::array::from_fn(|tap| &rows[(y + tap) * width..(y + tap + 1) * width]);
        out.extend((0..width).map(|x| {
            four.iter()
                .zip(down)
                .map(|(row, tap)| row[x] * tap)
                .sum::<f64>()
        }));
    }
    Some(())
}

/// First pixel and the four taps for positions `corner`, `corner` + 1, … (`n` of them) on a line of `length` pixels.
fn taps(corner: f64, n: usize, length: usize) -> Option<(usize, [f64; 4])> {
    let whole = corner.floor();
    if whole.is_nan() || whole < 1.0 || whole + to_f64(n) + 2.0 > to_f64(length) {
        return None;
    }
    let t = corner - whole;
    let taps = [
        ((-0.5 * t + 1.0) * t - 0.5) * t,
        (1.5 * t - 2.5) * t * t + 1.0,
        ((-1.5 * t + 2.0) * t + 0.5) * t,
        (0.5 * t - 0.5) * t * t,
    ];
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "checked above to lie on the line"
    )]
    let first = whole as usize - 1;
    Some((first, taps))
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    /// A smooth pattern that holds no frequency the low-pass would not pass.
    fn scene(x: f64, y: f64) -> f64 {
        2000.0 + 700.0 * (0.31 * x).sin() * (0.27 * y).cos() + 400.0 * (0.17 * x + 0.23 * y).sin()
    }

    #[expect(
        clippy::cast_possible_truncation,
        reason = "the scene's luma lies within 12 bits"
    )]
    fn window(width: usize, height: usize, f: impl Fn(f64, f64) -> f64) -> Vec<i16> {
        (0..width * height)
            .map(|at| f((at % width) as f64, (at / width) as f64).round() as i16)
            .collect()
    }

    proptest! {
        #[test]
        fn a_planted_shift_is_found_whatever_the_light(x in -0.6_f64..0.6, y in -0.6_f64..0.6, gain in 0.4_f64..1.6, offset in -300.0_f64..300.0) {
            let aligner = Aligner::of(&window(30, 26, scene), 30, 26).unwrap();
            let field = window(42, 38, |u, v| gain * scene(u - 6.0 - x, v - 6.0 - y) + offset);
            let found = aligner.align(&field, 42, 38, [6.0, 6.0]).unwrap();
            let off = [found.corner_px[0] - 6.0 - x, found.corner_px[1] - 6.0 - y];
            // Rounding to whole steps is the only noise, 0.29 of one in the field and in the template; six standard deviations.
            let noise = 0.29 * (1.0 + 1.0 / (gain * gain)).sqrt();
            let cov = aligner.shift_covariance();
            let limit = [cov[0], cov[2]].map(|variance| 6.0 * noise * variance.sqrt());
            prop_assert!(off[0].abs() < limit[0] && off[1].abs() < limit[1], "{off:?}, limit {limit:?}");
        }
    }

    #[test]
    fn the_template_lies_exactly_on_itself() {
        let field = window(40, 40, scene);
        let cut: Vec<i16> = (0..20 * 24)
            .map(|at| field[(at / 20 + 8) * 40 + at % 20 + 10])
            .collect();
        let aligner = Aligner::of(&cut, 20, 24).unwrap();
        let found = aligner.align(&field, 40, 40, [10.3, 7.8]).unwrap();
        assert!(
            (found.corner_px[0] - 10.0).abs() < 1e-5 && (found.corner_px[1] - 8.0).abs() < 1e-5,
            "{found:?}"
        );
        let floor = LEAST_NOISE * LEAST_NOISE;
        assert!(
            (found.covariance_px2[0] / (floor * aligner.shift_covariance()[0]) - 1.0).abs() < 1e-3
        );
    }

    #[test]
    fn stripes_and_plain_boxes_have_no_aligner() {
        assert!(Aligner::of(&window(20, 20, |_, y| 1000.0 + 50.0 * y), 20, 20).is_none());
        assert!(Aligner::of(&window(20, 20, |_, _| 1000.0), 20, 20).is_none());
        assert!(Aligner::of(&[], 0, 0).is_none());
    }

    #[test]
    fn a_box_that_leaves_the_field_is_none() {
        let aligner = Aligner::of(&window(20, 20, scene), 20, 20).unwrap();
        let field = window(21, 21, scene);
        assert!(aligner.align(&field, 21, 21, [1.6, 0.0]).is_none());
        assert!(aligner.align(&field, 21, 21, [f64::NAN, 0.0]).is_none());
    }
}
