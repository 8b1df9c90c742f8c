//! Everything one measurement knows, as plain data.

use crate::footage::{CaptureRate, ClipFacts, FrameClock};
use crate::motion::{Cycle, MotionFit, MotionQuantities};
use crate::uncertainty::Quantity;
use crate::verdict::Verdict;

/// What a row of `positions.csv` says of its frame.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum RowStatus {
    /// The fit rests on it.
    Used,
    /// The marker was not found.
    Lost,
    /// Found, but so far off the motion that it was left out.
    Outlier,
    /// Found, but before `--from` or after `--to`.
    Outside,
}

/// One row of the position–time record.
#[derive(Clone, Debug, PartialEq)]
pub struct RecordRow {
    /// Frame number in presentation order, from 0; the row's number for a table.
    pub frame: usize,
    /// Time, s.
    pub t_s: f64,
    /// Standard uncertainty of the time, s.
    pub u_t_s: f64,
    /// Position along the axis, m; None where the marker was lost.
    pub x_m: Option<f64>,
    /// Standard uncertainty of `x_m`, m.
    pub u_x_m: Option<f64>,
    /// Distance from the axis, m; None where lost or not known (a table).
    pub off_axis_m: Option<f64>,
    /// Marker centre in display pixels.
    pub p_px: Option<[f64; 2]>,
    /// Normalised correlation of the match, −1…1.
    pub match_score: Option<f64>,
    /// What became of it.
    pub status: RowStatus,
    /// Fitted position, m; None outside the fit's range or where lost.
    pub fit_m: Option<f64>,
    /// Observed minus fitted, m.
    pub residual_m: Option<f64>,
}

/// Length of a pixel along the motion, and the axis.
#[derive(Clone, Debug, PartialEq)]
pub struct ScaleFacts {
    /// Bar's ends, display px.
    pub bar_px: [[f64; 2]; 2],
    /// Bar's length, m, and its standard uncertainty.
    pub length_m: f64,
    /// Standard uncertainty of the length, m.
    pub u_length_m: f64,
    /// Standard uncertainty of each end along the bar, px.
    pub u_end_px: f64,
    /// Scale, m per display px.
    pub m_per_px: f64,
    /// Relative standard uncertainty of the scale.
    pub u_scale_rel: f64,
    /// True where `u_length_m` or `u_end_px` is our default.
    pub assumed: bool,
    /// Point of the axis where x = 0 (mean marker position), display px.
    pub origin_px: [f64; 2],
    /// Unit vector of the axis, display px; x grows along it (image right, or down for an upright axis).
    pub direction: [f64; 2],
    /// RMS distance of the marker from the axis, m.
    pub off_axis_rms_m: f64,
    /// Angle between bar and axis, rad.
    pub bar_angle_rad: f64,
}

/// What the streak picture is made of: one line of luma a frame, taken along the motion axis.
#[derive(Clone, Debug, PartialEq)]
pub struct Streak {
    /// Samples a line, the same for every frame.
    pub width: usize,
    /// Luma 0…255, `width` samples a frame, frame after frame in order of time.
    pub lines: Vec<u8>,
    /// Time of each line, s.
    pub t_s: Vec<f64>,
    /// Position of sample 0 along the axis, display px from the axis origin.
    pub first_px: f64,
    /// Distance of neighbouring samples, display px.
    pub step_px: f64,
}

/// A picture in grey, as displayed (turned upright, square pixels).
#[derive(Clone, Debug, PartialEq)]
pub struct Still {
    /// Width, px.
    pub width: usize,
    /// Height, px.
    pub height: usize,
    /// Luma 0…255, row by row.
    pub luma: Vec<u8>,
    /// Display px per pixel of this picture (1, or more where it was made smaller).
    pub display_px_per_px: f64,
}

/// What only a film has.
#[derive(Clone, Debug, PartialEq)]
pub struct FilmPart {
    /// Facts of the stream.
    pub clip: ClipFacts,
    /// The frame clock.
    pub frame_clock: FrameClock,
    /// Scale and axis.
    pub scale: ScaleFacts,
    /// Marker box as given: left, top, width, height, display px, in frame `at_frame`.
    pub marker_box_px: [f64; 4],
    /// Frame the box was drawn in.
    pub at_frame: usize,
    /// Steady patch, where one was given.
    pub steady_box_px: Option<[f64; 4]>,
    /// The start frame's picture.
    pub still: Still,
    /// The streak picture's lines.
    pub streak: Streak,
    /// Frames left out because the steady patch was lost in them.
    pub n_unsteady: usize,
    /// Where the rate of capture was taken from.
    pub capture_rate: CaptureRate,
    /// Share of the sensor's rows over which the marker moves.
    pub rows_swept_rel: f64,
    /// True where the readout of the sensor was given and the times allow for it.
    pub readout_given: bool,
    /// Frames that are missing behind even stamps; the times of the record allow for them.
    pub slips: Vec<FrameSlip>,
    /// True where the phase of the motion steps, but not by whole frame intervals: nothing was changed.
    pub doubtful_phase: bool,
}

/// A place where frames are missing though the stamps are even.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct FrameSlip {
    /// First frame behind the gap.
    pub before_frame: usize,
    /// Frames missing (negative: frames too many).
    pub n_frames: i32,
    /// The same as estimated from the motion.
    pub estimate_frames: f64,
}

/// Energies, where the mass is known.
#[derive(Clone, Debug, PartialEq)]
pub struct EnergyFigures {
    /// Moving mass, kg, and its standard uncertainty where it was given.
    pub mass_kg: f64,
    /// Standard uncertainty of the mass, kg; None where not given, and then left out of the uncertainties below.
    pub u_mass_kg: Option<f64>,
    /// k = m ω_0², N/m.
    pub stiffness: Quantity,
    /// ½ k A² at the start, J.
    pub energy_at_start: Quantity,
    /// Energy lost in the first cycle, J.
    pub energy_lost_first_cycle: Quantity,
}

/// Something the user should know about this result.
#[derive(Clone, Debug, PartialEq)]
pub struct Warning {
    /// Key in snake case.
    pub key: &'static str,
    /// One sentence with figures and what to do.
    pub sentence: String,
}

/// One measurement, complete.
#[derive(Clone, Debug, PartialEq)]
pub struct Measurement {
    /// File name of the clip or table.
    pub source_name: String,
    /// SHA-256 of the clip or table.
    pub source_sha256: String,
    /// The run sheet as TOML text; its clip or table is the file's name without a folder, so that results do not depend
    /// on where files lie.
    pub sheet_toml: String,
    /// What only a film has; None after `refit`.
    pub film: Option<FilmPart>,
    /// The position–time record.
    pub rows: Vec<RecordRow>,
    /// The fit.
    pub fit: MotionFit,
    /// The figures.
    pub quantities: MotionQuantities,
    /// Per cycle.
    pub cycles: Vec<Cycle>,
    /// Energies, where a mass was given.
    pub energy: Option<EnergyFigures>,
    /// The verdicts.
    pub verdicts: Vec<Verdict>,
    /// The warnings, in order of importance.
    pub warnings: Vec<Warning>,
}
