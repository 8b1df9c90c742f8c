//! The position–time record: what every fit starts from, whoever made it.

/// One position of the marker along the motion axis.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct PositionRecord {
    /// Time, in s.
    pub t_s: f64,
    /// Standard uncertainty of the time, in s; 0 where the clock is steady. Enters the fit as |v|·u_t.
    pub u_t_s: f64,
    /// Position along the motion axis, in m.
    pub x_m: f64,
    /// Standard uncertainty of the position, in m; used as a relative weight, its overall size is re-estimated from the residuals.
    pub u_x_m: f64,
}

/// What became of a position in the fit.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PositionUse {
    /// The fit rests on it.
    Used,
    /// Its residual stands so far out that it is no reading of this motion; left out and marked.
    Outlier,
}
