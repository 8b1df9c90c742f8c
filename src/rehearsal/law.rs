//! The motion as a function of time: exact for no loss, viscous and dry loss and the two together, integrated for the rest.
//!
//! In: the scene's coefficients. Out: x(t) for any t of the film, and the turning points.
use std::f64::consts::PI;

use super::equation::{Coefficients, TurningPoint};
use super::integrate::{self, Piece};
use super::scene::{LeaveFrame, Scene};

/// Position of the marker along its axis as a function of time.
///
/// Without dry friction, drag and stiffening: x = c + A e^(−γt) cos(ω_d t + φ), exactly. Otherwise the motion starts with the
/// position and velocity that this formula has at t = 0, and obeys the equation in [`MotionScene`](super::MotionScene):
/// dry and viscous loss by exact half cycles, each a damped sinusoid about its shifted centre; drag and stiffening by
/// Taylor series, within 1e-12 m. Times before 0, which the first exposure needs, continue the first half cycle backwards.
#[derive(Clone, Debug, PartialEq)]
pub struct Motion {
    course: Course,
    centre_m: f64,
    leave: Option<LeaveFrame>,
}

#[derive(Clone, Debug, PartialEq)]
enum Course {
    Still(f64),
    Sinusoid {
        amplitude_m: f64,
        phase_rad: f64,
        gamma_per_s: f64,
        omega_d_rad_per_s: f64,
    },
    HalfCycles {
        of: Coefficients,
        halves: Vec<Half>,
        turns: Vec<TurningPoint>,
    },
    Series {
        pieces: Vec<Piece>,
        turns: Vec<TurningPoint>,
    },
}

/// From one turn to the next under friction of one sign.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Half {
    t_s: f64,
    /// Where the forces balance, m from c.
    balance_m: f64,
    /// Start relative to the balance, m, and its velocity, m/s.
    start_m: f64,
    start_m_per_s: f64,
    /// Friction holds the body: it stays.
    stuck: bool,
}

impl Motion {
    /// The motion of a checked scene, over its whole film.
    #[must_use]
    pub fn new(scene: &Scene) -> Self {
        let motion = &scene.motion;
        let of = Coefficients::new(scene);
        // Exposure, readout and jitter reach beyond the last picture: a few intervals more than the film.
        let until_s = scene.camera.duration_s + 1.0;
        let (x_m, v_m_per_s) = of.start(motion.amplitude_m, motion.phase_rad);
        let smooth = of.drag_per_m == 0.0 && of.stiffening_per_m2 == 0.0;
        let course = if scene.mishap.still {
            Course::Still(x_m)
        } else if smooth && of.dry_step_m == 0.0 {
            Course::Sinusoid {
                amplitude_m: motion.amplitude_m,
                phase_rad: motion.phase_rad,
                gamma_per_s: of.gamma_per_s,
                omega_d_rad_per_s: of.omega_d_rad_per_s,
            }
        } else if smooth {
            let (halves, turns) = half_cycles(&of, x_m, v_m_per_s, until_s);
            Course::HalfCycles { of, halves, turns }
        } else {
            let (pieces, turns) = integrate::pieces(&of, x_m, v_m_per_s, until_s);
            Course::Series { pieces, turns }
        };
        Self {
            course,
            centre_m: motion.centre_m,
            leave: scene.mishap.leave_frame,
        }
    }

    /// x(t), m, at a time in s.
    #[must_use]
    pub fn position_m(&self, t_s: f64) -> f64 {
        let x_m = match &self.course {
            Course::Still(x_m) => *x_m,
            Course::Sinusoid {
                amplitude_m,
                phase_rad,
                gamma_per_s,
                omega_d_rad_per_s,
            } => {
                amplitude_m
                    * (-gamma_per_s * t_s).exp()
                    * (omega_d_rad_per_s * t_s + phase_rad).cos()
            }
            Course::HalfCycles { of, halves, .. } => {
                let at = halves
                    .partition_point(|half| half.t_s <= t_s)
                    .saturating_sub(1);
                halves.get(at).map_or(0.0, |half| half.position_m(of, t_s))
            }
            Course::Series { pieces, .. } => integrate::position_m(pieces, t_s),
        };
        let left_m = self.leave.map_or(0.0, |leave| {
            leave.speed_m_per_s * (t_s - leave.from_s).max(0.0)
        });
        self.centre_m + x_m + left_m
    }

    /// The turns from 0 to a time, m and s, in order; a start from rest is the first of them. What [`LeaveFrame`] adds is left out.
    #[must_use]
    pub fn turning_points(&self, until_s: f64) -> Vec<TurningPoint> {
        let about_rest: Vec<TurningPoint> = match &self.course {
            Course::Still(_) => Vec::new(),
            Course::Sinusoid {
                amplitude_m,
                phase_rad,
                gamma_per_s,
                omega_d_rad_per_s,
            } => {
                // v = 0 where tan ψ = −γ/ω_d, ψ = ω_d t + φ. A millionth of a turn before 0 counts as 0: a start from rest is a turn.
                let psi = -(gamma_per_s / omega_d_rad_per_s).atan();
                let first = ((phase_rad - psi) / PI - 1e-6).ceil();
                (0..)
                    .map(|n| (psi + (first + f64::from(n)) * PI - phase_rad) / omega_d_rad_per_s)
                    .take_while(|t_s| *t_s <= until_s)
                    .map(|t_s| TurningPoint {
                        t_s: t_s.max(0.0),
                        x_m: amplitude_m
                            * (-gamma_per_s * t_s).exp()
                            * (omega_d_rad_per_s * t_s + phase_rad).cos(),
                    })
                    .collect()
            }
            Course::HalfCycles { turns, .. } | Course::Series { turns, .. } => turns.clone(),
        };
        about_rest
            .into_iter()
            .filter(|turn| turn.t_s <= until_s)
            .map(|turn| TurningPoint {
                x_m: turn.x_m + self.centre_m,
                ..turn
            })
            .collect()
    }
}

impl Half {
    fn position_m(&self, of: &Coefficients, t_s: f64) -> f64 {
        if self.stuck {
            return self.balance_m + self.start_m;
        }
        let tau_s = t_s - self.t_s;
        let (sin, cos) = (of.omega_d_rad_per_s * tau_s).sin_cos();
        let quadrature_m =
            (self.start_m_per_s + of.gamma_per_s * self.start_m) / of.omega_d_rad_per_s;
        self.balance_m + (-of.gamma_per_s * tau_s).exp() * (self.start_m * cos + quadrature_m * sin)
    }

    /// Time from the start to the next turn, s: v₀ cos θ = (ω₀² y₀ + γ v₀)/ω_d · sin θ at the first θ = ω_d τ > 0.
    fn time_to_turn_s(&self, of: &Coefficients) -> f64 {
        if self.start_m_per_s == 0.0 {
            return PI / of.omega_d_rad_per_s;
        }
        let pull = (of.omega_0_rad_per_s.powi(2) * self.start_m
            + of.gamma_per_s * self.start_m_per_s)
            / of.omega_d_rad_per_s;
        self.start_m_per_s
            .abs()
            .atan2(pull * self.start_m_per_s.signum())
            / of.omega_d_rad_per_s
    }
}

/// Dry and viscous loss: between turns the friction is constant and only shifts the balance by F/k against the motion.
///
/// # Source
/// Textbook solution; checked against `fixtures/reference/oscillation/coulomb_turning_points.csv`.
fn half_cycles(
    of: &Coefficients,
    x_m: f64,
    v_m_per_s: f64,
    until_s: f64,
) -> (Vec<Half>, Vec<TurningPoint>) {
    let (mut halves, mut turns) = (Vec::new(), Vec::new());
    let (mut t_s, mut x_m, mut v_m_per_s) = (0.0, x_m, v_m_per_s);
    while t_s <= until_s {
        let resting = v_m_per_s == 0.0;
        if resting {
            turns.push(TurningPoint { t_s, x_m });
        }
        if resting && x_m.abs() <= of.dry_step_m {
            halves.push(Half {
                t_s,
                balance_m: 0.0,
                start_m: x_m,
                start_m_per_s: 0.0,
                stuck: true,
            });
            break;
        }
        let direction = if resting {
            -x_m.signum()
        } else {
            v_m_per_s.signum()
        };
        let balance_m = -direction * of.dry_step_m;
        let half = Half {
            t_s,
            balance_m,
            start_m: x_m - balance_m,
            start_m_per_s: v_m_per_s,
            stuck: false,
        };
        t_s += half.time_to_turn_s(of);
        x_m = half.position_m(of, t_s);
        v_m_per_s = 0.0;
        halves.push(half);
    }
    (halves, turns)
}
