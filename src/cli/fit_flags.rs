//! Flags of the fit, the same for film and table.

use super::numbers::one;
use crate::run_sheet::RunSheet;

/// What film and table have in common.
#[derive(Debug, clap::Args)]
pub(super) struct FitArguments {
    /// Start of the part that is fitted, s of the film's own time
    #[arg(long, value_name = "S", value_parser = one, allow_hyphen_values = true)]
    from: Option<f64>,
    /// End of the part that is fitted, s of the film's own time
    #[arg(long, value_name = "S", value_parser = one, allow_hyphen_values = true)]
    to: Option<f64>,
    /// How wrong the phone's clock may run, ± ppm (rectangular) [default: 50, said to be assumed]
    #[arg(long, value_name = "U", value_parser = one, allow_hyphen_values = true)]
    clock_ppm: Option<f64>,
    /// Moving mass, kg, for stiffness and energies
    #[arg(long, value_name = "KG", value_parser = one, allow_hyphen_values = true)]
    mass: Option<f64>,
    /// Standard uncertainty of the mass, kg
    #[arg(long, value_name = "KG", value_parser = one, allow_hyphen_values = true)]
    mass_u: Option<f64>,
}

impl FitArguments {
    /// Lays the flags over a sheet.
    pub(super) fn lay_over(&self, sheet: &mut RunSheet) {
        over(&mut sheet.time.from_s, self.from);
        over(&mut sheet.time.to_s, self.to);
        over(&mut sheet.time.clock_ppm, self.clock_ppm);
        over(&mut sheet.glider.mass_kg, self.mass);
        over(&mut sheet.glider.u_mass_kg, self.mass_u);
    }
}

/// Lays a flag over a key of the sheet, where it was given.
pub(super) fn over<T: Copy>(key: &mut Option<T>, flag: Option<T>) {
    if flag.is_some() {
        *key = flag;
    }
}
