//! A plot as SVG text: axes with round ticks, and layers of lines, readings and bars over them.
//!
//! The plotting crate places everything on whole pixels, so the canvas is four times as large as the figure on the page and
//! the root element scales it down; fonts are named by kind, never by file.

use std::ops::Range;

use plotters::chart::ChartContext;
use plotters::coord::Shift;
use plotters::coord::ranged1d::{DefaultFormatting, KeyPointHint, Ranged};
use plotters::prelude::{
    Cartesian2d, ChartBuilder, Circle, Cross, DashedLineSeries, DrawingArea, IntoDrawingArea as _, LineSeries, PathElement, RGBColor, SVGBackend,
};
use plotters::style::{Color as _, ShapeStyle, TRANSPARENT, WHITE};

use super::error::RecordError;
use super::rounding::fixed;
use super::thin::Point;

/// Canvas pixels in a CSS pixel.
const FINENESS: u32 = 4;
const WIDTH: u32 = 720 * FINENESS;
const INK: RGBColor = RGBColor(28, 36, 48);
const GRID: RGBColor = RGBColor(224, 227, 231);
const ACCENT: RGBColor = RGBColor(154, 52, 18);

/// An axis: its words, its ends and its ticks.
#[derive(Clone, Debug)]
pub(super) struct Axis {
    label: String,
    range: Range<f64>,
    ticks: Vec<f64>,
    decimals: usize,
    logarithmic: bool,
}

impl Axis {
    /// A linear axis that holds `low` and `high`, with about `n_ticks` round ticks and a margin at both ends.
    pub(super) fn linear(label: impl Into<String>, low: f64, high: f64, n_ticks: u32) -> Self {
        let (low, high) = widened(low, high);
        let step = round_step((high - low) / f64::from(n_ticks.max(1)));
        Self { label: label.into(), range: low..high, ticks: multiples(low, high, step), decimals: decimals_of(step), logarithmic: false }
    }

    /// The same without a margin: for time, where the plots stand above one another.
    pub(super) fn tight(label: impl Into<String>, low: f64, high: f64, n_ticks: u32) -> Self {
        let high = if high > low { high } else { low + 1.0 };
        let step = round_step((high - low) / f64::from(n_ticks.max(1)));
        Self { label: label.into(), range: low..high, ticks: multiples(low, high, step), decimals: decimals_of(step), logarithmic: false }
    }

    /// A logarithmic axis for positive values.
    ///
    /// Ticks at 1, 2 and 5 of each power of ten; where fewer than three fall inside, at round values instead.
    pub(super) fn logarithmic(label: impl Into<String>, low: f64, high: f64) -> Self {
        let (log_low, log_high) = widened(low.log10(), high.log10());
        let (low, high) = (10f64.powf(log_low), 10f64.powf(log_high));
        let mut values = one_two_five(low, high);
        let mut decimals = decimals_of(values.first().copied().unwrap_or(1.0));
        if values.len() < 3 || values.len() > 12 {
            let step = round_step((high - low) / 5.0);
            if values.len() < 3 {
                values = multiples(low, high, step);
                decimals = decimals_of(step);
            } else {
                values.retain(|value| value.log10().fract().abs() < 1e-9);
            }
        }
        Self { label: label.into(), range: low..high, ticks: values, decimals, logarithmic: true }
    }

    fn text(&self, value: f64) -> String {
        fixed(value, self.decimals).replace('-', "−")
    }

    /// Where a value stands along the axis, in any unit that grows evenly on paper.
    fn place(&self, value: f64) -> f64 {
        if self.logarithmic { value.log10() } else { value }
    }
}

impl Ranged for Axis {
    type FormatOption = DefaultFormatting;
    type ValueType = f64;

    fn map(&self, value: &f64, limit: (i32, i32)) -> i32 {
        let (start, end) = (self.place(self.range.start), self.place(self.range.end));
        let share = (self.place(*value) - start) / (end - start);
        #[expect(clippy::cast_possible_truncation, reason = "a place on a canvas of some thousand pixels; `as` saturates")]
        let offset = (share * f64::from(limit.1 - limit.0)).round() as i32;
        limit.0.saturating_add(offset)
    }

    fn key_points<Hint: KeyPointHint>(&self, hint: Hint) -> Vec<f64> {
        // The crate asks once for bold and once for light grid lines; we have only the former.
        if hint.weight().allow_light_points() { Vec::new() } else { self.ticks.clone() }
    }

    fn range(&self) -> Range<f64> {
        self.range.clone()
    }
}

/// What is drawn over the axes, in order.
#[derive(Clone, Debug)]
pub(super) enum Layer {
    /// Readings: small open circles.
    Readings(Vec<Point>),
    /// Readings that were left out: crosses.
    LeftOut(Vec<Point>),
    /// Readings with a vertical bar: time, low end, value, high end.
    Bars(Vec<(f64, f64, f64, f64)>),
    /// The fit: a solid line in the accent colour.
    Fit(Vec<Point>),
    /// A reference: a dashed line in ink.
    Reference(Vec<Point>),
}

/// A plot as an `<svg>` element with `title` and `description` for those who cannot see it.
///
/// `height` in CSS px; the width is that of the page.
pub(super) fn plot(part: &'static str, height: u32, x: &Axis, y: &Axis, layers: &[Layer]) -> Result<String, RecordError> {
    let height = height * FINENESS;
    let mut svg = String::new();
    {
        let area = SVGBackend::with_string(&mut svg, (WIDTH, height)).into_drawing_area();
        draw(&area, x, y, layers).map_err(RecordError::compose(part))?;
        area.present().map_err(RecordError::compose(part))?;
    }
    Ok(scalable(&svg, height))
}

/// The drawing with a root of our own: it fills the width it is given, and carries no size of its own.
fn scalable(svg: &str, height: u32) -> String {
    let inner = svg.split_once('>').map_or("", |(_, rest)| rest);
    let compact: String = inner.lines().map(str::trim).collect();
    format!("<svg class=\"plot\" role=\"img\" viewBox=\"0 0 {WIDTH} {height}\" xmlns=\"http://www.w3.org/2000/svg\">{}", compact.replace(" opacity=\"1\"", ""))
}

type Area<'a> = DrawingArea<SVGBackend<'a>, Shift>;
type Chart<'a, 'b> = ChartContext<'a, SVGBackend<'b>, Cartesian2d<Axis, Axis>>;
type DrawResult = Result<(), plotters::drawing::DrawingAreaErrorKind<std::io::Error>>;

fn draw(area: &Area<'_>, x: &Axis, y: &Axis, layers: &[Layer]) -> DrawResult {
    let unit = FINENESS;
    let mut chart = ChartBuilder::on(area)
        .margin(4 * unit)
        .margin_right(14 * unit)
        .x_label_area_size(40 * unit)
        .y_label_area_size(64 * unit)
        .build_cartesian_2d(x.clone(), y.clone())?;
    chart
        .configure_mesh()
        .bold_line_style(stroke(GRID, 0.75))
        .light_line_style(TRANSPARENT)
        .axis_style(stroke(INK, 0.75))
        .x_desc(x.label.as_str())
        .y_desc(y.label.as_str())
        .axis_desc_style(("sans-serif", 15 * unit))
        .label_style(("sans-serif", 14 * unit))
        .x_label_formatter(&|place| x.text(*place))
        .y_label_formatter(&|place| y.text(*place))
        .draw()?;
    for layer in layers {
        draw_layer(&mut chart, layer)?;
    }
    Ok(())
}

fn draw_layer(chart: &mut Chart<'_, '_>, layer: &Layer) -> DrawResult {
    let unit = FINENESS;
    match layer {
        Layer::Readings(points) => {
            chart.draw_series(points.iter().map(|&point| Circle::new(point, 2 * unit - 1, stroke(INK, 0.75))))?;
        }
        Layer::LeftOut(points) => {
            chart.draw_series(points.iter().map(|&point| Cross::new(point, 3 * unit, stroke(INK, 1.25))))?;
        }
        Layer::Bars(bars) => {
            chart.draw_series(bars.iter().map(|&(x, low, _, high)| PathElement::new([(x, low), (x, high)], stroke(INK, 1.0))))?;
            chart.draw_series(bars.iter().map(|&(x, _, value, _)| Circle::new((x, value), 2 * unit + 2, WHITE.filled())))?;
            chart.draw_series(bars.iter().map(|&(x, _, value, _)| Circle::new((x, value), 2 * unit + 2, stroke(INK, 1.0))))?;
        }
        Layer::Fit(points) => {
            chart.draw_series(LineSeries::new(points.iter().copied(), stroke(ACCENT, 1.25)))?;
        }
        Layer::Reference(points) => {
            chart.draw_series(DashedLineSeries::new(points.iter().copied(), 6 * unit, 4 * unit, stroke(INK, 1.0)))?;
        }
    }
    Ok(())
}

/// A line of a width in CSS px.
fn stroke(colour: RGBColor, width_px: f64) -> ShapeStyle {
    #[expect(clippy::cast_possible_truncation, clippy::cast_sign_loss, reason = "widths here are constants between 0 and 2 CSS px")]
    let width = (width_px * f64::from(FINENESS)).round() as u32;
    colour.stroke_width(width)
}

/// A range with 6 % to spare at both ends; a range of no width, or not finite, becomes one of some width.
fn widened(low: f64, high: f64) -> (f64, f64) {
    if !(low.is_finite() && high.is_finite()) {
        return (0.0, 1.0);
    }
    let width = (high - low).max(1e-9 * high.abs().max(low.abs())).max(f64::MIN_POSITIVE.sqrt());
    (low - 0.06 * width, high + 0.06 * width)
}

/// The smallest of 1, 2, 5 times a power of ten that is not below `raw`.
fn round_step(raw: f64) -> f64 {
    let power = 10f64.powf(raw.log10().floor());
    [1.0, 2.0, 5.0].map(|m| m * power).into_iter().find(|&step| step >= raw * (1.0 - 1e-9)).unwrap_or(10.0 * power)
}

fn multiples(low: f64, high: f64, step: f64) -> Vec<f64> {
    let first = (low / step).ceil();
    (0..64u32).map(|i| (first + f64::from(i)) * step).take_while(|&tick| tick <= high).collect()
}

/// 1, 2 and 5 times the powers of ten between two positive values.
fn one_two_five(low: f64, high: f64) -> Vec<f64> {
    let first = low.log10().floor();
    (0..20u32)
        .map(|i| 10f64.powf(first + f64::from(i)))
        .take_while(|&power| power <= high)
        .flat_map(|power| [1.0, 2.0, 5.0].map(|m| m * power))
        .filter(|&value| value >= low && value <= high)
        .collect()
}

/// The decimals that show a step of 1, 2 or 5 times a power of ten.
fn decimals_of(step: f64) -> usize {
    (0..12usize).find(|&d| step >= 10f64.powi(-i32::try_from(d).unwrap_or(0)) * (1.0 - 1e-9)).unwrap_or(12)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ticks_are_round_and_few() {
        let axis = Axis::tight("time, s", 0.0, 30.0, 8);
        assert_eq!(axis.ticks, [0.0, 5.0, 10.0, 15.0, 20.0, 25.0, 30.0]);
        assert_eq!(axis.text(5.0), "5");
        let axis = Axis::linear("x, mm", -0.031, 0.029, 6);
        assert_eq!(axis.ticks.iter().map(|&t| axis.text(t)).collect::<Vec<_>>(), ["−0.03", "−0.02", "−0.01", "0.00", "0.01", "0.02", "0.03"]);
    }

    #[test]
    fn a_logarithmic_axis_has_ticks_within_less_than_a_decade() {
        let wide = Axis::logarithmic("amplitude, mm", 0.9, 120.0);
        assert_eq!(wide.ticks.iter().map(|&t| wide.text(t)).collect::<Vec<_>>(), ["1", "2", "5", "10", "20", "50", "100"]);
        let narrow = Axis::logarithmic("amplitude, mm", 71.0, 84.0);
        assert!(narrow.ticks.len() >= 3, "{:?}", narrow.ticks);
        assert_eq!(narrow.text(narrow.ticks[0]), "75", "{:?}", narrow);
    }

    #[test]
    fn a_plot_names_no_font_file_and_keeps_its_words() {
        let axis = Axis::linear("x, mm", -1.0, 1.0, 4);
        let svg = plot("plot", 200, &axis, &axis, &[Layer::Readings(vec![(0.0, 0.5)])]).unwrap();
        assert!(svg.starts_with("<svg class=\"plot\" role=\"img\""), "{svg}");
        assert!(svg.contains("x, mm") && svg.contains("sans-serif"));
        assert!(svg.trim_end().ends_with("</svg>"));
    }
}
