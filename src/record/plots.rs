//! The plots of the report: what each one shows. How it is drawn is [`canvas`](super::canvas)'s business.

use super::axis::Axis;
use super::canvas::{Layer, plot};
use super::error::RecordError;
use super::stretch::{Span, first_cycles, period_s};
use super::tables::cycle_energy;
use super::thin::{Point, thinned};
use crate::measurement::{Measurement, RecordRow, RowStatus};
use crate::motion::{Cycle, MotionFit};

/// Readings of a long record that are drawn at least, and the shares of it whose extremes are drawn besides.
const DRAWN_READINGS: usize = 1200;
const EXTREMES: usize = 150;
/// Points of the fitted curve in a cycle, and the most that are drawn in all.
const CURVE_POINTS_PER_CYCLE: f64 = 32.0;
const MAX_CURVE_POINTS: f64 = 6000.0;
const MM_PER_M: f64 = 1e3;
const TIME_LABEL: &str = "time, s";
const TIME_TICKS: u32 = 10;

fn drawn(points: &[Point]) -> Vec<Point> {
    thinned(points, DRAWN_READINGS, EXTREMES)
}

fn time_axis(span: Span) -> Axis {
    Axis::tight(TIME_LABEL, span.start_s, span.end_s, TIME_TICKS)
}

/// x(t) over the whole record, readings and fit.
pub(super) fn motion(measurement: &Measurement) -> Result<String, RecordError> {
    position_plot(measurement, Span::whole(measurement))
}

/// The first cycles alone, where the whole record is too dense to see a reading; `None` where it is not.
pub(super) fn motion_close(measurement: &Measurement) -> Result<Option<String>, RecordError> {
    first_cycles(&measurement.fit)
        .map(|span| position_plot(measurement, span))
        .transpose()
}

fn position_plot(measurement: &Measurement, span: Span) -> Result<String, RecordError> {
    let readings = readings(measurement, span, RowStatus::Used, |row| row.x_m);
    let left_out = readings_left_out(measurement, span, |row| row.x_m);
    let curve = curve(&measurement.fit, span);
    let (low, high) = range_of(
        readings
            .iter()
            .chain(&curve)
            .chain(&left_out)
            .map(|point| point.1),
    );
    let layers = [
        Layer::Readings(drawn(&readings)),
        Layer::LeftOut(drawn(&left_out)),
        Layer::Fit(curve),
    ];
    plot(
        "plot of position",
        250,
        &time_axis(span),
        &Axis::linear("position x, mm", low, high, 6),
        &layers,
    )
}

/// Observed minus fitted over the whole record; readings left out stand at the edge where they lie beyond it.
pub(super) fn residuals(measurement: &Measurement) -> Result<String, RecordError> {
    let span = Span::whole(measurement);
    let used = readings(measurement, span, RowStatus::Used, |row| row.residual_m);
    let (low, high) = range_of(used.iter().map(|point| point.1));
    let left_out: Vec<Point> = readings_left_out(measurement, span, |row| row.residual_m)
        .into_iter()
        .map(|(t_s, mm)| (t_s, mm.max(low).min(high)))
        .collect();
    let zero = vec![(span.start_s, 0.0), (span.end_s, 0.0)];
    let layers = [
        Layer::Readings(drawn(&used)),
        Layer::LeftOut(drawn(&left_out)),
        Layer::Fit(zero),
    ];
    plot(
        "plot of residuals",
        170,
        &time_axis(span),
        &Axis::linear("residual, mm", low.min(0.0), high.max(0.0), 6),
        &layers,
    )
}

/// Amplitude of each cycle with its 95 % bar on a logarithmic axis, and the fitted A e^(−γt); `None` without amplitudes.
pub(super) fn envelope(measurement: &Measurement) -> Result<Option<String>, RecordError> {
    let span = Span::whole(measurement);
    let bars: Vec<_> = measurement
        .cycles
        .iter()
        .filter_map(|cycle| {
            let mm = cycle.amplitude_m? * MM_PER_M;
            let expanded = 2.0 * cycle.u_amplitude_m.unwrap_or(0.0) * MM_PER_M;
            // A bar that reaches 0 has no place on a logarithmic axis; it is cut at a tenth of the amplitude.
            (mm > 0.0).then(|| {
                (
                    middle_s(cycle),
                    (mm - expanded).max(0.1 * mm),
                    mm,
                    mm + expanded,
                )
            })
        })
        .collect();
    if bars.is_empty() {
        return Ok(None);
    }
    let fit = &measurement.fit;
    let line: Vec<Point> = [fit.t_ref_s, fit.t_end_s]
        .map(|t_s| (t_s, fit.envelope_m(t_s) * MM_PER_M))
        .to_vec();
    let (low, high) = range_of(
        bars.iter()
            .flat_map(|bar| [bar.1, bar.3])
            .chain(line.iter().map(|point| point.1)),
    );
    let y = Axis::logarithmic("amplitude, mm (log)", low, high);
    plot(
        "plot of the amplitude",
        220,
        &time_axis(span),
        &y,
        &[Layer::Bars(bars), Layer::Fit(line)],
    )
    .map(Some)
}

/// Energy of each cycle, J where a mass is known, else its ratio to the cycle before, with 95 % bars; `None` without any.
pub(super) fn energy(measurement: &Measurement) -> Result<Option<String>, RecordError> {
    let span = Span::whole(measurement);
    let fit = &measurement.fit;
    let (bars, line, label) = match &measurement.energy {
        Some(energy) => {
            let bars = bars(&measurement.cycles, 1e3, |cycle| {
                cycle_energy(cycle, energy)
            });
            let stiffness = energy.stiffness.value.unwrap_or(0.0);
            let at = |t_s: f64| (t_s, 1e3 * 0.5 * stiffness * fit.envelope_m(t_s).powi(2));
            let line = (0..=60u32)
                .map(|i| at(fit.t_ref_s + (fit.t_end_s - fit.t_ref_s) * f64::from(i) / 60.0))
                .collect();
            (bars, line, "energy, mJ")
        }
        None => {
            let bars = bars(&measurement.cycles, 1.0, |cycle| {
                (cycle.energy_ratio, cycle.u_energy_ratio)
            });
            let ratio = (-2.0 * fit.decay_rate_per_s * period_s(fit)).exp();
            (
                bars,
                vec![(fit.t_ref_s, ratio), (fit.t_end_s, ratio)],
                "energy / cycle before",
            )
        }
    };
    if bars.is_empty() {
        return Ok(None);
    }
    let (low, high) = range_of(
        bars.iter()
            .flat_map(|bar| [bar.1, bar.3])
            .chain(line.iter().map(|point: &Point| point.1)),
    );
    plot(
        "plot of the energy",
        200,
        &time_axis(span),
        &Axis::linear(label, low, high, 5),
        &[Layer::Bars(bars), Layer::Fit(line)],
    )
    .map(Some)
}

fn bars(
    cycles: &[Cycle],
    factor: f64,
    value_of: impl Fn(&Cycle) -> (Option<f64>, Option<f64>),
) -> Vec<(f64, f64, f64, f64)> {
    cycles
        .iter()
        .filter_map(|cycle| {
            let (value, u) = value_of(cycle);
            let (value, expanded) = (value? * factor, 2.0 * u.unwrap_or(0.0) * factor);
            Some((middle_s(cycle), value - expanded, value, value + expanded))
        })
        .collect()
}

fn middle_s(cycle: &Cycle) -> f64 {
    cycle.start_s + 0.5 * cycle.period_crossings_s
}

/// Readings of one status as points in s and mm.
fn readings(
    measurement: &Measurement,
    span: Span,
    status: RowStatus,
    value_m: impl Fn(&RecordRow) -> Option<f64>,
) -> Vec<Point> {
    let rows = measurement
        .rows
        .iter()
        .filter(|row| row.status == status && span.holds(row.t_s));
    rows.filter_map(|row| Some((row.t_s, value_m(row)? * MM_PER_M)))
        .collect()
}

fn readings_left_out(
    measurement: &Measurement,
    span: Span,
    value_m: impl Fn(&RecordRow) -> Option<f64>,
) -> Vec<Point> {
    readings(measurement, span, RowStatus::Outlier, value_m)
}

/// The fitted curve where the fit holds, in s and mm.
fn curve(fit: &MotionFit, span: Span) -> Vec<Point> {
    let (start_s, end_s) = (span.start_s.max(fit.t_ref_s), span.end_s.min(fit.t_end_s));
    let wanted =
        ((end_s - start_s) / period_s(fit) * CURVE_POINTS_PER_CYCLE).clamp(2.0, MAX_CURVE_POINTS);
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "clamped to 2…6000 on the line above"
    )]
    let n = wanted as u32;
    (0..=n)
        .map(|i| start_s + (end_s - start_s) * f64::from(i) / f64::from(n))
        .map(|t_s| (t_s, fit.position_m(t_s) * MM_PER_M))
        .collect()
}

/// The smallest and the largest of the finite values; −1…1 of none.
fn range_of(values: impl Iterator<Item = f64>) -> (f64, f64) {
    let finite = values.filter(|value| value.is_finite());
    let ends = finite.fold(None, |ends: Option<(f64, f64)>, v| {
        Some(ends.map_or((v, v), |(low, high)| (low.min(v), high.max(v))))
    });
    ends.unwrap_or((-1.0, 1.0))
}
