//! A part of the record in time: the whole of it, or the first cycles.

use std::f64::consts::TAU;
use std::ops::Range;

use crate::measurement::Measurement;
use crate::motion::MotionFit;

/// Cycles in a close view.
const CLOSE_CYCLES: f64 = 4.0;
/// With fewer cycles than this a close view shows no more than the whole record does.
const CYCLES_WORTH_A_CLOSE_VIEW: f64 = 8.0;

/// From one time to another, both in s and both inside.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Span {
    /// First time, s.
    pub(super) start_s: f64,
    /// Last time, s.
    pub(super) end_s: f64,
}

impl Span {
    /// From the first to the last row of the record, used or not; 0…1 s for an empty one.
    pub(super) fn whole(measurement: &Measurement) -> Self {
        let start_s = measurement.rows.first().map_or(0.0, |row| row.t_s);
        let end_s = measurement.rows.last().map_or(1.0, |row| row.t_s);
        Self { start_s, end_s }
    }

    /// Whether a time lies inside.
    pub(super) fn holds(self, t_s: f64) -> bool {
        t_s >= self.start_s && t_s <= self.end_s
    }

    /// The times inside, as a range of a list in order of time.
    pub(super) fn range_in(self, t_s: &[f64]) -> Range<usize> {
        let start = t_s.partition_point(|&t| t < self.start_s);
        start..t_s.partition_point(|&t| t <= self.end_s).max(start)
    }
}

/// The fitted period, s.
pub(super) fn period_s(fit: &MotionFit) -> f64 {
    TAU / fit.damped_angular_frequency_rad_per_s
}

/// The first four cycles of the fit; `None` where the record has fewer than eight.
pub(super) fn first_cycles(fit: &MotionFit) -> Option<Span> {
    let n_cycles = (fit.t_end_s - fit.t_ref_s) / period_s(fit);
    (n_cycles >= CYCLES_WORTH_A_CLOSE_VIEW).then(|| Span {
        start_s: fit.t_ref_s,
        end_s: fit.t_ref_s + CLOSE_CYCLES * period_s(fit),
    })
}
