//! The start frame with what was pointed out on it: marker box, motion axis, scale bar.
//!
//! The drawing is in display pixels, the pixel centre at the top left being (0, 0), so that every figure of the run sheet
//! can be found in it again.

use super::error::RecordError;
use super::page::escape;
use super::picture::{Grey, data_url, png_from_grey};
use super::rounding::significant;
use crate::measurement::{FilmPart, ScaleFacts};

const PART: &str = "start frame";
/// Longest side of the embedded picture, px.
const MAX_SIDE_PX: usize = 960;
/// Room for the picture on the page, CSS px; the height is the limit of `style.css`.
const PAGE_WIDTH_PX: f64 = 690.0;
const PAGE_HEIGHT_PX: f64 = 480.0;
/// Height of the words, CSS px, and the width of a letter in that unit, generously.
const WORDS_PX: f64 = 14.0;
const LETTER_WIDTH: f64 = 0.66;
/// The axis is drawn this many amplitudes to both sides.
const AXIS_REACH: f64 = 1.35;

type Vector = [f64; 2];

/// The start frame as an `<svg>` element.
///
/// * `amplitude_m`: A of the motion, which sets the length of the axis arrow.
///
/// # Errors
/// [`RecordError::Compose`] where the still's size and its pixels disagree.
pub(super) fn start_frame(film: &FilmPart, amplitude_m: f64) -> Result<String, RecordError> {
    let (picture, px_per_display_px) = embedded(film)?;
    let width = picture.width as f64 / px_per_display_px;
    let height = picture.height as f64 / px_per_display_px;
    let drawing = Drawing {
        unit: (width / PAGE_WIDTH_PX).max(height / PAGE_HEIGHT_PX),
        width,
        height,
    };
    let png = png_from_grey(&picture, PART)?;
    let mut svg = format!(
        "<svg class=\"still\" role=\"img\" viewBox=\"-0.5 -0.5 {width:.2} {height:.2}\" style=\"aspect-ratio:{width:.0}/{height:.0}\" \
         xmlns=\"http://www.w3.org/2000/svg\"><image x=\"-0.5\" y=\"-0.5\" width=\"{width:.2}\" height=\"{height:.2}\" href=\"{}\"/>",
        data_url(&png)
    );
    svg.push_str(&drawing.axis(&film.scale, amplitude_m));
    svg.push_str(&drawing.bar(&film.scale));
    if let Some(box_px) = film.steady_box_px {
        svg.push_str(&drawing.rectangle(box_px, true));
        svg.push_str(&drawing.words_above(box_px, "steady"));
    }
    svg.push_str(&drawing.rectangle(film.marker_box_px, false));
    svg.push_str(&drawing.marker_words(film));
    svg.push_str("</svg>");
    Ok(svg)
}

/// The still at a size for the page, and its pixels per display pixel.
fn embedded(film: &FilmPart) -> Result<(Grey, f64), RecordError> {
    let still = &film.still;
    if still.luma.len() != still.width * still.height {
        let reason = format!(
            "{} pixels for {} × {}",
            still.luma.len(),
            still.width,
            still.height
        );
        return Err(RecordError::Compose { part: PART, reason });
    }
    let grey = Grey {
        width: still.width,
        height: still.height,
        luma: still.luma.clone(),
    };
    let step = still.width.max(still.height).div_ceil(MAX_SIDE_PX).max(1);
    Ok((
        grey.shrunk(step).coarse(),
        1.0 / (step as f64 * still.display_px_per_px),
    ))
}

/// The sheet that is drawn on: its size in display px, and the display px in a CSS px.
#[derive(Clone, Copy, Debug)]
struct Drawing {
    unit: f64,
    width: f64,
    height: f64,
}

impl Drawing {
    /// The motion axis: an arrow in the direction in which x grows, with a tick where x = 0.
    fn axis(self, scale: &ScaleFacts, amplitude_m: f64) -> String {
        let reach = (AXIS_REACH * amplitude_m / scale.m_per_px).max(40.0 * self.unit);
        let along = scale.direction;
        let across = turned(along);
        let tail = self.inside(moved(scale.origin_px, along, -reach));
        let head = self.inside(moved(scale.origin_px, along, reach));
        let wing = |side: f64| {
            moved(
                moved(head, along, -14.0 * self.unit),
                across,
                side * 6.0 * self.unit,
            )
        };
        let tick = [-8.0, 8.0].map(|offset| moved(scale.origin_px, across, offset * self.unit));
        let letter = moved(head, across, -self.away_from_bar(scale) * 14.0 * self.unit);
        let strokes = [
            path(&[tail, head]),
            path(&[wing(1.0), head, wing(-1.0)]),
            path(&tick),
        ]
        .concat();
        format!(
            "{}{}",
            self.stroked(&strokes, "axis"),
            self.words(letter, "middle", "x")
        )
    }

    /// The scale bar with its end strokes and its length.
    fn bar(self, scale: &ScaleFacts) -> String {
        let [a, b] = scale.bar_px;
        let length = (b[0] - a[0]).hypot(b[1] - a[1]).max(f64::MIN_POSITIVE);
        let across = turned([(b[0] - a[0]) / length, (b[1] - a[1]) / length]);
        let end = |p: Vector| [-7.0, 7.0].map(|offset| moved(p, across, offset * self.unit));
        let strokes = [path(&[a, b]), path(&end(a)), path(&end(b))].concat();
        let middle = [0.5 * (a[0] + b[0]), 0.5 * (a[1] + b[1])];
        let outwards = if dot(across, difference(middle, scale.origin_px)) < 0.0 {
            -1.0
        } else {
            1.0
        };
        let text = format!("{} mm", significant(scale.length_m * 1e3, 4));
        let beside = (
            moved(middle, across, outwards * 16.0 * self.unit),
            anchor_for(across, outwards),
        );
        // Where the picture ends too near, the words stand above the bar's upper end: on its other side runs the axis.
        let upper = if a[1] < b[1] { a } else { b };
        let (place, anchor) = if self.fits(beside, &text) {
            beside
        } else {
            ([upper[0], upper[1] - 16.0 * self.unit], "middle")
        };
        format!(
            "{}{}",
            self.stroked(&strokes, "bar"),
            self.words(place, anchor, &text)
        )
    }

    /// Which side of the axis is free of the bar: 1 for the side that `turned(direction)` points to, −1 for the other.
    fn away_from_bar(self, scale: &ScaleFacts) -> f64 {
        let middle = [
            0.5 * (scale.bar_px[0][0] + scale.bar_px[1][0]),
            0.5 * (scale.bar_px[0][1] + scale.bar_px[1][1]),
        ];
        if dot(turned(scale.direction), difference(middle, scale.origin_px)) > 0.0 {
            -1.0
        } else {
            1.0
        }
    }

    fn marker_words(self, film: &FilmPart) -> String {
        let [left, top, width, height] = film.marker_box_px;
        let across = turned(film.scale.direction);
        let side = self.away_from_bar(&film.scale);
        let reach = 0.5 * (width * across[0].abs() + height * across[1].abs()) + 12.0 * self.unit;
        let centre = [left + 0.5 * (width - 1.0), top + 0.5 * (height - 1.0)];
        self.words_beside(centre, across, side, reach, "marker")
    }

    /// Words on one side of a place, or on the other where the picture ends.
    fn words_beside(
        self,
        place: Vector,
        across: Vector,
        side: f64,
        reach: f64,
        text: &str,
    ) -> String {
        let at = |side: f64| (moved(place, across, side * reach), anchor_for(across, side));
        let (place, anchor) = if self.fits(at(side), text) {
            at(side)
        } else {
            at(-side)
        };
        self.words(place, anchor, text)
    }

    /// Whether words to the left or right of a place stay inside the picture; centred ones are moved there.
    fn fits(self, ([x, _], anchor): (Vector, &str), text: &str) -> bool {
        match anchor {
            "start" => x + self.width_of(text) < self.width,
            "end" => x - self.width_of(text) > 0.0,
            _ => true,
        }
    }

    fn width_of(self, text: &str) -> f64 {
        text.chars().count() as f64 * LETTER_WIDTH * WORDS_PX * self.unit
    }

    fn words_above(self, [left, top, width, height]: [f64; 4], text: &str) -> String {
        let above = top - 10.0 * self.unit;
        let y = if above > 14.0 * self.unit {
            above
        } else {
            top + height + 10.0 * self.unit
        };
        self.words([left + 0.5 * width, y], "middle", text)
    }

    fn rectangle(self, [left, top, width, height]: [f64; 4], dashed: bool) -> String {
        let (x, y) = (left - 0.5, top - 0.5);
        let corners = [
            [x, y],
            [x + width, y],
            [x + width, y + height],
            [x, y + height],
            [x, y],
        ];
        self.stroked(&path(&corners), if dashed { "steady" } else { "marker" })
    }

    /// A line in its colour over a wider white one, so that it shows on every ground.
    fn stroked(self, path: &str, class: &str) -> String {
        let (halo, line) = (4.0 * self.unit, 1.6 * self.unit);
        format!(
            "<path class=\"halo\" d=\"{path}\" stroke-width=\"{halo:.2}\"/><path class=\"{class}\" d=\"{path}\" stroke-width=\"{line:.2}\"/>"
        )
    }

    fn words(self, place: Vector, anchor: &str, text: &str) -> String {
        let [mut x, y] = self.inside(place);
        if anchor == "middle" {
            let half = 0.5 * self.width_of(text);
            x = x.min(self.width - half).max(half);
        }
        let (size, halo) = (WORDS_PX * self.unit, 3.5 * self.unit);
        format!(
            "<text x=\"{x:.2}\" y=\"{y:.2}\" font-size=\"{size:.2}\" stroke-width=\"{halo:.2}\" text-anchor=\"{anchor}\" \
             dominant-baseline=\"central\">{}</text>",
            escape(text)
        )
    }

    /// The nearest place that leaves room for a line of words.
    fn inside(self, [x, y]: Vector) -> Vector {
        let margin = 10.0 * self.unit;
        [
            x.min(self.width - margin).max(margin),
            y.min(self.height - margin).max(margin),
        ]
    }
}

/// Words beside an upright line stand clear of it; above or below a level one they are centred.
fn anchor_for(across: Vector, side: f64) -> &'static str {
    match across[0] * side {
        level if level.abs() < 0.5 => "middle",
        right if right > 0.0 => "start",
        _ => "end",
    }
}

fn path(points: &[Vector]) -> String {
    points
        .iter()
        .enumerate()
        .map(|(i, [x, y])| format!("{}{x:.2} {y:.2}", if i == 0 { "M" } else { "L" }))
        .collect()
}

fn moved(p: Vector, direction: Vector, by: f64) -> Vector {
    [p[0] + by * direction[0], p[1] + by * direction[1]]
}

fn turned([x, y]: Vector) -> Vector {
    [-y, x]
}

fn difference(a: Vector, b: Vector) -> Vector {
    [a[0] - b[0], a[1] - b[1]]
}

fn dot(a: Vector, b: Vector) -> f64 {
    a[0] * b[0] + a[1] * b[1]
}
