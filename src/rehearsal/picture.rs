//! One picture before it is stored: greys as real numbers.

/// Greys of one picture, turned as it is displayed, one sample a stored pixel.
#[derive(Clone, Debug, PartialEq)]
pub struct Picture {
    /// Samples a line; with square pixels the display's width.
    pub width: usize,
    /// Lines.
    pub height: usize,
    /// Row-major, 0 black, 255 white, not rounded and not cut off.
    pub grey: Vec<f32>,
}

/// Display px of a sample's centre: the picture's left edge lies at −½ whatever the samples' width.
pub(super) fn centre_px(column: usize, pixel_width_px: f64) -> f64 {
    (as_f64(column) + 0.5) * pixel_width_px - 0.5
}

#[expect(clippy::cast_precision_loss, reason = "places in a picture")]
pub(super) fn as_f64(count: usize) -> f64 {
    count as f64
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "greys: f32 inside pixel kernels"
)]
pub(super) fn to_f32(number: f64) -> f32 {
    number as f32
}
