//! What the sensor sees: averages over pixel and exposure, the shutter's rows, shake, lamp and grain.
//!
//! In: an [`Exposure`]. Out: a [`Picture`]. The still part is drawn once; only body and springs are drawn again.
use std::f64::consts::TAU;

use super::backdrop::{self, Shake};
use super::grain::Grain;
use super::law::Motion;
use super::picture::{Picture, as_f64, centre_px, to_f32};
use super::scene::Scene;
use super::shutter::Exposure;
use super::sprite::Sprite;
use super::workshop::Workshop;

/// Longest way of the body between two samples of one exposure, px.
const SMEAR_STEP_PX: f64 = 0.25;
/// The same for the springs, whose wire is only looked at.
const SPRING_STEP_PX: f64 = 1.0;

/// A camera in front of a workshop.
#[derive(Clone, Debug)]
pub struct Camera {
    scene: Scene,
    motion: Motion,
    shop: Workshop,
    body: Sprite,
    still: Picture,
    hand: Vec<(usize, f32)>,
    grain: Grain,
    shake: Shake,
    pixel_width_px: f64,
}

impl Camera {
    /// Sets up a camera for a checked scene: draws the still part and the body.
    #[must_use]
    pub fn new(scene: &Scene) -> Self {
        let shop = Workshop::new(scene);
        let [wide, high] = scene.camera.pixel_aspect.map(f64::from);
        let pixel_width_px = wide / high;
        let angle_rad = scene.camera.axis_angle_deg.to_radians();
        let body = Sprite::new(
            shop.half_body_px,
            scene.camera.blur_px,
            pixel_width_px,
            angle_rad,
            |u, v| shop.body_grey(u, v),
        );
        let still = backdrop::still_part(scene, &shop, pixel_width_px);
        let hand = if scene.mishap.occlusion.is_some() {
            backdrop::hand(&still, &shop, pixel_width_px)
        } else {
            Vec::new()
        };
        Self {
            motion: Motion::new(scene),
            body,
            still,
            hand,
            grain: Grain::new(scene.seed),
            shake: Shake::new(scene),
            pixel_width_px,
            scene: scene.clone(),
            shop,
        }
    }

    /// Takes one picture.
    #[must_use]
    pub fn shoot(&self, exposure: &Exposure) -> Picture {
        let shake_px = self.shake_px(exposure.t_s);
        let mut picture = self.still.moved(shake_px, self.pixel_width_px);
        if self.scene.glider.springs {
            self.add_springs(&mut picture, exposure.t_s, shake_px);
        }
        self.add_body(&mut picture, exposure.t_s, shake_px);
        if self.is_occluded(exposure.t_s) {
            for (at, grey) in &self.hand {
                picture.grey[*at] = *grey;
            }
        }
        self.add_lamp_and_grain(&mut picture, exposure);
        picture
    }

    /// Centre of the marker in display px, and the time at which its row was exposed, s.
    #[must_use]
    pub fn marker_px(&self, t_s: f64) -> ([f64; 2], f64) {
        let shake_px = self.shake_px(t_s);
        let mut seen_s = t_s;
        let mut place_px = self.place_px(seen_s, shake_px);
        // The row decides the time and the time the row; each round shrinks the error by speed · readout/height, far below 1.
        for _ in 0..20 {
            seen_s = t_s + self.delay_s(place_px);
            place_px = self.place_px(seen_s, shake_px);
        }
        (place_px, seen_s)
    }

    /// True where the whole marker can be seen at a time: inside the picture and not behind the hand.
    #[must_use]
    pub fn is_visible(&self, t_s: f64) -> bool {
        let ([x_px, y_px], _) = self.marker_px(t_s);
        let radius_px = 0.5 * self.scene.marker.size_px;
        let (width_px, height_px) = (
            f64::from(self.scene.camera.width_px),
            f64::from(self.scene.camera.height_px),
        );
        let inside = |at: f64, side: f64| at - radius_px >= -0.5 && at + radius_px <= side - 0.5;
        let hidden = self.is_occluded(t_s) && {
            let from_rest_px = (self.motion.position_m(t_s) - self.scene.motion.centre_m)
                * self.scene.camera.px_per_m;
            from_rest_px.abs() < self.shop.hand_half_px()[0] + radius_px
        };
        inside(x_px, width_px) && inside(y_px, height_px) && !hidden
    }

    /// Centres of the scale bar's end marks, display px.
    #[must_use]
    pub fn bar_ends_px(&self) -> Option<[[f64; 2]; 2]> {
        self.shop.bar_ends_px()
    }

    /// The motion that is filmed.
    #[must_use]
    pub fn motion(&self) -> &Motion {
        &self.motion
    }

    fn place_px(&self, t_s: f64, shake_px: [f64; 2]) -> [f64; 2] {
        let [x, y] = self.shop.display_px(
            self.motion.position_m(t_s) * self.scene.camera.px_per_m,
            0.0,
        );
        [x + shake_px[0], y + shake_px[1]]
    }

    fn is_occluded(&self, t_s: f64) -> bool {
        self.scene
            .mishap
            .occlusion
            .is_some_and(|occlusion| (occlusion.from_s..=occlusion.to_s).contains(&t_s))
    }

    /// How much later than row 0 a place in display px is exposed, s. Rows are rows of the stored picture.
    fn delay_s(&self, [x_px, y_px]: [f64; 2]) -> f64 {
        let camera = &self.scene.camera;
        let (width_px, height_px) = (f64::from(camera.width_px), f64::from(camera.height_px));
        let part = match camera.rotation_deg {
            90 => (width_px - 1.0 - x_px) / width_px,
            180 => (height_px - 1.0 - y_px) / height_px,
            270 => x_px / width_px,
            _ => y_px / height_px,
        };
        part * camera.readout_s
    }

    /// Shake of the whole picture at a time, px. It is slow: within one picture it is taken as constant.
    pub(super) fn shake_px(&self, t_s: f64) -> [f64; 2] {
        self.shake.at_px(t_s)
    }

    /// Places of the body's centre along the axis during an exposure around a time, px, at most a step apart.
    fn path_px(&self, t_s: f64, step_px: f64) -> Vec<f64> {
        let camera = &self.scene.camera;
        let at_px = |part: f64| {
            self.motion
                .position_m(t_s + (part - 0.5) * camera.exposure_s)
                * camera.px_per_m
        };
        let way_px: f64 = (0..8)
            .map(|i| (at_px(f64::from(i + 1) / 8.0) - at_px(f64::from(i) / 8.0)).abs())
            .sum();
        // 1.3: between the eighths the body may be that much faster than their mean.
        #[expect(
            clippy::cast_possible_truncation,
            clippy::cast_sign_loss,
            reason = "limits::check bounds the smear"
        )]
        let n = (1.3 * way_px / step_px).ceil().clamp(1.0, 4096.0) as u32;
        (0..n)
            .map(|i| at_px((f64::from(i) + 0.5) / f64::from(n)))
            .collect()
    }

    /// Calls `draw` with sample index, place along and across the axis, and line of exposure, for a box of the axis's frame.
    fn for_box(
        &self,
        picture: &Picture,
        along: [f64; 2],
        across: [f64; 2],
        shake_px: [f64; 2],
        mut draw: impl FnMut(usize, f64, f64),
    ) {
        let corners = along
            .iter()
            .flat_map(|u| across.iter().map(|v| self.shop.display_px(*u, *v)))
            .collect::<Vec<_>>();
        let span = |pick: fn(&[f64; 2]) -> f64, shift: f64, scale: f64, n: usize| {
            let low = corners.iter().map(pick).fold(f64::INFINITY, f64::min) + shift;
            let high = corners.iter().map(pick).fold(f64::NEG_INFINITY, f64::max) + shift;
            index(low / scale - 1.0, n)..index(high / scale + 2.0, n)
        };
        let columns = span(
            |corner| corner[0],
            shake_px[0],
            self.pixel_width_px,
            picture.width,
        );
        for row in span(|corner| corner[1], shake_px[1], 1.0, picture.height) {
            for column in columns.clone() {
                let x_px = centre_px(column, self.pixel_width_px);
                let [u, v] = self
                    .shop
                    .along_across_px(x_px - shake_px[0], as_f64(row) - shake_px[1]);
                draw(row * picture.width + column, u, v);
            }
        }
    }

    fn add_body(&self, picture: &mut Picture, t_s: f64, shake_px: [f64; 2]) {
        let camera = &self.scene.camera;
        // One path a row of exposure; a global shutter has a single one. Rows of exposure are rows or columns of the display.
        let by_column = !camera.rotation_deg.is_multiple_of(180);
        let n_lines = if camera.readout_s == 0.0 {
            1
        } else if by_column {
            picture.width
        } else {
            picture.height
        };
        let paths: Vec<Vec<f64>> = (0..n_lines)
            .map(|line| {
                self.path_px(
                    t_s + if n_lines == 1 {
                        0.0
                    } else {
                        self.delay_s([as_f64(line); 2])
                    },
                    SMEAR_STEP_PX,
                )
            })
            .collect();
        let low = paths
            .iter()
            .flatten()
            .copied()
            .fold(f64::INFINITY, f64::min)
            - self.body.half_along_px;
        let high = paths
            .iter()
            .flatten()
            .copied()
            .fold(f64::NEG_INFINITY, f64::max)
            + self.body.half_along_px;
        let across = [-self.body.half_across_px, self.body.half_across_px];
        let (width, mut grey) = (picture.width, std::mem::take(&mut picture.grey));
        self.for_box(picture, [low, high], across, shake_px, |at, u, v| {
            let line = if n_lines == 1 {
                0
            } else if by_column {
                at % width
            } else {
                at / width
            };
            let [light, coverage] = self.body.seen(u, v, &paths[line]);
            grey[at] += light - coverage * grey[at];
        });
        picture.grey = grey;
    }

    fn add_springs(&self, picture: &mut Picture, t_s: f64, shake_px: [f64; 2]) {
        let path_px = self.path_px(t_s, SPRING_STEP_PX);
        let reach_px = self.shop.spring_half_px + 2.0;
        let mut grey = std::mem::take(&mut picture.grey);
        self.for_box(
            picture,
            self.shop.posts_px,
            [-reach_px, reach_px],
            shake_px,
            |at, u, v| {
                let (mut light, mut hits, mut looks) = (0.0, 0.0, 0.0);
                for body_px in &path_px {
                    for (du, dv) in [(-0.25, -0.37), (0.25, -0.12), (-0.25, 0.13), (0.25, 0.38)] {
                        looks += 1.0;
                        if let Some(seen) = self.shop.spring_grey(u + du, v + dv, *body_px) {
                            light += seen;
                            hits += 1.0;
                        }
                    }
                }
                grey[at] += to_f32(light / looks) - to_f32(hits / looks) * grey[at];
            },
        );
        picture.grey = grey;
    }

    fn add_lamp_and_grain(&self, picture: &mut Picture, exposure: &Exposure) {
        let camera = &self.scene.camera;
        let lit = camera.flicker.is_some() || camera.brightness_drift != 0.0;
        let (read, shot) = (to_f32(camera.noise_grey.powi(2)), to_f32(camera.shot_grey));
        if !lit && read + shot == 0.0 {
            return;
        }
        for (row, line) in picture.grey.chunks_exact_mut(picture.width).enumerate() {
            if lit {
                // Bands of a rolling shutter run along the stored rows; a picture stored on its side gets its mean instead.
                let t_s = exposure.t_s
                    + if camera.rotation_deg.is_multiple_of(180) {
                        self.delay_s([0.0, as_f64(row)])
                    } else {
                        0.5 * camera.readout_s
                    };
                let flicker = camera.flicker.map_or(0.0, |lamp| {
                    lamp.amplitude * (TAU * lamp.frequency_hz * t_s).sin()
                });
                let gain =
                    to_f32(1.0 + flicker + camera.brightness_drift * t_s / camera.duration_s);
                line.iter_mut().for_each(|grey| *grey *= gain);
            }
            let deviates = self.grain.row(exposure.shown, row, picture.width);
            if shot > 0.0 {
                line.iter_mut().zip(deviates).for_each(|(grey, deviate)| {
                    *grey += (read + shot * grey.max(0.0)).sqrt() * deviate
                });
            } else {
                line.iter_mut()
                    .zip(deviates)
                    .for_each(|(grey, deviate)| *grey += to_f32(camera.noise_grey) * deviate);
            }
        }
    }
}

#[expect(
    clippy::cast_possible_truncation,
    clippy::cast_sign_loss,
    reason = "cut to 0…n before the cast"
)]
fn index(place: f64, n: usize) -> usize {
    place.clamp(0.0, as_f64(n)) as usize
}
