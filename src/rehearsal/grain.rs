//! Randomness that a place decides, not an order: texture of surfaces, and the grain of the pictures.
//!
//! Everything here is a pure function of seed and position, so that the number of rendering threads changes nothing.
use rand::SeedableRng;
use rand_chacha::ChaCha8Rng;
use rand_distr::{Distribution, StandardNormal};

/// Normal deviates kept; every row of every picture starts at its own place among them.
const KEPT: usize = 1 << 19;

/// A row of normal deviates for any picture and row, from a store that is filled once.
///
/// Drawing two million deviates a picture afresh would take ten times as long as the rest of the rendering. Two rows share a
/// stretch of the store only by chance, shifted against each other, which no eye and no correlation at zero lag can see.
#[derive(Clone, Debug)]
pub(super) struct Grain {
    deviates: Vec<f32>,
    seed: u64,
}

impl Grain {
    pub(super) fn new(seed: u64) -> Self {
        let mut generator = ChaCha8Rng::seed_from_u64(seed ^ 0x0067_7261_696e);
        let deviates = (0..KEPT)
            .map(|_| StandardNormal.sample(&mut generator))
            .collect();
        Self { deviates, seed }
    }

    /// `width` deviates of mean 0 and variance 1, width < 2¹⁹.
    pub(super) fn row(&self, picture: usize, row: usize, width: usize) -> &[f32] {
        let word = mixed(self.seed ^ mixed(picture as u64 ^ mixed(row as u64)));
        #[expect(
            clippy::cast_possible_truncation,
            reason = "the remainder is below 2¹⁹"
        )]
        let start = (word % (KEPT - width) as u64) as usize;
        &self.deviates[start..start + width]
    }
}

/// Smooth noise in −1…1 that varies over about one unit of x and y.
pub(super) fn smooth_noise(seed: u64, x: f64, y: f64) -> f64 {
    let (x_floor, y_floor) = (x.floor(), y.floor());
    let ease = |t: f64| t * t * (3.0 - 2.0 * t);
    let (across, down) = (ease(x - x_floor), ease(y - y_floor));
    #[expect(
        clippy::cast_possible_truncation,
        reason = "places in a picture, far inside i64"
    )]
    let (i, j) = (x_floor as i64, y_floor as i64);
    let top = lattice(seed, i, j) * (1.0 - across) + lattice(seed, i + 1, j) * across;
    let foot = lattice(seed, i, j + 1) * (1.0 - across) + lattice(seed, i + 1, j + 1) * across;
    top * (1.0 - down) + foot * down
}

/// A number in −1…1 for a lattice point.
fn lattice(seed: u64, i: i64, j: i64) -> f64 {
    let word = mixed(seed ^ mixed(i.cast_unsigned() ^ mixed(j.cast_unsigned().rotate_left(32))));
    #[expect(clippy::cast_precision_loss, reason = "the top 53 bits are exact")]
    let unit = (word >> 11) as f64 / (1_u64 << 53) as f64;
    2.0 * unit - 1.0
}

/// A word whose bits all depend on all bits of another (two rounds of multiply and fold).
pub(super) fn mixed(word: u64) -> u64 {
    let word = word.wrapping_add(0x9e37_79b9_7f4a_7c15);
    let word = (word ^ (word >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
    let word = (word ^ (word >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
    word ^ (word >> 31)
}
