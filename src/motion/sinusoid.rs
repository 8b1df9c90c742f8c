//! The damped sinusoid x(τ) = A e^(−γτ) cos(ωτ + φ) + c, and the weighted least-squares problem that it poses.

use super::least_squares::Residuals;
use super::readings::Readings;
use nalgebra::DMatrix;

/// The five parameters of the damped sinusoid, at τ = 0 the first reading.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(super) struct Sinusoid {
    /// A, m.
    pub(super) amplitude_m: f64,
    /// φ, rad.
    pub(super) phase_rad: f64,
    /// γ, s⁻¹.
    pub(super) decay_rate_per_s: f64,
    /// ω, rad/s.
    pub(super) omega_rad_per_s: f64,
    /// c, m, from the readings' origin.
    pub(super) centre_m: f64,
}

impl Sinusoid {
    /// From (A, φ, γ, ω, c), brought to A ≥ 0, ω ≥ 0 and φ in (−π, π].
    pub(super) fn from_parameters(p: [f64; 5]) -> Self {
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
    pub(super) fn parameters(&self) -> [f64; 5] {
        [
            self.amplitude_m,
            self.phase_rad,
            self.decay_rate_per_s,
            self.omega_rad_per_s,
            self.centre_m,
        ]
    }
    /// The same motion with τ counted from `shift_s` later.
    pub(super) fn counted_from(&self, shift_s: f64) -> Self {
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
    pub(super) fn position_m(&self, tau_s: f64) -> f64 {
        let envelope = self.amplitude_m * (-self.decay_rate_per_s * tau_s).exp();
        self.centre_m + envelope * (self.omega_rad_per_s * tau_s + self.phase_rad).cos()
    }
    /// Velocity at τ, m/s.
    pub(super) fn velocity_m_per_s(&self, tau_s: f64) -> f64 {
        let envelope = self.amplitude_m * (-self.decay_rate_per_s * tau_s).exp();
        let (sin, cos) = (self.omega_rad_per_s * tau_s + self.phase_rad).sin_cos();
        -envelope * (self.decay_rate_per_s * cos + self.omega_rad_per_s * sin)
    }
    /// Standard uncertainty of each reading: √(u_x² + (v u_t)²), m.
    pub(super) fn sigma_m(&self, readings: &Readings) -> Vec<f64> {
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
    pub(super) fn scale(&self, span_s: f64) -> [f64; 5] {
        [
            self.amplitude_m,
            1.0,
            1.0 / span_s,
            1.0 / span_s,
            self.amplitude_m,
        ]
    }
}

/// The weighted problem: parameters (A, φ, γ, ω, c), or (A, φ, ω, c) where γ is held.
#[derive(Debug)]
pub(super) struct SinusoidProblem<'a> {
    /// The readings.
    pub(super) readings: &'a Readings,
    /// 1/σ of each, m⁻¹; 0 leaves a reading out.
    pub(super) weight_per_m: &'a [f64],
    /// γ where it is held, s⁻¹.
    pub(super) held_decay_rate_per_s: Option<f64>,
}

impl SinusoidProblem<'_> {
    /// All five, whatever is held.
    pub(super) fn all_parameters(&self, p: &[f64]) -> [f64; 5] {
        match (self.held_decay_rate_per_s, p) {
            (Some(gamma), &[a, phi, omega, c]) => [a, phi, gamma, omega, c],
            (None, &[a, phi, gamma, omega, c]) => [a, phi, gamma, omega, c],
            // OK because only this room calls, with one of the two lengths; a result that is not finite is refused by the fit.
            _ => [f64::NAN; 5],
        }
    }
    /// Those that are not held.
    pub(super) fn free_parameters(&self, p: [f64; 5]) -> Vec<f64> {
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

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;
    use crate::motion::PositionRecord;
    use crate::motion::least_squares::refine;

    /// Units 1/σ of the table's bounds; its figures have 13 digits, QR on scaled columns keeps them.
    const BOUND_TOL_REL: f64 = 1e-10;

    fn readings(truth: Sinusoid, rate_hz: f64, n: u32) -> Readings {
        let at = |i| PositionRecord {
            t_s: f64::from(i) / rate_hz,
            u_t_s: 0.0,
            x_m: truth.position_m(f64::from(i) / rate_hz),
            u_x_m: 1.0,
        };
        Readings::new(&(0..n).map(at).collect::<Vec<_>>()).expect("a sound record")
    }

    #[test]
    fn the_covariance_is_the_cramer_rao_bound() {
        let text = include_str!("../../fixtures/reference/oscillation/crb_damped_sinusoid.csv");
        for line in text.lines().skip(1) {
            let row: Vec<f64> = line
                .split(',')
                .map(|cell| cell.parse().expect("a number"))
                .collect();
            let row: [f64; 14] = row.try_into().expect("14 columns");
            let [
                a,
                gamma,
                omega,
                phi,
                rate_hz,
                n,
                sigma,
                u_a,
                u_gamma,
                u_omega,
                u_phi,
                u_c,
                u_period,
                _,
            ] = row;
            let truth = Sinusoid {
                amplitude_m: a,
                phase_rad: phi,
                decay_rate_per_s: gamma,
                omega_rad_per_s: omega,
                centre_m: 0.0,
            };
            #[expect(
                clippy::cast_possible_truncation,
                clippy::cast_sign_loss,
                reason = "a count of the table"
            )]
            let readings = readings(truth, rate_hz, n as u32);
            let weight_per_m = vec![1.0 / sigma; readings.len()];
            let problem = SinusoidProblem {
                readings: &readings,
                weight_per_m: &weight_per_m,
                held_decay_rate_per_s: None,
            };
            let mut start = truth.parameters();
            start[4] -= readings.x_ref_m;
            let factor = refine(&problem, &start)
                .expect("at the minimum already")
                .covariance_factor;
            let got: Vec<f64> = (0..5).map(|j| factor[(j, j)].sqrt()).collect();
            for (got, want) in got.iter().zip([u_a, u_phi, u_gamma, u_omega, u_c]) {
                assert!(
                    (got / want - 1.0).abs() < BOUND_TOL_REL,
                    "got {got:e}, want {want:e} in {line}"
                );
            }
            assert!(
                (got[3] * std::f64::consts::TAU / omega.powi(2) / u_period - 1.0).abs()
                    < BOUND_TOL_REL
            );
        }
    }

    #[test]
    fn the_jacobian_agrees_with_differences_away_from_the_solution() {
        let truth = Sinusoid {
            amplitude_m: 0.1,
            phase_rad: 0.3,
            decay_rate_per_s: 0.05,
            omega_rad_per_s: 5.0,
            centre_m: 0.02,
        };
        let readings = readings(truth, 10.0, 40);
        let weight_per_m = vec![3.0; 40];
        for held_decay_rate_per_s in [None, Some(0.02)] {
            let problem = SinusoidProblem {
                readings: &readings,
                weight_per_m: &weight_per_m,
                held_decay_rate_per_s,
            };
            let at = problem.free_parameters([0.13, -0.4, 0.02, 5.3, -0.01]);
            let mut jacobian = DMatrix::zeros(40, at.len());
            problem.jacobian(&at, &mut jacobian);
            for j in 0..at.len() {
                // Central differences: the error is the step's square, 1e-10, times third derivatives of up to 10.
                let step = 1e-5;
                let side = |sign: f64| {
                    let mut moved = at.clone();
                    moved[j] += sign * step;
                    let mut residuals = vec![0.0; 40];
                    problem.residuals(&moved, &mut residuals);
                    residuals
                };
                for (i, (plus, minus)) in side(1.0).into_iter().zip(side(-1.0)).enumerate() {
                    let difference = (plus - minus) / (2.0 * step);
                    assert!(
                        (difference - jacobian[(i, j)]).abs() < 1e-8,
                        "row {i}, column {j}: {difference} against {}",
                        jacobian[(i, j)]
                    );
                }
            }
        }
    }

    #[test]
    fn a_negative_amplitude_is_half_a_turn_and_the_phase_stays_in_its_range() {
        let turned = Sinusoid::from_parameters([-2.0, 3.0, 0.1, 5.0, 0.0]);
        assert!(
            (turned.amplitude_m - 2.0).abs() < 1e-15
                && (turned.phase_rad - (3.0 - std::f64::consts::PI)).abs() < 1e-15
        );
        let edge = Sinusoid::from_parameters([1.0, -std::f64::consts::PI, 0.0, 1.0, 0.0]);
        assert!(
            (edge.phase_rad - std::f64::consts::PI).abs() < 1e-15,
            "−π counts as π: {}",
            edge.phase_rad
        );
    }
}
