//! What stands in the picture, as greys of places: wall, table, rail, posts, scale bar, body, springs, hand.
//!
//! In: places in display pixels, or along (u) and across (v) the axis from where x = 0 is seen. Out: greys 0…255. Nothing here
//! knows of pixels' areas or of time; [`Camera`](super::Camera) averages over both.
use super::grain::smooth_noise;
use super::marker;
use super::scene::{ScaleBarScene, Scene, Texture};

/// Gap between body and rail, px: the air cushion.
const AIR_GAP_PX: f64 = 2.0;
/// Turns of a spring from body to post.
const SPRING_TURNS: f64 = 16.0;

/// The workshop of one scene: its measures, derived once.
#[derive(Clone, Debug)]
pub(super) struct Workshop {
    scene: Scene,
    /// Where x = 0 is seen, display px.
    pub(super) origin_px: [f64; 2],
    /// Cosine and sine of the axis in the image.
    cos: f64,
    sin: f64,
    /// Half length and height of the body, px.
    pub(super) half_body_px: [f64; 2],
    /// Upper and lower edge of the rail, px across the axis.
    rail_px: [f64; 2],
    /// Places of the posts along the axis, px.
    pub(super) posts_px: [f64; 2],
    /// Amplitude of a spring's winding, px.
    pub(super) spring_half_px: f64,
    bar: Option<Bar>,
}

/// The scale bar in pixels.
#[derive(Clone, Copy, Debug)]
struct Bar {
    /// Its middle along and across the axis, px.
    middle_px: [f64; 2],
    half_length_px: f64,
    mark_radius_px: f64,
}

impl Scene {
    /// Length and height of the body, px.
    #[must_use]
    pub fn body_px(&self) -> (f64, f64) {
        let size_px = self.marker.size_px;
        (
            self.glider.length_px.unwrap_or(2.0 * size_px),
            self.glider.height_px.unwrap_or(1.2 * size_px),
        )
    }
}

impl Workshop {
    pub(super) fn new(scene: &Scene) -> Self {
        let camera = &scene.camera;
        let middle = [
            0.5 * (f64::from(camera.width_px) - 1.0),
            0.5 * (f64::from(camera.height_px) - 1.0),
        ];
        let (sin, cos) = camera.axis_angle_deg.to_radians().sin_cos();
        let (length_px, height_px) = scene.body_px();
        let rail_top = 0.5 * height_px + AIR_GAP_PX;
        let rail_px = [rail_top, rail_top + (0.45 * height_px).max(8.0)];
        let swing_px = scene.motion.amplitude_m * camera.px_per_m;
        let rest_px = scene.motion.centre_m * camera.px_per_m;
        let post_px = swing_px + 0.5 * length_px + (0.5 * swing_px).max(30.0);
        let mut shop = Self {
            scene: scene.clone(),
            origin_px: camera.centre_px.unwrap_or(middle),
            cos,
            sin,
            half_body_px: [0.5 * length_px, 0.5 * height_px],
            rail_px,
            posts_px: [rest_px - post_px, rest_px + post_px],
            spring_half_px: (0.11 * height_px).max(3.0),
            bar: None,
        };
        shop.bar = scene.scale_bar.map(|bar| shop.placed(&bar));
        shop
    }

    fn placed(&self, bar: &ScaleBarScene) -> Bar {
        let mark_radius_px = (f64::from(self.scene.camera.width_px) / 130.0).max(5.0);
        let below_rail_px = [0.0, self.rail_px[1] + 3.0 * mark_radius_px];
        Bar {
            middle_px: bar
                .centre_px
                .map_or(below_rail_px, |[x, y]| self.along_across_px(x, y)),
            half_length_px: 0.5 * bar.length_m * self.scene.camera.px_per_m,
            mark_radius_px,
        }
    }

    /// Places along and across the axis of a point in display pixels.
    pub(super) fn along_across_px(&self, x_px: f64, y_px: f64) -> [f64; 2] {
        let (dx, dy) = (x_px - self.origin_px[0], y_px - self.origin_px[1]);
        [dx * self.cos + dy * self.sin, dy * self.cos - dx * self.sin]
    }

    /// Display pixels of a point along and across the axis.
    pub(super) fn display_px(&self, along_px: f64, across_px: f64) -> [f64; 2] {
        [
            self.origin_px[0] + along_px * self.cos - across_px * self.sin,
            self.origin_px[1] + along_px * self.sin + across_px * self.cos,
        ]
    }

    /// Centres of the bar's end marks, display px.
    pub(super) fn bar_ends_px(&self) -> Option<[[f64; 2]; 2]> {
        let Bar {
            middle_px: [along, across],
            half_length_px,
            ..
        } = self.bar?;
        Some([
            self.display_px(along - half_length_px, across),
            self.display_px(along + half_length_px, across),
        ])
    }

    /// Grey of everything that stands still, at a point in display pixels.
    pub(super) fn still_grey(&self, x_px: f64, y_px: f64) -> f64 {
        let [u, v] = self.along_across_px(x_px, y_px);
        if let Some(grey) = self.bar.and_then(|bar| bar.grey(u, v)) {
            return grey;
        }
        match self.scene.background.texture {
            Texture::Plain => 128.0,
            Texture::Speckle => {
                let octave = |n: u64, size_px: f64| {
                    smooth_noise(self.scene.seed ^ n, u / size_px, v / size_px)
                };
                128.0 + 34.0 * octave(1, 4.3) + 30.0 * octave(2, 11.0) + 22.0 * octave(3, 41.0)
            }
            Texture::Bench => self.bench_grey(u, v),
        }
    }

    fn bench_grey(&self, u: f64, v: f64) -> f64 {
        let noise = |n: u64, along_px: f64, across_px: f64| {
            smooth_noise(self.scene.seed ^ n, u / along_px, v / across_px)
        };
        let [rail_top, rail_foot] = self.rail_px;
        let depth = (v - rail_top) / (rail_foot - rail_top);
        let near_post_px = self
            .posts_px
            .iter()
            .map(|post| (u - post).abs())
            .fold(f64::INFINITY, f64::min);
        if near_post_px <= 4.0 && (-0.9 * self.half_body_px[1]..=rail_top).contains(&v) {
            return 58.0 + 26.0 * (1.0 - near_post_px / 4.0);
        }
        if (0.0..=1.0).contains(&depth) {
            // An extruded profile: a bright edge, a row of air holes, a groove, a dark foot.
            let hole = (u.rem_euclid(26.0) - 13.0).hypot((depth - 0.32) * (rail_foot - rail_top));
            let profile = match depth {
                d if d < 0.09 => 205.0,
                d if (0.58..0.66).contains(&d) => 96.0,
                d => 158.0 - 42.0 * d,
            };
            return if hole < 1.9 {
                52.0
            } else {
                profile + 2.5 * noise(11, 60.0, 1.5)
            };
        }
        let table_top = rail_foot + 0.25 * (rail_foot - rail_top);
        if depth > 1.0 && v < table_top {
            // The rail's feet and the shadow between them.
            return if u.rem_euclid(190.0) < 26.0 {
                74.0
            } else {
                62.0 + 3.0 * noise(12, 40.0, 6.0)
            };
        }
        if v >= table_top {
            let far = (v - table_top) / 150.0;
            let fibre = 7.0 * noise(13, 95.0, 2.3)
                + 9.0 * noise(14, 240.0, 9.0)
                + 4.0 * noise(15, 19.0, 1.2);
            return 104.0 + 16.0 * far.min(1.5) + fibre;
        }
        178.0 + 0.045 * v + 5.0 * noise(16, 130.0, 110.0) + 3.0 * noise(17, 7.0, 7.0)
    }

    /// Grey of the body with its marker, at a point from its centre; None where there is none.
    pub(super) fn body_grey(&self, u: f64, v: f64) -> Option<f64> {
        if let Some(grey) = marker::grey(&self.scene, u, v) {
            return Some(grey);
        }
        let [half_along, half_across] = self.half_body_px;
        let corner_px = 0.12 * half_across;
        let (beyond_u, beyond_v) = (
            (u.abs() - half_along + corner_px).max(0.0),
            (v.abs() - half_across + corner_px).max(0.0),
        );
        if beyond_u.hypot(beyond_v) > corner_px {
            return None;
        }
        let shaded = self.scene.glider.grey * (1.0 - 0.12 * v / half_across);
        if self.scene.background.texture == Texture::Plain {
            return Some(shaded);
        }
        let bolt_px = (u.abs() - 0.88 * half_along).hypot(v.abs() - 0.7 * half_across);
        let worn = 3.0 * smooth_noise(self.scene.seed ^ 21, u / 5.0, v / 2.0);
        Some(if bolt_px < 0.07 * half_across {
            0.45 * shaded
        } else {
            shaded + worn
        })
    }

    /// Grey of the springs at a point, with the body's centre at `body_px` along the axis; None beside the wire.
    pub(super) fn spring_grey(&self, u: f64, v: f64, body_px: f64) -> Option<f64> {
        let [left, right] = self.posts_px;
        let (from, to) = if u < body_px {
            (body_px - self.half_body_px[0], left)
        } else {
            (body_px + self.half_body_px[0], right)
        };
        let stretch_px = to - from;
        let part = (u - from) / stretch_px;
        if !(0.0..=1.0).contains(&part) {
            return None;
        }
        // A winding seen from the side: a wave of parabolas, near enough to a sine and much cheaper.
        let turn = (part * SPRING_TURNS).fract();
        let half = 4.0 * if turn < 0.5 { turn } else { turn - 1.0 };
        let wave = half * (2.0 - half.abs());
        let slope = 8.0 * (1.0 - half.abs()) * SPRING_TURNS / stretch_px * self.spring_half_px;
        let distance_px = (v - self.spring_half_px * wave).abs() / slope.hypot(1.0);
        let front = half.abs() < 1.0;
        (distance_px < 0.9).then_some(if front { 222.0 } else { 120.0 })
    }

    /// Grey of the hand in front of the marker's path; None beside it.
    pub(super) fn hand_grey(&self, x_px: f64, y_px: f64) -> Option<f64> {
        let [u, v] = self.along_across_px(x_px, y_px);
        let [half_u, half_v] = self.hand_half_px();
        let u = u - self.scene.motion.centre_m * self.scene.camera.px_per_m;
        let palm = u.abs() <= half_u && v.abs() <= half_v;
        let arm = u.abs() <= 0.4 * half_u && v > 0.0;
        let noise =
            |n: u64, size_px: f64| smooth_noise(self.scene.seed ^ n, u / size_px, v / size_px);
        let fold = if (v / (0.5 * half_v)).fract().abs() < 0.08 {
            -28.0
        } else {
            0.0
        };
        (palm || arm).then(|| 158.0 + fold + 14.0 * noise(31, 23.0) + 7.0 * noise(32, 5.0))
    }

    /// Half the extent of the hand along and across the axis: the whole swing and a marker more.
    pub(super) fn hand_half_px(&self) -> [f64; 2] {
        let size_px = self.scene.marker.size_px;
        [
            self.scene.motion.amplitude_m * self.scene.camera.px_per_m + size_px,
            0.9 * size_px,
        ]
    }
}

impl Bar {
    /// Paper strip, ticks at every tenth, a quartered disc on each end; None beside it.
    fn grey(&self, u: f64, v: f64) -> Option<f64> {
        let (u, v) = (u - self.middle_px[0], v - self.middle_px[1]);
        let radius = self.mark_radius_px;
        let end_u = u.abs() - self.half_length_px;
        if end_u > 1.6 * radius || v.abs() > 1.5 * radius {
            return None;
        }
        if end_u > 1.6 * radius - 1.2 || v.abs() > 1.5 * radius - 1.2 {
            return Some(70.0);
        }
        let from_end = end_u.hypot(v) / radius;
        if from_end <= 1.0 {
            return Some(if from_end > 0.87 {
                30.0
            } else {
                133.0 - 103.0 * marker::sign(end_u * v)
            });
        }
        let tenth_px = 0.2 * self.half_length_px;
        let tick = ((u + self.half_length_px) / tenth_px + 0.5).fract();
        let on_tick = (tick - 0.5).abs() * tenth_px < 0.8 && v > 0.3 * radius;
        Some(if on_tick { 60.0 } else { 226.0 })
    }
}
