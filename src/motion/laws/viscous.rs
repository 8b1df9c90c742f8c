//! Viscous loss: x(τ) = A e^(−γτ) cos(ωτ + φ) + c; with γ held at 0, no loss.

use super::{Law, LawFit, Weighted};
use crate::motion::least_squares::{LeastSquaresError, Residuals, minimise, refine};
use crate::motion::readings::Readings;
use nalgebra::DMatrix;

/// The law's row in the table.
pub(super) const LAW: Law = Law {
    key: "viscous",
    described: "with viscous loss",
    nested_in: None,
    fit: |weighted| fit(weighted, None),
};

/// The five parameters of the damped sinusoid, at τ = 0 the first reading.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(in crate::motion) struct Sinusoid {
    /// A, m.
    pub(in crate::motion) amplitude_m: f64,
    /// φ, rad.
    pub(in crate::motion) phase_rad: f64,
    /// γ, s⁻¹.
    pub(in crate::motion) decay_rate_per_s: f64,
    /// ω, rad/s.
    pub(in crate::motion) omega_rad_per_s: f64,
    /// c, m, from the readings' origin.
    pub(in crate::motion) centre_m: f64,
}

impl Sinusoid {
    /// From (A, φ, γ, ω, c), brought to A ≥ 0, ω ≥ 0 and φ in (−π, π].
    pub(in crate::motion) fn from_parameters(p: [f64; 5]) -> Self {
        let [
            mut amplitude_m,
            mut phase_rad,
            decay_rate_per_s,
            mut omega_rad_per_s,
            centre_m,
        ] = p;
        if omega_rad_per_s < 0.0 {
            (omega_rad_per_s, phase_rad) = (-omega_rad_per_s, -phase_rad);
        }
        if amplitude_m < 0.0 {
            (amplitude_m, phase_rad) = (-amplitude_m, phase_rad + std::f64::consts::PI);
        }
        let turn = std::f64::consts::TAU;
        phase_rad -= turn * ((phase_rad - std::f64::consts::PI) / turn).ceil();
        Self {
            amplitude_m,
            phase_rad,
            decay_rate_per_s,
            omega_rad_per_s,
            centre_m,
        }
    }
    /// (A, φ, γ, ω, c).
    pub(in crate::motion) fn parameters(&self) -> [f64; 5] {
        [
            self.amplitude_m,
            self.phase_rad,
            self.decay_rate_per_s,
            self.omega_rad_per_s,
            self.centre_m,
        ]
    }
    /// The same motion with τ counted from `shift_s` later.
    pub(in crate::motion) fn from_later(&self, shift_s: f64) -> Self {
        let [a, phi, gamma, omega, c] = self.parameters();
        Self::from_parameters([
            a * (-gamma * shift_s).exp(),
            phi + omega * shift_s,
            gamma,
            omega,
            c,
        ])
    }
    /// Position at τ, m.
    pub(in crate::motion) fn position_m(&self, tau_s: f64) -> f64 {
        let envelope = self.amplitude_m * (-self.decay_rate_per_s * tau_s).exp();
        self.centre_m + envelope * (self.omega_rad_per_s * tau_s + self.phase_rad).cos()
    }
    /// Velocity at τ, m/s.
    pub(in crate::motion) fn velocity_m_per_s(&self, tau_s: f64) -> f64 {
        let envelope = self.amplitude_m * (-self.decay_rate_per_s * tau_s).exp();
        let (sin, cos) = (self.omega_rad_per_s * tau_s + self.phase_rad).sin_cos();
        -envelope * (self.decay_rate_per_s * cos + self.omega_rad_per_s * sin)
    }
    /// Standard uncertainty of each reading: √(u_x² + (v u_t)²), m.
    pub(in crate::motion) fn sigma_m(&self, readings: &Readings) -> Vec<f64> {
        let u = readings
            .u_x_m
            .iter()
            .zip(&readings.u_t_s)
            .zip(&readings.tau_s);
        u.map(|((u_x, u_t), tau)| {
            if *u_t > 0.0 {
                u_x.hypot(self.velocity_m_per_s(*tau) * u_t)
            } else {
                *u_x
            }
        })
        .collect()
    }
    /// Steps that matter for each parameter: parts of the amplitude, a radian, and a radian over the record.
    pub(in crate::motion) fn scale(&self, span_s: f64) -> [f64; 5] {
        [
            self.amplitude_m,
            1.0,
            1.0 / span_s,
            1.0 / span_s,
            self.amplitude_m,
        ]
    }
}

/// Fits the sinusoid, with γ free or held, starting from the weighted readings' own.
pub(super) fn fit(
    weighted: &Weighted,
    held_decay_rate_per_s: Option<f64>,
) -> Result<LawFit, LeastSquaresError> {
    let Weighted {
        readings,
        weight_per_m,
        start,
        enlargement,
        ..
    } = *weighted;
    let problem = SinusoidProblem {
        readings,
        weight_per_m,
        held_decay_rate_per_s,
    };
    let mut from = start.parameters();
    if let Some(gamma) = held_decay_rate_per_s {
        // The mean amplitude of the record, not the first: the best undamped sinusoid runs through its middle.
        from[0] *= (-0.5 * (start.decay_rate_per_s - gamma) * readings.span_s()).exp();
    }
    let scale = problem.free_parameters(start.scale(readings.span_s()));
    let free = problem.free_parameters(from);
    let solution = refine(&problem, &free).or_else(|_| minimise(&problem, &free, Some(&scale)))?;
    let fitted = Sinusoid::from_parameters(problem.all_parameters(&solution.parameters));
    let mut u = solution
        .standard_uncertainties()
        .into_iter()
        .map(|u| u * enlargement.sqrt());
    let [amplitude, phase, gamma, omega, centre] = fitted.parameters();
    let mut row =
        |key, value, held: bool, unit| (key, value, if held { None } else { u.next() }, unit);
    let parameters = vec![
        row("amplitude", amplitude, false, "m"),
        row("phase", phase, false, "rad"),
        row("decay_rate", gamma, held_decay_rate_per_s.is_some(), "s-1"),
        row("damped_angular_frequency", omega, false, "rad/s"),
        row("centre", centre + readings.x_ref_m, false, "m"),
    ];
    Ok(LawFit {
        parameters,
        sum_of_squares: solution.sum_of_squares,
        n_free: solution.parameters.len(),
    })
}

/// The weighted problem: parameters (A, φ, γ, ω, c), or (A, φ, ω, c) where γ is held.
#[derive(Debug)]
pub(in crate::motion) struct SinusoidProblem<'a> {
    /// The readings.
    pub(in crate::motion) readings: &'a Readings,
    /// 1/σ of each, m⁻¹; 0 leaves a reading out.
    pub(in crate::motion) weight_per_m: &'a [f64],
    /// γ where it is held, s⁻¹.
    pub(in crate::motion) held_decay_rate_per_s: Option<f64>,
}

impl SinusoidProblem<'_> {
    /// All five, whatever is held.
    pub(in crate::motion) fn all_parameters(&self, p: &[f64]) -> [f64; 5] {
        match (self.held_decay_rate_per_s, p) {
            (Some(gamma), &[a, phi, omega, c]) => [a, phi, gamma, omega, c],
            (None, &[a, phi, gamma, omega, c]) => [a, phi, gamma, omega, c],
            // OK because only this room calls, with one of the two lengths; a result that is not finite is refused by the fit.
            _ => [f64::NAN; 5],
        }
    }
    /// Those that are not held.
    pub(in crate::motion) fn free_parameters(&self, p: [f64; 5]) -> Vec<f64> {
        if self.held_decay_rate_per_s.is_some() {
            vec![p[0], p[1], p[3], p[4]]
        } else {
            p.to_vec()
        }
    }
}

impl Residuals for SinusoidProblem<'_> {
    fn n_residuals(&self) -> usize {
        self.readings.len()
    }
    fn residuals(&self, parameters: &[f64], out: &mut [f64]) {
        let [a, phi, gamma, omega, c] = self.all_parameters(parameters);
        for (i, r) in out.iter_mut().enumerate() {
            let tau = self.readings.tau_s[i];
            *r = (a * (-gamma * tau).exp() * (omega * tau + phi).cos() + c - self.readings.x_m[i])
                * self.weight_per_m[i];
        }
    }
    fn jacobian(&self, parameters: &[f64], out: &mut DMatrix<f64>) {
        let [a, phi, gamma, omega, _] = self.all_parameters(parameters);
        let free = self.held_decay_rate_per_s.is_none();
        for (i, w) in self.weight_per_m.iter().enumerate() {
            let tau = self.readings.tau_s[i];
            let envelope = w * (-gamma * tau).exp();
            let (sin, cos) = (omega * tau + phi).sin_cos();
            let row = [
                envelope * cos,
                -a * envelope * sin,
                -a * envelope * tau * cos,
                -a * envelope * tau * sin,
                *w,
            ];
            let columns = row
                .into_iter()
                .enumerate()
                .filter(|(j, _)| free || *j != 2)
                .map(|(_, v)| v);
            for (j, v) in columns.enumerate() {
                out[(i, j)] = v;
            }
        }
    }
}
