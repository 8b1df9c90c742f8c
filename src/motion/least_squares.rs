//! Nonlinear least squares: minimise Σ rᵢ(p)² and say how well the minimum is known.
//!
//! In: a [`Residuals`] problem with its exact Jacobian (rows divided by their standard uncertainties) and a start. Out: a
//! [`Solution`] with its covariance factor. The trust-region core is the crate `levenberg-marquardt`. It fixes a scale of
//! the parameters, has no covariance, and reports "no further improvement possible" as an error; what it leaves open is done here:
//! * parameters in units of their own size, |start value|. All 27 NIST sets are then reached from both starts in one run; the restarts,
//!   whose scale follows the parameters, are for starts that are wrong by orders of magnitude;
//! * a Gauss–Newton polish: a test on the sum of squares alone stops ENSO at 6.4 digits;
//! * one test of convergence for every ending, the relative offset of Bates and Watts, which is in units of the result's own
//!   uncertainty and needs no tolerance in the problem's units.

use levenberg_marquardt::{LeastSquaresProblem, LevenbergMarquardt};
use nalgebra::{DMatrix, DVector, Dyn, Owned};

/// A minimum is accepted where the relative offset is below this: the estimate is then within 1e-6 of the radius of its confidence region.
const RELATIVE_OFFSET_MAX: f64 = 1e-6;
/// Or where a full Gauss–Newton step would move the model by less than this part of what the parameters contribute to it: fits whose residuals
/// are rounding errors. (A test on the parameters themselves would never pass for one that is 0.)
const STEP_MAX_REL: f64 = 1e-12;
/// Runs of the trust region; each takes its scale from where the last one stopped. No NIST set needs a second.
const MAX_RUNS: usize = 3;
/// Polishing steps; they stop by themselves when the gradient no longer falls.
const MAX_POLISH_STEPS: usize = 40;
/// A step that leaves more than this part of what it should remove is slow.
const SLOW: f64 = 0.3;
/// Tolerance handed to the trust region: the rounding of a double, so that it stops only where it can do no more.
const TRUST_REGION_TOL: f64 = f64::EPSILON;

/// A weighted least-squares problem: residuals rᵢ = (model − reading)ᵢ/σᵢ and their derivatives.
///
/// Residuals without a common scale of σ are fine: the covariance is multiplied by the residual variance.
pub trait Residuals {
    /// Number of residuals.
    fn n_residuals(&self) -> usize;
    /// Writes the residuals at `parameters` into `out` (length `n_residuals`).
    fn residuals(&self, parameters: &[f64], out: &mut [f64]);
    /// Writes ∂rᵢ/∂pⱼ into `out` (n_residuals × number of parameters).
    fn jacobian(&self, parameters: &[f64], out: &mut DMatrix<f64>);
}

/// How long to look for a minimum.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Patience {
    /// A start of the right kind: 20 evaluations for each parameter. A record that is no oscillation is then refused in a second, not a minute.
    Short,
    /// A start that may be wrong by orders of magnitude: 2000 evaluations for each parameter. Bennett5 takes a thousand in all.
    Long,
}

impl Patience {
    fn evaluations_per_parameter(self) -> usize {
        match self {
            Self::Short => 20,
            Self::Long => 2000,
        }
    }
}

/// By which test a minimum was accepted.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// The residual is orthogonal to the tangent plane, to a millionth of its own scatter.
    Orthogonal,
    /// A further step would not change the model: the residuals are rounding errors.
    StepNegligible,
}

/// A minimum.
#[derive(Clone, Debug)]
pub struct Solution {
    /// The parameters, in the problem's units.
    pub parameters: Vec<f64>,
    /// The residuals there, in units of their σ.
    pub residuals: Vec<f64>,
    /// Σ rᵢ².
    pub sum_of_squares: f64,
    /// n − p.
    pub degrees_of_freedom: f64,
    /// (JᵀJ)⁻¹; times the residual variance it is the covariance of the parameters.
    pub covariance_factor: DMatrix<f64>,
    /// By which test it was accepted.
    pub ending: Ending,
    /// Runs of the trust region; 0 where Gauss–Newton steps sufficed.
    pub n_runs: usize,
}

impl Solution {
    /// s² = Σ rᵢ²/(n − p), the factor by which the stated variances have to be multiplied.
    #[must_use]
    pub fn residual_variance(&self) -> f64 {
        self.sum_of_squares / self.degrees_of_freedom
    }
    /// Standard uncertainties from the residual scatter: √(s² (JᵀJ)⁻¹ⱼⱼ), independent residuals assumed.
    #[must_use]
    pub fn standard_uncertainties(&self) -> Vec<f64> {
        let s2 = self.residual_variance();
        (0..self.parameters.len())
            .map(|j| (s2 * self.covariance_factor[(j, j)]).sqrt())
            .collect()
    }
}

/// Why there is no minimum to report.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum LeastSquaresError {
    /// Not more residuals than parameters: nothing is left to estimate the scatter from.
    #[error(
        "{n_residuals} readings cannot determine {n_parameters} parameters and their scatter; give more readings"
    )]
    TooFewResiduals {
        /// Number of residuals.
        n_residuals: usize,
        /// Number of parameters.
        n_parameters: usize,
    },
    /// The model gave a value that is not a number at the start.
    #[error("the model is not finite at the start values of the fit; start closer to the solution")]
    NotFinite,
    /// The readings do not tell two parameters apart.
    #[error(
        "the readings do not determine all {n_parameters} parameters; give readings that cover more of the motion"
    )]
    Singular {
        /// Number of parameters.
        n_parameters: usize,
    },
    /// It stopped where the gradient test does not pass.
    #[error(
        "the fit did not settle: it stopped {relative_offset:.1e} of its own uncertainty away from a minimum; start closer to the solution"
    )]
    NotConverged {
        /// Distance from the minimum in units of the confidence region's radius.
        relative_offset: f64,
    },
}

/// Minimises Σ rᵢ² from `start`.
///
/// * `scale`: size of a typical change of each parameter, > 0; `None` takes |start value|, or 1 where that is 0, and
///   follows the parameters from restart to restart.
///
/// # Errors
/// [`LeastSquaresError`], one variant a cause; a fit that did not settle is not a fit.
///
/// # Source
/// [Levenberg, Marquardt, Moré](crate::sources::LevenbergMarquardt); the test is the relative offset of
/// [Bates and Watts](crate::sources::BatesWatts81). Checked against [NIST's certified results](crate::sources::NistStrd) (`tests/motion.rs`).
pub fn minimise<P: Residuals>(
    problem: &P,
    start: &[f64],
    scale: Option<&[f64]>,
    patience: Patience,
) -> Result<Solution, LeastSquaresError> {
    check(problem, start)?;
    let mut parameters = start.to_vec();
    let mut last = Err(LeastSquaresError::NotConverged {
        relative_offset: f64::INFINITY,
    });
    for run in 1..=MAX_RUNS {
        let unit = scale.map_or_else(|| own_scale(&parameters), <[f64]>::to_vec);
        let stopped = trust_region(problem, &parameters, &unit, patience);
        let settled = stopped == parameters;
        parameters = stopped;
        let polished = polish(problem, &parameters, 0.0, run);
        if let Ok(solution) = polished {
            return Ok(solution);
        }
        last = polished;
        if settled {
            break;
        }
    }
    last
}

/// Minimises from a start that is close already, by Gauss–Newton steps alone and only until the test of convergence passes: a fraction of the
/// cost of [`minimise`], which goes on to the last digit.
///
/// # Errors
/// As [`minimise`]; [`LeastSquaresError::NotConverged`] where the start was not close.
pub fn refine<P: Residuals>(problem: &P, start: &[f64]) -> Result<Solution, LeastSquaresError> {
    check(problem, start)?;
    polish(problem, start, RELATIVE_OFFSET_MAX, 0)
}

/// Goes downhill for one short run of the trust region from `start` and returns where it stopped, without a verdict: a step of an
/// iteration that judges itself, as a reweighted fit does.
///
/// * `scale`: as in [`minimise`].
pub fn advance<P: Residuals>(problem: &P, start: &[f64], scale: &[f64]) -> Vec<f64> {
    trust_region(problem, start, scale, Patience::Short)
}

/// The door: enough residuals, and finite ones.
fn check<P: Residuals>(problem: &P, start: &[f64]) -> Result<(), LeastSquaresError> {
    let (n_residuals, n_parameters) = (problem.n_residuals(), start.len());
    if n_residuals <= n_parameters {
        return Err(LeastSquaresError::TooFewResiduals {
            n_residuals,
            n_parameters,
        });
    }
    let finite = sum_of_squares(problem, start).1.is_finite();
    finite.then_some(()).ok_or(LeastSquaresError::NotFinite)
}

/// |value|, or 1 where it is 0.
fn own_scale(parameters: &[f64]) -> Vec<f64> {
    parameters
        .iter()
        .map(|p| if p.abs() > 0.0 { p.abs() } else { 1.0 })
        .collect()
}

fn sum_of_squares<P: Residuals>(problem: &P, parameters: &[f64]) -> (Vec<f64>, f64) {
    let mut residuals = vec![0.0; problem.n_residuals()];
    problem.residuals(parameters, &mut residuals);
    let sum = residuals.iter().map(|r| r * r).sum();
    (residuals, sum)
}

/// One run of the trust region, in parameters divided by `unit`. Where it stops is judged by [`polish`], whatever it says itself.
fn trust_region<P: Residuals>(
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

/// The tangent plane at a point: what a Gauss–Newton step, the convergence test and the covariance need.
struct Tangent {
    step: DVector<f64>,
    covariance_factor: DMatrix<f64>,
    /// ‖Qᵀr‖: the part of the residual that a step in the tangent plane would remove.
    removable: f64,
    /// Largest ‖∂r/∂pⱼ‖·|pⱼ|: the size of the model, in the residuals' units.
    size: f64,
}

/// QR of the Jacobian with columns scaled to length one: normal equations would lose half the digits.
fn tangent<P: Residuals>(problem: &P, parameters: &[f64], residuals: &[f64]) -> Option<Tangent> {
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

/// Parameters with all that a step from them needs.
struct Point {
    parameters: Vec<f64>,
    residuals: Vec<f64>,
    sum: f64,
    plane: Tangent,
}

impl Point {
    /// The point `part` of a step away; None where the model is not finite there.
    fn beyond<P: Residuals>(
        problem: &P,
        from: &[f64],
        step: &DVector<f64>,
        part: f64,
    ) -> Option<Self> {
        let parameters: Vec<f64> = from
            .iter()
            .zip(step.iter())
            .map(|(p, d)| p + part * d)
            .collect();
        let (residuals, sum) = sum_of_squares(problem, &parameters);
        let plane = if sum.is_finite() {
            tangent(problem, &parameters, &residuals)
        } else {
            None
        }?;
        Some(Self {
            parameters,
            residuals,
            sum,
            plane,
        })
    }
}

/// Gauss–Newton steps while the removable part of the residual falls and the relative offset is above `enough`, then the test of convergence.
fn polish<P: Residuals>(
    problem: &P,
    start: &[f64],
    enough: f64,
    n_runs: usize,
) -> Result<Solution, LeastSquaresError> {
    let n_parameters = start.len();
    let singular = LeastSquaresError::Singular { n_parameters };
    let mut parameters = start.to_vec();
    let (mut residuals, mut sum) = sum_of_squares(problem, &parameters);
    let mut plane = tangent(problem, &parameters, &residuals).ok_or(singular)?;
    let (p, degrees_of_freedom) = (n_parameters as f64, (residuals.len() - n_parameters) as f64);
    let offset = |sum: f64, removable: f64| {
        let left = (sum - removable * removable).max(0.0);
        removable / p.sqrt() / (left / degrees_of_freedom).sqrt()
    };
    for _ in 0..MAX_POLISH_STEPS {
        if offset(sum, plane.removable) <= enough {
            break;
        }
        let full = Point::beyond(problem, &parameters, &plane.step, 1.0);
        // Where the residuals are large and the model bends, full steps overshoot and swing about the minimum; half steps then do not.
        let slow = full
            .as_ref()
            .is_none_or(|point| point.plane.removable > SLOW * plane.removable);
        let half = if slow {
            Point::beyond(problem, &parameters, &plane.step, 0.5)
        } else {
            None
        };
        let best = full
            .into_iter()
            .chain(half)
            .min_by(|a, b| a.plane.removable.total_cmp(&b.plane.removable));
        let Some(next) = best.filter(|point| point.plane.removable < plane.removable) else {
            break;
        };
        Point {
            parameters,
            residuals,
            sum,
            plane,
        } = next;
    }
    let relative_offset = offset(sum, plane.removable);
    let step_negligible = plane.removable <= STEP_MAX_REL * plane.size;
    let ending = match (relative_offset <= RELATIVE_OFFSET_MAX, step_negligible) {
        (true, _) => Ending::Orthogonal,
        (false, true) => Ending::StepNegligible,
        (false, false) => return Err(LeastSquaresError::NotConverged { relative_offset }),
    };
    Ok(Solution {
        parameters,
        residuals,
        sum_of_squares: sum,
        degrees_of_freedom,
        covariance_factor: plane.covariance_factor,
        ending,
        n_runs,
    })
}
