//! One frame's marker position.

/// Where the marker was seen in one frame, in coded pixels.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Sighting {
    /// Centre of the marker box, coded px.
    pub p_px: [f64; 2],
    /// Covariance of `p_px`: xx, xy, yy, px².
    pub covariance_px2: [f64; 3],
    /// Normalised correlation at the peak, −1…1.
    pub match_score: f64,
}

impl Sighting {
    /// Standard uncertainty of the position along a direction, px.
    ///
    /// * `direction`: in coded px, any length but zero.
    #[must_use]
    pub fn u_along_px(&self, direction: [f64; 2]) -> f64 {
        let [x, y] = direction;
        let [xx, xy, yy] = self.covariance_px2;
        ((x * x * xx + 2.0 * x * y * xy + y * y * yy) / (x * x + y * y))
            .max(0.0)
            .sqrt()
    }
}

/// What a frame gave.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum SightingOutcome {
    /// The marker was found.
    Seen(Sighting),
    /// No place in the picture resembles the marker enough.
    Lost,
    /// The decoder had to patch the picture up: what it shows is not where the marker was.
    Damaged,
}

impl SightingOutcome {
    /// The sighting, where there is one.
    #[must_use]
    pub fn seen(&self) -> Option<&Sighting> {
        match self {
            Self::Seen(sighting) => Some(sighting),
            Self::Lost | Self::Damaged => None,
        }
    }
}
