//! From the fit to every figure that is asked of an oscillation, each with its budget.
//!
//! In: a [`MotionFit`] and what is known of clock and scale. Out: [`MotionQuantities`].
//!
//! A clock that runs wrong by a part ε stretches every time by it: period and half-life grow, ω and γ shrink, and their ratios ζ, δ, Q and
//! the energy loss do not notice. A wrong scale stretches amplitude and centre only.

use super::MotionFit;
use super::relations::Figures;
use crate::stats::coverage_factor;
use crate::uncertainty::{BudgetRow, Evaluation, Quantity, combined, effective_degrees_of_freedom};

/// Coverage of every interval.
const COVERAGE: f64 = 0.95;

/// Everything derived from the fit, each with its combined standard uncertainty (fit, clock, scale).
///
/// Intervals have 95 % coverage. Those of γ and of what grows or falls with it alone follow the profile-likelihood interval of γ and are
/// unequal. Where that interval contains 0, γ, ζ, δ and the energy loss keep their estimate and u, and their interval runs from 0, which a
/// passive system cannot pass, to the one-sided 95 % bound; Q and the half-life then have no value and a lower bound only.
#[derive(Clone, Debug, PartialEq)]
pub struct MotionQuantities {
    /// T_d = 2π/ω, s.
    pub period: Quantity,
    /// ω, rad/s.
    pub damped_angular_frequency: Quantity,
    /// T_0 = 2π/√(ω² + γ²), s (viscous law).
    pub undamped_period: Quantity,
    /// γ, s⁻¹.
    pub decay_rate: Quantity,
    /// ζ = γ/√(ω² + γ²), 1.
    pub damping_ratio: Quantity,
    /// δ = γT, 1.
    pub log_decrement: Quantity,
    /// Q = 1/(2ζ), 1; no value where the interval of γ reaches 0, then a lower bound.
    pub quality_factor: Quantity,
    /// 1 − e^(−2δ), 1.
    pub energy_loss_per_cycle: Quantity,
    /// A at `t_ref_s`, m.
    pub amplitude: Quantity,
    /// ln 2/γ, s: time for the amplitude to halve; no value where the interval of γ reaches 0, then a lower bound.
    pub half_life: Quantity,
    /// c, m.
    pub centre: Quantity,
    /// The budget rows behind period, amplitude, decay_rate and the rest.
    pub budget: Vec<BudgetRow>,
}

/// Type B terms that do not come from the record itself.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ExternalTerms {
    /// Relative standard uncertainty of the clock's rate, 1.
    pub u_clock_rel: f64,
    /// True where the clock's limit is our default.
    pub clock_assumed: bool,
    /// Relative standard uncertainty of the scale, 1; None for a table of positions, whose scale is taken as it stands.
    pub u_scale_rel: Option<f64>,
    /// True where a part of the scale's uncertainty is our default.
    pub scale_assumed: bool,
    /// Longest the shutter can have been open for a frame, s; None where positions are those of an instant.
    pub longest_exposure_s: Option<f64>,
}

/// The figures of a motion.
///
/// Uncertainties propagate through the full covariance of the fit (γ and ω are correlated) and combine with clock and scale as independent;
/// intervals take Student's t at the effective degrees of freedom.
///
/// # Source
/// [JCGM 100](crate::sources::Gum), 5.1, 5.2 and G.4; terms of [ISO 2041](crate::sources::Iso2041). Intervals of γ:
/// [Venzon and Moolgavkar 1988](crate::sources::VenzonMoolgavkar88).
#[must_use]
pub fn quantities(fit: &MotionFit, external: &ExternalTerms) -> MotionQuantities {
    let figures = Figures {
        gamma: fit.decay_rate_per_s,
        omega: fit.damped_angular_frequency_rad_per_s,
    };
    let mut ledger = Ledger {
        fit,
        external,
        figures,
        budget: Vec::new(),
    };
    MotionQuantities {
        period: ledger.symmetric("period", "s", figures.period(), figures.period_slope(), 1.0),
        damped_angular_frequency: ledger.symmetric(
            "damped_angular_frequency",
            "rad/s",
            figures.omega,
            [0.0, 1.0],
            -1.0,
        ),
        undamped_period: ledger.symmetric(
            "undamped_period",
            "s",
            figures.undamped_period(),
            figures.undamped_period_slope(),
            1.0,
        ),
        decay_rate: ledger.loss("decay_rate", "s-1", |f| f.gamma, [1.0, 0.0], -1.0),
        damping_ratio: ledger.loss(
            "damping_ratio",
            "1",
            Figures::damping_ratio,
            figures.damping_ratio_slope(),
            0.0,
        ),
        log_decrement: ledger.loss(
            "log_decrement",
            "1",
            Figures::log_decrement,
            figures.log_decrement_slope(),
            0.0,
        ),
        quality_factor: ledger.endurance(
            "quality_factor",
            "1",
            Figures::quality_factor,
            figures.quality_factor_slope(),
            0.0,
        ),
        energy_loss_per_cycle: ledger.loss(
            "energy_loss_per_cycle",
            "1",
            Figures::energy_loss,
            figures.energy_loss_slope(),
            0.0,
        ),
        amplitude: ledger.length("amplitude", fit.amplitude_m, 0),
        half_life: ledger.endurance(
            "half_life",
            "s",
            Figures::half_life,
            figures.half_life_slope(),
            1.0,
        ),
        centre: ledger.length("centre", fit.centre_m, 4),
        budget: ledger.budget,
    }
}

/// What the open shutter takes off the amplitude: a marker smeared over a time τ is seen at its mean place, and the amplitude
/// comes out sin(ωτ/2)/(ωτ/2) ≈ 1 − (ωτ)²/24 times its size.
///
/// τ is not known but for its limit, `omega_tau`/ω: the loss lies between 0 and (ωτ)²/24, rectangular, and is not corrected;
/// its root mean square is limit/√3.
fn smear_row(key: &'static str, amplitude_m: f64, omega_tau: f64) -> BudgetRow {
    let limit_rel = omega_tau * omega_tau / 24.0;
    BudgetRow::new(
        key,
        "smear while the shutter is open, at most a frame interval",
        Evaluation::B,
        limit_rel / 3.0_f64.sqrt(),
        "1",
        amplitude_m,
    )
    .assumed(true)
}

/// The upper end of a one-sided 95 % interval of γ where the two-sided one contains 0, s⁻¹.
///
/// The profile's upper half-width, from t(0.975) to t(0.95). An estimate below 0 counts as 0: a fluctuation must not buy a bound that the
/// record's noise does not support. That costs over-coverage, by up to 5 %, where the loss is truly 0.
fn one_sided_decay_rate_bound(fit: &MotionFit) -> f64 {
    let half = fit.decay_rate_interval95_per_s[1] - fit.decay_rate_per_s;
    let nu = fit.degrees_of_freedom;
    fit.decay_rate_per_s.max(0.0)
        + half * coverage_factor(2.0 * COVERAGE - 1.0, nu) / coverage_factor(COVERAGE, nu)
}

/// True where the 95 % interval of γ contains 0.
fn loss_may_be_zero(fit: &MotionFit) -> bool {
    let [low, high] = fit.decay_rate_interval95_per_s;
    low <= 0.0 && high >= 0.0
}

/// Writes budget rows as the quantities are made.
struct Ledger<'a> {
    fit: &'a MotionFit,
    external: &'a ExternalTerms,
    figures: Figures,
    budget: Vec<BudgetRow>,
}

impl Ledger<'_> {
    /// u of a function of (γ, ω) from the covariance alone.
    fn u_fit(&self, slope: [f64; 2]) -> f64 {
        let c = &self.fit.covariance;
        (slope[0].powi(2) * c[2][2]
            + 2.0 * slope[0] * slope[1] * c[2][3]
            + slope[1].powi(2) * c[3][3])
            .max(0.0)
            .sqrt()
    }

    /// Rows of a function of (γ, ω), whose value goes as the `clock_power`-th power of the clock's rate.
    fn rows(
        &self,
        key: &'static str,
        unit: &'static str,
        value: f64,
        slope: [f64; 2],
        clock_power: f64,
    ) -> Vec<BudgetRow> {
        let c = &self.fit.covariance;
        let fit_row = match slope {
            [s, 0.0] => BudgetRow::new(
                key,
                "fit of the positions: decay rate",
                Evaluation::A,
                c[2][2].sqrt(),
                "s-1",
                s,
            ),
            [0.0, s] => BudgetRow::new(
                key,
                "fit of the positions: angular frequency",
                Evaluation::A,
                c[3][3].sqrt(),
                "rad/s",
                s,
            ),
            _ => {
                let source = if clock_power == 0.0 {
                    "fit of the positions: decay rate and angular frequency, correlated (a ratio of times, so the clock cancels)"
                } else {
                    "fit of the positions: decay rate and angular frequency, correlated"
                };
                BudgetRow::new(key, source, Evaluation::A, self.u_fit(slope), unit, 1.0)
            }
        };
        let mut rows = vec![fit_row.with_degrees_of_freedom(self.fit.degrees_of_freedom)];
        if clock_power != 0.0 {
            let row = BudgetRow::new(
                key,
                "rate of the clock",
                Evaluation::B,
                self.external.u_clock_rel,
                "1",
                clock_power * value,
            );
            rows.push(row.assumed(self.external.clock_assumed));
        }
        rows
    }

    fn symmetric(
        &mut self,
        key: &'static str,
        unit: &'static str,
        value: f64,
        slope: [f64; 2],
        clock_power: f64,
    ) -> Quantity {
        let rows = self.rows(key, unit, value, slope, clock_power);
        self.enter(value, unit, rows)
    }

    fn length(&mut self, key: &'static str, value_m: f64, index: usize) -> Quantity {
        let u_m = self.fit.covariance[index][index].sqrt();
        let mut rows = vec![
            BudgetRow::new(key, "fit of the positions", Evaluation::A, u_m, "m", 1.0)
                .with_degrees_of_freedom(self.fit.degrees_of_freedom),
        ];
        if let Some(u_scale_rel) = self.external.u_scale_rel {
            let row = BudgetRow::new(
                key,
                "scale, metres per pixel",
                Evaluation::B,
                u_scale_rel,
                "1",
                value_m,
            );
            rows.push(row.assumed(self.external.scale_assumed));
        }
        let residual = &self.fit.residual;
        if index == 0 && residual.is_structured() {
            // An envelope of another shape misses most at its ends: twice its rms, there the amplitude is read off.
            let source = "what the law misses of the motion";
            let row = BudgetRow::new(key, source, Evaluation::A, residual.rms_m, "m", 2.0);
            rows.push(row.with_degrees_of_freedom(self.fit.degrees_of_freedom));
        }
        if let (0, Some(longest_s)) = (index, self.external.longest_exposure_s) {
            rows.push(smear_row(key, value_m, self.figures.omega * longest_s));
        }
        self.enter(value_m, "m", rows)
    }

    fn enter(&mut self, value: f64, unit: &'static str, rows: Vec<BudgetRow>) -> Quantity {
        let nu = effective_degrees_of_freedom(&rows).unwrap_or(f64::INFINITY);
        let quantity =
            Quantity::symmetric(value, combined(&rows), coverage_factor(COVERAGE, nu), unit);
        self.budget.extend(rows);
        quantity
    }

    /// A figure that grows with γ and is 0 with it.
    fn loss(
        &mut self,
        key: &'static str,
        unit: &'static str,
        of: fn(&Figures) -> f64,
        slope: [f64; 2],
        clock_power: f64,
    ) -> Quantity {
        let value = of(&self.figures);
        let rows = self.rows(key, unit, value, slope, clock_power);
        let u = combined(&rows);
        let at = |gamma| {
            of(&Figures {
                gamma,
                ..self.figures
            })
        };
        let interval95 = if loss_may_be_zero(self.fit) {
            let bound = at(one_sided_decay_rate_bound(self.fit));
            [
                Some(0.0),
                Some(self.widened(value.max(0.0), bound, slope, u)),
            ]
        } else {
            self.fit
                .decay_rate_interval95_per_s
                .map(|gamma| Some(self.widened(value, at(gamma), slope, u)))
        };
        self.budget.extend(rows);
        Quantity {
            value: Some(value),
            u: Some(u),
            unit,
            interval95,
        }
    }

    /// A figure that falls with γ and is infinite without it.
    fn endurance(
        &mut self,
        key: &'static str,
        unit: &'static str,
        of: fn(&Figures) -> f64,
        slope: [f64; 2],
        clock_power: f64,
    ) -> Quantity {
        let at = |gamma| {
            of(&Figures {
                gamma,
                ..self.figures
            })
        };
        if loss_may_be_zero(self.fit) {
            let lower = at(one_sided_decay_rate_bound(self.fit));
            return Quantity {
                value: None,
                u: None,
                unit,
                interval95: [Some(lower), None],
            };
        }
        if self.figures.gamma <= 0.0 {
            // The motion grows: there is no time to halve in, and no bound to it.
            return Quantity {
                value: None,
                u: None,
                unit,
                interval95: [None, None],
            };
        }
        let value = of(&self.figures);
        let rows = self.rows(key, unit, value, slope, clock_power);
        let u = combined(&rows);
        let [low, high] = self
            .fit
            .decay_rate_interval95_per_s
            .map(|gamma| Some(self.widened(value, at(gamma), slope, u)));
        self.budget.extend(rows);
        Quantity {
            value: Some(value),
            u: Some(u),
            unit,
            interval95: [high, low],
        }
    }

    /// An end of an interval that covers γ alone, moved out for what the combined u has beyond γ's part (ω, the clock), in quadrature.
    fn widened(&self, value: f64, end: f64, slope: [f64; 2], u: f64) -> f64 {
        let k = coverage_factor(COVERAGE, self.fit.degrees_of_freedom);
        let extra2 = (u * u - slope[0].powi(2) * self.fit.covariance[2][2]).max(0.0);
        value + (end - value).signum() * (end - value).hypot(k * extra2.sqrt())
    }
}
