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

mod tangent;
mod trust_region;

pub use tangent::tangent_basis;

use nalgebra::{DMatrix, DVector};
use tangent::{Tangent, tangent};
use trust_region::trust_region;

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

#[cfg(test)]
mod tests {
    use super::*;

    /// y = p₀ + p₁x², with a third parameter that does nothing where `idle` is true.
    struct Parabola {
        x: Vec<f64>,
        y: Vec<f64>,
        idle: bool,
    }

    impl Residuals for Parabola {
        fn n_residuals(&self) -> usize {
            self.x.len()
        }
        fn residuals(&self, p: &[f64], out: &mut [f64]) {
            for (r, (x, y)) in out.iter_mut().zip(self.x.iter().zip(&self.y)) {
                *r = p[0] + p[1] * x * x - y;
            }
        }
        fn jacobian(&self, _: &[f64], out: &mut DMatrix<f64>) {
            out.fill(0.0);
            for (i, x) in self.x.iter().enumerate() {
                out[(i, 0)] = 1.0;
                out[(i, 1)] = x * x;
            }
            if !self.idle {
                assert_eq!(out.ncols(), 2);
            }
        }
    }

    fn parabola(idle: bool) -> Parabola {
        Parabola {
            x: vec![0.0, 1.0, 1.0, 0.0],
            y: vec![1.0, 3.0, 5.0, 3.0],
            idle,
        }
    }

    #[test]
    fn a_line_by_eye() -> Result<(), LeastSquaresError> {
        // Two readings at x² = 0 (mean 2) and two at 1 (mean 4), each 1 off its mean: p = (2, 2), Σr² = 4, s² = 2, u(p₀) = √(2/2), u(p₁) = √(2/2 + 2/2).
        let found = minimise(&parabola(false), &[0.0, 0.0], None, Patience::Short)?;
        let u = found.standard_uncertainties();
        for (got, want) in [
            (found.parameters[0], 2.0),
            (found.parameters[1], 2.0),
            (found.sum_of_squares, 4.0),
            (u[0], 1.0),
            (u[1], 2.0_f64.sqrt()),
        ] {
            assert!((got - want).abs() < 1e-14, "got {got}, want {want}");
        }
        assert_eq!(found.ending, Ending::Orthogonal);
        Ok(())
    }

    #[test]
    fn exact_readings_end_by_the_step_that_would_change_nothing() -> Result<(), LeastSquaresError> {
        let mut exact = parabola(false);
        exact.y = exact.x.iter().map(|x| 0.1 + 0.3 * x * x).collect();
        let found = minimise(&exact, &[1.0, 1.0], None, Patience::Short)?;
        assert!(
            (found.parameters[0] - 0.1).abs() < 1e-15 && (found.parameters[1] - 0.3).abs() < 1e-15
        );
        Ok(())
    }

    #[test]
    fn an_idle_parameter_is_said_to_be_undetermined() {
        let found = minimise(&parabola(true), &[0.0, 0.0, 1.0], None, Patience::Short)
            .map(|found| found.parameters);
        assert_eq!(found, Err(LeastSquaresError::Singular { n_parameters: 3 }));
    }

    #[test]
    fn as_many_parameters_as_readings_leave_no_scatter() {
        let mut short = parabola(false);
        short.x.truncate(2);
        let found =
            minimise(&short, &[0.0, 0.0], None, Patience::Short).map(|found| found.parameters);
        assert_eq!(
            found,
            Err(LeastSquaresError::TooFewResiduals {
                n_residuals: 2,
                n_parameters: 2
            })
        );
    }

    #[test]
    fn a_start_that_is_not_finite_is_refused() {
        let found = minimise(&parabola(false), &[f64::NAN, 0.0], None, Patience::Short)
            .map(|found| found.parameters);
        assert_eq!(found, Err(LeastSquaresError::NotFinite));
    }
}
