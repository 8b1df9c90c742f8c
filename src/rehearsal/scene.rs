//! The scene: everything that decides a rehearsal, as TOML. `fixtures/scenes/every-key.toml` shows every key with a comment.
use serde::Deserialize;

use super::storage::{CodecScene, StampScene};

/// A film to be made: what moves, what looks at it, what goes wrong, how it is stored.
///
/// Units are in the names of the keys. Tables may be left out unless they are said to be needed; an unknown key is an error.
#[derive(Clone, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Scene {
    /// Name of the scene, repeated in the truth.
    #[serde(default)]
    pub name: String,
    /// Seed of everything random: grain, speckle, shake, jitter, wood. Same scene, same bytes.
    #[serde(default)]
    pub seed: u64,
    /// The oscillation. Needed.
    pub motion: MotionScene,
    /// The camera. Needed.
    pub camera: CameraScene,
    /// The tracked pattern.
    #[serde(default)]
    pub marker: MarkerScene,
    /// The body that carries the marker.
    #[serde(default)]
    pub glider: GliderScene,
    /// The bar of known length; no bar when left out.
    pub scale_bar: Option<ScaleBarScene>,
    /// What lies behind.
    #[serde(default)]
    pub background: BackgroundScene,
    /// What goes wrong.
    #[serde(default)]
    pub mishap: MishapScene,
    /// The time stamps.
    #[serde(default)]
    pub stamps: StampScene,
    /// The compression.
    #[serde(default)]
    pub codec: CodecScene,
}

/// The oscillation about `centre_m`, along the axis; forces divided by mass m or stiffness k.
///
/// m ẍ = −k (x − c) (1 + κ (x − c)²) − 2 ζ √(k m) ẋ − F sign(ẋ) − β m |ẋ| ẋ
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct MotionScene {
    /// One word for a pure law; the coefficients are then checked against it. Without it they stand as given.
    pub law: Option<LawName>,
    /// T_0 = 2π √(m/k), s: the period without loss and at small amplitude.
    pub period_s: f64,
    /// A, m: x(0) = c + A cos φ.
    pub amplitude_m: f64,
    /// φ, rad.
    #[serde(default)]
    pub phase_rad: f64,
    /// c, m.
    #[serde(default)]
    pub centre_m: f64,
    /// ζ of the viscous part, 1.
    #[serde(default)]
    pub damping_ratio: f64,
    /// F/k of the dry part, m: the amplitude shrinks by four of them a cycle.
    #[serde(default)]
    pub dry_step_m: f64,
    /// β = (drag force)/(m v²), 1/m.
    #[serde(default)]
    pub drag_per_m: f64,
    /// κ = k₃/k of the restoring force, 1/m²; negative softens.
    #[serde(default)]
    pub stiffening_per_m2: f64,
}

/// A pure law of loss.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum LawName {
    /// No loss.
    None,
    /// Force in proportion to speed.
    Viscous,
    /// Force of constant size against the motion.
    Dry,
    /// Force in proportion to the square of the speed.
    Drag,
}

/// A frame rate: pictures a second, as a number or exactly as `[numerator, denominator]`.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(untagged)]
pub enum Rate {
    /// Exact fraction.
    Fraction([u32; 2]),
    /// A number; the nearest fraction with a denominator of at most 1001 is meant.
    Number(f64),
}

/// The camera: where it looks, how long it exposes, what it adds.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct CameraScene {
    /// Width of the displayed picture, px.
    pub width_px: u32,
    /// Height of the displayed picture, px.
    pub height_px: u32,
    /// Pictures a second, as the stamps count them.
    pub rate_hz: Rate,
    /// Length of the motion filmed, s.
    pub duration_s: f64,
    /// Image scale in the plane of the motion, px/m.
    pub px_per_m: f64,
    /// Turn of the motion axis from the right of the image towards its foot, degrees.
    #[serde(default)]
    pub axis_angle_deg: f64,
    /// Where x = 0 m is seen, px; the middle of the picture when left out.
    pub centre_px: Option<[f64; 2]>,
    /// Exposure of a row, s; at most one frame interval. 0 freezes the motion.
    #[serde(default)]
    pub exposure_s: f64,
    /// Standard deviation of the lens's Gaussian blur, px.
    #[serde(default = "default_blur_px")]
    pub blur_px: f64,
    /// Standard deviation of the grain, grey levels of 255.
    #[serde(default)]
    pub noise_grey: f64,
    /// Variance of the grain that grows with the light: grey levels² per grey level.
    #[serde(default)]
    pub shot_grey: f64,
    /// Lamp flicker.
    pub flicker: Option<Flicker>,
    /// Relative change of the brightness over the whole film, 1.
    #[serde(default)]
    pub brightness_drift: f64,
    /// Root mean square of the camera's slow shake on each image axis, px.
    #[serde(default)]
    pub shake_px: f64,
    /// Rolling shutter: row r of a picture of h stored rows is exposed r/h of this later than row 0, s.
    #[serde(default)]
    pub readout_s: f64,
    /// Clockwise turn that a player must give the stored picture: 0, 90, 180 or 270. The displayed picture stays the scene.
    #[serde(default)]
    pub rotation_deg: u32,
    /// Width over height of a stored pixel, `[numerator, denominator]`. The stored picture is narrower by as much.
    #[serde(default = "default_aspect")]
    pub pixel_aspect: [u32; 2],
}

/// Brightness that follows the mains.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Flicker {
    /// Relative amplitude, 1.
    pub amplitude: f64,
    /// Frequency, Hz.
    pub frequency_hz: f64,
}

/// The tracked pattern, centred on the body.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct MarkerScene {
    /// What is printed on it.
    pub kind: MarkerKind,
    /// Side of its box, px.
    pub size_px: f64,
    /// Spread of its greys: 0 none, 1 black on white.
    pub contrast: f64,
}

/// What is printed on the marker.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum MarkerKind {
    /// Two dark and two light quadrants in a disc on a light sticker.
    Quadrant,
    /// Rings.
    Rings,
    /// Random blobs, other ones for another seed.
    Speckle,
    /// Nothing: a sticker of the body's grey, to be refused.
    Plain,
}

/// The body that slides along the rail.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct GliderScene {
    /// Length along the axis, px; twice the marker when left out.
    pub length_px: Option<f64>,
    /// Height across the axis, px; a little more than the marker when left out.
    pub height_px: Option<f64>,
    /// Grey of its side, 0…255.
    pub grey: f64,
    /// Two springs between the body and posts on the rail.
    pub springs: bool,
}

/// A bar of known length, parallel to the axis, with a quartered disc centred on each end.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ScaleBarScene {
    /// Distance between the centres of its end marks, m.
    pub length_m: f64,
    /// Middle of the bar, px; below the rail when left out.
    pub centre_px: Option<[f64; 2]>,
}

/// What lies behind the moving parts.
#[derive(Clone, Copy, Debug, Default, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct BackgroundScene {
    /// Its look.
    pub texture: Texture,
    /// Blue and red difference added to the colourless chroma, levels of 255, −64…64.
    pub tint: [i32; 2],
}

/// The look of the background.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Texture {
    /// One grey.
    #[default]
    Plain,
    /// A wall, a rail with holes and a table of wood.
    Bench,
    /// Blotches of several sizes.
    Speckle,
}

/// What goes wrong. Pictures are counted from 0 as the camera takes them, before any is lost.
#[derive(Clone, Debug, Default, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct MishapScene {
    /// Something is held in front of the marker's path.
    pub occlusion: Option<Occlusion>,
    /// The body glides away for good.
    pub leave_frame: Option<LeaveFrame>,
    /// Pictures that are lost; the stamps keep the gap.
    pub drop_frames: Vec<usize>,
    /// Pictures that are lost, the stamps closed up as if they had never been.
    pub slip_frames: Vec<usize>,
    /// Pictures that show the one before them once more, under their own stamp.
    pub repeat_frames: Vec<usize>,
    /// Nothing moves: x = c + A cos φ throughout.
    pub still: bool,
}

/// A hand-like block over the whole path of the marker.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct Occlusion {
    /// From, s.
    pub from_s: f64,
    /// To, s.
    pub to_s: f64,
}

/// A velocity added to the motion from a time on.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct LeaveFrame {
    /// From, s.
    pub from_s: f64,
    /// Velocity, m/s.
    pub speed_m_per_s: f64,
}

fn default_blur_px() -> f64 {
    0.5
}
fn default_aspect() -> [u32; 2] {
    [1, 1]
}

impl Default for MarkerScene {
    fn default() -> Self {
        Self {
            kind: MarkerKind::Quadrant,
            size_px: 40.0,
            contrast: 0.8,
        }
    }
}

impl Default for GliderScene {
    fn default() -> Self {
        Self {
            length_px: None,
            height_px: None,
            grey: 92.0,
            springs: false,
        }
    }
}
