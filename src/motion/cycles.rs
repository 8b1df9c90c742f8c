/// One cycle of the motion, from one upward passage through the centre to the next.
#[derive(Clone, Debug, PartialEq)]
pub struct Cycle {
    /// 1, 2, …
    pub index: usize,
    /// Upward passage through the centre that starts the cycle, from the local readings, s.
    pub start_s: f64,
    /// Interval to the next upward passage, s, and its standard uncertainty.
    pub period_crossings_s: f64,
    /// Standard uncertainty of `period_crossings_s`, s.
    pub u_period_crossings_s: f64,
    /// Period of a sinusoid fitted to the readings of this cycle alone, s; None where there are too few.
    pub period_local_s: Option<f64>,
    /// Standard uncertainty of `period_local_s`, s.
    pub u_period_local_s: Option<f64>,
    /// Amplitude of this cycle at its middle, m, from a sinusoid of the common ω fitted to its readings alone.
    pub amplitude_m: Option<f64>,
    /// Standard uncertainty of `amplitude_m`, m.
    pub u_amplitude_m: Option<f64>,
    /// (amplitude/amplitude of the previous cycle)²; None for the first cycle.
    pub energy_ratio: Option<f64>,
    /// Standard uncertainty of `energy_ratio`, 1.
    pub u_energy_ratio: Option<f64>,
}
