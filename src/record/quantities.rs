//! The eleven quantities of a motion, each with the key, name, symbol and meaning that every file uses.
//!
//! A new quantity is a field of [`MotionQuantities`] and an entry here; tables, JSON and glossary follow.

use crate::motion::MotionQuantities;
use crate::uncertainty::Quantity;

/// How a quantity is called.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(super) struct Words {
    /// Key in `result.json` and in the budget.
    pub(super) key: &'static str,
    /// Name in the field's words.
    pub(super) title: &'static str,
    /// Symbol.
    pub(super) symbol: &'static str,
    /// What it means, in one or two sentences.
    pub(super) meaning: &'static str,
    /// Whether a report shows it in per cent.
    pub(super) percent: bool,
}

const PERIOD: Words = Words {
    key: "period",
    title: "Period",
    symbol: "T",
    meaning: "Time of one full swing, there and back, of the motion as filmed.",
    percent: false,
};
const DAMPED_ANGULAR_FREQUENCY: Words = Words {
    key: "damped_angular_frequency",
    title: "Angular frequency",
    symbol: "ω",
    meaning: "2π over the period: the phase that the motion runs through in a second.",
    percent: false,
};
const UNDAMPED_PERIOD: Words = Words {
    key: "undamped_period",
    title: "Period without loss",
    symbol: "T₀",
    meaning: "The period the same mass and spring would have if nothing took energy away (viscous law): T₀ = 2π/√(ω² + γ²).",
    percent: false,
};
const DECAY_RATE: Words = Words {
    key: "decay_rate",
    title: "Decay rate",
    symbol: "γ",
    meaning: "The amplitude falls as e^(−γt). Twice γ is the rate at which the energy falls.",
    percent: false,
};
const DAMPING_RATIO: Words = Words {
    key: "damping_ratio",
    title: "Damping ratio",
    symbol: "ζ",
    meaning: "Loss against the loss at which the mass would only creep back: ζ = γ/√(ω² + γ²).",
    percent: false,
};
const LOG_DECREMENT: Words = Words {
    key: "log_decrement",
    title: "Logarithmic decrement",
    symbol: "δ",
    meaning: "Natural logarithm of the ratio of two amplitudes one period apart: δ = γT.",
    percent: false,
};
const QUALITY_FACTOR: Words = Words {
    key: "quality_factor",
    title: "Quality factor",
    symbol: "Q",
    meaning: "1/(2ζ): the amplitude falls to 37 % in Q/π swings. High means little loss.",
    percent: false,
};
const ENERGY_LOSS_PER_CYCLE: Words = Words {
    key: "energy_loss_per_cycle",
    title: "Energy lost per cycle",
    symbol: "1 − e^(−2δ)",
    meaning: "The part of the energy that one swing takes away.",
    percent: true,
};
const AMPLITUDE: Words = Words {
    key: "amplitude",
    title: "Amplitude at the start",
    symbol: "A",
    meaning: "Largest distance from the centre, at the first reading used.",
    percent: false,
};
const HALF_LIFE: Words = Words {
    key: "half_life",
    title: "Half-life of the amplitude",
    symbol: "t½",
    meaning: "Time in which the amplitude halves: ln 2/γ.",
    percent: false,
};
const CENTRE: Words = Words {
    key: "centre",
    title: "Centre of the motion",
    symbol: "c",
    meaning: "Rest position on the motion axis, counted from the marker's mean position.",
    percent: false,
};

/// The quantities with their words, in the order every file lists them.
pub(super) fn named(quantities: &MotionQuantities) -> [(Words, &Quantity); 11] {
    // Taken apart by name, so that a new field breaks the build and not the file format.
    let MotionQuantities {
        period,
        damped_angular_frequency,
        undamped_period,
        decay_rate,
        damping_ratio,
        log_decrement,
        quality_factor,
        energy_loss_per_cycle,
        amplitude,
        half_life,
        centre,
        budget: _,
    } = quantities;
    [
        (PERIOD, period),
        (DAMPED_ANGULAR_FREQUENCY, damped_angular_frequency),
        (UNDAMPED_PERIOD, undamped_period),
        (DECAY_RATE, decay_rate),
        (DAMPING_RATIO, damping_ratio),
        (LOG_DECREMENT, log_decrement),
        (QUALITY_FACTOR, quality_factor),
        (ENERGY_LOSS_PER_CYCLE, energy_loss_per_cycle),
        (AMPLITUDE, amplitude),
        (HALF_LIFE, half_life),
        (CENTRE, centre),
    ]
}

/// The words of the quantity with a key, and its unit; `None` where the key is not one of ours.
pub(super) fn find<'a>(
    quantities: &'a MotionQuantities,
    key: &str,
) -> Option<(Words, &'a Quantity)> {
    named(quantities)
        .into_iter()
        .find(|(words, _)| words.key == key)
}
