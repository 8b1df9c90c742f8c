//! What was planted: the law, every frame's time and place, the bar, the marker's box, the mishaps. Written as JSON beside the clip.
use serde::{Deserialize, Serialize};

use super::camera::Camera;
use super::equation::Coefficients;
use super::scene::Scene;
use super::shutter::Exposure;

/// Times are rounded to a picosecond, places to a picometre and a millionth of a pixel: more digits would only bloat the file.
const STEPS_PER_S: f64 = 1e12;
const STEPS_PER_M: f64 = 1e12;
const STEPS_PER_PX: f64 = 1e6;
/// Turning points kept: enough for any check, and a long film stays readable.
const TURNS_KEPT: usize = 200;

/// The truth about a clip. Arrays have one entry a picture in the file, in order.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct Truth {
    /// File name of the clip.
    pub file: String,
    /// The scene's name.
    pub scene: String,
    /// The scene's seed.
    pub seed: u64,
    /// Displayed width and height, px.
    pub size_px: [u32; 2],
    /// What pixel coordinates mean here.
    pub pixel_convention: String,
    /// Pictures a second by the stamps, `[numerator, denominator]`.
    pub rate_hz: [u32; 2],
    /// Pictures a second of true time; differs in slow motion.
    pub taken_hz: f64,
    /// Exposure of a row, s. A sharp-eyed tracker sees the mean of x over it.
    pub exposure_s: f64,
    /// Readout of the rolling shutter, s.
    pub readout_s: f64,
    /// Image scale, px/m.
    pub px_per_m: f64,
    /// Turn of the axis from image right towards the foot, degrees.
    pub axis_angle_deg: f64,
    /// The law of the motion.
    pub law: LawTruth,
    /// The scale bar, if there is one.
    pub scale_bar: Option<BarTruth>,
    /// The marker's box in the first picture.
    pub marker_box_px: PixelBox,
    /// Index of the first picture in which the whole marker can be seen, and its box there; None where there is none.
    pub first_visible: Option<(usize, PixelBox)>,
    /// Ticks a second of the stamps as they were given to the container.
    pub ticks_per_s: u32,
    /// The first stamps, ticks.
    pub first_stamps_ticks: Vec<i64>,
    /// Planted mishaps, one sentence each.
    pub mishaps: Vec<String>,
    /// Picture slot of each picture, lost ones counted.
    pub picture: Vec<usize>,
    /// Slot of the picture that is shown: an earlier one where it is repeated.
    pub shown: Vec<usize>,
    /// Stamp, s.
    pub stamp_s: Vec<f64>,
    /// True mid-exposure of row 0 of what is shown, s.
    pub t_s: Vec<f64>,
    /// Position at `t_s`, m.
    pub x_m: Vec<f64>,
    /// True mid-exposure of the marker's row, s: `t_s` with a global shutter.
    pub marker_t_s: Vec<f64>,
    /// Centre of the marker at `marker_t_s`, px, shake included.
    pub marker_px: Vec<[f64; 2]>,
    /// True where the whole marker can be seen.
    pub visible: Vec<bool>,
}

/// The law with what follows from it. A quantity that the law does not have is None.
#[derive(Clone, Debug, PartialEq, Serialize, Deserialize)]
pub struct LawTruth {
    /// `none`, `viscous`, `dry`, `drag`, or `mixture`, with `+ stiffening` where the spring is not straight.
    pub name: String,
    /// The equation whose coefficients these are.
    pub equation: String,
    /// A, m.
    pub amplitude_m: f64,
    /// φ, rad.
    pub phase_rad: f64,
    /// c, m.
    pub centre_m: f64,
    /// T_0, s.
    pub undamped_period_s: f64,
    /// ω_0, rad/s.
    pub undamped_angular_frequency_rad_per_s: f64,
    /// ζ of the viscous part.
    pub damping_ratio: f64,
    /// γ = ζ ω_0, 1/s.
    pub decay_rate_per_s: f64,
    /// ω_d = ω_0 √(1 − ζ²), rad/s.
    pub damped_angular_frequency_rad_per_s: f64,
    /// T_d = 2π/ω_d, s; the period of the motion only without drag and stiffening.
    pub damped_period_s: f64,
    /// δ = γ T_d.
    pub log_decrement: f64,
    /// Q = 1/(2ζ) of the viscous part; None without one.
    pub quality_factor: Option<f64>,
    /// 1 − e^(−2δ) for a loss that is viscous or none; None where it changes from cycle to cycle.
    pub energy_loss_per_cycle: Option<f64>,
    /// F/k, m.
    pub dry_step_m: f64,
    /// β, 1/m.
    pub drag_per_m: f64,
    /// κ, 1/m².
    pub stiffening_per_m2: f64,
    /// Turns as `[t in s, x in m]`, the first two hundred.
    pub turning_points: Vec<[f64; 2]>,
}

/// The scale bar.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
pub struct BarTruth {
    /// Distance between the centres of the end marks, m.
    pub length_m: f64,
    /// Those centres with the camera at rest, px.
    pub ends_px: [[f64; 2]; 2],
    /// The same in the first picture: moved by the shake.
    pub ends_first_picture_px: [[f64; 2]; 2],
}

/// A box in display pixels: the centre of its top-left pixel, and its size.
#[derive(Clone, Copy, Debug, PartialEq, Serialize, Deserialize)]
pub struct PixelBox {
    /// Left, px.
    pub x: i64,
    /// Top, px.
    pub y: i64,
    /// Width, px.
    pub w: i64,
    /// Height, px.
    pub h: i64,
}

impl BarTruth {
    /// The bar as the camera sees it, at rest and in the first picture; None where there is none in the scene.
    fn new(length_m: f64, camera: &Camera, first: Option<&Exposure>) -> Option<Self> {
        let ends_px = camera.bar_ends_px()?;
        let shake_px = first.map_or([0.0; 2], |first| camera.shake_px(first.t_s));
        let moved = |by: [f64; 2]| {
            ends_px.map(|[x, y]| {
                [
                    rounded(x + by[0], STEPS_PER_PX),
                    rounded(y + by[1], STEPS_PER_PX),
                ]
            })
        };
        Some(Self {
            length_m,
            ends_px: moved([0.0; 2]),
            ends_first_picture_px: moved(shake_px),
        })
    }
}

impl Truth {
    /// The truth about the pictures that a camera took.
    pub(super) fn new(
        scene: &Scene,
        camera: &Camera,
        exposures: &[Exposure],
        file: String,
    ) -> Self {
        let seen: Vec<([f64; 2], f64)> = exposures
            .iter()
            .map(|exposure| camera.marker_px(exposure.t_s))
            .collect();
        let visible: Vec<bool> = exposures
            .iter()
            .map(|exposure| camera.is_visible(exposure.t_s))
            .collect();
        #[expect(
            clippy::cast_possible_truncation,
            reason = "limits::check bounds the marker"
        )]
        let side = scene.marker.size_px.ceil() as i64;
        let box_px = |at: usize| {
            seen.get(at).map_or(
                PixelBox {
                    x: 0,
                    y: 0,
                    w: 0,
                    h: 0,
                },
                |(px, _)| PixelBox::around(*px, side),
            )
        };
        let ticks_per_s = scene.ticks_per_s();
        let stamps = exposures.iter().map(|exposure| exposure.stamp_ticks);
        #[expect(
            clippy::cast_precision_loss,
            reason = "an hour in ticks is far below 2⁵³"
        )]
        let stamp_s = |ticks: i64| rounded(ticks as f64 / f64::from(ticks_per_s), STEPS_PER_S);
        Self {
            file,
            scene: scene.name.clone(),
            seed: scene.seed,
            size_px: [scene.camera.width_px, scene.camera.height_px],
            pixel_convention:
                "display pixels, x right, y down, centre of the top-left pixel at (0, 0)".to_owned(),
            rate_hz: scene.camera.rate_hz.fraction().unwrap_or([1, 1]),
            taken_hz: scene.taken_hz(),
            exposure_s: scene.camera.exposure_s,
            readout_s: scene.camera.readout_s,
            px_per_m: scene.camera.px_per_m,
            axis_angle_deg: scene.camera.axis_angle_deg,
            law: LawTruth::new(scene, camera),
            scale_bar: scene
                .scale_bar
                .and_then(|bar| BarTruth::new(bar.length_m, camera, exposures.first())),
            marker_box_px: box_px(0),
            first_visible: visible
                .iter()
                .position(|visible| *visible)
                .map(|at| (at, box_px(at))),
            ticks_per_s,
            first_stamps_ticks: stamps.clone().take(8).collect(),
            mishaps: mishaps(scene),
            picture: exposures.iter().map(|exposure| exposure.picture).collect(),
            shown: exposures.iter().map(|exposure| exposure.shown).collect(),
            stamp_s: stamps.map(stamp_s).collect(),
            t_s: exposures
                .iter()
                .map(|exposure| rounded(exposure.t_s, STEPS_PER_S))
                .collect(),
            x_m: exposures
                .iter()
                .map(|exposure| rounded(camera.motion().position_m(exposure.t_s), STEPS_PER_M))
                .collect(),
            marker_t_s: seen
                .iter()
                .map(|(_, t_s)| rounded(*t_s, STEPS_PER_S))
                .collect(),
            marker_px: seen
                .iter()
                .map(|(px, _)| px.map(|at| rounded(at, STEPS_PER_PX)))
                .collect(),
            visible,
        }
    }

    /// The marker's box in a picture of the file, by its index; None beyond the last.
    #[must_use]
    pub fn marker_box_at(&self, index: usize) -> Option<PixelBox> {
        let side = self.marker_box_px.w;
        self.marker_px
            .get(index)
            .map(|centre| PixelBox::around(*centre, side))
    }

    /// JSON with one line a key, so that a difference between two truths can be read.
    ///
    /// # Errors
    /// What the JSON writer says; it has no reason to fail on finite numbers.
    pub fn to_json(&self) -> Result<String, serde_json::Error> {
        let serde_json::Value::Object(entries) = serde_json::to_value(self)? else {
            return serde_json::to_string(self);
        };
        let lines = entries.iter().map(|(key, value)| {
            Ok(format!(
                " {}: {}",
                serde_json::to_string(key)?,
                serde_json::to_string(value)?
            ))
        });
        Ok(format!(
            "{{\n{}\n}}\n",
            lines
                .collect::<Result<Vec<_>, serde_json::Error>>()?
                .join(",\n")
        ))
    }
}

impl LawTruth {
    fn new(scene: &Scene, camera: &Camera) -> Self {
        let (motion, of) = (&scene.motion, Coefficients::new(scene));
        let damped_period_s = std::f64::consts::TAU / of.omega_d_rad_per_s;
        let log_decrement = of.gamma_per_s * damped_period_s;
        let viscous_only = motion.dry_step_m == 0.0 && motion.drag_per_m == 0.0;
        let turns = camera.motion().turning_points(scene.camera.duration_s);
        Self {
            name: law_name(scene),
            equation: "x'' = -w0^2 (x-c) (1 + stiffening (x-c)^2) - 2 decay_rate x' - w0^2 dry_step sign(x') - drag |x'| x'; \
                       x(0)-c = A cos(phase), x'(0) = -A (decay_rate cos(phase) + wd sin(phase))"
                .to_owned(),
            amplitude_m: motion.amplitude_m,
            phase_rad: motion.phase_rad,
            centre_m: motion.centre_m,
            undamped_period_s: motion.period_s,
            undamped_angular_frequency_rad_per_s: of.omega_0_rad_per_s,
            damping_ratio: motion.damping_ratio,
            decay_rate_per_s: of.gamma_per_s,
            damped_angular_frequency_rad_per_s: of.omega_d_rad_per_s,
            damped_period_s,
            log_decrement,
            quality_factor: (motion.damping_ratio > 0.0).then(|| 0.5 / motion.damping_ratio),
            energy_loss_per_cycle: viscous_only.then(|| -(-2.0 * log_decrement).exp_m1()),
            dry_step_m: motion.dry_step_m,
            drag_per_m: motion.drag_per_m,
            stiffening_per_m2: motion.stiffening_per_m2,
            turning_points: turns.iter().take(TURNS_KEPT).map(|turn| [rounded(turn.t_s, STEPS_PER_S), rounded(turn.x_m, STEPS_PER_M)]).collect(),
        }
    }
}

impl PixelBox {
    /// The whole pixels that hold a square around a centre.
    fn around([x, y]: [f64; 2], side: i64) -> Self {
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_precision_loss,
            reason = "places near a picture"
        )]
        let corner = |centre: f64| (centre - 0.5 * (side - 1) as f64).round() as i64;
        Self {
            x: corner(x),
            y: corner(y),
            w: side,
            h: side,
        }
    }
}

fn law_name(scene: &Scene) -> String {
    let motion = &scene.motion;
    let parts = [
        ("viscous", motion.damping_ratio),
        ("dry", motion.dry_step_m),
        ("drag", motion.drag_per_m),
    ];
    let present: Vec<&str> = parts
        .iter()
        .filter(|(_, size)| *size > 0.0)
        .map(|(name, _)| *name)
        .collect();
    let loss = match present[..] {
        [] => "none",
        [one] => one,
        _ => "mixture",
    };
    if motion.stiffening_per_m2 == 0.0 {
        loss.to_owned()
    } else {
        format!("{loss} + stiffening")
    }
}

fn mishaps(scene: &Scene) -> Vec<String> {
    let mishap = &scene.mishap;
    let mut said = Vec::new();
    if let Some(hand) = mishap.occlusion {
        said.push(format!(
            "a hand hides the marker from {} s to {} s",
            hand.from_s, hand.to_s
        ));
    }
    if let Some(leave) = mishap.leave_frame {
        said.push(format!(
            "from {} s on the marker leaves at {} m/s",
            leave.from_s, leave.speed_m_per_s
        ));
    }
    let lists = [
        (&mishap.drop_frames, "lost, the stamps keep the gap"),
        (&mishap.slip_frames, "lost, the stamps closed up"),
        (&mishap.repeat_frames, "replaced by the picture before"),
    ];
    said.extend(
        lists
            .iter()
            .filter(|(list, _)| !list.is_empty())
            .map(|(list, fate)| format!("pictures {list:?}: {fate}")),
    );
    if mishap.still {
        said.push("nothing moves".to_owned());
    }
    said
}

fn rounded(number: f64, steps: f64) -> f64 {
    (number * steps).round() / steps
}
