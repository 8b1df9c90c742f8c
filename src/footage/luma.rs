//! Luma, borrowed from the decoder: no colour conversion and no copy of a whole picture.

use crate::number::to_f64;

/// How a sample is stored.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) enum Sample {
    /// One byte.
    Eight,
    /// Two bytes, little-endian: `(word >> shift)` has `depth` bits.
    Sixteen {
        /// Unused low bits.
        shift: u32,
        /// Bits of the sample, 9…16.
        depth: u32,
    },
}

/// A picture's luma: rows of samples in coded pixels, as the decoder left them.
///
/// Values are given on a 12-bit scale (an 8-bit 255 reads 4080) by [`window_into`](Self::window_into), so that every
/// bit depth meets the matcher in the same integer arithmetic, and on the 8-bit scale by the other readers.
#[derive(Clone, Copy, Debug)]
pub struct LumaView<'a> {
    data: &'a [u8],
    stride: usize,
    width: usize,
    height: usize,
    sample: Sample,
}

impl<'a> LumaView<'a> {
    /// A view of `height` rows of `stride` bytes; `None` where the bytes do not hold that many.
    pub(super) fn new(
        data: &'a [u8],
        stride: usize,
        width: usize,
        height: usize,
        sample: Sample,
    ) -> Option<Self> {
        let row_bytes = match sample {
            Sample::Eight => width,
            Sample::Sixteen { .. } => width.checked_mul(2)?,
        };
        let needed = stride
            .checked_mul(height.checked_sub(1)?)?
            .checked_add(row_bytes)?;
        (width > 0 && row_bytes <= stride && needed <= data.len()).then_some(Self {
            data,
            stride,
            width,
            height,
            sample,
        })
    }

    /// A view of 8-bit rows without padding; `None` where `data` is not `width` × `height` bytes.
    #[must_use]
    pub fn from_grey(data: &'a [u8], width: usize, height: usize) -> Option<Self> {
        (data.len() == width.checked_mul(height)?)
            .then(|| Self::new(data, width, width, height, Sample::Eight))?
    }

    /// Width, coded px.
    #[must_use]
    pub fn width(&self) -> usize {
        self.width
    }

    /// Height, coded px.
    #[must_use]
    pub fn height(&self) -> usize {
        self.height
    }

    /// A copy that outlives the decoder's frame.
    #[must_use]
    pub fn to_copy(&self) -> LumaCopy {
        LumaCopy {
            data: self.data.to_vec(),
            stride: self.stride,
            width: self.width,
            height: self.height,
            sample: self.sample,
        }
    }

    /// Luma of one pixel on the 12-bit scale; the pixel must lie in the picture.
    fn at(&self, x: usize, y: usize) -> i16 {
        debug_assert!(x < self.width && y < self.height);
        match self.sample {
            Sample::Eight => i16::from(self.data[y * self.stride + x]) << 4,
            Sample::Sixteen { shift, depth } => {
                let at = y * self.stride + 2 * x;
                twelve_bits(
                    u16::from_le_bytes([self.data[at], self.data[at + 1]]) >> shift,
                    depth,
                )
            }
        }
    }

    /// Copies the window whose top-left pixel is (`left`, `top`) into `out`, row by row, on the 12-bit scale.
    ///
    /// * `out` is resized to `width` × `height`. Pixels outside the picture repeat its nearest edge.
    pub fn window_into(
        &self,
        left: i64,
        top: i64,
        width: usize,
        height: usize,
        out: &mut Vec<i16>,
    ) {
        out.clear();
        out.reserve(width * height);
        for row in 0..height {
            let y = clamp(top, row, self.height);
            let inside = usize::try_from(left)
                .ok()
                .filter(|left| left + width <= self.width);
            match (self.sample, inside) {
                // The common case, kept apart because it is the only one the compiler turns into wide moves.
                (Sample::Eight, Some(left)) => {
                    let start = y * self.stride + left;
                    out.extend(
                        self.data[start..start + width]
                            .iter()
                            .map(|&value| i16::from(value) << 4),
                    );
                }
                _ => {
                    out.extend((0..width).map(|column| self.at(clamp(left, column, self.width), y)))
                }
            }
        }
    }

    /// Luma at a position between pixels, bilinear, on the 8-bit scale; positions outside repeat the nearest edge.
    #[must_use]
    pub fn sample(&self, p_px: [f64; 2]) -> f32 {
        let max_x = to_f64(self.width - 1);
        let max_y = to_f64(self.height - 1);
        // NaN clamps to NaN; `max` brings it to 0 so that no position can leave the picture.
        let x = p_px[0].clamp(0.0, max_x).max(0.0);
        let y = p_px[1].clamp(0.0, max_y).max(0.0);
        let (x0, y0) = (floor_index(x), floor_index(y));
        let (x1, y1) = ((x0 + 1).min(self.width - 1), (y0 + 1).min(self.height - 1));
        let (fx, fy) = (x - to_f64(x0), y - to_f64(y0));
        let value = |x, y| f64::from(self.at(x, y)) / 16.0;
        let above = value(x0, y0) * (1.0 - fx) + value(x1, y0) * fx;
        let below = value(x0, y1) * (1.0 - fx) + value(x1, y1) * fx;
        #[expect(
            clippy::cast_possible_truncation,
            reason = "a luma of at most 256 in f32 keeps more digits than the film has"
        )]
        let mixed = (above * (1.0 - fy) + below * fy) as f32;
        mixed
    }

    /// Mean over squares of `step` × `step` pixels, on the 8-bit scale: a smaller picture for a coarse search or a still.
    ///
    /// Returns ⌊width/step⌋ × ⌊height/step⌋ values, row by row.
    #[must_use]
    pub fn shrunk(&self, step: usize) -> GreyPicture {
        let step = step.max(1);
        let (width, height) = (self.width / step, self.height / step);
        let mut luma = Vec::with_capacity(width * height);
        let mut sums = vec![0_u32; width];
        for row in 0..height {
            sums.fill(0);
            for y in row * step..(row + 1) * step {
                self.add_row(y, step, &mut sums);
            }
            let full = u32::try_from(16 * step * step).unwrap_or(u32::MAX);
            luma.extend(
                sums.iter()
                    .map(|&sum| u8::try_from((sum + full / 2) / full).unwrap_or(u8::MAX)),
            );
        }
        GreyPicture {
            width,
            height,
            luma,
        }
    }

    /// Adds groups of `step` neighbours of row `y`, on the 12-bit scale, to `sums`.
    fn add_row(&self, y: usize, step: usize, sums: &mut [u32]) {
        if self.sample == Sample::Eight {
            let start = y * self.stride;
            for (sum, group) in sums
                .iter_mut()
                .zip(self.data[start..start + self.width].chunks_exact(step))
            {
                *sum += group
                    .iter()
                    .map(|&value| u32::from(value) << 4)
                    .sum::<u32>();
            }
            return;
        }
        for (column, sum) in sums.iter_mut().enumerate() {
            *sum += (column * step..(column + 1) * step)
                .map(|x| u32::from(self.at(x, y).unsigned_abs()))
                .sum::<u32>();
        }
    }
}

/// A copy of a decoder's luma, sample for sample, for the few frames that must be read in reverse order.
#[derive(Clone, Debug)]
pub struct LumaCopy {
    data: Vec<u8>,
    stride: usize,
    width: usize,
    height: usize,
    sample: Sample,
}

impl LumaCopy {
    /// The copy, to be read like the decoder's own.
    #[must_use]
    pub fn view(&self) -> LumaView<'_> {
        LumaView {
            data: &self.data,
            stride: self.stride,
            width: self.width,
            height: self.height,
            sample: self.sample,
        }
    }
}

/// A picture in grey of our own, 8 bits a pixel, row by row.
#[derive(Clone, Debug, PartialEq, Eq)]
pub struct GreyPicture {
    /// Width, px.
    pub width: usize,
    /// Height, px.
    pub height: usize,
    /// Luma, `width` × `height`, row by row.
    pub luma: Vec<u8>,
}

impl GreyPicture {
    /// The picture as a view, to read it like a decoder's.
    #[must_use]
    pub fn view(&self) -> Option<LumaView<'_>> {
        LumaView::from_grey(&self.luma, self.width, self.height)
    }
}

/// A sample of `depth` bits on the 12-bit scale.
fn twelve_bits(value: u16, depth: u32) -> i16 {
    let scaled = if depth >= 12 {
        value >> (depth - 12)
    } else {
        value << (12 - depth)
    };
    i16::try_from(scaled.min(4095)).unwrap_or(4095)
}

/// Pixel number `first + offset` brought into 0…`n`−1.
fn clamp(first: i64, offset: usize, n: usize) -> usize {
    let last = i64::try_from(n).unwrap_or(i64::MAX) - 1;
    let wanted = first.saturating_add(i64::try_from(offset).unwrap_or(i64::MAX));
    usize::try_from(wanted.clamp(0, last.max(0))).unwrap_or(0)
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "the value was clamped to the picture: finite, not negative"
)]
fn floor_index(value: f64) -> usize {
    value.floor() as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_window_over_the_edge_repeats_the_edge() {
        let data = [1, 2, 3, 4, 5, 6];
        let view = LumaView::from_grey(&data, 3, 2).unwrap();
        let mut out = Vec::new();
        view.window_into(-1, -1, 3, 3, &mut out);
        assert_eq!(
            out,
            [1, 1, 2, 1, 1, 2, 4, 4, 5].map(|value: i16| value << 4)
        );
        view.window_into(1, 0, 2, 2, &mut out);
        assert_eq!(out, [2, 3, 5, 6].map(|value: i16| value << 4));
        view.window_into(i64::MAX, i64::MIN, 1, 1, &mut out);
        assert_eq!(out, [3 << 4]);
    }

    #[test]
    fn ten_bits_low_and_high_in_the_word_read_the_same() {
        // Planar 10-bit keeps the sample in the low bits, the semi-planar kind in the high ones.
        let low: Vec<u8> = [64_u16, 940]
            .iter()
            .flat_map(|value| value.to_le_bytes())
            .collect();
        let high: Vec<u8> = [64_u16 << 6, 940 << 6]
            .iter()
            .flat_map(|value| value.to_le_bytes())
            .collect();
        let mut out = Vec::new();
        for (bytes, shift) in [(&low, 0), (&high, 6)] {
            let view = LumaView::new(bytes, 4, 2, 1, Sample::Sixteen { shift, depth: 10 }).unwrap();
            view.window_into(0, 0, 2, 1, &mut out);
            assert_eq!(out, [64 << 2, 940 << 2]);
        }
    }

    #[test]
    fn between_four_pixels_the_sample_is_their_mean() {
        let view = LumaView::from_grey(&[10, 20, 30, 40], 2, 2).unwrap();
        assert!((view.sample([0.5, 0.5]) - 25.0).abs() < 1e-6);
        assert!((view.sample([-3.0, 9.0]) - 30.0).abs() < 1e-6);
        assert!(view.sample([f64::NAN, 0.0]).is_finite());
    }

    #[test]
    fn a_shrunk_picture_holds_means_and_drops_the_rest() {
        let view = LumaView::from_grey(&[0, 4, 100, 8, 12, 100], 3, 2).unwrap();
        let small = view.shrunk(2);
        assert_eq!((small.width, small.height, small.luma), (1, 1, vec![6]));
    }

    #[test]
    fn too_few_bytes_are_no_view() {
        assert!(LumaView::from_grey(&[0; 5], 3, 2).is_none());
        assert!(LumaView::new(&[0; 5], 3, 3, 2, Sample::Eight).is_none());
        assert!(LumaView::new(&[0; 6], 2, 3, 2, Sample::Eight).is_none());
        assert!(LumaView::new(&[0; 6], 3, 3, 0, Sample::Eight).is_none());
    }
}
