//! The still part of the picture: drawn once, blurred by the lens, moved by the camera's shake.
use std::f64::consts::TAU;
use std::thread;

use super::grain::mixed;
use super::picture::{Picture, as_f64, centre_px, to_f32};
use super::scene::Scene;
use super::sprite::normal_weights;
use super::workshop::Workshop;

/// Samples of a pixel, each way.
const STILL_SAMPLES: u32 = 4;
/// Taps of the windowed sinc that moves the picture by a fraction of a pixel.
const SHAKE_TAPS: usize = 8;
/// Waves that make up the shake.
const N_WAVES: u32 = 5;

/// Slow movement of the whole picture: waves of equal power, none faster than a hand.
#[derive(Clone, Debug, Default)]
pub(super) struct Shake {
    /// Amplitude (px), frequency (Hz), phase across and down (rad).
    waves: Vec<[f64; 4]>,
}

impl Shake {
    pub(super) fn new(scene: &Scene) -> Self {
        if scene.camera.shake_px == 0.0 {
            return Self::default();
        }
        #[expect(clippy::cast_precision_loss, reason = "the top 53 bits are exact")]
        let unit = |n: u32| {
            (mixed(scene.seed ^ mixed(u64::from(n) ^ 0x7368_616b)) >> 11) as f64
                / (1_u64 << 53) as f64
        };
        // A sine of amplitude a has mean square a²/2.
        let amplitude_px = scene.camera.shake_px * (2.0 / f64::from(N_WAVES)).sqrt();
        let wave = |n: u32| {
            [
                amplitude_px,
                0.3 + 2.7 * unit(3 * n),
                TAU * unit(3 * n + 1),
                TAU * unit(3 * n + 2),
            ]
        };
        Self {
            waves: (0..N_WAVES).map(wave).collect(),
        }
    }

    /// Shift across and down at a time, px.
    pub(super) fn at_px(&self, t_s: f64) -> [f64; 2] {
        self.waves.iter().fold(
            [0.0; 2],
            |[x, y], [amplitude_px, frequency_hz, phase_x, phase_y]| {
                let turn = TAU * frequency_hz * t_s;
                [
                    x + amplitude_px * (turn + phase_x).sin(),
                    y + amplitude_px * (turn + phase_y).sin(),
                ]
            },
        )
    }
}

impl Picture {
    /// The still part, moved by the shake, with a windowed sinc: bilinear would blur and sharpen it in step with the shake.
    pub(super) fn moved(&self, [shake_x_px, shake_y_px]: [f64; 2], pixel_width_px: f64) -> Self {
        if shake_x_px == 0.0 && shake_y_px == 0.0 {
            return self.clone();
        }
        let Self {
            width,
            height,
            grey,
        } = self;
        let (column_shift, column_weights) = sinc_weights(-shake_x_px / pixel_width_px);
        let (row_shift, row_weights) = sinc_weights(-shake_y_px);
        let mut lines = vec![0.0_f32; grey.len()];
        for (row, line) in lines.chunks_exact_mut(*width).enumerate() {
            for (tap, weight) in row_weights.iter().enumerate() {
                let source = clamped(row, row_shift + tap.cast_signed(), *height) * width;
                line.iter_mut()
                    .zip(&grey[source..source + width])
                    .for_each(|(sum, from)| *sum += weight * from);
            }
        }
        let mut moved = vec![0.0_f32; grey.len()];
        for (to, from) in moved
            .chunks_exact_mut(*width)
            .zip(lines.chunks_exact(*width))
        {
            for (column, sum) in to.iter_mut().enumerate() {
                let at =
                    |tap: usize| from[clamped(column, column_shift + tap.cast_signed(), *width)];
                *sum = column_weights
                    .iter()
                    .enumerate()
                    .map(|(tap, weight)| weight * at(tap))
                    .sum();
            }
        }
        Picture {
            width: *width,
            height: *height,
            grey: moved,
        }
    }
}

/// Everything that does not move, averaged over each pixel and blurred by the lens.
pub(super) fn still_part(scene: &Scene, shop: &Workshop, pixel_width_px: f64) -> Picture {
    let [wide, high] = scene.camera.pixel_aspect;
    let (width, height) = (
        (scene.camera.width_px * high / wide) as usize,
        scene.camera.height_px as usize,
    );
    let mut grey = vec![0.0_f32; width * height];
    // Sixteen looks at wood and wall for each pixel take seconds at 1080p: bands are drawn side by side.
    let n_bands = thread::available_parallelism().map_or(1, usize::from);
    let band = height.div_ceil(n_bands);
    thread::scope(|scope| {
        for (n, lines) in grey.chunks_mut(band * width).enumerate() {
            scope.spawn(move || draw_band(shop, pixel_width_px, n * band, width, lines));
        }
    });
    let mut picture = Picture {
        width,
        height,
        grey,
    };
    if scene.camera.blur_px > 0.0 {
        blur_rows(
            &mut picture,
            &normal_weights(scene.camera.blur_px / pixel_width_px),
        );
        picture = turned(&picture);
        blur_rows(&mut picture, &normal_weights(scene.camera.blur_px));
        picture = turned(&picture);
    }
    picture
}

/// Lines of the still part from a row on.
fn draw_band(
    shop: &Workshop,
    pixel_width_px: f64,
    from_row: usize,
    width: usize,
    lines: &mut [f32],
) {
    let sub = |sample: u32| (f64::from(sample) + 0.5) / f64::from(STILL_SAMPLES) - 0.5;
    for (at, grey) in lines.iter_mut().enumerate() {
        let (x_px, y_px) = (
            centre_px(at % width, pixel_width_px),
            as_f64(from_row + at / width),
        );
        let places =
            (0..STILL_SAMPLES).flat_map(|j| (0..STILL_SAMPLES).map(move |i| (sub(i), sub(j))));
        let sum: f64 = places
            .map(|(dx, dy)| shop.still_grey(x_px + dx * pixel_width_px, y_px + dy))
            .sum();
        *grey = to_f32(sum / f64::from(STILL_SAMPLES * STILL_SAMPLES));
    }
}

fn blur_rows(picture: &mut Picture, weights: &[f32]) {
    let half = (weights.len() / 2).cast_signed();
    for line in picture.grey.chunks_exact_mut(picture.width) {
        let before = line.to_vec();
        for (column, grey) in line.iter_mut().enumerate() {
            let at = |tap: usize| before[clamped(column, tap.cast_signed() - half, before.len())];
            *grey = weights
                .iter()
                .enumerate()
                .map(|(tap, weight)| weight * at(tap))
                .sum();
        }
    }
}

/// Rows become columns.
fn turned(picture: &Picture) -> Picture {
    let Picture {
        width,
        height,
        grey,
    } = picture;
    let grey = (0..grey.len())
        .map(|at| grey[(at % height) * width + at / height])
        .collect();
    Picture {
        width: *height,
        height: *width,
        grey,
    }
}

/// The hand as a list of samples: it is in focus and at rest, whatever moves behind it.
pub(super) fn hand(still: &Picture, shop: &Workshop, pixel_width_px: f64) -> Vec<(usize, f32)> {
    let grey = |at: usize| {
        shop.hand_grey(
            centre_px(at % still.width, pixel_width_px),
            as_f64(at / still.width),
        )
    };
    (0..still.grey.len())
        .filter_map(|at| grey(at).map(|grey| (at, to_f32(grey))))
        .collect()
}

/// Lanczos weights for a move by a real number of samples, and the offset of the first.
fn sinc_weights(shift: f64) -> (isize, [f32; SHAKE_TAPS]) {
    let lobes = as_f64(SHAKE_TAPS / 2);
    let fraction = shift - shift.floor();
    let sinc = |t: f64| {
        if t.abs() < 1e-9 {
            1.0
        } else {
            (std::f64::consts::PI * t).sin() / (std::f64::consts::PI * t)
        }
    };
    let raw: [f64; SHAKE_TAPS] = std::array::from_fn(|tap| {
        let t = as_f64(tap) - (lobes - 1.0) - fraction;
        if t.abs() < lobes {
            sinc(t) * sinc(t / lobes)
        } else {
            0.0
        }
    });
    let total: f64 = raw.iter().sum();
    #[expect(clippy::cast_possible_truncation, reason = "a shake of some pixels")]
    let first = (shift.floor() - (lobes - 1.0)) as isize;
    (first, raw.map(|weight| to_f32(weight / total)))
}

fn clamped(at: usize, offset: isize, n: usize) -> usize {
    at.saturating_add_signed(offset).min(n - 1)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// A wave of eight pixels, moved by a fraction of one, against the same wave drawn there.
    #[test]
    fn a_moved_picture_is_the_picture_drawn_elsewhere() {
        let wave = |shift: [f64; 2]| {
            let at = |at: usize| {
                let (x, y) = (as_f64(at % 40) - shift[0], as_f64(at / 40) - shift[1]);
                to_f32(128.0 + 60.0 * (TAU * x / 8.0).sin() * (TAU * y / 11.0).cos())
            };
            Picture {
                width: 40,
                height: 30,
                grey: (0..1200).map(at).collect(),
            }
        };
        for shift in [[0.3, -0.7], [1.5, 0.0], [-2.25, 0.125]] {
            let (moved, wanted) = (wave([0.0, 0.0]).moved(shift, 1.0), wave(shift));
            // The middle only: beyond the edge there is nothing to move in.
            for at in
                (0..1200).filter(|at| (8..32).contains(&(at % 40)) && (8..22).contains(&(at / 40)))
            {
                let (got, wanted) = (moved.grey[at], wanted.grey[at]);
                assert!(
                    (got - wanted).abs() < 0.5,
                    "moved by {shift:?}, sample {at}: wanted {wanted}, got {got}"
                );
            }
        }
    }

    #[test]
    fn shake_has_the_spread_asked_for() -> Result<(), crate::rehearsal::RehearsalError> {
        let text = "[motion]\nperiod_s = 1\namplitude_m = 0.1\n[camera]\nwidth_px = 64\nheight_px = 64\nrate_hz = 30\n\
                    duration_s = 1\npx_per_m = 100\nshake_px = 0.8\n";
        let shake = Shake::new(&Scene::from_toml(text)?);
        let n = 200_000;
        let mean_square = (0..n)
            .map(|i| shake.at_px(0.01 * f64::from(i))[0].powi(2))
            .sum::<f64>()
            / f64::from(n);
        assert!(
            (mean_square.sqrt() - 0.8).abs() < 0.02,
            "rms {} px",
            mean_square.sqrt()
        );
        Ok(())
    }
}
