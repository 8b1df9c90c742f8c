//! The start frame, turned upright, for the report.

use super::Still;
use crate::footage::{GreyPicture, Orientation};
use crate::number::{byte, to_f64};

/// The picture as displayed: turned, mirrored and with square pixels.
///
/// * `picture`: coded px, made smaller by `shrunk_by`.
pub(super) fn upright(picture: &GreyPicture, shrunk_by: usize, orientation: &Orientation) -> Still {
    let [display_width, display_height] = orientation.display_size_px();
    let scale = to_f64(shrunk_by);
    let (width, height) = (whole(display_width / scale), whole(display_height / scale));
    let mut luma = Vec::with_capacity(width * height);
    if let Some(view) = picture.view() {
        for row in 0..height {
            for column in 0..width {
                let at = |index: usize| (to_f64(index) + 0.5) * scale - 0.5;
                let coded = orientation.coded_from_display([at(column), at(row)]);
                let small = coded.map(|position| (position + 0.5) / scale - 0.5);
                luma.push(byte(view.sample(small)));
            }
        }
    }
    Still {
        width,
        height,
        luma,
        display_px_per_px: scale,
    }
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "a picture's side: not negative, far below 2^53"
)]
fn whole(value: f64) -> usize {
    value.floor().max(0.0) as usize
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_phone_held_upright_gives_an_upright_still() {
        // Stored 3 × 2, to be turned clockwise: the first stored column becomes the top row, read from below.
        let picture = GreyPicture {
            width: 3,
            height: 2,
            luma: vec![1, 2, 3, 4, 5, 6],
        };
        let orientation = Orientation::new(3, 2, [1, 1], Some([0, 65536, -65536, 0])).unwrap();
        let still = upright(&picture, 1, &orientation);
        assert_eq!((still.width, still.height), (2, 3));
        assert_eq!(still.luma, [4, 1, 5, 2, 6, 3]);
    }
}
