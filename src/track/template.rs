//! The template: what the marker looks like, and how well its look tells where it is.

use super::TrackError;
use super::align::{Aligned, Aligner};
use super::lowpass::{LOWPASS_REACH_PX, lowpass};
use super::texture::{lowpassed_noise_gain, noise};
use crate::footage::LumaView;
use crate::number::to_f64;

/// A box of whole coded pixels.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct PixelBox {
    /// Column of the top-left pixel.
    pub left: i64,
    /// Row of the top-left pixel.
    pub top: i64,
    /// Width, px.
    pub width: usize,
    /// Height, px.
    pub height: usize,
}

impl PixelBox {
    /// Centre of the box, px: between two pixels where a side is even.
    #[must_use]
    pub fn centre_px(&self) -> [f64; 2] {
        let half = |n: usize| (to_f64(n) - 1.0) / 2.0;
        [
            i64_to_f64(self.left) + half(self.width),
            i64_to_f64(self.top) + half(self.height),
        ]
    }
}

/// Least side of a box, px: below it the low-pass leaves nothing to match.
const LEAST_SIDE_PX: usize = 8;
/// Largest side of a box, px: a marker needs no more, and the time to match grows with the area.
const MOST_SIDE_PX: usize = 512;
/// Largest bound on the standard uncertainty of a shift along the motion, px: beyond it a box has no usable texture.
const TEXTURE_LIMIT_PX: f64 = 0.1;
/// The same for a steady patch: it only has to be better than the shake it takes off.
const STEADY_LIMIT_PX: f64 = 0.5;
/// Noise taken at the least when texture is judged, on the 8-bit scale: a compressed film hides its noise where nothing moves.
const LEAST_NOISE_GREY: f64 = 1.0;

/// A marker's low-passed picture, ready to be matched.
#[derive(Clone, Debug, PartialEq)]
pub struct Template {
    width: usize,
    height: usize,
    /// Low-passed luma less its mean, rounded: what the kernel multiplies.
    centred: Vec<i16>,
    centred_sum: f64,
    /// Σ(t − t̄)².
    energy: f64,
    aligner: Aligner,
}

impl Template {
    /// The template of a box in a frame.
    ///
    /// * `along`: direction of the motion in coded px, as far as it is known; texture is judged along it.
    /// * `what`: `marker` or `steady`, for messages.
    ///
    /// # Errors
    /// [`TrackError::TooSmall`], [`TrackError::TooLarge`], [`TrackError::OutsidePicture`],
    /// [`TrackError::TooLittleTexture`].
    pub fn of_box(
        luma: &LumaView<'_>,
        pixel_box: PixelBox,
        along: [f64; 2],
        what: &'static str,
        frame: usize,
    ) -> Result<Self, TrackError> {
        let PixelBox {
            left,
            top,
            width,
            height,
        } = pixel_box;
        if width < LEAST_SIDE_PX || height < LEAST_SIDE_PX {
            return Err(TrackError::TooSmall {
                what,
                width,
                height,
                least: LEAST_SIDE_PX,
            });
        }
        if width > MOST_SIDE_PX || height > MOST_SIDE_PX {
            return Err(TrackError::TooLarge {
                what,
                width,
                height,
                most: MOST_SIDE_PX,
            });
        }
        let (right, bottom) = (
            left.saturating_add(to_i64(width)),
            top.saturating_add(to_i64(height)),
        );
        if left < 0 || top < 0 || right > to_i64(luma.width()) || bottom > to_i64(luma.height()) {
            return Err(TrackError::OutsidePicture {
                what,
                left: i64_to_f64(left),
                top: i64_to_f64(top),
                width: to_f64(width),
                height: to_f64(height),
                picture_width: to_f64(luma.width()),
                picture_height: to_f64(luma.height()),
            });
        }
        let reach = to_i64(LOWPASS_REACH_PX);
        let (wide, high) = (width + 2 * LOWPASS_REACH_PX, height + 2 * LOWPASS_REACH_PX);
        let mut window = Vec::new();
        luma.window_into(left - reach, top - reach, wide, high, &mut window);
        let noise_grey = noise(&window, wide).max(LEAST_NOISE_GREY);
        let limit_px = if what == "steady" {
            STEADY_LIMIT_PX
        } else {
            TEXTURE_LIMIT_PX
        };
        let too_little = |u_px: f64| TrackError::TooLittleTexture {
            what,
            frame,
            u_px,
            limit_px,
        };
        let template = Self::from_lowpassed(lowpass(&window, wide, high), width, height)
            .ok_or_else(|| too_little(f64::INFINITY))?;
        // Noise sits in the template and in every frame: √2 of one picture's.
        let u_px = template.shift_u_px(
            noise_grey * 16.0 * std::f64::consts::SQRT_2 * lowpassed_noise_gain(),
            along,
        );
        if u_px <= limit_px {
            Ok(template)
        } else {
            Err(too_little(u_px))
        }
    }

    /// A template of low-passed luma on the 12-bit scale, row by row.
    ///
    /// Returns None where the sizes do not fit, or where the picture is plain in some direction so that a shift cannot be told.
    #[must_use]
    pub fn from_lowpassed(luma: Vec<i16>, width: usize, height: usize) -> Option<Self> {
        if luma.len() != width * height || width < 3 || height < 3 {
            return None;
        }
        let mean = luma.iter().map(|&value| f64::from(value)).sum::<f64>() / to_f64(luma.len());
        let centred: Vec<i16> = luma
            .iter()
            .map(|&value| round(f64::from(value) - mean))
            .collect();
        let energy: f64 = luma
            .iter()
            .map(|&value| (f64::from(value) - mean).powi(2))
            .sum();
        let aligner = Aligner::of(&luma, width, height)?;
        let centred_sum = centred.iter().map(|&value| f64::from(value)).sum();
        (energy > 0.0).then_some(Self {
            width,
            height,
            centred,
            centred_sum,
            energy,
            aligner,
        })
    }

    /// Width, px.
    #[must_use]
    pub fn width(&self) -> usize {
        self.width
    }

    /// Height, px.
    #[must_use]
    pub fn height(&self) -> usize {
        self.height
    }

    pub(super) fn centred(&self) -> &[i16] {
        &self.centred
    }

    pub(super) fn centred_sum(&self) -> f64 {
        self.centred_sum
    }

    /// Σ(t − t̄)², (12-bit steps)².
    #[must_use]
    pub fn energy(&self) -> f64 {
        self.energy
    }

    /// Standard uncertainty of a shift along a direction for low-passed noise of a standard deviation, px.
    fn shift_u_px(&self, noise: f64, [x, y]: [f64; 2]) -> f64 {
        let [xx, xy, yy] = self.aligner.shift_covariance();
        noise * ((x * x * xx + 2.0 * x * y * xy + y * y * yy) / (x * x + y * y)).sqrt()
    }

    /// A position as the score's peak gives it, with the covariance of what the score leaves unexplained:
    /// Σ(residual)² = (1 − r²)/r² · Σ(t − t̄)² in the template's own contrast.
    pub(super) fn unaligned(&self, corner_px: [f64; 2], score: f64) -> Aligned {
        let unexplained = (1.0 - score * score).max(0.0) / (score * score).max(1e-6);
        let variance = unexplained * self.energy / to_f64(self.width * self.height);
        let covariance_px2 = self
            .aligner
            .shift_covariance()
            .map(|entry| entry * variance);
        Aligned {
            corner_px,
            covariance_px2,
        }
    }

    /// Lays the template over a field of low-passed luma, starting at a corner near the peak; the position and its covariance.
    ///
    /// The covariance is that of [Robinson & Milanfar 2004](crate::sources::RobinsonMilanfar04) for what the template does
    /// not explain, taken as noise that the low-pass correlated. None where the alignment does not settle near the start.
    pub(super) fn align(
        &self,
        field: &[i16],
        width: usize,
        height: usize,
        start_px: [f64; 2],
    ) -> Option<Aligned> {
        self.aligner.align(field, width, height, start_px)
    }
}

#[expect(clippy::cast_precision_loss, reason = "pixel numbers")]
fn i64_to_f64(n: i64) -> f64 {
    n as f64
}

fn to_i64(n: usize) -> i64 {
    i64::try_from(n).unwrap_or(i64::MAX)
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "12-bit luma less its mean lies within ±4095"
)]
fn round(value: f64) -> i16 {
    value.round() as i16
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::track::LOWPASS_SIGMA_PX;

    fn picture(f: impl Fn(usize, usize) -> u8) -> Vec<u8> {
        (0..80 * 60).map(|at| f(at % 80, at / 80)).collect()
    }

    const BOX: PixelBox = PixelBox {
        left: 20,
        top: 15,
        width: 32,
        height: 32,
    };

    fn template_of(
        grey: &[u8],
        pixel_box: PixelBox,
        along: [f64; 2],
    ) -> Result<Template, TrackError> {
        Template::of_box(
            &LumaView::from_grey(grey, 80, 60).unwrap(),
            pixel_box,
            along,
            "marker",
            0,
        )
    }

    #[test]
    fn a_chequered_marker_is_accepted_and_a_plain_wall_is_not() {
        let chequered = picture(|x, y| if (x / 16 + y / 16) % 2 == 0 { 60 } else { 190 });
        assert!(template_of(&chequered, BOX, [1.0, 0.0]).is_ok());
        let plain = picture(|_, _| 128);
        assert!(matches!(
            template_of(&plain, BOX, [1.0, 0.0]),
            Err(TrackError::TooLittleTexture { .. })
        ));
        let noisy = picture(|x, y| 128 + u8::try_from((x * 31 + y * 57 + x * y * 13) % 7).unwrap());
        assert!(matches!(
            template_of(&noisy, BOX, [1.0, 0.0]),
            Err(TrackError::TooLittleTexture { .. })
        ));
    }

    #[test]
    fn a_stripe_along_the_motion_is_refused() {
        let stripe = picture(|_, y| if y < 31 { 60 } else { 190 });
        assert!(matches!(
            template_of(&stripe, BOX, [1.0, 0.0]),
            Err(TrackError::TooLittleTexture { .. })
        ));
    }

    #[test]
    fn boxes_that_cannot_be_are_refused_by_name() {
        let grey = picture(|x, y| u8::try_from((x * 37 + y * 91) % 256).unwrap());
        for (left, top, width, height) in [
            (-1, 0, 20, 20),
            (70, 0, 20, 20),
            (0, 50, 20, 20),
            (i64::MAX, 0, 20, 20),
        ] {
            let outside = template_of(
                &grey,
                PixelBox {
                    left,
                    top,
                    width,
                    height,
                },
                [1.0, 0.0],
            );
            assert!(
                matches!(outside, Err(TrackError::OutsidePicture { .. })),
                "{left} {top}"
            );
        }
        assert!(matches!(
            template_of(&grey, PixelBox { width: 7, ..BOX }, [1.0, 0.0]),
            Err(TrackError::TooSmall { .. })
        ));
        assert!(matches!(
            template_of(&grey, PixelBox { width: 513, ..BOX }, [1.0, 0.0]),
            Err(TrackError::TooLarge { .. })
        ));
    }

    /// The bound for a single edge, worked out by hand: a step of contrast C, low-passed by σ, has Σ g_x² = C²/(2√π σ) a row.
    #[test]
    fn the_bound_for_a_straight_edge_is_that_of_the_textbook() {
        let (width, height) = (121_usize, 41_usize);
        let contrast = 1600.0;
        let edge = |at: f64| 0.5 * (1.0 + erf(at / (LOWPASS_SIGMA_PX * std::f64::consts::SQRT_2)));
        let luma: Vec<i16> = (0..width * height)
            .map(|at| {
                let (x, y) = ((at % width) as f64 - 60.0, (at / width) as f64 - 20.0);
                round(1000.0 + contrast * edge(x) + 0.5 * contrast * edge(y))
            })
            .collect();
        let template = Template::from_lowpassed(luma, width, height).unwrap();
        let sigma = LOWPASS_SIGMA_PX;
        let root_pi = std::f64::consts::PI.sqrt();
        // Rows at the edge count less: 37 of the 39 that have gradients, (Σw)²/Σw².
        let rows = height as f64 - 4.0;
        let h = rows * contrast * contrast / (2.0 * root_pi * sigma);
        // Down the edge the noise's correlation adds up to 2 √π σ; across it the edge's own profile, met by the
        // correlation, gives E[exp(−d²/4σ²)] = 1/√2 for d of variance 2σ².
        let m = rows * 2.0 * root_pi * sigma * contrast * contrast / std::f64::consts::SQRT_2;
        let wanted = m.sqrt() / h;
        let got = template.shift_u_px(1.0, [1.0, 0.0]);
        assert!((got / wanted - 1.0).abs() < 0.08, "{got} wanted {wanted}");
    }

    /// Abramowitz & Stegun 7.1.26 (from memory), good to 1.5e-7: enough for luma in whole steps.
    fn erf(x: f64) -> f64 {
        let t = 1.0 / (1.0 + 0.327_591_1 * x.abs());
        let poly = t
            * (0.254_829_592
                + t * (-0.284_496_736
                    + t * (1.421_413_741 + t * (-1.453_152_027 + t * 1.061_405_429))));
        (1.0 - poly * (-x * x).exp()).copysign(x)
    }
}
