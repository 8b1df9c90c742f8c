//! The equation of motion as numbers: what the scene gives, and what follows from it at once.
use std::f64::consts::TAU;

use super::scene::Scene;

/// A turn of the motion: the speed is zero there.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TurningPoint {
    /// When, s.
    pub t_s: f64,
    /// Where, m, centre included.
    pub x_m: f64,
}

/// Coefficients of the equation of motion, derived once.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Coefficients {
    /// ω₀, rad/s.
    pub(super) omega_0_rad_per_s: f64,
    /// γ = ζ ω₀, 1/s.
    pub(super) gamma_per_s: f64,
    /// ω_d = ω₀ √(1 − ζ²), rad/s.
    pub(super) omega_d_rad_per_s: f64,
    /// F/k, m.
    pub(super) dry_step_m: f64,
    /// β, 1/m.
    pub(super) drag_per_m: f64,
    /// κ, 1/m².
    pub(super) stiffening_per_m2: f64,
}

impl Coefficients {
    pub(super) fn new(scene: &Scene) -> Self {
        let motion = &scene.motion;
        let omega_0_rad_per_s = TAU / motion.period_s;
        Self {
            omega_0_rad_per_s,
            gamma_per_s: motion.damping_ratio * omega_0_rad_per_s,
            omega_d_rad_per_s: omega_0_rad_per_s * (1.0 - motion.damping_ratio.powi(2)).sqrt(),
            dry_step_m: motion.dry_step_m,
            drag_per_m: motion.drag_per_m,
            stiffening_per_m2: motion.stiffening_per_m2,
        }
    }

    /// Position (m from c) and velocity (m/s) of the damped sinusoid at t = 0.
    pub(super) fn start(&self, amplitude_m: f64, phase_rad: f64) -> (f64, f64) {
        let (sin, cos) = phase_rad.sin_cos();
        (
            amplitude_m * cos,
            -amplitude_m * (self.gamma_per_s * cos + self.omega_d_rad_per_s * sin),
        )
    }
}
