//! The two tables, `positions.csv` and `cycles.csv`: RFC 4180, UTF-8, `.` as the decimal sign.
//!
//! Decimals are fixed, far below any uncertainty of a film (1 ns, 1 nm, 10⁻⁴ px), so that a column lines up and a diff of
//! two runs shows what changed. A figure that is not there is an empty field.

use csv::{Terminator, Writer, WriterBuilder};

use super::error::RecordError;
use super::rounding::fixed;
use crate::measurement::{EnergyFigures, Measurement, RecordRow, RowStatus};
use crate::motion::Cycle;

const TIME_DECIMALS: usize = 9;
const LENGTH_DECIMALS: usize = 9;
const PIXEL_DECIMALS: usize = 4;
const MATCH_DECIMALS: usize = 5;
const RATIO_DECIMALS: usize = 7;
/// Energies on a bench are millijoules; 10⁻¹² J leaves nine digits of one.
const ENERGY_DECIMALS: usize = 12;

const POSITION_HEADER: [&str; 12] = [
    "frame",
    "t_s",
    "u_t_s",
    "x_m",
    "u_x_m",
    "off_axis_m",
    "x_px",
    "y_px",
    "match",
    "status",
    "fit_m",
    "residual_m",
];

const CYCLE_HEADER: [&str; 10] = [
    "cycle",
    "start_s",
    "period_crossings_s",
    "u_period_crossings_s",
    "period_local_s",
    "u_period_local_s",
    "amplitude_m",
    "u_amplitude_m",
    "energy_ratio",
    "u_energy_ratio",
];

/// `positions.csv`: one row a frame, lost ones included.
///
/// # Errors
/// [`RecordError::Compose`] where the CSV writer gives up.
pub fn positions_csv(measurement: &Measurement) -> Result<Vec<u8>, RecordError> {
    const PART: &str = "positions.csv";
    let mut table = table();
    table
        .write_record(POSITION_HEADER)
        .map_err(RecordError::compose(PART))?;
    for row in &measurement.rows {
        table
            .write_record(position_fields(row))
            .map_err(RecordError::compose(PART))?;
    }
    table.into_inner().map_err(RecordError::compose(PART))
}

/// `cycles.csv`: one row a cycle; `energy_j` and `u_energy_j` at the end where a mass is known.
///
/// # Errors
/// [`RecordError::Compose`] where the CSV writer gives up.
pub fn cycles_csv(measurement: &Measurement) -> Result<Vec<u8>, RecordError> {
    const PART: &str = "cycles.csv";
    let energy = measurement.energy.as_ref();
    let mut table = table();
    let mut header = CYCLE_HEADER.to_vec();
    if energy.is_some() {
        header.extend(["energy_j", "u_energy_j"]);
    }
    table
        .write_record(header)
        .map_err(RecordError::compose(PART))?;
    for cycle in &measurement.cycles {
        let mut fields = cycle_fields(cycle).to_vec();
        if let Some(energy) = energy {
            let (joule, u_joule) = cycle_energy(cycle, energy);
            fields.extend([
                field(joule, ENERGY_DECIMALS),
                field(u_joule, ENERGY_DECIMALS),
            ]);
        }
        table
            .write_record(fields)
            .map_err(RecordError::compose(PART))?;
    }
    table.into_inner().map_err(RecordError::compose(PART))
}

/// Energy ½ k A² of a cycle at its middle and its standard uncertainty, J; `None` where the amplitude or k is not known.
///
/// The amplitude's and the stiffness's uncertainties are taken as independent: they share only the scale-free period.
pub(super) fn cycle_energy(cycle: &Cycle, energy: &EnergyFigures) -> (Option<f64>, Option<f64>) {
    let (Some(amplitude_m), Some(stiffness)) = (cycle.amplitude_m, energy.stiffness.value) else {
        return (None, None);
    };
    let joule = 0.5 * stiffness * amplitude_m * amplitude_m;
    let u_joule = cycle.u_amplitude_m.map(|u_m| {
        let from_stiffness = 0.5 * energy.stiffness.u.unwrap_or(0.0) * amplitude_m * amplitude_m;
        (stiffness * amplitude_m * u_m).hypot(from_stiffness)
    });
    (Some(joule), u_joule)
}

fn table() -> Writer<Vec<u8>> {
    WriterBuilder::new()
        .terminator(Terminator::CRLF)
        .from_writer(Vec::new())
}

fn field(value: Option<f64>, decimals: usize) -> String {
    value.map_or_else(String::new, |value| fixed(value, decimals))
}

fn position_fields(row: &RecordRow) -> [String; 12] {
    let RecordRow {
        frame,
        t_s,
        u_t_s,
        x_m,
        u_x_m,
        off_axis_m,
        p_px,
        match_score,
        status,
        fit_m,
        residual_m,
    } = row;
    [
        frame.to_string(),
        fixed(*t_s, TIME_DECIMALS),
        fixed(*u_t_s, TIME_DECIMALS),
        field(*x_m, LENGTH_DECIMALS),
        field(*u_x_m, LENGTH_DECIMALS),
        field(*off_axis_m, LENGTH_DECIMALS),
        field(p_px.map(|p| p[0]), PIXEL_DECIMALS),
        field(p_px.map(|p| p[1]), PIXEL_DECIMALS),
        field(*match_score, MATCH_DECIMALS),
        status_word(*status).to_owned(),
        field(*fit_m, LENGTH_DECIMALS),
        field(*residual_m, LENGTH_DECIMALS),
    ]
}

fn cycle_fields(cycle: &Cycle) -> [String; 10] {
    let Cycle {
        index,
        start_s,
        period_crossings_s,
        u_period_crossings_s,
        period_local_s,
        u_period_local_s,
        amplitude_m,
        u_amplitude_m,
        energy_ratio,
        u_energy_ratio,
    } = cycle;
    [
        index.to_string(),
        fixed(*start_s, TIME_DECIMALS),
        fixed(*period_crossings_s, TIME_DECIMALS),
        fixed(*u_period_crossings_s, TIME_DECIMALS),
        field(*period_local_s, TIME_DECIMALS),
        field(*u_period_local_s, TIME_DECIMALS),
        field(*amplitude_m, LENGTH_DECIMALS),
        field(*u_amplitude_m, LENGTH_DECIMALS),
        field(*energy_ratio, RATIO_DECIMALS),
        field(*u_energy_ratio, RATIO_DECIMALS),
    ]
}

/// The word of a status in `positions.csv`.
fn status_word(status: RowStatus) -> &'static str {
    match status {
        RowStatus::Used => "used",
        RowStatus::Lost => "lost",
        RowStatus::Outlier => "outlier",
        RowStatus::Outside => "outside",
    }
}
