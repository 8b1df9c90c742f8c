//! The tracked pattern as a function of place: a grey at every point of the sticker, None outside it.
use super::grain::smooth_noise;
use super::scene::{MarkerKind, MarkerScene, Scene};

/// Grey of paper in the middle between light and dark ink.
const MIDDLE_GREY: f64 = 130.0;
/// Half the distance between light and dark at contrast 1.
const FULL_SWING_GREY: f64 = 105.0;
/// Part of the sticker's radius that the quartered disc fills: a light rim keeps it apart from the body.
const PATTERN_PART: f64 = 0.8;
/// Light and dark rings on the marker of rings.
const N_RINGS: f64 = 5.0;
/// Blobs along one side of the speckle marker.
const N_BLOBS: f64 = 9.0;

/// Grey 0…255 at a point, px along and across the axis from the marker's centre.
pub(super) fn grey(scene: &Scene, u_px: f64, v_px: f64) -> Option<f64> {
    let MarkerScene {
        kind,
        size_px,
        contrast,
    } = scene.marker;
    let radius_px = 0.5 * size_px;
    let r = u_px.hypot(v_px) / radius_px;
    let light = MIDDLE_GREY + contrast * FULL_SWING_GREY;
    let dark = MIDDLE_GREY - contrast * FULL_SWING_GREY;
    match kind {
        MarkerKind::Quadrant if r <= 1.0 => {
            // On a dividing line the product is 0 and the grey is the mean: the pattern stays symmetric to the last sample.
            Some(if r > PATTERN_PART {
                light
            } else {
                MIDDLE_GREY + (dark - MIDDLE_GREY) * sign(u_px * v_px)
            })
        }
        MarkerKind::Rings if r <= 1.0 => {
            let ring = (r * N_RINGS).floor();
            Some(if ring % 2.0 == 0.0 { light } else { dark })
        }
        MarkerKind::Speckle if u_px.abs() <= radius_px && v_px.abs() <= radius_px => {
            let blob_px = size_px / N_BLOBS;
            let level = smooth_noise(
                scene.seed ^ 0x626c_6f62,
                u_px / blob_px + 40.0,
                v_px / blob_px + 40.0,
            );
            Some(MIDDLE_GREY + (light - MIDDLE_GREY) * (4.0 * level).clamp(-1.0, 1.0))
        }
        MarkerKind::Plain if r <= 1.0 => Some(scene.glider.grey),
        MarkerKind::Quadrant | MarkerKind::Rings | MarkerKind::Speckle | MarkerKind::Plain => None,
    }
}

/// −1, 0 or 1.
pub(super) fn sign(number: f64) -> f64 {
    if number == 0.0 { 0.0 } else { number.signum() }
}
