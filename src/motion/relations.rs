//! What follows exactly from the decay rate and the damped angular frequency of a viscously damped motion.
//!
//! No small-ζ forms: at ζ = 0.2 they are 2 % off. Every relation comes with its slopes, for the propagation of uncertainty.

use std::f64::consts::{LN_2, TAU};

/// γ and ω, and what follows from them exactly; a slope is (∂/∂γ, ∂/∂ω).
#[derive(Clone, Copy, Debug)]
pub(super) struct Figures {
    /// γ, s⁻¹.
    pub(super) gamma: f64,
    /// ω, rad/s.
    pub(super) omega: f64,
}

impl Figures {
    /// ω_0 = √(ω² + γ²), rad/s.
    pub(super) fn undamped(&self) -> f64 {
        self.omega.hypot(self.gamma)
    }
    pub(super) fn period(&self) -> f64 {
        TAU / self.omega
    }
    pub(super) fn period_slope(&self) -> [f64; 2] {
        [0.0, -TAU / self.omega.powi(2)]
    }
    pub(super) fn undamped_period(&self) -> f64 {
        TAU / self.undamped()
    }
    pub(super) fn undamped_period_slope(&self) -> [f64; 2] {
        let cubed = self.undamped().powi(3);
        [-TAU * self.gamma / cubed, -TAU * self.omega / cubed]
    }
    pub(super) fn damping_ratio(&self) -> f64 {
        self.gamma / self.undamped()
    }
    pub(super) fn damping_ratio_slope(&self) -> [f64; 2] {
        let cubed = self.undamped().powi(3);
        [self.omega.powi(2) / cubed, -self.gamma * self.omega / cubed]
    }
    pub(super) fn log_decrement(&self) -> f64 {
        TAU * self.gamma / self.omega
    }
    pub(super) fn log_decrement_slope(&self) -> [f64; 2] {
        [TAU / self.omega, -TAU * self.gamma / self.omega.powi(2)]
    }
    pub(super) fn quality_factor(&self) -> f64 {
        0.5 / self.damping_ratio()
    }
    pub(super) fn quality_factor_slope(&self) -> [f64; 2] {
        self.damping_ratio_slope()
            .map(|slope| -0.5 * slope / self.damping_ratio().powi(2))
    }
    /// By `exp_m1`: 1 − e^(−2δ) itself loses the digits that a small loss has.
    pub(super) fn energy_loss(&self) -> f64 {
        -(-2.0 * self.log_decrement()).exp_m1()
    }
    pub(super) fn energy_loss_slope(&self) -> [f64; 2] {
        self.log_decrement_slope()
            .map(|slope| 2.0 * slope * (-2.0 * self.log_decrement()).exp())
    }
    pub(super) fn half_life(&self) -> f64 {
        LN_2 / self.gamma
    }
    pub(super) fn half_life_slope(&self) -> [f64; 2] {
        [-LN_2 / self.gamma.powi(2), 0.0]
    }
}

/// T_d − T_0 of the viscous law, in s, from the damped period T_d in s and the damping ratio ζ, |ζ| ≤ 1.
///
/// T_d (1 − √(1 − ζ²)) in the form T_d ζ²/(1 + √(1 − ζ²)), which does not cancel where ζ is small.
#[must_use]
pub fn period_shift_s(period_s: f64, damping_ratio: f64) -> f64 {
    let x = damping_ratio * damping_ratio;
    period_s * x / (1.0 + (1.0 - x).max(0.0).sqrt())
}

#[cfg(test)]
mod tests {
    use super::*;
    use std::error::Error;

    /// The tables have 13 digits.
    const TABLE_TOL_REL: f64 = 1e-10;

    type Outcome = Result<(), Box<dyn Error>>;

    fn assert_close(got: f64, want: f64, what: &str) {
        assert!(
            (got / want - 1.0).abs() < TABLE_TOL_REL,
            "{what}: got {got:e}, want {want:e}"
        );
    }

    fn table(text: &str) -> Vec<Vec<f64>> {
        text.lines()
            .skip(1)
            .map(|line| {
                line.split(',')
                    .map(|cell| cell.parse().unwrap_or(f64::NAN))
                    .collect()
            })
            .collect()
    }

    #[test]
    fn damping_relations_hold_from_weak_to_strong() {
        for row in table(include_str!(
            "../../fixtures/reference/oscillation/damping_relations.csv"
        )) {
            let zeta = row[0];
            let figures = Figures {
                gamma: zeta,
                omega: (1.0 - zeta * zeta).sqrt(),
            };
            let what = format!("ζ = {zeta}");
            assert_close(figures.damping_ratio(), zeta, &what);
            assert_close(figures.log_decrement(), row[1], &what);
            assert_close(figures.quality_factor(), row[3], &what);
            assert_close(figures.energy_loss(), row[5], &what);
            assert_close(figures.period() / figures.undamped_period(), row[8], &what);
            assert_close(figures.half_life() / figures.period(), row[10], &what);
            // 1e6 (T_d/T_0 − 1): the table keeps the digits that the ratio has lost.
            assert_close(
                1e6 * period_shift_s(figures.period(), zeta) / figures.undamped_period(),
                row[9],
                &what,
            );
        }
    }

    #[test]
    fn the_inverse_of_the_decrement_holds() {
        for row in table(include_str!(
            "../../fixtures/reference/oscillation/decrement_inverse.csv"
        )) {
            let decrement = -row[1].ln() / row[0];
            let figures = Figures {
                gamma: decrement,
                omega: TAU,
            };
            assert_close(figures.log_decrement(), row[2], "δ");
            assert_close(figures.damping_ratio(), row[3], "ζ");
            assert_close(figures.quality_factor(), row[5], "Q");
        }
    }

    #[test]
    fn the_textbook_example_comes_out() -> Outcome {
        // 10 lbf on 30 lbf/in with 0.12 lbf·s/in, g = 386 in/s².
        let (mass, stiffness, resistance) = (10.0 / 386.0, 30.0, 0.12);
        let gamma: f64 = resistance / (2.0 * mass);
        let figures = Figures {
            gamma,
            omega: (stiffness / mass - gamma * gamma).sqrt(),
        };
        let text = include_str!("../../fixtures/reference/oscillation/textbook_example.csv");
        let value = |key: &str| -> Result<f64, Box<dyn Error>> {
            let line = text
                .lines()
                .find(|line| line.starts_with(key))
                .ok_or("no such row")?;
            Ok(line.split(',').nth(1).ok_or("no value")?.parse()?)
        };
        assert_close(figures.undamped(), value("omega_n")?, "ω_0");
        assert_close(figures.damping_ratio(), value("zeta")?, "ζ");
        assert_close(figures.log_decrement(), value("log_decrement")?, "δ");
        assert_close(
            figures.log_decrement().exp(),
            value("ratio")?,
            "amplitude ratio",
        );
        Ok(())
    }

    #[test]
    fn slopes_agree_with_differences() {
        let at = Figures {
            gamma: 0.4,
            omega: 5.0,
        };
        type Pair = (fn(&Figures) -> f64, [f64; 2]);
        let pairs: [Pair; 7] = [
            (Figures::half_life, at.half_life_slope()),
            (Figures::period, at.period_slope()),
            (Figures::undamped_period, at.undamped_period_slope()),
            (Figures::damping_ratio, at.damping_ratio_slope()),
            (Figures::log_decrement, at.log_decrement_slope()),
            (Figures::quality_factor, at.quality_factor_slope()),
            (Figures::energy_loss, at.energy_loss_slope()),
        ];
        let step = 1e-5;
        for (i, (of, slope)) in pairs.into_iter().enumerate() {
            let gamma = (of(&Figures {
                gamma: at.gamma + step,
                ..at
            }) - of(&Figures {
                gamma: at.gamma - step,
                ..at
            })) / (2.0 * step);
            let omega = (of(&Figures {
                omega: at.omega + step,
                ..at
            }) - of(&Figures {
                omega: at.omega - step,
                ..at
            })) / (2.0 * step);
            assert!(
                (gamma - slope[0]).abs() < 1e-7 && (omega - slope[1]).abs() < 1e-7,
                "figure {i}: {gamma} {omega} against {slope:?}"
            );
        }
    }
}
