//! What a scene may ask for. Checked once, at the door: what passes can be filmed within a few gigabytes and without overflow.
use super::RehearsalError;
use super::camera_limits::{check_camera, check_codec, check_time};
use super::error::{require, within};
use super::scene::{LawName, MarkerScene, MotionScene, Scene};
use super::shutter;

/// Largest body, px²: it is drawn once at eight samples a pixel each way, 8 bytes a sample.
pub(super) const LARGEST_BODY_PX2: f64 = 160_000.0;

/// Refuses a scene that cannot be filmed, naming the first key that stands in the way.
///
/// # Errors
/// [`RehearsalError::SceneValue`] with the key, what was found there and what it accepts.
pub(super) fn check(scene: &Scene) -> Result<(), RehearsalError> {
    check_motion(&scene.motion)?;
    check_camera(&scene.camera)?;
    check_time(scene)?;
    check_bodies(scene)?;
    check_mishaps(scene)?;
    check_codec(&scene.codec, &scene.camera)
}

fn check_motion(motion: &MotionScene) -> Result<(), RehearsalError> {
    within(
        "motion.period_s",
        motion.period_s,
        0.01,
        1000.0,
        "give seconds from 0.01 to 1000",
    )?;
    within(
        "motion.amplitude_m",
        motion.amplitude_m,
        0.0,
        10.0,
        "give metres from 0 to 10",
    )?;
    within(
        "motion.phase_rad",
        motion.phase_rad,
        -100.0,
        100.0,
        "give radians from -100 to 100",
    )?;
    within(
        "motion.centre_m",
        motion.centre_m,
        -10.0,
        10.0,
        "give metres from -10 to 10",
    )?;
    within(
        "motion.damping_ratio",
        motion.damping_ratio,
        0.0,
        0.9,
        "give a ratio from 0 to 0.9; beyond 1 nothing oscillates",
    )?;
    within(
        "motion.dry_step_m",
        motion.dry_step_m,
        0.0,
        1.0,
        "give F/k in metres, from 0 to 1",
    )?;
    let a = motion.amplitude_m.max(1e-6);
    within(
        "motion.drag_per_m",
        motion.drag_per_m,
        0.0,
        4.0 / a,
        "give 1/m, at least 0 and at most 4/amplitude",
    )?;
    let wanted = "give 1/m², times amplitude² from -0.5 (a softer spring would not pull back) to 8";
    within(
        "motion.stiffening_per_m2",
        motion.stiffening_per_m2,
        -0.5 / (a * a),
        8.0 / (a * a),
        wanted,
    )?;
    let losses = [
        motion.damping_ratio > 0.0,
        motion.dry_step_m > 0.0,
        motion.drag_per_m > 0.0,
    ];
    let (word, expected) = match motion.law {
        None => return Ok(()),
        Some(LawName::None) => ("none", [false, false, false]),
        Some(LawName::Viscous) => ("viscous", [true, false, false]),
        Some(LawName::Dry) => ("dry", [false, true, false]),
        Some(LawName::Drag) => ("drag", [false, false, true]),
    };
    let wanted = "its coefficient, and no other of damping_ratio, dry_step_m and drag_per_m, must be above 0; leave the word out for a mixture";
    require(losses == expected, "motion.law", word, wanted)
}

fn check_bodies(scene: &Scene) -> Result<(), RehearsalError> {
    let MarkerScene {
        size_px,
        contrast,
        kind: _,
    } = scene.marker;
    within(
        "marker.size_px",
        size_px,
        4.0,
        400.0,
        "give pixels from 4 to 400",
    )?;
    within(
        "marker.contrast",
        contrast,
        0.0,
        1.0,
        "give a contrast from 0 to 1",
    )?;
    let (length_px, height_px) = scene.body_px();
    within(
        "glider.length_px",
        length_px,
        size_px,
        4000.0,
        "give pixels from the marker's size to 4000",
    )?;
    within(
        "glider.height_px",
        height_px,
        size_px,
        4000.0,
        "give pixels from the marker's size to 4000",
    )?;
    require(
        length_px * height_px <= LARGEST_BODY_PX2,
        "glider.length_px",
        length_px,
        "length times height must not exceed 160000 px²: make the body smaller",
    )?;
    within(
        "glider.grey",
        scene.glider.grey,
        0.0,
        255.0,
        "give a grey level from 0 to 255",
    )?;
    if let Some(bar) = scene.scale_bar {
        within(
            "scale_bar.length_m",
            bar.length_m,
            1e-3,
            100.0,
            "give metres from 0.001 to 100",
        )?;
        for centre in bar.centre_px.iter().flatten() {
            within(
                "scale_bar.centre_px",
                *centre,
                -8192.0,
                16384.0,
                "give [x, y] in pixels near the picture",
            )?;
        }
    }
    for tint in scene.background.tint {
        require(
            (-64..=64).contains(&tint),
            "background.tint",
            tint,
            "give two levels from -64 to 64",
        )?;
    }
    Ok(())
}

fn check_mishaps(scene: &Scene) -> Result<(), RehearsalError> {
    let mishap = &scene.mishap;
    if let Some(occlusion) = mishap.occlusion {
        within(
            "mishap.occlusion.from_s",
            occlusion.from_s,
            0.0,
            3600.0,
            "give seconds from 0 to 3600",
        )?;
        within(
            "mishap.occlusion.to_s",
            occlusion.to_s,
            occlusion.from_s,
            3600.0,
            "give seconds from from_s to 3600",
        )?;
    }
    if let Some(leave) = mishap.leave_frame {
        within(
            "mishap.leave_frame.from_s",
            leave.from_s,
            0.0,
            3600.0,
            "give seconds from 0 to 3600",
        )?;
        within(
            "mishap.leave_frame.speed_m_per_s",
            leave.speed_m_per_s,
            -10.0,
            10.0,
            "give metres a second from -10 to 10",
        )?;
    }
    let left = shutter::exposures(scene).len();
    require(
        left > 0,
        "mishap.drop_frames",
        "every picture there is",
        "leave at least one picture",
    )
}
