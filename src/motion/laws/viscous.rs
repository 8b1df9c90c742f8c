//! Viscous loss: the damped sinusoid; with γ held at 0, no loss.

use super::{Law, LawFit, Weighted};
use crate::motion::least_squares::{LeastSquaresError, Patience, minimise, refine};
use crate::motion::noise;
use crate::motion::sinusoid::{Sinusoid, SinusoidProblem};

/// The law's row in the table.
pub(super) const LAW: Law = Law {
    key: "viscous",
    described: "with viscous loss",
    nested_in: None,
    fit: |weighted| fit(weighted, None),
};

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
        // The projection on a sinusoid that decays at the held rate: the mean of what the envelopes differ by.
        let n = readings.len() as f64;
        from[0] *= readings
            .tau_s
            .iter()
            .map(|tau| (-(start.decay_rate_per_s - gamma) * tau).exp())
            .sum::<f64>()
            / n;
    }
    let scale = problem.free_parameters(start.scale(readings.span_s()));
    let free = problem.free_parameters(from);
    let solution = refine(&problem, &free)
        .or_else(|_| minimise(&problem, &free, Some(&scale), Patience::Long))?;
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
        enlargement,
        autocorrelation_lag1: noise::autocorrelation_lag1(&solution.residuals),
    })
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;
    use crate::motion::PositionRecord;
    use crate::motion::readings::Readings;

    #[test]
    fn the_lossless_law_fits_the_beam_of_the_handbook() {
        // NIST/SEMATECH e-Handbook 1.4.2.5.3, y = C + A sin(2πft + φ), t = 1…200; the handbook's figures are no minimum, these are
        // (fixtures/reference/README.md). Three of its readings stand out and would be marked, so the law is fitted here without the marks.
        let text = include_str!("../../../fixtures/reference/strd/univariate/Lew.dat");
        let data = text.rfind("\nData:").map_or("", |at| &text[at + 1..]);
        let x_m = data
            .lines()
            .skip(1)
            .filter_map(|line| line.trim().parse::<f64>().ok());
        let records: Vec<PositionRecord> = (1..)
            .zip(x_m)
            .map(|(i, x_m)| PositionRecord {
                t_s: f64::from(i),
                u_t_s: 0.0,
                x_m,
                u_x_m: 1.0,
            })
            .collect();
        let readings = Readings::new(&records).expect("a sound record");
        let start = Sinusoid {
            amplitude_m: 300.0,
            phase_rad: 2.0,
            decay_rate_per_s: 0.0,
            omega_rad_per_s: 1.896,
            centre_m: 0.0,
        };
        let weighted = Weighted {
            readings: &readings,
            weight_per_m: &[1.0; 200],
            start,
            enlargement: 1.0,
            degrees_of_freedom: 196.0,
        };
        let fitted = fit(&weighted, Some(0.0)).expect("a minimum");
        let [amplitude, omega, centre] = [0, 3, 4].map(|i| fitted.parameters[i].1);
        let deviation = (fitted.sum_of_squares / 196.0).sqrt();
        let pairs = [
            (amplitude, 343.288_566),
            (omega / std::f64::consts::TAU, 0.301_807_037),
            (centre, -178.768_157),
            (deviation, 134.066_400_94),
        ];
        for (got, want) in pairs {
            assert!((got / want - 1.0).abs() < 3e-9, "got {got}, want {want}");
        }
    }
}
