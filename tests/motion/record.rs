//! Invented records with a known motion.

use ebbmark::motion::PositionRecord;
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};
use std::f64::consts::TAU;

/// A known damped sinusoid.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Truth {
    pub(crate) amplitude_m: f64,
    pub(crate) phase_rad: f64,
    pub(crate) decay_rate_per_s: f64,
    pub(crate) omega_rad_per_s: f64,
    pub(crate) centre_m: f64,
}

impl Truth {
    /// Period 1.2 s, amplitude 0.1 m, damping ratio `zeta`.
    pub(crate) fn rail(zeta: f64) -> Self {
        let omega_rad_per_s = TAU / 1.2;
        let decay_rate_per_s = omega_rad_per_s * zeta / (1.0 - zeta * zeta).sqrt();
        Self {
            amplitude_m: 0.1,
            phase_rad: 0.3,
            decay_rate_per_s,
            omega_rad_per_s,
            centre_m: 0.02,
        }
    }
    pub(crate) fn position_m(&self, t_s: f64) -> f64 {
        self.centre_m
            + self.amplitude_m
                * (-self.decay_rate_per_s * t_s).exp()
                * (self.omega_rad_per_s * t_s + self.phase_rad).cos()
    }
    pub(crate) fn period_s(&self) -> f64 {
        TAU / self.omega_rad_per_s
    }
    /// Positions at t = i/rate plus an error each.
    pub(crate) fn record(&self, rate_hz: f64, errors_m: &[f64]) -> Vec<PositionRecord> {
        let position = |(i, e): (usize, &f64)| {
            let t_s = i as f64 / rate_hz;
            PositionRecord {
                t_s,
                u_t_s: 0.0,
                x_m: self.position_m(t_s) + e,
                u_x_m: 1e-4,
            }
        };
        errors_m.iter().enumerate().map(position).collect()
    }
}

/// Gaussian errors of standard deviation `sigma` whose neighbours correlate by `lag1` (0 for white), the same for a seed everywhere.
pub(crate) fn errors(n: usize, sigma: f64, lag1: f64, seed: u64) -> Vec<f64> {
    let mut rng = ChaCha8Rng::seed_from_u64(seed);
    let mut gauss = || -> f64 { StandardNormal.sample(&mut rng) };
    let mut last = gauss();
    let fresh = (1.0 - lag1 * lag1).sqrt();
    (0..n)
        .map(|_| {
            last = lag1 * last + fresh * gauss();
            sigma * last
        })
        .collect()
}
