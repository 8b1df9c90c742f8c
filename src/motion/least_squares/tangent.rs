//! The tangent plane of a least-squares problem, by QR on columns of length one: normal equations would lose half the digits.

use super::Residuals;
use nalgebra::{DMatrix, DVector};

/// The tangent plane at a point: what a Gauss–Newton step, the convergence test and the covariance need.
pub(super) struct Tangent {
    pub(super) step: DVector<f64>,
    pub(super) covariance_factor: DMatrix<f64>,
    /// ‖Qᵀr‖: the part of the residual that a step in the tangent plane would remove.
    pub(super) removable: f64,
    /// Largest ‖∂r/∂pⱼ‖·|pⱼ|: the size of the model, in the residuals' units.
    pub(super) size: f64,
}

/// QR of the Jacobian with columns scaled to length one: normal equations would lose half the digits.
pub(super) fn tangent<P: Residuals>(
    problem: &P,
    parameters: &[f64],
    residuals: &[f64],
) -> Option<Tangent> {
    let n_parameters = parameters.len();
    let (jacobian, length) = scaled_jacobian(problem, parameters)?;
    let qr = jacobian.qr();
    let mut rotated = DVector::from_column_slice(residuals);
    qr.q_tr_mul(&mut rotated);
    let along = rotated.rows(0, n_parameters).into_owned();
    let r = qr.r();
    let r_inverse = r.solve_upper_triangular(&DMatrix::identity(n_parameters, n_parameters))?;
    let mut step = -(&r_inverse * &along);
    let mut covariance_factor = &r_inverse * r_inverse.transpose();
    for i in 0..n_parameters {
        step[i] /= length[i];
        for j in 0..n_parameters {
            covariance_factor[(i, j)] /= length[i] * length[j];
        }
    }
    let finite = step
        .iter()
        .chain(covariance_factor.iter())
        .all(|v| v.is_finite());
    let size = length
        .iter()
        .zip(parameters)
        .map(|(l, p)| l * p.abs())
        .fold(0.0, f64::max);
    finite.then(|| Tangent {
        step,
        covariance_factor,
        removable: along.norm(),
        size,
    })
}

/// Orthonormal columns (n × p) that span the tangent plane at `parameters`: what a fit takes out of the residuals.
///
/// None where the model is not finite there or does not depend on a parameter.
pub fn tangent_basis<P: Residuals>(problem: &P, parameters: &[f64]) -> Option<DMatrix<f64>> {
    let (jacobian, _) = scaled_jacobian(problem, parameters)?;
    Some(jacobian.qr().q())
}

/// The Jacobian with columns of length one, and their lengths.
fn scaled_jacobian<P: Residuals>(
    problem: &P,
    parameters: &[f64],
) -> Option<(DMatrix<f64>, Vec<f64>)> {
    let mut jacobian = DMatrix::zeros(problem.n_residuals(), parameters.len());
    problem.jacobian(parameters, &mut jacobian);
    let length: Vec<f64> = jacobian.column_iter().map(|column| column.norm()).collect();
    if length.iter().any(|l| !l.is_finite() || *l <= 0.0) {
        return None;
    }
    for (mut column, l) in jacobian.column_iter_mut().zip(&length) {
        column /= *l;
    }
    Some((jacobian, length))
}
