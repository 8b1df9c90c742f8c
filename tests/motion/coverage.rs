//! Do 95 % intervals contain the truth in 95 % of records, and is the scatter what theory allows at best?
//!
//! Twelve kinds of record, 400 of each, seeded. The limits follow from the binomial distribution; over-coverage is allowed for, because
//! the variance enlargement is floored at 1, under-coverage is not.

use crate::motion::record::{Truth, errors};
use ebbmark::motion::{ExternalTerms, fit, quantities};

const TRIALS: u32 = 400;
const SIGMA_M: f64 = 5e-4;
const RATE_HZ: f64 = 12.0;
/// P(fewer than 362 of 400 | 0.95) = 6.7e-5 by the binomial distribution: one in four hundred for these 36 counts together.
const LEAST_COVERED: u32 = 362;
/// The Cramér–Rao bound for white noise; the rms of 400 errors is known to 1/√800 = 3.5 %, and four times that is allowed.
const RMS_TOL_REL: f64 = 0.14;

struct Outcome {
    period_covered: u32,
    decay_covered: u32,
    centre_covered: u32,
    /// rms error over the mean stated uncertainty without enlargement, of T and γ.
    period_rms: f64,
    decay_rms: f64,
    period_bound: f64,
    decay_bound: f64,
}

fn simulate(zeta: f64, cycles: f64, lag1: f64) -> Outcome {
    let truth = Truth::rail(zeta);
    let n = (cycles * truth.period_s() * RATE_HZ) as usize;
    let mut outcome = Outcome {
        period_covered: 0,
        decay_covered: 0,
        centre_covered: 0,
        period_rms: 0.0,
        decay_rms: 0.0,
        period_bound: 0.0,
        decay_bound: 0.0,
    };
    let exact = ExternalTerms {
        u_clock_rel: 0.0,
        clock_assumed: false,
        u_scale_rel: None,
        scale_assumed: false,
        longest_exposure_s: None,
    };
    for trial in 0..TRIALS {
        let seed =
            u64::from(trial) + 1000 * (cycles as u64) + (lag1 * 1e6) as u64 + (zeta * 1e9) as u64;
        let fit = fit(&truth.record(RATE_HZ, &errors(n, SIGMA_M, lag1, seed))).expect("a motion");
        let found = quantities(&fit, &exact);
        let (period, centre) = (found.period, found.centre);
        let within = |interval: [f64; 2], value: f64| {
            u32::from(interval[0] <= value && value <= interval[1])
        };
        outcome.period_covered += within(
            period.interval95.map(|end| end.expect("two-sided")),
            truth.period_s(),
        );
        outcome.centre_covered += within(
            centre.interval95.map(|end| end.expect("two-sided")),
            truth.centre_m,
        );
        outcome.decay_covered += within(fit.decay_rate_interval95_per_s, truth.decay_rate_per_s);
        outcome.period_rms += (fit.period_s() - truth.period_s()).powi(2) / f64::from(TRIALS);
        outcome.decay_rms +=
            (fit.decay_rate_per_s - truth.decay_rate_per_s).powi(2) / f64::from(TRIALS);
        let white = SIGMA_M.powi(2)
            / fit.residual.variance_enlargement
            / (fit.residual.rms_m.powi(2) * n as f64 / (n as f64 - 5.0));
        outcome.period_bound += (fit.period_s() / fit.damped_angular_frequency_rad_per_s).powi(2)
            * fit.covariance[3][3]
            * white
            / f64::from(TRIALS);
        outcome.decay_bound += fit.covariance[2][2] * white / f64::from(TRIALS);
    }
    outcome
}

#[test]
fn intervals_cover_the_truth_and_the_scatter_attains_the_bound() {
    println!("lag-1  zeta    cycles  T covered  γ covered  c covered  rms/bound T  rms/bound γ");
    for lag1 in [0.0, 0.6] {
        for zeta in [3e-4, 5e-3] {
            for cycles in [3.0, 8.0, 30.0] {
                let outcome = simulate(zeta, cycles, lag1);
                let (period, decay) = (
                    (outcome.period_rms / outcome.period_bound).sqrt(),
                    (outcome.decay_rms / outcome.decay_bound).sqrt(),
                );
                println!(
                    "{lag1:<6} {zeta:<7} {cycles:>6} {:>10} {:>10} {:>10} {period:>12.3} {decay:>12.3}",
                    outcome.period_covered, outcome.decay_covered, outcome.centre_covered
                );
                assert!(
                    outcome.centre_covered >= LEAST_COVERED
                        && outcome.period_covered >= LEAST_COVERED
                        && outcome.decay_covered >= LEAST_COVERED,
                    "under-coverage"
                );
                if lag1 == 0.0 {
                    assert!(
                        (period - 1.0).abs() < RMS_TOL_REL && (decay - 1.0).abs() < RMS_TOL_REL,
                        "off the Cramér–Rao bound"
                    );
                }
            }
        }
    }
}
