//! Where to look: a window around the prediction, and the whole picture when that fails.

use super::correlate::correlate;
use super::lowpass::{LOWPASS_REACH_PX, lowpass};
use super::refine::{Peak, quadratic_peak};
use super::template::Template;
use crate::footage::{GreyPicture, LumaView};

/// A match: top-left corner of the box between pixels, and score.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Match {
    pub(super) corner_px: [f64; 2],
    /// Covariance of the corner (xx, xy, yy), px².
    pub(super) covariance_px2: [f64; 3],
    pub(super) score: f64,
    /// Contrast over the template's: 1 where it looks as it did in the start frame.
    pub(super) contrast: f64,
}

/// The best match whose corner lies within `radius` px of a corner, each way; None where the peak lies on the window's edge.
///
/// Positions that would put the box outside the picture are not looked at.
pub(super) fn search_window(
    luma: &LumaView<'_>,
    template: &Template,
    corner_px: [f64; 2],
    radius: i64,
    scratch: &mut Vec<i16>,
) -> Option<Match> {
    let limit = |picture: usize, side: usize| {
        i64::try_from(picture)
            .ok()?
            .checked_sub(i64::try_from(side).ok()?)
    };
    let (most_x, most_y) = (
        limit(luma.width(), template.width())?,
        limit(luma.height(), template.height())?,
    );
    let (x, y) = (round(corner_px[0]), round(corner_px[1]));
    let (left, right) = ((x - radius).clamp(0, most_x), (x + radius).clamp(0, most_x));
    let (top, bottom) = ((y - radius).clamp(0, most_y), (y + radius).clamp(0, most_y));
    let side =
        |from: i64, to: i64, box_side: usize| usize::try_from(to - from).unwrap_or(0) + box_side;
    let (width, height) = (
        side(left, right, template.width()),
        side(top, bottom, template.height()),
    );
    let (wide, high) = (width + 2 * LOWPASS_REACH_PX, height + 2 * LOWPASS_REACH_PX);
    let reach = i64::try_from(LOWPASS_REACH_PX).unwrap_or(0);
    luma.window_into(left - reach, top - reach, wide, high, scratch);
    let field = lowpass(scratch, wide, high);
    let Peak {
        p_px,
        score,
        contrast,
    } = quadratic_peak(&correlate(&field, width, height, template))?;
    // The correlation finds the place; laying the template over it tells it more finely. Where that does not settle (a weak texture, a
    // corner of the window), the peak between the pixels stands.
    let aligned = template
        .align(&field, width, height, p_px)
        .unwrap_or_else(|| template.unaligned(p_px, score));
    let corner_px = [
        to_f64(left) + aligned.corner_px[0],
        to_f64(top) + aligned.corner_px[1],
    ];
    Some(Match {
        corner_px,
        covariance_px2: aligned.covariance_px2,
        score,
        contrast,
    })
}

/// Side of the marker in the shrunk picture, px: enough to know it by.
const COARSE_SIDE_PX: usize = 10;
/// Places of the shrunk picture that are looked at closely.
const N_CANDIDATES: usize = 6;

/// A marker in a shrunk picture, to find it anywhere.
#[derive(Clone, Debug)]
pub(super) struct CoarseTemplate {
    step: usize,
    template: Template,
}

impl CoarseTemplate {
    /// The coarse look of a box; None where too little of it is left to know it by.
    pub(super) fn of_box(
        luma: &LumaView<'_>,
        left: usize,
        top: usize,
        width: usize,
        height: usize,
    ) -> Option<Self> {
        let step = (width.min(height) / COARSE_SIDE_PX).clamp(1, 8);
        let mut window = Vec::new();
        luma.window_into(
            i64::try_from(left).ok()?,
            i64::try_from(top).ok()?,
            width,
            height,
            &mut window,
        );
        let bytes: Vec<u8> = window
            .iter()
            .map(|value| u8::try_from(value >> 4).unwrap_or(u8::MAX))
            .collect();
        let small = LumaView::from_grey(&bytes, width, height)?.shrunk(step);
        let template = Template::from_lowpassed(
            small
                .luma
                .iter()
                .map(|&value| i16::from(value) << 4)
                .collect(),
            small.width,
            small.height,
        )?;
        Some(Self { step, template })
    }

    /// The best match anywhere in the picture, refined at full size.
    pub(super) fn search_picture(
        &self,
        luma: &LumaView<'_>,
        template: &Template,
        scratch: &mut Vec<i16>,
    ) -> Option<Match> {
        let GreyPicture {
            width,
            height,
            luma: small,
        } = luma.shrunk(self.step);
        let field: Vec<i16> = small.iter().map(|&value| i16::from(value) << 4).collect();
        let scores = correlate(&field, width, height, &self.template);
        let mut places: Vec<usize> = (0..scores.values.len()).collect();
        places.sort_by(|&a, &b| {
            scores.values[b]
                .total_cmp(&scores.values[a])
                .then(a.cmp(&b))
        });
        let mut chosen: Vec<(usize, usize)> = Vec::new();
        for place in places {
            let (u, v) = (place % scores.width, place / scores.width);
            let apart = chosen
                .iter()
                .all(|&(x, y)| x.abs_diff(u) > 2 || y.abs_diff(v) > 2);
            if apart {
                chosen.push((u, v));
            }
            if chosen.len() == N_CANDIDATES {
                break;
            }
        }
        let radius = i64::try_from(2 * self.step + 2).unwrap_or(16);
        chosen
            .into_iter()
            .filter_map(|(u, v)| {
                let corner =
                    [u * self.step, v * self.step].map(|at| to_f64(i64::try_from(at).unwrap_or(0)));
                search_window(luma, template, corner, radius, scratch)
            })
            .max_by(|a, b| a.score.total_cmp(&b.score))
    }
}

#[expect(clippy::cast_precision_loss, reason = "pixel numbers")]
fn to_f64(n: i64) -> f64 {
    n as f64
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "`as` saturates, and the window is clamped to the picture"
)]
fn round(value: f64) -> i64 {
    value.round() as i64
}
