//! Energies, where the moving mass is known.

use super::{EnergyFigures, u_rel};
use crate::motion::MotionQuantities;
use crate::run_sheet::FitRun;
use crate::uncertainty::Quantity;

/// Coverage factor of the energies' intervals: their uncertainty is mostly type B, so that k = 2 stands for 95 % (GUM 6.3.3).
const COVERAGE_FACTOR: f64 = 2.0;

/// Stiffness and energies implied by the period, the amplitude and a mass; None without a mass.
///
/// k = m ω₀², E = ½ k A², lost in the first cycle: E (1 − e^(−2δ)). Relative uncertainties add in squares with their powers;
/// the correlation of A and the loss in the fit is taken as 0, which errs by less than the mass does.
pub(super) fn figures(quantities: &MotionQuantities, run: &FitRun) -> Option<EnergyFigures> {
    let mass_kg = run.mass_kg?;
    let u_mass_rel = run.u_mass_kg.unwrap_or(0.0) / mass_kg;
    let period_s = quantities.undamped_period.value?;
    let amplitude_m = quantities.amplitude.value?;
    let loss = quantities.energy_loss_per_cycle.value?;
    let omega = 2.0 * std::f64::consts::PI / period_s;
    let stiffness = mass_kg * omega * omega;
    let energy = 0.5 * stiffness * amplitude_m * amplitude_m;
    let u_period_rel = u_rel(&quantities.undamped_period)?;
    let u_amplitude_rel = u_rel(&quantities.amplitude)?;
    let u_stiffness_rel = u_mass_rel.hypot(2.0 * u_period_rel);
    let u_energy_rel = u_stiffness_rel.hypot(2.0 * u_amplitude_rel);
    // The loss may be as good as zero: its own uncertainty enters absolutely.
    let u_lost = (energy * quantities.energy_loss_per_cycle.u?).hypot(energy * loss * u_energy_rel);
    Some(EnergyFigures {
        mass_kg,
        u_mass_kg: run.u_mass_kg,
        stiffness: Quantity::symmetric(
            stiffness,
            stiffness * u_stiffness_rel,
            COVERAGE_FACTOR,
            "N/m",
        ),
        energy_at_start: Quantity::symmetric(energy, energy * u_energy_rel, COVERAGE_FACTOR, "J"),
        energy_lost_first_cycle: Quantity::symmetric(energy * loss, u_lost, COVERAGE_FACTOR, "J"),
    })
}
