//! Conversions between number types that lose nothing where they are used, each with the reason.

/// A count (frames, pixels, readings) as a float.
#[expect(
    clippy::cast_precision_loss,
    reason = "counts here are limited far below 2^53"
)]
pub(crate) fn to_f64(count: usize) -> f64 {
    count as f64
}

/// A luma value as a byte, cut off at 0 and 255.
#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "`as` saturates at 0 and 255"
)]
pub(crate) fn byte(luma: f32) -> u8 {
    luma.round() as u8
}
