//! A plot as SVG text: axes with round ticks, and layers of lines, readings and bars over them.
//!
//! The plotting crate places everything on whole pixels, so the canvas is four times as large as the figure on the page and
//! the root element scales it down; fonts are named by kind, never by file.

use plotters::chart::ChartContext;
use plotters::coord::Shift;
use plotters::prelude::{
    Cartesian2d, ChartBuilder, Circle, Cross, DrawingArea, IntoDrawingArea as _, LineSeries,
    PathElement, RGBColor, SVGBackend,
};
use plotters::style::{Color as _, ShapeStyle, TRANSPARENT, WHITE};

use super::axis::Axis;
use super::error::RecordError;
use super::thin::Point;

/// Canvas pixels in a CSS pixel.
const FINENESS: u32 = 4;
const WIDTH: u32 = 720 * FINENESS;
/// Readings above which a layer is drawn as dots.
const DENSE: usize = 600;
const INK: RGBColor = RGBColor(28, 36, 48);
const GRID: RGBColor = RGBColor(224, 227, 231);
const ACCENT: RGBColor = RGBColor(154, 52, 18);

/// What is drawn over the axes, in order.
#[derive(Clone, Debug)]
pub(super) enum Layer {
    /// Readings: small open circles, dots where they are dense.
    Readings(Vec<Point>),
    /// Readings that were left out: crosses.
    LeftOut(Vec<Point>),
    /// Readings with a vertical bar: time, low end, value, high end.
    Bars(Vec<(f64, f64, f64, f64)>),
    /// The fit: a solid line in the accent colour.
    Fit(Vec<Point>),
}

/// A plot as an `<svg>` element with `title` and `description` for those who cannot see it.
///
/// `height` in CSS px; the width is that of the page.
pub(super) fn plot(
    part: &'static str,
    height: u32,
    x: &Axis,
    y: &Axis,
    layers: &[Layer],
) -> Result<String, RecordError> {
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
    format!(
        "<svg class=\"plot\" role=\"img\" viewBox=\"0 0 {WIDTH} {height}\" xmlns=\"http://www.w3.org/2000/svg\">{}",
        compact.replace(" opacity=\"1\"", "")
    )
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
        .x_desc(x.label())
        .y_desc(y.label())
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
            // Open circles let the fit show through; in a dense record they would run together, so they become dots.
            let (radius, style) = if points.len() > DENSE {
                (unit, INK.filled())
            } else {
                (2 * unit - 1, stroke(INK, 0.75))
            };
            chart.draw_series(
                points
                    .iter()
                    .map(|&point| Circle::new(point, radius, style)),
            )?;
        }
        Layer::LeftOut(points) => {
            chart.draw_series(
                points
                    .iter()
                    .map(|&point| Cross::new(point, 3 * unit, stroke(INK, 1.25))),
            )?;
        }
        Layer::Bars(bars) => {
            chart.draw_series(bars.iter().map(|&(x, low, _, high)| {
                PathElement::new([(x, low), (x, high)], stroke(INK, 1.0))
            }))?;
            chart
                .draw_series(bars.iter().map(|&(x, _, value, _)| {
                    Circle::new((x, value), 2 * unit + 2, WHITE.filled())
                }))?;
            chart.draw_series(bars.iter().map(|&(x, _, value, _)| {
                Circle::new((x, value), 2 * unit + 2, stroke(INK, 1.0))
            }))?;
        }
        Layer::Fit(points) => {
            chart.draw_series(LineSeries::new(
                points.iter().copied(),
                stroke(ACCENT, 1.25),
            ))?;
        }
    }
    Ok(())
}

/// A line of a width in CSS px.
fn stroke(colour: RGBColor, width_px: f64) -> ShapeStyle {
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "widths here are constants between 0 and 2 CSS px"
    )]
    let width = (width_px * f64::from(FINENESS)).round() as u32;
    colour.stroke_width(width)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_plot_names_no_font_file_and_keeps_its_words() {
        let axis = Axis::linear("x, mm", -1.0, 1.0, 4);
        let svg = plot(
            "plot",
            200,
            &axis,
            &axis,
            &[Layer::Readings(vec![(0.0, 0.5)])],
        )
        .unwrap();
        assert!(svg.starts_with("<svg class=\"plot\" role=\"img\""), "{svg}");
        assert!(svg.contains("x, mm") && svg.contains("sans-serif"));
        assert!(svg.trim_end().ends_with("</svg>"));
    }
}
