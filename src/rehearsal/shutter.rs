//! When each picture is taken and which stamp it carries; lost, slipped and repeated pictures happen here.
//!
//! In: the scene. Out: one [`Exposure`] a written picture. Stamps are whole ticks until the container writes them.
use std::collections::BTreeSet;

use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, Normal};

use super::scene::{Rate, Scene};
use super::storage::{CodecName, StampKind};

/// Ticks a second unless the scene says otherwise: one ninety-thousandth divides the intervals of all usual rates.
pub(super) const FINE_TICKS_PER_S: u32 = 90_000;
/// The same for MPEG-4 part 2, whose bitstream writes its clock with 16 bits.
const MPEG4_TICKS_PER_S: u32 = 60_000;
/// The clock of phones that write movie time.
const COARSE_TICKS_PER_S: u32 = 600;
/// Largest denominator meant by a frame rate that is given as a number: that of 30000/1001.
const LARGEST_DENOMINATOR: u32 = 1001;
/// Jitter beyond this part of the frame interval is cut off, so that exposures stay in order.
const LARGEST_JITTER: f64 = 0.4;

/// One written picture.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Exposure {
    /// Index of the picture slot, counted from 0 as the camera takes pictures, lost ones included.
    pub picture: usize,
    /// Slot of the picture that is shown: an earlier one where it is repeated.
    pub shown: usize,
    /// True mid-exposure of row 0 of what is shown, s; frame 0 defines 0.
    pub t_s: f64,
    /// Stamp, in ticks of 1/`ticks_per_s`.
    pub stamp_ticks: i64,
}

impl Rate {
    /// The rate as `[numerator, denominator]`; None where it is no positive number.
    #[must_use]
    pub fn fraction(self) -> Option<[u32; 2]> {
        match self {
            Self::Fraction([num, den]) => (num > 0 && den > 0).then_some([num, den]),
            Self::Number(hz) if (1e-3..=1e6).contains(&hz) => {
                let error = |den: u32| ((hz * f64::from(den)).round() / f64::from(den) - hz).abs();
                // Strictly better only: 30 is 30/1 and not 60/2.
                let best = (1..=LARGEST_DENOMINATOR).fold(1, |best, den| {
                    if error(den) < error(best) - 1e-12 * hz {
                        den
                    } else {
                        best
                    }
                });
                #[expect(
                    clippy::cast_possible_truncation,
                    clippy::cast_sign_loss,
                    reason = "at most 1e6 · 1001, and positive"
                )]
                let num = (hz * f64::from(best)).round() as u32;
                (num > 0).then_some([num, best])
            }
            Self::Number(_) => None,
        }
    }
}

impl Scene {
    /// Ticks a second of the stamps.
    #[must_use]
    pub fn ticks_per_s(&self) -> u32 {
        self.stamps
            .ticks_per_s
            .unwrap_or(match (self.stamps.kind, self.codec.name) {
                (StampKind::Rounded, _) => COARSE_TICKS_PER_S,
                (_, CodecName::Mpeg4) => MPEG4_TICKS_PER_S,
                _ => FINE_TICKS_PER_S,
            })
    }

    /// Pictures a second of true time.
    #[must_use]
    pub fn taken_hz(&self) -> f64 {
        self.codec.capture_fps.unwrap_or_else(|| self.stamped_hz())
    }

    /// Pictures a second of the stamps.
    fn stamped_hz(&self) -> f64 {
        self.camera
            .rate_hz
            .fraction()
            .map_or(1.0, |[num, den]| f64::from(num) / f64::from(den))
    }
}

/// The pictures that end up in the file, in order, with stamps that strictly increase.
#[must_use]
pub fn exposures(scene: &Scene) -> Vec<Exposure> {
    let taken_hz = scene.taken_hz();
    #[expect(
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "limits::check bounds the number of pictures"
    )]
    let n_pictures = (scene.camera.duration_s * taken_hz).round() as usize;
    let times_s = true_times_s(scene, n_pictures);
    let [num, den] = scene.camera.rate_hz.fraction().unwrap_or([1, 1]);
    let ticks_per_s = scene.ticks_per_s();
    let set = |frames: &[usize]| frames.iter().copied().collect::<BTreeSet<usize>>();
    let mishap = &scene.mishap;
    let (dropped, slipped, repeated) = (
        set(&mishap.drop_frames),
        set(&mishap.slip_frames),
        set(&mishap.repeat_frames),
    );
    let mut written: Vec<Exposure> = Vec::new();
    let mut n_slipped = 0;
    let mut shown = 0;
    for (picture, t_s) in times_s.iter().enumerate() {
        if picture == 0 || !repeated.contains(&picture) {
            shown = picture;
        }
        if slipped.contains(&picture) {
            n_slipped += 1;
            continue;
        }
        if dropped.contains(&picture) {
            continue;
        }
        let slot = picture - n_slipped;
        let nominal = grid_ticks(slot, ticks_per_s, [num, den]);
        let stamp_ticks = if scene.stamps.kind == StampKind::Variable {
            nominal
                + rounded(
                    (t_s * taken_hz - as_f64(picture)) / scene.stamped_hz()
                        * f64::from(ticks_per_s),
                )
        } else {
            nominal
        };
        let stamp_ticks = written
            .last()
            .map_or(stamp_ticks, |last| stamp_ticks.max(last.stamp_ticks + 1));
        written.push(Exposure {
            picture,
            shown,
            t_s: times_s[shown],
            stamp_ticks,
        });
    }
    written
}

/// True times of all pictures: the grid, or with variable stamps a jittered one that keeps its order.
fn true_times_s(scene: &Scene, n_pictures: usize) -> Vec<f64> {
    let interval_s = 1.0 / scene.taken_hz();
    let mut generator = ChaCha8Rng::seed_from_u64(scene.seed ^ 0x7374_616d_7073);
    let jitter = match scene.stamps.kind {
        StampKind::Variable => Normal::new(0.0, scene.stamps.jitter_s).ok(),
        StampKind::Steady | StampKind::Rounded => None,
    };
    (0..n_pictures)
        .map(|picture| {
            let drawn_s = jitter.map_or(0.0, |normal| normal.sample(&mut generator));
            // Frame 0 defines time 0.
            let off_s = if picture == 0 {
                0.0
            } else {
                drawn_s.clamp(-LARGEST_JITTER * interval_s, LARGEST_JITTER * interval_s)
            };
            as_f64(picture) * interval_s + off_s
        })
        .collect()
}

/// slot · den/num s in ticks, rounded to nearest in whole numbers.
fn grid_ticks(slot: usize, ticks_per_s: u32, [num, den]: [u32; 2]) -> i64 {
    let (twice, num) = (
        2 * slot as u128 * u128::from(ticks_per_s) * u128::from(den),
        u128::from(num),
    );
    i64::try_from((twice + num) / (2 * num)).unwrap_or(i64::MAX)
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "a jitter is a fraction of a frame interval"
)]
fn rounded(ticks: f64) -> i64 {
    ticks.round() as i64
}

#[expect(
    clippy::cast_precision_loss,
    reason = "pictures are counted in hundreds of thousands"
)]
fn as_f64(count: usize) -> f64 {
    count as f64
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_rate_given_as_a_number_is_the_fraction_it_means() {
        for (hz, wanted) in [
            (30.0, Some([30, 1])),
            (29.97, Some([2997, 100])),
            (30_000.0 / 1001.0, Some([30_000, 1001])),
            (239.76, Some([5994, 25])),
            (0.0, None),
            (-30.0, None),
            (f64::NAN, None),
            (f64::INFINITY, None),
        ] {
            assert_eq!(Rate::Number(hz).fraction(), wanted, "{hz} Hz");
        }
        assert_eq!(
            Rate::Fraction([60_000, 1001]).fraction(),
            Some([60_000, 1001])
        );
        assert_eq!(Rate::Fraction([30, 0]).fraction(), None);
    }
}
