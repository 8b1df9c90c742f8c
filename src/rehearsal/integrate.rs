//! Motion under drag and a spring that is not straight: Taylor series of order 16, one a step.
//!
//! In: the coefficients and a start. Out: polynomials in time, end to end, which are the dense solution themselves. Between two
//! turns the signs of the friction and of the drag are constant and the right-hand side is a polynomial in x and v, so that its
//! series follows from products of series; at a turn the step is cut where the velocity is zero and the signs change.
use std::f64::consts::TAU;

use super::equation::{Coefficients, TurningPoint};

/// Highest power of time in a piece. With [`STEPS_PER_PERIOD`] the first neglected term is below 1e-17 of the amplitude even
/// where the local frequency is five times ω₀.
const ORDER: usize = 16;
/// Steps in a period T₀ before stiffening and drag shorten them.
const STEPS_PER_PERIOD: f64 = 64.0;
/// Halvings that pin a turn: 2⁻⁶⁰ of a step is below the resolution of the time itself.
const TURN_HALVINGS: usize = 60;

/// Position as a polynomial in the time since `t_s`, valid until the next piece.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Piece {
    t_s: f64,
    /// Coefficient n in m/sⁿ.
    x: [f64; ORDER + 1],
}

/// x(t), m from the centre.
pub(super) fn position_m(pieces: &[Piece], t_s: f64) -> f64 {
    let at = pieces
        .partition_point(|piece| piece.t_s <= t_s)
        .saturating_sub(1);
    pieces
        .get(at)
        .map_or(0.0, |piece| piece.position_m(t_s - piece.t_s))
}

/// The pieces and turns from t = 0 until a time.
pub(super) fn pieces(
    of: &Coefficients,
    x_m: f64,
    v_m_per_s: f64,
    until_s: f64,
) -> (Vec<Piece>, Vec<TurningPoint>) {
    let (mut pieces, mut turns) = (Vec::new(), Vec::new());
    let (mut t_s, mut x_m, mut v_m_per_s) = (0.0, x_m, v_m_per_s);
    let mut direction = v_m_per_s.signum();
    // The largest reach of the motion bounds both the stiffest spring and the strongest drag it can meet.
    let reach_m = x_m.hypot(v_m_per_s / of.omega_0_rad_per_s);
    let shorter =
        (1.0 + 3.0 * of.stiffening_per_m2.abs() * reach_m.powi(2)).sqrt() + of.drag_per_m * reach_m;
    let step_s = TAU / of.omega_0_rad_per_s / STEPS_PER_PERIOD / shorter;
    while t_s <= until_s {
        if v_m_per_s == 0.0 {
            turns.push(TurningPoint { t_s, x_m });
            let pull_m = x_m * (1.0 + of.stiffening_per_m2 * x_m * x_m);
            if pull_m.abs() <= of.dry_step_m {
                pieces.push(Piece::resting(t_s, x_m));
                break;
            }
            direction = -pull_m.signum();
        }
        let piece = Piece::new(of, t_s, x_m, v_m_per_s, direction);
        let turned = piece.velocity_m_per_s(step_s) * direction <= 0.0;
        let taken_s = if turned {
            piece.time_of_turn_s(step_s, direction)
        } else {
            step_s
        };
        x_m = piece.position_m(taken_s);
        v_m_per_s = if turned {
            0.0
        } else {
            piece.velocity_m_per_s(taken_s)
        };
        t_s += taken_s;
        pieces.push(piece);
    }
    (pieces, turns)
}

impl Piece {
    fn resting(t_s: f64, x_m: f64) -> Self {
        let mut x = [0.0; ORDER + 1];
        x[0] = x_m;
        Self { t_s, x }
    }

    /// Taylor coefficients of ẍ = −ω₀² (x + κ x³ + s F/k) − 2 γ v − s β v², s the sign of the velocity.
    fn new(of: &Coefficients, t_s: f64, x_m: f64, v_m_per_s: f64, direction: f64) -> Self {
        let mut x = [0.0; ORDER + 1];
        let mut v = [0.0; ORDER + 1];
        let mut x_squared = [0.0; ORDER + 1];
        (x[0], x[1], v[0]) = (x_m, v_m_per_s, v_m_per_s);
        for n in 0..ORDER - 1 {
            x_squared[n] = product(&x, &x, n);
            let constant = if n == 0 {
                direction * of.dry_step_m
            } else {
                0.0
            };
            let spring = x[n] + of.stiffening_per_m2 * product(&x_squared, &x, n) + constant;
            let loss = 2.0 * of.gamma_per_s * v[n] + direction * of.drag_per_m * product(&v, &v, n);
            let acceleration = -of.omega_0_rad_per_s.powi(2) * spring - loss;
            v[n + 1] = acceleration / as_f64(n + 1);
            x[n + 2] = v[n + 1] / as_f64(n + 2);
        }
        Self { t_s, x }
    }

    fn position_m(&self, tau_s: f64) -> f64 {
        self.x
            .iter()
            .rev()
            .fold(0.0, |sum, coefficient| sum * tau_s + coefficient)
    }

    fn velocity_m_per_s(&self, tau_s: f64) -> f64 {
        (1..=ORDER)
            .rev()
            .fold(0.0, |sum, n| sum * tau_s + as_f64(n) * self.x[n])
    }

    /// Where the velocity first leaves its direction; halving, because the start of a piece can itself be a turn.
    fn time_of_turn_s(&self, step_s: f64, direction: f64) -> f64 {
        let (mut low_s, mut high_s) = (0.0, step_s);
        for _ in 0..TURN_HALVINGS {
            let middle_s = 0.5 * (low_s + high_s);
            if self.velocity_m_per_s(middle_s) * direction > 0.0 {
                low_s = middle_s;
            } else {
                high_s = middle_s;
            }
        }
        high_s
    }
}

/// Coefficient n of the product of two series.
fn product(a: &[f64; ORDER + 1], b: &[f64; ORDER + 1], n: usize) -> f64 {
    (0..=n).map(|i| a[i] * b[n - i]).sum()
}

#[expect(
    clippy::cast_precision_loss,
    reason = "n is at most the order of the series"
)]
fn as_f64(n: usize) -> f64 {
    n as f64
}
