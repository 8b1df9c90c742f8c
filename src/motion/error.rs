//! Why a record gives no motion.

use super::least_squares::LeastSquaresError;

/// Why a record of positions cannot be measured: what is wrong, where, and what to do.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
pub enum MotionError {
    /// Fewer positions than the fit and its scatter need.
    #[error(
        "only {n_positions} positions to fit: at least {n_needed} are needed; film longer or find the marker in more frames"
    )]
    TooFewPositions {
        /// Positions there are.
        n_positions: usize,
        /// Positions needed.
        n_needed: usize,
    },
    /// A value that is not a finite number.
    #[error("{quantity} of position {row} is not a finite number; correct or remove that row")]
    NotFinite {
        /// Which of the four: `time`, `uncertainty of the time`, `position`, `uncertainty of the position`.
        quantity: &'static str,
        /// Position counted from 1.
        row: usize,
    },
    /// A standard uncertainty below zero, or of zero where others are not.
    #[error(
        "{quantity} of position {row} is {value:e}, which cannot serve as a weight; give a figure above zero, or zero for every position"
    )]
    UnusableUncertainty {
        /// `uncertainty of the time` or `uncertainty of the position`.
        quantity: &'static str,
        /// Position counted from 1.
        row: usize,
        /// The value.
        value: f64,
    },
    /// Times that do not grow.
    #[error(
        "the time of position {row}, {t_s} s, is not later than the one before it, {previous_s} s; sort the rows by time and remove repeated ones"
    )]
    TimeNotIncreasing {
        /// Position counted from 1.
        row: usize,
        /// Its time, s.
        t_s: f64,
        /// The time before it, s.
        previous_s: f64,
    },
    /// Times or positions of a size no experiment has.
    #[error(
        "{quantity} span {span:e} {unit}, which no record of a motion does; check the units of the table"
    )]
    AbsurdSpan {
        /// `the times` or `the positions`.
        quantity: &'static str,
        /// From the least to the greatest.
        span: f64,
        /// Unit of the span.
        unit: &'static str,
    },
    /// The amplitude does not stand out of the noise.
    #[error(
        "no motion found: the best amplitude is {amplitude_m:.2e} m where the readings scatter by {noise_m:.2e} m; check that the marker is on the moving part"
    )]
    NoMotion {
        /// Amplitude of the best sinusoid, m.
        amplitude_m: f64,
        /// Scatter about it, m.
        noise_m: f64,
    },
    /// It moves, but not to and fro.
    #[error(
        "the marker moves, but does not oscillate: what a damped sinusoid leaves over is {residual_m:.2e} m against an amplitude of {amplitude_m:.2e} m; cut the record to the free oscillation"
    )]
    NoOscillation {
        /// Amplitude of the best sinusoid, m.
        amplitude_m: f64,
        /// Root mean square of what is left over, m.
        residual_m: f64,
    },
    /// Less than one and a half cycles.
    #[error(
        "the record holds {cycles:.2} cycles of a motion of period {period_s:.3} s, and at least {cycles_needed} are needed; film for {duration_needed_s:.1} s or more"
    )]
    TooShort {
        /// Cycles there are.
        cycles: f64,
        /// Cycles needed.
        cycles_needed: f64,
        /// The period as far as it can be told, s.
        period_s: f64,
        /// Length of record needed, s.
        duration_needed_s: f64,
    },
    /// Too few readings a cycle: the frequency could be another one.
    #[error(
        "the motion shows at {frequency_hz:.3} Hz, too near half the rate of {rate_hz:.3} readings a second to be told from a faster one; film at {rate_needed_hz:.0} Hz or more"
    )]
    AboveNyquist {
        /// Frequency found, Hz.
        frequency_hz: f64,
        /// Readings a second.
        rate_hz: f64,
        /// Readings a second that would do, if the frequency is the true one.
        rate_needed_hz: f64,
    },
    /// More than a third of the positions do not belong to the motion.
    #[error(
        "{n_outliers} of {n_positions} positions lie off the motion, more than a third; check the marker's box and the record's limits"
    )]
    TooManyOutliers {
        /// Positions off the motion.
        n_outliers: usize,
        /// Positions there are.
        n_positions: usize,
    },
    /// The fit did not settle.
    #[error("no damped sinusoid could be fitted; cut the record to the free oscillation")]
    NotFitted(#[from] LeastSquaresError),
}
