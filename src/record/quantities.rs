//! The eleven quantities of a motion, each with the key, name, symbol and meaning that every file uses.
//!
//! A new quantity is a field of [`MotionQuantities`] and an entry here; tables, JSON and glossary follow.

use crate::motion::MotionQuantities;
use crate::uncertainty::Quantity;

/// A quantity with its names.
pub(super) struct Named<'a> {
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
    /// The figure.
    pub(super) quantity: &'a Quantity,
}

/// The quantities in the order every file lists them.
pub(super) fn named(quantities: &MotionQuantities) -> [Named<'_>; 11] {
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
    let entry = |key, title, symbol, meaning, quantity| Named { key, title, symbol, meaning, percent: false, quantity };
    [
        entry("period", "Period", "T", "Time of one full swing, there and back, of the motion as filmed.", period),
        entry(
            "damped_angular_frequency",
            "Angular frequency",
            "ω",
            "2π over the period: the phase that the motion runs through in a second.",
            damped_angular_frequency,
        ),
        entry(
            "undamped_period",
            "Period without loss",
            "T₀",
            "The period the same mass and spring would have if nothing took energy away (viscous law): T₀ = 2π/√(ω² + γ²).",
            undamped_period,
        ),
        entry(
            "decay_rate",
            "Decay rate",
            "γ",
            "The amplitude falls as e^(−γt). Twice γ is the rate at which the energy falls.",
            decay_rate,
        ),
        entry(
            "damping_ratio",
            "Damping ratio",
            "ζ",
            "Loss against the loss at which the mass would only creep back: ζ = γ/√(ω² + γ²).",
            damping_ratio,
        ),
        entry(
            "log_decrement",
            "Logarithmic decrement",
            "δ",
            "Natural logarithm of the ratio of two amplitudes one period apart: δ = γT.",
            log_decrement,
        ),
        entry(
            "quality_factor",
            "Quality factor",
            "Q",
            "1/(2ζ): about π times the number of swings in which the amplitude falls to 37 %. High means little loss.",
            quality_factor,
        ),
        Named {
            percent: true,
            ..entry(
                "energy_loss_per_cycle",
                "Energy lost per cycle",
                "1 − e^(−2δ)",
                "The part of the energy that one swing takes away.",
                energy_loss_per_cycle,
            )
        },
        entry("amplitude", "Amplitude at the start", "A", "Largest distance from the centre, at the first reading used.", amplitude),
        entry("half_life", "Half-life of the amplitude", "t½", "Time in which the amplitude halves: ln 2/γ.", half_life),
        entry("centre", "Centre of the motion", "c", "Rest position on the motion axis, counted from the axis origin.", centre),
    ]
}

/// The name of the quantity with a key; the key itself where it is not one of ours.
pub(super) fn title_of<'a>(quantities: &MotionQuantities, key: &'a str) -> &'a str {
    named(quantities).iter().find(|entry| entry.key == key).map_or(key, |entry| entry.title)
}
