//! A still frame with a grid of display pixels, to read marker box and scale bar off.
//!
//! A line every hundred pixels with its number, a shorter mark every ten along the upper and the left edge.

use crate::number::byte;
use std::path::Path;

use image::{Rgb, RgbImage};

use super::error::RecordError;
use super::single::write_file;
use crate::footage::{LumaView, Orientation};

/// Distance of the numbered lines, px.
const LINE_EVERY_PX: u32 = 100;
/// Distance of the marks on the edges, px.
const MARK_EVERY_PX: u32 = 10;
/// Length of a mark, px.
const MARK_PX: u32 = 8;
/// Colour of lines and numbers, and how much of it covers the picture.
const INK: [u8; 3] = [255, 196, 0];
const INK_SHARE: f32 = 0.6;
/// Side of one dot of a digit, px.
const DOT_PX: u32 = 2;

/// Digits 0–9 as five rows of three dots, the top row in the highest bits.
const DIGITS: [u16; 10] = [
    0b111_101_101_101_111,
    0b010_110_010_010_111,
    0b111_001_111_100_111,
    0b111_001_111_001_111,
    0b101_101_111_001_001,
    0b111_100_111_001_111,
    0b111_100_111_101_111,
    0b111_001_010_010_010,
    0b111_101_111_101_111,
    0b111_101_111_001_111,
];

/// Writes `frame-NNNNN.png` into a folder: the frame as displayed, full size, with the grid over it.
///
/// # Errors
/// [`RecordError::Write`] where the disk refuses, [`RecordError::Compose`] where the picture cannot be coded.
pub fn write_still(
    folder: &Path,
    frame: usize,
    luma: &LumaView<'_>,
    orientation: &Orientation,
) -> Result<(), RecordError> {
    let picture = with_grid(luma, orientation);
    let mut png = std::io::Cursor::new(Vec::new());
    picture
        .write_to(&mut png, image::ImageFormat::Png)
        .map_err(RecordError::compose("still frame"))?;
    write_file(&folder.join(format!("frame-{frame:05}.png")), png.get_ref())
}

/// The frame as displayed with the grid drawn over it.
fn with_grid(luma: &LumaView<'_>, orientation: &Orientation) -> RgbImage {
    let [width, height] = orientation.display_size_px().map(whole);
    let mut picture = RgbImage::from_fn(width, height, |x, y| {
        let value = luma.sample(orientation.coded_from_display([f64::from(x), f64::from(y)]));
        Rgb([byte(value); 3])
    });
    for x in (0..width).step_by(MARK_EVERY_PX as usize) {
        let length = if x % LINE_EVERY_PX == 0 {
            height
        } else {
            MARK_PX
        };
        (0..length.min(height)).for_each(|y| ink(&mut picture, x, y));
    }
    for y in (0..height).step_by(MARK_EVERY_PX as usize) {
        let length = if y % LINE_EVERY_PX == 0 {
            width
        } else {
            MARK_PX
        };
        (0..length.min(width)).for_each(|x| ink(&mut picture, x, y));
    }
    for x in (0..width).step_by(LINE_EVERY_PX as usize) {
        number(&mut picture, x, x + 4, MARK_PX + 4);
    }
    for y in (LINE_EVERY_PX..height).step_by(LINE_EVERY_PX as usize) {
        number(&mut picture, y, MARK_PX + 4, y + 4);
    }
    picture
}

/// Writes a number with its top-left corner at (x, y).
fn number(picture: &mut RgbImage, value: u32, x: u32, y: u32) {
    for (place, digit) in value.to_string().bytes().enumerate() {
        let Some(&dots) = DIGITS.get(usize::from(digit.saturating_sub(b'0'))) else {
            continue;
        };
        let left = x + u32::try_from(place).unwrap_or(0) * 4 * DOT_PX;
        for dot in 0..15_u32 {
            if dots >> (14 - dot) & 1 == 1 {
                let (dot_x, dot_y) = (left + dot % 3 * DOT_PX, y + dot / 3 * DOT_PX);
                for offset in 0..DOT_PX * DOT_PX {
                    ink(picture, dot_x + offset % DOT_PX, dot_y + offset / DOT_PX);
                }
            }
        }
    }
}

/// Lays ink over one pixel; outside the picture nothing happens.
fn ink(picture: &mut RgbImage, x: u32, y: u32) {
    if let Some(pixel) = picture.get_pixel_mut_checked(x, y) {
        for (channel, ink) in pixel.0.iter_mut().zip(INK) {
            *channel = byte(f32::from(*channel) * (1.0 - INK_SHARE) + f32::from(ink) * INK_SHARE);
        }
    }
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "`as` saturates; a picture's side"
)]
fn whole(side_px: f64) -> u32 {
    side_px.round() as u32
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lines_stand_at_whole_hundreds_and_nowhere_else() {
        let grey = vec![0_u8; 320 * 240];
        let luma = LumaView::from_grey(&grey, 320, 240).unwrap();
        let picture = with_grid(&luma, &Orientation::new(320, 240, [1, 1], None).unwrap());
        let inked = |x, y| picture.get_pixel(x, y).0[0] > 0;
        assert!((0..240).all(|y| inked(100, y) && inked(200, y)));
        assert!((0..320).all(|x| inked(x, 0) && inked(x, 200)));
        assert!(!inked(150, 150) && !inked(99, 150) && !inked(101, 150));
        assert!(inked(150, MARK_PX - 1) && !inked(150, MARK_PX));
    }

    #[test]
    fn an_upright_phone_gives_an_upright_grid() {
        let grey = vec![9_u8; 40 * 20];
        let luma = LumaView::from_grey(&grey, 40, 20).unwrap();
        let picture = with_grid(
            &luma,
            &Orientation::new(40, 20, [1, 1], Some([0, 1, -1, 0])).unwrap(),
        );
        assert_eq!(picture.dimensions(), (20, 40));
    }
}
