//! Pictures in memory: made smaller or larger by whole steps, encoded as PNG, written into a page as a data URL.

use std::io::Cursor;

use base64::Engine as _;
use base64::engine::general_purpose::STANDARD;
use image::codecs::png::{CompressionType, FilterType, PngEncoder};
use image::{ExtendedColorType, ImageEncoder as _};

use super::error::RecordError;

/// A grey picture, row by row.
#[derive(Clone, Debug, PartialEq, Eq)]
pub(super) struct Grey {
    /// Width, px.
    pub(super) width: usize,
    /// Height, px.
    pub(super) height: usize,
    /// Luma 0…255.
    pub(super) luma: Vec<u8>,
}

impl Grey {
    /// The picture with every `step` × `step` square averaged to a pixel; an incomplete square at the edge is left out.
    pub(super) fn shrunk(&self, step: usize) -> Self {
        let step = step.max(1);
        let (width, height) = (self.width / step, self.height / step);
        let mut luma = Vec::with_capacity(width * height);
        for row in 0..height {
            for column in 0..width {
                let square = (0..step).flat_map(|dy| {
                    let start = (row * step + dy) * self.width + column * step;
                    &self.luma[start..start + step]
                });
                luma.push(mean(square));
            }
        }
        Self {
            width,
            height,
            luma,
        }
    }

    /// The picture in 64 greys: no eye sees it, and the noise that is thrown away halves the file.
    pub(super) fn coarse(mut self) -> Self {
        coarsen(&mut self.luma);
        self
    }
}

/// Rounds luma, or the channels of a grey pixel, to 64 steps from 0 to 255.
pub(super) fn coarsen(values: &mut [u8]) {
    for value in values {
        // Six high bits, repeated in the two low ones, so that 255 stays white.
        *value = (*value & 0xfc) | (*value >> 6);
    }
}

/// Mean of luma values, rounded to the nearest; 0 of none.
pub(super) fn mean<'a>(values: impl Iterator<Item = &'a u8>) -> u8 {
    let (sum, count) = values.fold((0usize, 0usize), |(sum, count), &v| {
        (sum + usize::from(v), count + 1)
    });
    let rounded = (sum + count / 2).checked_div(count).unwrap_or(0);
    u8::try_from(rounded).unwrap_or(u8::MAX)
}

/// A grey picture as PNG.
pub(super) fn png_from_grey(picture: &Grey, part: &'static str) -> Result<Vec<u8>, RecordError> {
    png(
        &picture.luma,
        picture.width,
        picture.height,
        ExtendedColorType::L8,
        part,
    )
}

/// A colour picture as PNG; `rgb` holds three bytes a pixel, row by row.
pub(super) fn png_from_rgb(
    rgb: &[u8],
    width: usize,
    height: usize,
    part: &'static str,
) -> Result<Vec<u8>, RecordError> {
    png(rgb, width, height, ExtendedColorType::Rgb8, part)
}

fn png(
    bytes: &[u8],
    width: usize,
    height: usize,
    colour: ExtendedColorType,
    part: &'static str,
) -> Result<Vec<u8>, RecordError> {
    let wrong_size = |_| RecordError::Compose {
        part,
        reason: format!("{width} × {height} px is not a picture"),
    };
    let (columns, rows) = (
        u32::try_from(width).map_err(wrong_size)?,
        u32::try_from(height).map_err(wrong_size)?,
    );
    // The encoder asserts this; here it is an error that names the picture.
    let expected = width * height * usize::from(colour.bits_per_pixel() / 8);
    if bytes.len() != expected || expected == 0 {
        return Err(RecordError::Compose {
            part,
            reason: format!("{} bytes for {width} × {height} px", bytes.len()),
        });
    }
    let mut out = Cursor::new(Vec::new());
    PngEncoder::new_with_quality(&mut out, CompressionType::Default, FilterType::Adaptive)
        .write_image(bytes, columns, rows, colour)
        .map_err(RecordError::compose(part))?;
    Ok(out.into_inner())
}

/// A PNG as the address of an `<img>` that needs no file and no network.
pub(super) fn data_url(png: &[u8]) -> String {
    format!("data:image/png;base64,{}", STANDARD.encode(png))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn squares_are_averaged_and_a_ragged_edge_is_left_out() {
        let picture = Grey {
            width: 3,
            height: 2,
            luma: vec![10, 20, 99, 30, 41, 99],
        };
        assert_eq!(
            picture.shrunk(2),
            Grey {
                width: 1,
                height: 1,
                luma: vec![25]
            }
        );
        assert_eq!(picture.shrunk(1), picture);
    }

    #[test]
    fn black_and_white_stay_so_in_64_greys() {
        let mut values = [0, 3, 127, 128, 255];
        coarsen(&mut values);
        assert_eq!(values, [0, 0, 125, 130, 255]);
    }

    #[test]
    fn a_picture_of_the_wrong_size_is_an_error_that_names_it() {
        let error = png_from_grey(
            &Grey {
                width: 3,
                height: 2,
                luma: vec![0; 5],
            },
            "start frame",
        )
        .unwrap_err();
        assert_eq!(
            error.to_string(),
            "start frame: could not be made (5 bytes for 3 × 2 px); please report this with the run sheet"
        );
    }
}
