//! A measurement whose every figure is known: a closed-form damped sinusoid, seeded noise, a drawn still.

use std::f64::consts::{PI, TAU};

use ebbmark::footage::{CaptureRate, ClipFacts, FrameClock};
use ebbmark::measurement::{
    EnergyFigures, FilmPart, Measurement, RecordRow, RowStatus, ScaleFacts, Still, Streak, Warning,
};
use ebbmark::motion::{
    Cycle, LawTrial, MotionFit, MotionQuantities, PositionUse, ResidualDiagnosis,
};
use ebbmark::uncertainty::{BudgetRow, Evaluation, Quantity};
use ebbmark::verdict::{Answer, Verdict};
use rand::SeedableRng as _;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution as _, Normal};

const RATE_HZ: f64 = 60.0;
const M_PER_PX: f64 = 0.000_5;
const NOISE_M: f64 = 0.000_012;
const PERIOD_S: f64 = 1.204_352;
const DECAY_PER_S: f64 = 0.012_4;
const AMPLITUDE_M: f64 = 0.085_2;
const CENTRE_M: f64 = 0.000_4;
const MASS_KG: f64 = 0.2563;

/// What the double is like; the setters say how it differs from a film of a viscous run.
pub(crate) struct Double {
    n_frames: usize,
    film: bool,
    mass: bool,
    open_bounds: bool,
    upright: bool,
    name: String,
}

impl Double {
    pub(crate) fn film(n_frames: usize) -> Self {
        Self {
            n_frames,
            film: true,
            mass: false,
            open_bounds: false,
            upright: false,
            name: "rail-long-springs.mov".to_owned(),
        }
    }
    pub(crate) fn table(n_rows: usize) -> Self {
        Self {
            film: false,
            name: "positions.csv".to_owned(),
            ..Self::film(n_rows)
        }
    }
    pub(crate) fn with_mass(self) -> Self {
        Self { mass: true, ..self }
    }
    /// Loss so small that Q and the half-life are only bounded.
    pub(crate) fn with_open_bounds(self) -> Self {
        Self {
            open_bounds: true,
            ..self
        }
    }
    pub(crate) fn upright(self) -> Self {
        Self {
            upright: true,
            ..self
        }
    }
    pub(crate) fn named(self, name: &str) -> Self {
        Self {
            name: name.to_owned(),
            ..self
        }
    }

    pub(crate) fn build(&self) -> Measurement {
        let fit = self.fit();
        let rows = self.rows(&fit);
        let cycles = cycles(&fit);
        let quantities = self.quantities();
        let energy = self.mass.then(|| energy_figures(&fit));
        Measurement {
            source_name: self.name.clone(),
            source_sha256: "9f2b5c0e7d1a4f638b0c2d5e8a7f6134c9e0d1b2a3f4056789abcdef01234567".to_owned(),
            sheet_toml: "# Repeats this run.\nclip = \"rail-long-springs.mov\"\nmarker = [292, 258, 24, 24]\nscale_bar = [120, 420, 520, 420]\nlength_m = 0.2\n".to_owned(),
            film: self.film.then(|| self.film_part(&fit, &rows)),
            rows,
            fit,
            quantities,
            cycles,
            energy,
            verdicts: self.verdicts(),
            warnings: self.warnings(),
        }
    }

    fn decay_per_s(&self) -> f64 {
        if self.open_bounds {
            0.000_02
        } else {
            DECAY_PER_S
        }
    }

    fn fit(&self) -> MotionFit {
        let mut fit = MotionFit {
            t_ref_s: 0.5,
            t_end_s: (self.n_frames - 1) as f64 / RATE_HZ,
            amplitude_m: AMPLITUDE_M,
            phase_rad: 0.4,
            decay_rate_per_s: self.decay_per_s(),
            damped_angular_frequency_rad_per_s: TAU / PERIOD_S,
            centre_m: CENTRE_M,
            covariance: [[0.0; 5]; 5],
            decay_rate_interval95_per_s: [self.decay_per_s() - 6e-5, self.decay_per_s() + 6e-5],
            degrees_of_freedom: 412.0,
            uses: Vec::new(),
            fit_m: Vec::new(),
            residual_m: Vec::new(),
            residual: ResidualDiagnosis {
                rms_m: NOISE_M,
                autocorrelation_lag1: 0.21,
                variance_enlargement: 1.6,
                n_used: self.n_frames - 40,
                n_effective: (self.n_frames - 40) as f64 / 1.6,
                runs_z: -2.1,
                runs_p: 0.036,
            },
            laws: laws(),
        };
        let mut noise = noise();
        for frame in 0..self.n_frames {
            let fit_m = fit.position_m(frame as f64 / RATE_HZ);
            fit.fit_m.push(fit_m);
            fit.residual_m.push(noise());
            fit.uses.push(PositionUse::Used);
        }
        fit
    }

    fn rows(&self, fit: &MotionFit) -> Vec<RecordRow> {
        let mut noise = noise();
        let row = |frame: usize| {
            let t_s = frame as f64 / RATE_HZ;
            let residual_m = noise() + if frame == 77 { 0.000_9 } else { 0.0 };
            let x_m = fit.position_m(t_s) + residual_m;
            let status = match frame {
                0..30 => RowStatus::Outside,
                77 => RowStatus::Outlier,
                140..149 => RowStatus::Lost,
                _ => RowStatus::Used,
            };
            let seen = status != RowStatus::Lost;
            let fitted = seen && status != RowStatus::Outside;
            RecordRow {
                frame,
                t_s,
                u_t_s: 0.0,
                x_m: seen.then_some(x_m),
                u_x_m: seen.then_some(NOISE_M),
                off_axis_m: (seen && self.film).then_some(noise() * 0.5),
                p_px: (seen && self.film).then(|| self.display_px(x_m)),
                match_score: (seen && self.film).then_some(0.991),
                status,
                fit_m: fitted.then(|| fit.position_m(t_s)),
                residual_m: fitted.then_some(residual_m),
            }
        };
        (0..self.n_frames).map(row).collect()
    }

    fn size_px(&self) -> [usize; 2] {
        if self.upright { [540, 960] } else { [640, 480] }
    }

    fn scale_axis(&self) -> ScaleFacts {
        let (bar_px, origin_px, direction) = if self.upright {
            ([[420.0, 300.0], [420.0, 700.0]], [270.0, 480.0], [0.0, 1.0])
        } else {
            ([[120.0, 420.0], [520.0, 420.0]], [320.0, 270.0], [1.0, 0.0])
        };
        ScaleFacts {
            bar_px,
            length_m: 0.2,
            u_length_m: 0.000_2,
            u_end_px: 0.5,
            m_per_px: M_PER_PX,
            u_scale_rel: 0.002,
            assumed: true,
            origin_px,
            direction,
            off_axis_rms_m: 0.000_03,
            bar_angle_rad: 0.004,
        }
    }

    fn display_px(&self, x_m: f64) -> [f64; 2] {
        let scale = self.scale_axis();
        [0, 1].map(|i| scale.origin_px[i] + scale.direction[i] * x_m / M_PER_PX)
    }

    fn film_part(&self, fit: &MotionFit, rows: &[RecordRow]) -> FilmPart {
        let [width, height] = self.size_px();
        let centre_px = self.display_px(fit.position_m(0.5));
        FilmPart {
            clip: ClipFacts {
                file_name: self.name.clone(),
                sha256: "9f2b5c0e7d1a4f638b0c2d5e8a7f6134c9e0d1b2a3f4056789abcdef01234567"
                    .to_owned(),
                container: "mov,mp4,m4a,3gp,3g2,mj2".to_owned(),
                codec: "hevc".to_owned(),
                pixel_format: "yuv420p".to_owned(),
                coded_size_px: [640, 480],
                display_size_px: [width as f64, height as f64],
                rotation_deg: if self.upright { 90 } else { 0 },
                mirrored: false,
                pixel_aspect: [1, 1],
                time_base: [1, 600],
                capture_rate_metadata: None,
                n_frames: self.n_frames,
                n_frames_promised: None,
                n_interlaced: 0,
                n_damaged: 0,
            },
            frame_clock: FrameClock {
                steady: true,
                interval_s: 1.0 / RATE_HZ,
                tick_s: 1.0 / 600.0,
                rounding_step_s: 1.0 / 600.0,
                jitter_rms_s: 0.000_48,
                n_dropped: 0,
                n_repeated: 0,
                u_t_s: 0.0,
                time_scale: 1.0,
            },
            scale: self.scale_axis(),
            marker_box_px: [
                centre_px[0].round() - 12.0,
                centre_px[1].round() - 12.0,
                24.0,
                24.0,
            ],
            at_frame: 30,
            steady_box_px: Some([40.0, 30.0, 48.0, 48.0]),
            still: still(width, height, centre_px),
            streak: streak(rows),
            n_unsteady: 0,
            capture_rate: CaptureRate::AsStamped,
            rows_swept_rel: 0.01,
            readout_given: false,
            slips: Vec::new(),
            doubtful_phase: false,
        }
    }

    fn quantities(&self) -> MotionQuantities {
        let gamma = self.decay_per_s();
        let omega = TAU / PERIOD_S;
        let omega0 = omega.hypot(gamma);
        let delta = gamma * PERIOD_S;
        let u_rel = 3.1e-5 / gamma;
        let lossy =
            |value: f64, unit: &'static str| Quantity::symmetric(value, value * u_rel, 1.96, unit);
        let bounded = |value: f64, unit: &'static str| {
            if self.open_bounds {
                Quantity {
                    value: None,
                    u: None,
                    unit,
                    interval95: [Some(0.43 * value), None],
                }
            } else {
                lossy(value, unit)
            }
        };
        MotionQuantities {
            period: Quantity::symmetric(PERIOD_S, 3.5e-5, 1.96, "s"),
            damped_angular_frequency: Quantity::symmetric(omega, omega * 2.9e-5, 1.96, "rad/s"),
            undamped_period: Quantity::symmetric(TAU / omega0, 3.5e-5, 1.96, "s"),
            decay_rate: lossy(gamma, "s-1"),
            damping_ratio: lossy(gamma / omega0, "1"),
            log_decrement: lossy(delta, "1"),
            quality_factor: bounded(omega0 / (2.0 * gamma), "1"),
            energy_loss_per_cycle: lossy(1.0 - (-2.0 * delta).exp(), "1"),
            amplitude: Quantity::symmetric(AMPLITUDE_M, 0.000_17, 1.96, "m"),
            half_life: bounded(std::f64::consts::LN_2 / gamma, "s"),
            centre: Quantity::symmetric(CENTRE_M, 0.000_001_2, 1.96, "m"),
            budget: budget(),
        }
    }

    fn verdicts(&self) -> Vec<Verdict> {
        let present = if self.open_bounds {
            Answer::Undecided
        } else {
            Answer::Yes
        };
        vec![
            Verdict {
                question: "loss_present",
                asked: "Does the motion lose energy?",
                answer: present,
                ratio: if self.open_bounds { 0.65 } else { 400.0 },
                ratio_of: "decay rate over its standard uncertainty",
                sentence: if self.open_bounds {
                    "The decay rate of 0.00002 s⁻¹ is not told apart from zero; a film three times as long would decide.".to_owned()
                } else {
                    "Each swing takes 2.94 % of the energy: the decay rate is 400 times its standard uncertainty.".to_owned()
                },
            },
            Verdict {
                question: "loss_shifts_period",
                asked: "Does the loss matter to the period?",
                answer: Answer::No,
                ratio: 0.048,
                ratio_of: "shift of the period by the loss over the expanded uncertainty of the period",
                sentence: "The loss lengthens the period by 3.4 µs, far below the 70 µs to which the period is known.".to_owned(),
            },
            Verdict {
                question: "spring_linear",
                asked: "Is the spring linear?",
                answer: Answer::Undecided,
                ratio: 1.1,
                ratio_of: "slope of period against amplitude over its expanded uncertainty",
                sentence: "The period changes by 12 µs over the range of amplitudes; a start at twice the amplitude would decide.".to_owned(),
            },
        ]
    }

    fn warnings(&self) -> Vec<Warning> {
        vec![
            Warning {
                key: "clock_assumed",
                sentence: "The accuracy of the phone's clock was assumed (±50 ppm); give --clock-ppm after comparing it with a counter.".to_owned(),
            },
            Warning {
                key: "marker_lost",
                sentence: "The marker was lost in 9 frames between 2.33 s and 2.47 s; these frames are left out.".to_owned(),
            },
        ]
    }
}

/// A stream of normal noise that is the same on every call.
fn noise() -> impl FnMut() -> f64 {
    let mut generator = ChaCha8Rng::seed_from_u64(2026);
    let normal = Normal::new(0.0, NOISE_M).expect("a finite spread");
    move || normal.sample(&mut generator)
}

fn cycles(fit: &MotionFit) -> Vec<Cycle> {
    let mut noise = noise();
    let n = (1..)
        .take_while(|&n| f64::from(n) * PERIOD_S < fit.t_end_s - fit.t_ref_s)
        .last()
        .unwrap_or(0);
    let first_s = fit.t_ref_s + (1.5 * PI - fit.phase_rad) / fit.damped_angular_frequency_rad_per_s;
    let mut last: Option<f64> = None;
    (1..n)
        .map(|index| {
            let start_s = first_s + f64::from(index - 1) * PERIOD_S;
            let amplitude_m = fit.envelope_m(start_s + 0.5 * PERIOD_S) + 0.3 * noise();
            let energy_ratio = last.map(|last| (amplitude_m / last).powi(2));
            last = Some(amplitude_m);
            Cycle {
                index: usize::try_from(index).unwrap(),
                start_s,
                period_crossings_s: PERIOD_S + 2.0 * noise(),
                u_period_crossings_s: 2.0 * NOISE_M,
                period_local_s: Some(PERIOD_S + noise()),
                u_period_local_s: Some(NOISE_M),
                amplitude_m: Some(amplitude_m),
                u_amplitude_m: Some(0.3 * NOISE_M),
                energy_ratio,
                u_energy_ratio: energy_ratio
                    .map(|_| 2.0 * std::f64::consts::SQRT_2 * 0.3 * NOISE_M / AMPLITUDE_M),
            }
        })
        .collect()
}

fn laws() -> Vec<LawTrial> {
    let law = |law, parameters, rms_m, aicc, excluded, reason: &str| LawTrial {
        law,
        parameters,
        rms_m,
        aicc,
        excluded,
        reason: reason.to_owned(),
    };
    vec![
        law(
            "none",
            vec![],
            0.004_1,
            -9_011.0,
            true,
            "Its misfit is 340 times that of viscous loss (F = 1.2·10⁵).",
        ),
        law(
            "viscous",
            vec![("gamma", DECAY_PER_S, Some(3.1e-5), "s-1")],
            0.000_012,
            -31_420.0,
            false,
            "Fits to the noise.",
        ),
        law(
            "dry",
            vec![("step", 0.000_64, Some(0.000_002), "m")],
            0.000_71,
            -18_330.0,
            true,
            "Its straight envelope misses by 0.7 mm.",
        ),
        law(
            "viscous_dry",
            vec![
                ("gamma", DECAY_PER_S, Some(5.2e-5), "s-1"),
                ("step", 0.000_000_4, Some(0.000_001_1), "m"),
            ],
            0.000_012,
            -31_418.6,
            false,
            "The dry part is 0.4 of its uncertainty: nothing asks for it, nothing rules it out.",
        ),
    ]
}

fn budget() -> Vec<BudgetRow> {
    vec![
        BudgetRow::new(
            "period",
            "clock of the phone",
            Evaluation::B,
            2.887e-5,
            "1",
            PERIOD_S,
        )
        .assumed(true),
        BudgetRow::new(
            "period",
            "scatter of the readings",
            Evaluation::A,
            1.4e-6,
            "s",
            1.0,
        )
        .with_degrees_of_freedom(412.0),
        BudgetRow::new(
            "period",
            "read-out of the sensor",
            Evaluation::B,
            1.1e-6,
            "s",
            1.0,
        )
        .assumed(true),
        BudgetRow::new(
            "decay_rate",
            "scatter of the readings",
            Evaluation::A,
            3.1e-5,
            "s-1",
            1.0,
        )
        .with_degrees_of_freedom(412.0),
        BudgetRow::new(
            "amplitude",
            "scale bar and its ends",
            Evaluation::B,
            0.002,
            "1",
            AMPLITUDE_M,
        )
        .assumed(true),
        BudgetRow::new(
            "amplitude",
            "scatter of the readings",
            Evaluation::A,
            1.7e-6,
            "m",
            1.0,
        )
        .with_degrees_of_freedom(412.0),
    ]
}

fn energy_figures(fit: &MotionFit) -> EnergyFigures {
    let stiffness =
        MASS_KG * (fit.damped_angular_frequency_rad_per_s.powi(2) + fit.decay_rate_per_s.powi(2));
    let energy_j = 0.5 * stiffness * AMPLITUDE_M * AMPLITUDE_M;
    EnergyFigures {
        mass_kg: MASS_KG,
        u_mass_kg: Some(0.000_2),
        stiffness: Quantity::symmetric(stiffness, stiffness * 0.000_8, 1.96, "N/m"),
        energy_at_start: Quantity::symmetric(energy_j, energy_j * 0.004, 1.96, "J"),
        energy_lost_first_cycle: Quantity::symmetric(
            0.0294 * energy_j,
            0.0294 * energy_j * 0.005,
            1.96,
            "J",
        ),
    }
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "clamped on the same line"
)]
fn byte(value: f64) -> u8 {
    value.clamp(0.0, 255.0) as u8
}

/// A grey room with a rail, a dark glider and a bright marker.
fn still(width: usize, height: usize, centre_px: [f64; 2]) -> Still {
    let mut noise = noise();
    let mut luma = Vec::with_capacity(width * height);
    for y in 0..height {
        for x in 0..width {
            let (dx, dy) = (x as f64 - centre_px[0], y as f64 - centre_px[1]);
            let ground = 70.0 + 60.0 * y as f64 / height as f64 + 25.0 * (x as f64 / 37.0).sin();
            let glider = if dx.abs() < 34.0 && dy.abs() < 20.0 {
                35.0
            } else {
                ground
            };
            let marker = 190.0 * (-(dx * dx + dy * dy) / 50.0).exp();
            luma.push(byte(glider + marker + noise() / NOISE_M * 2.0));
        }
    }
    Still {
        width,
        height,
        luma,
        display_px_per_px: 1.0,
    }
}

/// A blob that follows the rows, dark glider around it, with noise; nothing where it was lost.
fn streak(rows: &[RecordRow]) -> Streak {
    let (width, first_px) = (420usize, -210.0);
    let mut noise = noise();
    let mut lines = Vec::with_capacity(rows.len() * width);
    for row in rows {
        for sample in 0..width {
            let px = first_px + sample as f64;
            let from_marker = row.x_m.map(|x_m| px - x_m / M_PER_PX);
            let blob = from_marker.map_or(0.0, |d| {
                150.0 * (-d * d / 50.0).exp() - if d.abs() < 34.0 { 60.0 } else { 0.0 }
            });
            lines.push(byte(105.0 + blob + noise() / NOISE_M * 3.0));
        }
    }
    Streak {
        width,
        lines,
        t_s: rows.iter().map(|row| row.t_s).collect(),
        first_px,
        step_px: 1.0,
    }
}
