//! Records whose motion is known: it must come out, whatever the units, the origin, the gaps and the wild values.

use crate::motion::record::{Truth, errors};
use ebbmark::motion::{ExternalTerms, MotionError, PositionRecord, PositionUse, fit, quantities};
use proptest::prelude::*;
use std::f64::consts::{PI, TAU};

const NO_TERMS: ExternalTerms = ExternalTerms {
    u_clock_rel: 0.0,
    clock_assumed: false,
    u_scale_rel: None,
    scale_assumed: false,
    longest_exposure_s: None,
};

fn record_of(x_m: impl Fn(f64) -> f64, rate_hz: f64, n: u32) -> Vec<PositionRecord> {
    (0..n)
        .map(|i| f64::from(i) / rate_hz)
        .map(|t_s| PositionRecord {
            t_s,
            u_t_s: 0.0,
            x_m: x_m(t_s),
            u_x_m: 1e-4,
        })
        .collect()
}

proptest! {
    #![proptest_config(ProptestConfig { cases: 48, rng_seed: proptest::test_runner::RngSeed::Fixed(7), failure_persistence: None, ..ProptestConfig::default() })]

    /// Exact readings: what is left is rounding, 1e-16 of the amplitude, which moves a period by 1e-15 of it.
    #[test]
    fn a_planted_motion_comes_out(
        cycles in 1.6..40.0_f64, per_cycle in 6.0..50.0_f64, zeta in 0.0..0.1_f64, phase_rad in -PI..PI, frequency_hz in 0.05..50.0_f64,
        amplitude_m in 1e-3..1.0_f64, centre_rel in -30.0..30.0_f64, gap in 0.2..0.7_f64,
    ) {
        let omega_rad_per_s = TAU * frequency_hz;
        let truth = Truth { amplitude_m, phase_rad, decay_rate_per_s: zeta * omega_rad_per_s, omega_rad_per_s, centre_m: centre_rel * amplitude_m };
        let n = (cycles * per_cycle) as usize;
        prop_assume!(n >= 12 && (n - 1) as f64 / per_cycle > 1.5);
        let mut records = truth.record(per_cycle * frequency_hz, &vec![0.0; n]);
        if n > 60 {
            let start = (gap * n as f64) as usize;
            records.drain(start..start + n / 10);
        }
        let fit = fit(&records).map_err(|error| TestCaseError::fail(error.to_string()))?;
        prop_assert!((fit.period_s() / truth.period_s() - 1.0).abs() < 1e-10, "period {} for {}", fit.period_s(), truth.period_s());
        prop_assert!((fit.decay_rate_per_s - truth.decay_rate_per_s).abs() < 1e-10 * omega_rad_per_s);
        prop_assert!((fit.amplitude_m / amplitude_m - 1.0).abs() < 1e-9 && (fit.centre_m - truth.centre_m).abs() < 1e-9 * amplitude_m);
        prop_assert!(fit.uses.iter().all(|u| *u == PositionUse::Used));
    }

    /// With noise: another origin of time, unit of length, sign and centre change nothing but themselves.
    #[test]
    fn time_shift_scale_and_sign_do_not_change_the_period(
        seed in 0..1000_u64, shift_s in -1e4..1e4_f64, scale in 1e-3..1e3_f64, mirrored: bool, offset_m in -10.0..10.0_f64,
    ) {
        let truth = Truth::rail(0.01);
        let records = truth.record(30.0, &errors(400, 1e-3, 0.3, seed));
        let factor = if mirrored { -scale } else { scale };
        let moved: Vec<PositionRecord> = records.iter().map(|r| PositionRecord {
            t_s: r.t_s + shift_s, u_t_s: r.u_t_s, x_m: factor * (r.x_m + offset_m), u_x_m: scale * r.u_x_m,
        }).collect();
        let (plain, moved) = (fit(&records).expect("a motion"), fit(&moved).expect("a motion"));
        let u_gamma = plain.covariance[2][2].sqrt();
        // A time of 1e4 s is rounded to 1e-12 s; both fits stop within 1e-6 of their uncertainty.
        let (a, b) = (quantities(&plain, &NO_TERMS), quantities(&moved, &NO_TERMS));
        let u_t = a.period.u.expect("a figure");
        prop_assert!((plain.period_s() - moved.period_s()).abs() < 1e-4 * u_t);
        prop_assert!((b.period.u.expect("a figure") / u_t - 1.0).abs() < 1e-4);
        prop_assert!((plain.decay_rate_per_s - moved.decay_rate_per_s).abs() < 1e-4 * u_gamma);
        prop_assert!((moved.amplitude_m / plain.amplitude_m / scale - 1.0).abs() < 1e-6);
        prop_assert!((moved.t_ref_s - plain.t_ref_s - shift_s).abs() < 1e-9);
    }
}

#[test]
fn a_tenth_of_wild_values_is_marked_and_does_not_move_the_result() {
    for zeta in [3e-4, 0.02, 0.2] {
        let truth = Truth::rail(zeta);
        let mut noise = errors(900, 2e-4, 0.0, 11);
        let wild: Vec<usize> = (4..900).step_by(10).collect();
        for i in &wild {
            noise[*i] += 0.3 * ((i * 7919 % 13) as f64 - 6.5);
        }
        let fit = fit(&truth.record(30.0, &noise)).expect("a motion");
        assert!(
            wild.iter().all(|i| fit.uses[*i] == PositionUse::Outlier),
            "ζ = {zeta}: a wild value was used"
        );
        let n_marked = fit
            .uses
            .iter()
            .filter(|u| **u == PositionUse::Outlier)
            .count();
        assert_eq!(n_marked, wild.len(), "ζ = {zeta}: a sound value was marked");
        let u = fit.covariance[3][3].sqrt();
        assert!(
            (fit.damped_angular_frequency_rad_per_s - truth.omega_rad_per_s).abs() < 4.0 * u,
            "ζ = {zeta}"
        );
    }
}

#[test]
fn gaussian_noise_is_hardly_ever_marked() {
    // 0.01 false marks a record are meant; 60 records of 10⁴, 1000 and 40 readings make 1.8 expected, and 8 has probability 5e-4.
    let truth = Truth::rail(0.001);
    let marks: usize = [(2, 10_000), (58, 1000), (120, 40)]
        .into_iter()
        .flat_map(|(records, n)| (0..records).map(move |seed| (n, seed)))
        .map(|(n, seed)| {
            let fit =
                fit(&truth.record(15.0, &errors(n, 1e-3, 0.0, 500 + seed))).expect("a motion");
            fit.uses
                .iter()
                .filter(|u| **u == PositionUse::Outlier)
                .count()
        })
        .sum();
    assert!(marks < 8, "{marks} false marks");
}

#[test]
fn uncertain_times_lower_the_weight_where_the_motion_is_fast() {
    // Every second time is wrong by ±5 ms and says so; the sharp half must decide.
    let truth = Truth::rail(0.002);
    let (jitter, noise) = (errors(900, 5e-3, 0.0, 3), errors(900, 1e-5, 0.0, 4));
    let stated: Vec<PositionRecord> = (0..900_usize)
        .map(|i| {
            let t_s = i as f64 / 30.0;
            let u_t_s = if i % 2 == 0 { 5e-3 } else { 0.0 };
            PositionRecord {
                t_s,
                u_t_s,
                x_m: truth.position_m(t_s + if i % 2 == 0 { jitter[i] } else { 0.0 }) + noise[i],
                u_x_m: 1e-5,
            }
        })
        .collect();
    let fit = fit(&stated).expect("a motion");
    assert!(
        fit.uses.iter().all(|u| *u == PositionUse::Used),
        "a late reading is no outlier where its time says so"
    );
    let u_s = quantities(&fit, &NO_TERMS).period.u.expect("a figure");
    // The 450 sharp readings alone give √24·σ/A·T²/(2π·√450·30 s) = 1.8e-7 s; with the blurred ones at full weight it would be 100 times that.
    assert!(
        u_s < 2.5e-7 && (fit.period_s() - truth.period_s()).abs() < 4.0 * u_s,
        "{:e}, u = {u_s:e}",
        fit.period_s() - truth.period_s()
    );
}

#[test]
fn a_loss_that_may_be_zero_gives_bounds_and_no_quality_factor() {
    let records = Truth::rail(0.0).record(20.0, &errors(200, 2e-3, 0.0, 5));
    let fit = fit(&records).expect("a motion");
    assert!(fit.decay_rate_interval95_per_s[0] < 0.0 && fit.decay_rate_interval95_per_s[1] > 0.0);
    let found = quantities(&fit, &NO_TERMS);
    assert_eq!(
        (
            found.quality_factor.value,
            found.quality_factor.interval95[1]
        ),
        (None, None)
    );
    let lower = found.quality_factor.interval95[0].expect("a lower bound");
    let upper = found.damping_ratio.interval95[1].expect("an upper bound");
    assert!(
        (lower * 2.0 * upper - 1.0).abs() < 1e-3,
        "Q ≥ {lower} and ζ ≤ {upper} are one statement"
    );
    assert_eq!(found.energy_loss_per_cycle.interval95[0], Some(0.0));
    assert!(!fit.laws[0].excluded, "{}", fit.laws[0].reason);
}

#[test]
fn a_loss_that_shows_excludes_the_lossless_law_and_clock_and_scale_enter_where_they_belong() {
    let fit = fit(&Truth::rail(0.01).record(20.0, &errors(400, 1e-4, 0.0, 5))).expect("a motion");
    assert!(
        fit.laws[0].excluded && fit.laws[0].law == "none" && !fit.laws[1].excluded,
        "{}",
        fit.laws[0].reason
    );
    let terms = ExternalTerms {
        u_clock_rel: 1e-3,
        clock_assumed: true,
        u_scale_rel: Some(2e-3),
        scale_assumed: false,
        longest_exposure_s: None,
    };
    let (bare, full) = (quantities(&fit, &NO_TERMS), quantities(&fit, &terms));
    let u = |quantity: &ebbmark::uncertainty::Quantity| quantity.u.expect("a figure");
    let grown = |with: f64, without: f64, value: f64, relative: f64| {
        ((with.powi(2) - without.powi(2)).sqrt() / (relative * value) - 1.0).abs() < 1e-6
    };
    assert!(grown(
        u(&full.period),
        u(&bare.period),
        fit.period_s(),
        1e-3
    ));
    assert!(grown(
        u(&full.decay_rate),
        u(&bare.decay_rate),
        fit.decay_rate_per_s,
        1e-3
    ));
    assert!(grown(
        u(&full.amplitude),
        u(&bare.amplitude),
        fit.amplitude_m,
        2e-3
    ));
    assert_eq!(full.damping_ratio, bare.damping_ratio, "the clock cancels");
    let clock = full
        .budget
        .iter()
        .find(|row| row.quantity == "period" && row.unit == "1")
        .expect("a clock row");
    assert!(clock.assumed && clock.degrees_of_freedom.is_none());
}

#[test]
fn growing_oscillation_has_a_negative_decay_rate_and_no_half_life() {
    let fit = fit(&Truth::rail(-0.003).record(20.0, &errors(300, 1e-4, 0.0, 9))).expect("a motion");
    assert!(fit.decay_rate_interval95_per_s[1] < 0.0);
    let half_life = quantities(&fit, &NO_TERMS).half_life;
    assert_eq!(
        (half_life.value, half_life.interval95),
        (None, [None, None])
    );
}

#[test]
fn noise_is_no_motion() {
    for seed in 0..20 {
        for n in [12, 60, 900] {
            let records: Vec<PositionRecord> = record_of(|_| 0.2, 30.0, n)
                .into_iter()
                .zip(errors(n as usize, 1e-3, 0.0, seed))
                .map(|(r, e)| PositionRecord {
                    x_m: r.x_m + e,
                    ..r
                })
                .collect();
            let error = fit(&records)
                .map(|fit| fit.amplitude_m)
                .expect_err("only noise");
            assert!(
                matches!(error, MotionError::NoMotion { .. }),
                "seed {seed}, {n} readings: {error:?}"
            );
        }
    }
}

#[test]
fn a_marker_at_rest_is_no_motion() {
    assert!(matches!(
        fit(&record_of(|_| 0.2, 30.0, 300)),
        Err(MotionError::NoMotion { .. })
    ));
}

#[test]
fn a_slide_without_return_is_no_oscillation() {
    let slide = |t_s: f64| 0.3 * (1.0 - (-t_s / 2.0).exp());
    for x_m in [
        Box::new(slide) as Box<dyn Fn(f64) -> f64>,
        Box::new(|t_s: f64| 0.05 * t_s),
        Box::new(|t_s: f64| 0.02 * t_s * t_s),
    ] {
        let noise = errors(300, 1e-4, 0.0, 2);
        let records: Vec<PositionRecord> = record_of(x_m, 30.0, 300)
            .into_iter()
            .zip(noise)
            .map(|(r, e)| PositionRecord {
                x_m: r.x_m + e,
                ..r
            })
            .collect();
        let error = fit(&records)
            .map(|fit| fit.amplitude_m)
            .expect_err("no oscillation");
        assert!(
            matches!(
                error,
                MotionError::NoOscillation { .. } | MotionError::TooShort { .. }
            ),
            "{error:?}"
        );
    }
}

#[test]
fn a_random_walk_is_no_oscillation() {
    for seed in 0..20 {
        let mut x_m = 0.0;
        let walk: Vec<f64> = errors(600, 1e-3, 0.0, seed)
            .into_iter()
            .map(|step| {
                x_m += step;
                x_m
            })
            .collect();
        let records: Vec<PositionRecord> = record_of(|_| 0.0, 30.0, 600)
            .into_iter()
            .zip(walk)
            .map(|(r, x_m)| PositionRecord { x_m, ..r })
            .collect();
        let found = fit(&records).map(|fit| (fit.period_s(), fit.amplitude_m, fit.residual));
        assert!(
            found.is_err(),
            "seed {seed} passed for an oscillation: {found:?}"
        );
    }
}

#[test]
fn one_cycle_is_too_short_and_the_length_needed_is_said() {
    let truth = Truth::rail(0.005);
    match fit(&truth.record(60.0, &errors(78, 1e-5, 0.0, 1))) {
        Err(MotionError::TooShort {
            cycles,
            duration_needed_s,
            ..
        }) => {
            assert!((cycles - 77.0 / 72.0).abs() < 0.02, "{cycles}");
            assert!(
                (duration_needed_s - 1.8).abs() < 0.04,
                "{duration_needed_s}"
            );
        }
        other => panic!("{:?}", other.map(|fit| fit.period_s())),
    }
}

#[test]
fn too_few_readings_a_cycle_are_refused_with_the_rate_needed() {
    let error = fit(&record_of(|t_s| 0.1 * (TAU * 14.3 * t_s).cos(), 30.0, 300))
        .map(|fit| fit.period_s())
        .expect_err("2.1 readings a cycle");
    assert!(
        matches!(error, MotionError::AboveNyquist { .. }),
        "{error:?}"
    );
}

#[test]
fn a_record_of_which_half_is_off_the_motion_is_refused() {
    let mut noise = errors(600, 1e-4, 0.0, 4);
    // Where a second list of errors exceeds 0.84 standard deviations either way: two readings in five.
    let wild = errors(600, 1.0, 0.0, 5);
    for (e, w) in noise.iter_mut().zip(wild).filter(|(_, w)| w.abs() > 0.84) {
        *e += w;
    }
    let found = fit(&Truth::rail(0.003).record(30.0, &noise)).map(|fit| fit.amplitude_m);
    assert!(
        matches!(found, Err(MotionError::TooManyOutliers { .. })),
        "{found:?}"
    );
}

/// Dry friction by its turning points: straight loss of 4d a cycle, in each half cycle a cosine about the centre moved by d.
fn dry_position_m(amplitude_m: f64, friction_m: f64, theta: f64) -> f64 {
    let (mut turning_m, mut sign, mut left) = (amplitude_m, 1.0, theta);
    while left > PI {
        turning_m -= 2.0 * friction_m;
        sign = -sign;
        left -= PI;
    }
    sign * (friction_m + (turning_m - friction_m) * left.cos())
}

#[test]
fn dry_friction_and_viscous_loss_are_told_apart() {
    let omega = TAU / 1.2;
    let noise = errors(900, 1e-4, 0.3, 21);
    let dry: Vec<PositionRecord> =
        record_of(|t_s| dry_position_m(0.1, 4e-4, omega * t_s), 30.0, 900)
            .into_iter()
            .zip(&noise)
            .map(|(r, e)| PositionRecord {
                x_m: r.x_m + e,
                ..r
            })
            .collect();
    let viscous = Truth::rail(0.004).record(30.0, &noise);
    let excluded = |records: &[PositionRecord]| {
        fit(records)
            .expect("a motion")
            .laws
            .iter()
            .map(|law| (law.law, law.excluded))
            .collect::<Vec<_>>()
    };
    assert_eq!(
        excluded(&dry),
        [("none", true), ("viscous", true), ("dry", false)]
    );
    assert_eq!(
        excluded(&viscous),
        [("none", true), ("viscous", false), ("dry", true)]
    );
    let friction = fit(&dry).expect("a motion").laws[2].parameters[2];
    let u = friction.2.expect("a free parameter");
    assert!(
        (friction.1 - 4e-4).abs() < 4.0 * u && u < 2e-6,
        "d = {} ± {u}",
        friction.1
    );
}

/// Dry friction is not the fitted law; what the law misses must not be thrown out as wild readings, whatever the weights.
#[test]
fn what_the_law_misses_is_no_outlier_but_a_wild_reading_still_is() {
    let (omega, friction_m, amplitude_m) = (5.984, 0.0006, 0.06);
    let mut records: Vec<PositionRecord> = (0..900)
        .map(|k| {
            let t_s = f64::from(k) / 60.0;
            // Half cycles about shifted centres: the turning point loses 2 F/k each time.
            let half = (omega * t_s / std::f64::consts::PI).floor();
            let sign = if half % 2.0 == 0.0 { 1.0 } else { -1.0 };
            let reach_m = amplitude_m - (2.0 * half + 1.0) * friction_m;
            let x_m = sign * friction_m + reach_m * (omega * t_s).cos();
            let u_x_m = if k % 7 == 0 { 1.5e-6 } else { 6e-6 };
            let error_m = u_x_m * (f64::from(k) * 2.399).sin();
            PositionRecord {
                t_s,
                u_t_s: 0.0,
                x_m: x_m + error_m,
                u_x_m,
            }
        })
        .collect();
    let clean = fit(&records).expect("a fit");
    assert!(clean.uses.iter().all(|of| *of == PositionUse::Used));
    records[300].x_m += 0.004;
    records[899].x_m -= 0.004;
    let marked = fit(&records).expect("a fit");
    let outliers: Vec<usize> = (0..900)
        .filter(|&k| marked.uses[k] == PositionUse::Outlier)
        .collect();
    assert_eq!(outliers, [300, 899]);
}
