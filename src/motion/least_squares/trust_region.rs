//! The trust-region core: the crate `levenberg-marquardt`, in parameters of a size that we choose.

use super::{Patience, Residuals};
use levenberg_marquardt::{LeastSquaresProblem, LevenbergMarquardt};
use nalgebra::{DMatrix, DVector, Dyn, Owned};

/// Tolerance handed to the trust region: the rounding of a double, so that it stops only where it can do no more.
const TRUST_REGION_TOL: f64 = f64::EPSILON;

/// One run of the trust region, in parameters divided by `unit`. Where it stops is judged by [`polish`], whatever it says itself.
pub(super) fn trust_region<P: Residuals>(
    problem: &P,
    start: &[f64],
    unit: &[f64],
    patience: Patience,
) -> Vec<f64> {
    let scaled = Scaled {
        problem,
        unit,
        at: DVector::from_iterator(start.len(), start.iter().zip(unit).map(|(p, s)| p / s)),
    };
    let (scaled, _report) = LevenbergMarquardt::new()
        .with_tol(TRUST_REGION_TOL)
        .with_gtol(TRUST_REGION_TOL)
        .with_scale_diag(false)
        .with_patience(patience.evaluations_per_parameter())
        .minimize(scaled);
    scaled.parameters(&scaled.at)
}

/// The problem in the form, and in the parameters' units, that the trust region takes.
struct Scaled<'a, P> {
    problem: &'a P,
    unit: &'a [f64],
    at: DVector<f64>,
}

impl<P> Scaled<'_, P> {
    fn parameters(&self, at: &DVector<f64>) -> Vec<f64> {
        at.iter().zip(self.unit).map(|(q, s)| q * s).collect()
    }
}

impl<P: Residuals> LeastSquaresProblem<f64, Dyn, Dyn> for Scaled<'_, P> {
    type ResidualStorage = Owned<f64, Dyn>;
    type JacobianStorage = Owned<f64, Dyn, Dyn>;
    type ParameterStorage = Owned<f64, Dyn>;

    fn set_params(&mut self, at: &DVector<f64>) {
        self.at.copy_from(at);
    }
    fn params(&self) -> DVector<f64> {
        self.at.clone()
    }
    fn residuals(&self) -> Option<DVector<f64>> {
        let mut residuals = DVector::zeros(self.problem.n_residuals());
        self.problem
            .residuals(&self.parameters(&self.at), residuals.as_mut_slice());
        // A step into a region where the model overflows must be refused, not end the run: a huge residual does that.
        residuals.apply(|r| {
            if !r.is_finite() {
                *r = 1e100;
            }
        });
        Some(residuals)
    }
    fn jacobian(&self) -> Option<DMatrix<f64>> {
        let mut jacobian = DMatrix::zeros(self.problem.n_residuals(), self.unit.len());
        self.problem
            .jacobian(&self.parameters(&self.at), &mut jacobian);
        for (mut column, s) in jacobian.column_iter_mut().zip(self.unit) {
            column *= *s;
        }
        jacobian.iter().all(|v| v.is_finite()).then_some(jacobian)
    }
}
