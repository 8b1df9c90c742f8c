//! When a record is refused: noise, motion that is no oscillation, too few cycles, too few readings a cycle.

use super::MotionError;
use super::guess::Guess;
use super::readings::Readings;
use std::f64::consts::TAU;

/// Fewest cycles from which period, decay and centre can be told apart.
pub const MIN_CYCLES: f64 = 1.5;
/// Fewest readings a cycle: two leave the frequency and its mirror above half the rate alike.
const MIN_READINGS_PER_CYCLE: f64 = 2.2;
/// Readings a cycle to ask for where there were too few.
const READINGS_PER_CYCLE_WANTED: f64 = 5.0;
/// Starts tried by the scan for each reading, about: frequencies times decay rates.
const TRIALS_PER_READING: f64 = 10.0;
/// Chance that noise alone passes for a motion.
const FALSE_MOTION: f64 = 1e-3;

pub(super) fn dense_enough(interval_s: f64, frequency_hz: f64) -> Result<(), MotionError> {
    let rate_hz = 1.0 / interval_s;
    if frequency_hz * MIN_READINGS_PER_CYCLE > rate_hz {
        return Err(MotionError::AboveNyquist {
            frequency_hz,
            rate_hz,
            rate_needed_hz: (READINGS_PER_CYCLE_WANTED * frequency_hz).ceil(),
        });
    }
    Ok(())
}

pub(super) fn long_enough(span_s: f64, frequency_hz: f64) -> Result<(), MotionError> {
    let cycles = span_s * frequency_hz;
    if cycles < MIN_CYCLES {
        let period_s = 1.0 / frequency_hz;
        return Err(MotionError::TooShort {
            cycles,
            cycles_needed: MIN_CYCLES,
            period_s,
            duration_needed_s: MIN_CYCLES * period_s,
        });
    }
    Ok(())
}

/// Does the best of all starts leave less of the sum of squares than pure noise lets it once in 1/[`FALSE_MOTION`] records?
///
/// One start leaves a part of at most q in a record of n independent readings with probability q^((n − 3)/2), two of them spent on A and φ
/// and one on c; (n − 5)/2 also pays for the refinement of γ and ω.
pub(super) fn stands_out(left: f64, n_readings: usize, n_effective: f64) -> bool {
    let trials = TRIALS_PER_READING * n_readings as f64;
    0.5 * (n_effective - 5.0).max(1.0) * -left.ln() > (trials / FALSE_MOTION).ln()
}

/// What to say where the fit itself failed: noise, too short a record and too low a rate are the usual causes, and the scan knows them.
pub(super) fn why_not_fitted(
    readings: &Readings,
    starts: &[Guess],
    error: MotionError,
) -> MotionError {
    let n = readings.len() as f64;
    let Some(best) = starts.first() else {
        return MotionError::NoMotion {
            amplitude_m: 0.0,
            noise_m: 0.0,
        };
    };
    if !matches!(error, MotionError::NotFitted(_)) {
        return error;
    }
    if !stands_out(1.0 - best.explained, readings.len(), n) {
        let left: f64 = readings
            .tau_s
            .iter()
            .zip(&readings.x_m)
            .map(|(tau, x)| (x - best.sinusoid.position_m(*tau)).powi(2))
            .sum();
        return MotionError::NoMotion {
            amplitude_m: best.sinusoid.amplitude_m,
            noise_m: (left / n).sqrt(),
        };
    }
    let frequency_hz = best.sinusoid.omega_rad_per_s / TAU;
    long_enough(readings.span_s(), frequency_hz)
        .and_then(|()| dense_enough(readings.interval_s(), frequency_hz))
        .err()
        .unwrap_or(error)
}
