//! Dry friction: a constant force against the velocity.
//!
//! In every half cycle the motion is an undamped one about a centre moved by d = F/k towards the side it comes from, so with θ = ωτ + φ and
//! k = ⌊θ/π⌋
//!
//! x(τ) = c + (−1)ᵏ d + (A − (2k + 1) d) cos θ,
//!
//! until a turning point A − 2kd lies within d of the centre: there the spring no longer overcomes the friction and the mass stays.
//! The amplitude falls by 4d a cycle on a straight line, and the period is that without loss.

use super::{Law, LawFit, Weighted};
use crate::motion::least_squares::{
    LeastSquaresError, Patience, Residuals, minimise, refine, tangent_basis,
};
use crate::motion::noise::{self, Residue};
use crate::motion::readings::Readings;
use nalgebra::DMatrix;
use std::f64::consts::PI;

/// The law's row in the table.
pub(super) const LAW: Law = Law {
    key: "dry",
    described: "with dry friction",
    nested_in: None,
    fit,
};

/// Decay times of the viscous motion over which its loss is matched at the start.
const MATCHED_DECAY_TIMES: f64 = 1.5;

/// Where the motion is at one time, and how that depends on A and d.
struct Place {
    /// ∂x/∂A.
    per_amplitude: f64,
    /// ∂x/∂d.
    per_friction: f64,
    /// ∂x/∂θ, m.
    per_angle_m: f64,
}

/// x − c = A·`per_amplitude` + d·`per_friction` at θ.
fn place(amplitude_m: f64, friction_m: f64, theta: f64) -> Place {
    let half_cycle = (theta / PI).floor();
    // A − 2kd ≤ d at the first k of at least (A/d − 1)/2.
    let rest = ((amplitude_m / friction_m - 1.0) / 2.0).ceil();
    if friction_m > 0.0 && half_cycle >= rest {
        let sign = side(rest);
        return Place {
            per_amplitude: sign,
            per_friction: -2.0 * rest * sign,
            per_angle_m: 0.0,
        };
    }
    let (sin, cos) = theta.sin_cos();
    let passed = 2.0 * half_cycle + 1.0;
    Place {
        per_amplitude: cos,
        per_friction: side(half_cycle) - passed * cos,
        per_angle_m: -(amplitude_m - passed * friction_m) * sin,
    }
}

/// (−1)ᵏ.
fn side(half_cycle: f64) -> f64 {
    if half_cycle.rem_euclid(2.0) < 0.5 {
        1.0
    } else {
        -1.0
    }
}

/// Parameters (A, φ, d, ω, c).
struct DryProblem<'a> {
    readings: &'a Readings,
    weight_per_m: &'a [f64],
}

impl Residuals for DryProblem<'_> {
    fn n_residuals(&self) -> usize {
        self.readings.len()
    }
    fn residuals(&self, p: &[f64], out: &mut [f64]) {
        for (i, r) in out.iter_mut().enumerate() {
            let at = place(p[0], p[2], p[3] * self.readings.tau_s[i] + p[1]);
            let x_m = p[4] + p[0] * at.per_amplitude + p[2] * at.per_friction;
            *r = (x_m - self.readings.x_m[i]) * self.weight_per_m[i];
        }
    }
    fn jacobian(&self, p: &[f64], out: &mut DMatrix<f64>) {
        for (i, w) in self.weight_per_m.iter().enumerate() {
            let tau = self.readings.tau_s[i];
            let at = place(p[0], p[2], p[3] * tau + p[1]);
            let row = [
                at.per_amplitude,
                at.per_angle_m,
                at.per_friction,
                at.per_angle_m * tau,
                1.0,
            ];
            for (j, v) in row.into_iter().enumerate() {
                out[(i, j)] = w * v;
            }
        }
    }
}

fn fit(weighted: &Weighted) -> Result<LawFit, LeastSquaresError> {
    let Weighted {
        readings,
        weight_per_m,
        start,
        ..
    } = *weighted;
    let problem = DryProblem {
        readings,
        weight_per_m,
    };
    let span_s = readings.span_s();
    let matched_s = span_s.min(MATCHED_DECAY_TIMES / start.decay_rate_per_s.abs());
    let lost_m = start.amplitude_m * -(-start.decay_rate_per_s * matched_s).exp_m1();
    let friction_m = lost_m / matched_s * PI / (2.0 * start.omega_rad_per_s);
    let from = [
        start.amplitude_m,
        start.phase_rad,
        friction_m,
        start.omega_rad_per_s,
        start.centre_m,
    ];
    let friction_scale_m = start.amplitude_m / (start.omega_rad_per_s * span_s);
    let scale = [
        start.amplitude_m,
        1.0,
        friction_scale_m,
        1.0 / span_s,
        start.amplitude_m,
    ];
    let solution = refine(&problem, &from)
        .or_else(|_| minimise(&problem, &from, Some(&scale), Patience::Short))?;
    let p = &solution.parameters;
    let basis =
        tangent_basis(&problem, p).ok_or(LeastSquaresError::Singular { n_parameters: 5 })?;
    let residue = Residue {
        tau_s: &readings.tau_s,
        normalised: &solution.residuals,
        basis: &basis,
        variance: solution.residual_variance(),
        degrees_of_freedom: solution.degrees_of_freedom,
    };
    let enlargement = noise::enlargement(&residue, p[3], start.decay_rate_per_s).near_omega;
    let u: Vec<f64> = solution
        .standard_uncertainties()
        .iter()
        .map(|u| u * enlargement.sqrt())
        .collect();
    let parameters = vec![
        // A belongs to θ = 0, within half a cycle of the first reading.
        ("amplitude", p[0], Some(u[0]), "m"),
        ("phase", p[1], Some(u[1]), "rad"),
        ("friction_over_stiffness", p[2], Some(u[2]), "m"),
        ("angular_frequency", p[3], Some(u[3]), "rad/s"),
        ("centre", p[4] + readings.x_ref_m, Some(u[4]), "m"),
    ];
    Ok(LawFit {
        parameters,
        sum_of_squares: solution.sum_of_squares,
        n_free: 5,
        enlargement,
        autocorrelation_lag1: noise::autocorrelation_lag1(&solution.residuals),
    })
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;

    fn x_m(amplitude_m: f64, friction_m: f64, theta: f64) -> f64 {
        let at = place(amplitude_m, friction_m, theta);
        amplitude_m * at.per_amplitude + friction_m * at.per_friction
    }

    #[test]
    fn the_turning_points_are_those_of_the_table_until_it_rests() {
        let text =
            include_str!("../../../fixtures/reference/oscillation/coulomb_turning_points.csv");
        let rows: Vec<Vec<&str>> = text
            .lines()
            .map(|line| line.split(',').collect())
            .filter(|row: &Vec<&str>| row[0] == "dry")
            .collect();
        let number = |cell: &str| cell.parse::<f64>().expect("a number");
        for row in &rows {
            let (d, k, want) = (number(row[2]), number(row[3]), number(row[4]));
            // Just after the turning point, where the new half cycle holds.
            let got = x_m(number(rows[0][4]), d, (k + 1e-9) * PI);
            assert!(
                (got - want).abs() < 1e-12,
                "half cycle {k}: got {got}, want {want}"
            );
        }
        let (last, d) = (number(rows[rows.len() - 1][4]), number(rows[0][2]));
        assert!(
            last.abs() <= d,
            "it rests where the spring is weaker than the friction"
        );
        assert!(
            (x_m(number(rows[0][4]), d, 1e4) - last).abs() < 1e-12,
            "and stays"
        );
    }

    #[test]
    fn slopes_agree_with_differences() {
        let step = 1e-6;
        for theta in [-2.0, 0.7, 4.0, 11.0, 40.0] {
            let at = place(0.1, 0.003, theta);
            let pairs = [
                (
                    at.per_amplitude,
                    (x_m(0.1 + step, 0.003, theta) - x_m(0.1 - step, 0.003, theta)) / (2.0 * step),
                ),
                (
                    at.per_friction,
                    (x_m(0.1, 0.003 + step, theta) - x_m(0.1, 0.003 - step, theta)) / (2.0 * step),
                ),
                (
                    at.per_angle_m,
                    (x_m(0.1, 0.003, theta + step) - x_m(0.1, 0.003, theta - step)) / (2.0 * step),
                ),
            ];
            for (exact, difference) in pairs {
                assert!(
                    (exact - difference).abs() < 1e-8,
                    "θ = {theta}: {exact} against {difference}"
                );
            }
        }
    }
}
