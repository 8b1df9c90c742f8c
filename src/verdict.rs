//! Answers, with the figures behind each.

use crate::motion::{MotionFit, MotionQuantities, period_shift_s};
use crate::uncertainty::{Evaluation, prefixed, rounded, significant};

/// One of three answers.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Answer {
    /// The data show it.
    Yes,
    /// The data rule it out, to the stated precision.
    No,
    /// The data allow both; the sentence says what would decide.
    Undecided,
}

impl Answer {
    /// The word used in every file: `yes`, `no`, `undecided`.
    #[must_use]
    pub fn word(self) -> &'static str {
        match self {
            Self::Yes => "yes",
            Self::No => "no",
            Self::Undecided => "undecided",
        }
    }
}

/// A question, its answer and what the answer rests on.
#[derive(Clone, Debug, PartialEq)]
pub struct Verdict {
    /// Key: `loss_present`, `loss_shifts_period`.
    pub question: &'static str,
    /// The question as a person would ask it.
    pub asked: &'static str,
    /// Yes, no or undecided.
    pub answer: Answer,
    /// The ratio the answer rests on.
    pub ratio: f64,
    /// What is divided by what, in words.
    pub ratio_of: &'static str,
    /// One sentence in plain words, with figures.
    pub sentence: String,
}

/// Energy loss per cycle below which a loss is taken as none: a thousandth, which halves the amplitude in 1400 cycles.
pub const RELEVANT_LOSS_PER_CYCLE: f64 = 1e-3;
/// Coverage factor of U(T), by convention (GUM 6.2.1, 6.3.3).
const EXPANDED: f64 = 2.0;
/// Steps in which longer films are tried, as factors of the length.
const LONGER: f64 = 1.05;
/// A film longer than this many times is no advice.
const LONGEST: f64 = 100.0;

/// The verdicts on loss.
///
/// `loss_present`: yes where the 95 % interval of the decay rate lies above 0; no where the upper end of the energy loss per cycle
/// is below [`RELEVANT_LOSS_PER_CYCLE`]; else undecided, with the film that would decide (the uncertainty of the decay rate falls with the
/// 3/2 power of the length at the same frame rate, as long as the motion lasts).
///
/// `loss_shifts_period`: T_d − T_0 of the viscous law, with the 95 % interval that follows from the damping ratio's, against U(T) = 2u(T)
/// of film and clock: yes where it lies above, no where it lies below, else undecided, with what would decide. Dry friction does not move the
/// period: no, where the record follows it and rules viscous loss out.
///
/// * `fit`, `quantities`: of the same record.
/// * Returns the two, in this order.
#[must_use]
pub fn verdicts(fit: &MotionFit, quantities: &MotionQuantities) -> Vec<Verdict> {
    vec![
        loss_present(fit, quantities),
        loss_shifts_period(fit, quantities),
    ]
}

fn loss_present(fit: &MotionFit, quantities: &MotionQuantities) -> Verdict {
    let [low, high] = fit.decay_rate_interval95_per_s;
    let gamma = fit.decay_rate_per_s;
    let loss = &quantities.energy_loss_per_cycle;
    let upper = loss.interval95[1].unwrap_or(f64::INFINITY);
    let (answer, sentence) = if low > 0.0 {
        let [from, to] = loss.interval95.map(|end| 100.0 * end.unwrap_or(0.0));
        let lost = rounded(100.0 * loss.value.unwrap_or(0.0), half(from, to));
        let expanded = significant(half(from, to), 2);
        (
            Answer::Yes,
            format!(
                "{lost} ± {expanded} % of the energy is lost in a cycle (95 %), and the decay rate of {} ± {} s⁻¹ stands clear of zero.",
                rounded(gamma, half(low, high)),
                significant(half(low, high), 2)
            ),
        )
    } else if high < 0.0 {
        (
            Answer::No,
            format!(
                "The amplitude grows, by {} s⁻¹: energy is fed in rather than lost; check that nothing drives the motion.",
                rounded(-gamma, half(low, high))
            ),
        )
    } else if upper < RELEVANT_LOSS_PER_CYCLE {
        (
            Answer::No,
            format!(
                "No loss that matters: at most {} of the energy is lost in a cycle (95 %), below the {} taken as relevant.",
                percent(upper),
                percent(RELEVANT_LOSS_PER_CYCLE)
            ),
        )
    } else {
        let advice = longer_film(fit, |shrunk| {
            decay_rate_decides(gamma, half(low, high) * shrunk, fit.period_s())
        });
        (
            Answer::Undecided,
            format!(
                "The record allows no loss as well as one of {} of the energy in a cycle; {advice}.",
                percent(upper)
            ),
        )
    };
    Verdict {
        question: "loss_present",
        asked: "Is energy lost?",
        answer,
        ratio: gamma / (gamma - low),
        ratio_of: "decay rate over the half-width of its 95 % interval towards zero",
        sentence,
    }
}

/// Would an interval of this half-width about the same estimate answer `loss_present`?
fn decay_rate_decides(gamma: f64, half_width: f64, period_s: f64) -> bool {
    let upper = gamma.max(0.0) + half_width;
    gamma > half_width || -(-2.0 * upper * period_s).exp_m1() < RELEVANT_LOSS_PER_CYCLE
}

fn loss_shifts_period(fit: &MotionFit, quantities: &MotionQuantities) -> Verdict {
    let period_s = fit.period_s();
    let shift_s = |zeta: f64| period_shift_s(period_s, zeta);
    let [mut low, mut high] = quantities
        .damping_ratio
        .interval95
        .map(|end| shift_s(end.unwrap_or(0.0)));
    if low > high {
        // A growing motion: both ends of ζ are below 0.
        (low, high) = (high, low);
    }
    let zeta = quantities.damping_ratio.value.unwrap_or(0.0);
    let expanded_s = EXPANDED * quantities.period.u.unwrap_or(f64::INFINITY);
    let digits = digits_that_tell(low, high);
    let shift = prefixed(shift_s(zeta), "s", digits);
    let against = prefixed(expanded_s, "s", 2);
    let (from, to) = (prefixed(low, "s", digits), prefixed(high, "s", digits));
    let (answer, sentence) = if loss_is_dry(fit) {
        (
            Answer::No,
            format!(
                "The record follows dry friction and rules viscous loss out; dry friction does not move the period (viscous loss of this size would by {shift}, against the {against} (k = 2) to which it is known)."
            ),
        )
    } else if fit.decay_rate_interval95_per_s[1] < 0.0 {
        (
            Answer::Undecided,
            "The amplitude grows, so that there is no loss to shift the period; find what drives the motion, and film it free.".to_owned(),
        )
    } else if fit.laws.iter().all(|law| law.excluded) {
        (
            Answer::Undecided,
            format!(
                "None of the laws of loss tried describes this motion, so that what the loss does to the period cannot be told; viscous loss of this size would make it {shift} longer, and it is known to {against} (k = 2) at best. Mend what the warnings name, or film smaller swings."
            ),
        )
    } else if low > expanded_s {
        (
            Answer::Yes,
            format!(
                "Viscous loss makes the period {shift} longer than without loss (95 % interval {from} to {to}), more than the {against} (k = 2) to which the period is known; dry friction of the same size would not move it."
            ),
        )
    } else if high < expanded_s {
        (
            Answer::No,
            format!(
                "Viscous loss would make the period at most {} longer, and the period is known to {against} (k = 2): the loss does not matter to it. Dry friction would not move it at all.",
                prefixed(high, "s", 2)
            ),
        )
    } else {
        let advice = longer_film(fit, |shrunk| shift_decides(fit, quantities, shrunk));
        (
            Answer::Undecided,
            format!(
                "If the loss is viscous the period is {from} to {to} longer than without it, and known to {against} (k = 2), which lies between; {advice}. Dry friction would not move it."
            ),
        )
    };
    Verdict {
        question: "loss_shifts_period",
        asked: "Does the loss shift the period by more than the timing can tell?",
        answer,
        ratio: shift_s(zeta) / expanded_s,
        ratio_of: "period shift of viscous loss over the expanded uncertainty (k = 2) of the period",
        sentence,
    }
}

/// True where the record rules viscous loss out and dry friction not.
fn loss_is_dry(fit: &MotionFit) -> bool {
    let excluded = |key| {
        fit.laws
            .iter()
            .find(|law| law.law == key)
            .map(|law| law.excluded)
    };
    excluded("viscous") == Some(true) && excluded("dry") == Some(false)
}

/// Would this record's estimates answer `loss_shifts_period` if the fit's uncertainties were `shrunk` times theirs? The clock's stays.
fn shift_decides(fit: &MotionFit, quantities: &MotionQuantities, shrunk: f64) -> bool {
    let part = |evaluation| {
        quantities
            .budget
            .iter()
            .filter(|row| row.quantity == "period" && row.evaluation == evaluation)
            .map(|row| row.contribution.powi(2))
            .sum::<f64>()
    };
    let expanded_s =
        EXPANDED * (part(Evaluation::A) * shrunk * shrunk + part(Evaluation::B)).sqrt();
    let [low, high] = fit.decay_rate_interval95_per_s;
    let gamma = fit.decay_rate_per_s;
    let omega = fit.damped_angular_frequency_rad_per_s;
    let shift_s = |gamma: f64| period_shift_s(fit.period_s(), gamma / omega.hypot(gamma));
    let nearer = (gamma - (gamma - low) * shrunk).max(0.0);
    shift_s(nearer) > expanded_s || shift_s(gamma.max(0.0) + (high - gamma) * shrunk) < expanded_s
}

/// The shortest film, a factor of 1.05 at a time, with which `decides` says yes; `decides` takes the factor of the fit's uncertainties,
/// (length now/length then)^(3/2), with the estimates as they are.
fn longer_film(fit: &MotionFit, decides: impl Fn(f64) -> bool) -> String {
    let mut factor = 1.0;
    while factor < LONGEST {
        factor *= LONGER;
        if decides(factor.powf(-1.5)) {
            let seconds = significant(factor * fit.duration_s(), 2);
            return format!(
                "a film of about {seconds} s at the same frame rate would decide it, if the estimate holds and the motion lasts"
            );
        }
    }
    "no longer film would decide it at this estimate, only a clock and a camera that are known better".to_owned()
}

/// Significant digits that tell the ends of an interval apart: two of its width, from two to six.
fn digits_that_tell(low: f64, high: f64) -> i32 {
    let ratio = high.abs().max(low.abs()) / (high - low).abs();
    let steps = (1..5)
        .take_while(|&power| ratio > 10_f64.powi(power))
        .count();
    2 + i32::try_from(steps).unwrap_or(0)
}

fn half(low: f64, high: f64) -> f64 {
    0.5 * (high - low)
}

fn percent(part: f64) -> String {
    format!("{} %", significant(100.0 * part, 2))
}

#[cfg(test)]
#[allow(clippy::expect_used, reason = "a failed expectation is a failed test")]
mod tests {
    use super::*;
    use crate::motion::{ExternalTerms, PositionRecord, fit, quantities};
    use std::f64::consts::TAU;

    /// The verdicts on a record at 60 Hz with alternating errors of ±1e-4·`noise` of the amplitude 0.1 m, and a clock known to `clock_rel`.
    fn on(zeta: f64, seconds: u32, noise: f64, clock_rel: f64) -> Vec<Verdict> {
        let omega = TAU / 1.2;
        let error = |i: u32| if (i * i * 7 + i * 3) % 11 < 5 { noise } else { -noise } * 1e-5;
        let at = |i: u32| {
            let t_s = f64::from(i) / 60.0;
            PositionRecord {
                t_s,
                u_t_s: 0.0,
                x_m: 0.1 * (-zeta * omega * t_s).exp() * (omega * t_s).cos() + error(i),
                u_x_m: 1e-5,
            }
        };
        let fit = fit(&(0..60 * seconds).map(at).collect::<Vec<_>>()).expect("a motion");
        let external = ExternalTerms {
            u_clock_rel: clock_rel,
            clock_assumed: false,
            u_scale_rel: None,
            scale_assumed: false,
            longest_exposure_s: None,
        };
        verdicts(&fit, &quantities(&fit, &external))
    }

    fn answers(verdicts: &[Verdict]) -> [Answer; 2] {
        [verdicts[0].answer, verdicts[1].answer]
    }

    #[test]
    fn loss_that_the_eye_sees_need_not_matter_to_the_period() {
        // ζ = 0.005 moves 1.2 s by 15 µs; a clock known to 29 ppm (±50 ppm) gives U(T) = 69 µs.
        let verdicts = on(0.005, 30, 5.0, 2.9e-5);
        assert_eq!(answers(&verdicts), [Answer::Yes, Answer::No]);
        assert!(
            (verdicts[1].ratio / (1.2 * 0.5 * 0.005_f64.powi(2) / (2.0 * 2.9e-5 * 1.2)) - 1.0)
                .abs()
                < 0.05,
            "{}",
            verdicts[1].ratio
        );
        assert!(
            verdicts[1].sentence.contains("15 µs") && verdicts[1].sentence.contains("70 µs"),
            "{}",
            verdicts[1].sentence
        );
    }

    #[test]
    fn with_a_good_clock_the_same_loss_shifts_the_period() {
        assert_eq!(
            answers(&on(0.005, 30, 0.5, 1e-6)),
            [Answer::Yes, Answer::Yes]
        );
    }

    #[test]
    fn a_loss_below_a_thousandth_a_cycle_is_no_loss_that_matters() {
        assert_eq!(answers(&on(0.0, 30, 5.0, 2.9e-5)), [Answer::No, Answer::No]);
    }

    #[test]
    fn a_short_noisy_record_is_undecided_and_says_which_film_would_decide() {
        let verdicts = on(0.0002, 4, 60.0, 2.9e-5);
        assert_eq!(verdicts[0].answer, Answer::Undecided);
        assert!(
            verdicts[0].sentence.contains("a film of about"),
            "{}",
            verdicts[0].sentence
        );
    }

    #[test]
    fn a_shift_at_the_edge_of_the_timing_is_undecided() {
        // With a perfect clock the ratio is shift/2u; a clock is then chosen that brings 2u to the shift of 1.2 s · ζ²/2.
        let shift_s = 1.2 * 0.5 * 0.02_f64.powi(2);
        let u_fit_s = 0.5 * shift_s / on(0.02, 4, 20.0, 0.0)[1].ratio;
        let verdicts = on(
            0.02,
            4,
            20.0,
            (0.25 * shift_s.powi(2) - u_fit_s.powi(2)).sqrt() / 1.2,
        );
        assert_eq!(
            verdicts[1].answer,
            Answer::Undecided,
            "{}",
            verdicts[1].sentence
        );
        assert!(
            (verdicts[1].ratio - 1.0).abs() < 0.01,
            "{}",
            verdicts[1].ratio
        );
    }

    #[test]
    fn dry_friction_loses_energy_and_does_not_shift_the_period() {
        // θ = ωt in half cycle k: (−1)ᵏd + (A − (2k + 1)d) cos θ, see the law.
        let (amplitude_m, d_m, omega) = (0.1, 4e-4, TAU / 1.2);
        let at = |i: u32| {
            let t_s = f64::from(i) / 60.0;
            let k = (omega * t_s / std::f64::consts::PI).floor();
            let side = if k % 2.0 == 0.0 { 1.0 } else { -1.0 };
            let error = if (i * i * 7 + i * 3) % 11 < 5 {
                5e-5
            } else {
                -5e-5
            };
            let x_m =
                side * d_m + (amplitude_m - (2.0 * k + 1.0) * d_m) * (omega * t_s).cos() + error;
            PositionRecord {
                t_s,
                u_t_s: 0.0,
                x_m,
                u_x_m: 1e-5,
            }
        };
        let fit = fit(&(0..1800).map(at).collect::<Vec<_>>()).expect("a motion");
        let external = ExternalTerms {
            u_clock_rel: 1e-9,
            clock_assumed: false,
            u_scale_rel: None,
            scale_assumed: false,
            longest_exposure_s: None,
        };
        let verdicts = verdicts(&fit, &quantities(&fit, &external));
        assert_eq!(answers(&verdicts), [Answer::Yes, Answer::No]);
        assert!(
            verdicts[1].sentence.contains("follows dry friction"),
            "{}",
            verdicts[1].sentence
        );
    }
}
