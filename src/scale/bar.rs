//! The scale bar: a length that is known, seen in the film.

/// Limit of error of each end of the bar along it, px, where the user gives none: a pixel either way, rectangular.
const ASSUMED_END_LIMIT_PX: f64 = 1.0;
/// Limit of error of the bar's length, m, where the user gives none: half a millimetre division, rectangular.
const ASSUMED_LENGTH_LIMIT_M: f64 = 0.0005;
/// Shortest bar that is accepted, px: below it the reading of its ends says nothing about the scale.
const SHORTEST_BAR_PX: f64 = 10.0;

/// Why a scale bar cannot be used; all of it is in the caller's hands.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum BarError {
    /// A number is not finite.
    #[error(
        "scale bar: {what} is {value}, not a finite number; give the bar's ends as X1,Y1,X2,Y2 in display px and its length in metres"
    )]
    NotFinite {
        /// Which number.
        what: &'static str,
        /// Its value.
        value: f64,
    },
    /// The ends lie on each other, or nearly so.
    #[error(
        "scale bar: its ends are {length_px:.1} px apart, and at least {least_px} px are needed; mark the two ends of a bar of known length"
    )]
    TooShort {
        /// Distance of the ends, display px.
        length_px: f64,
        /// Least distance, display px.
        least_px: f64,
    },
    /// The length is zero or negative.
    #[error(
        "scale bar: a length of {length_m} m cannot be; give the bar's true length in metres, such as 0.5"
    )]
    Length {
        /// The length given, m.
        length_m: f64,
    },
    /// An uncertainty is negative, or as large as the length itself.
    #[error(
        "scale bar: {what} of {value} cannot be; give a standard uncertainty that is not negative and below the length itself"
    )]
    Uncertainty {
        /// Which uncertainty.
        what: &'static str,
        /// Its value.
        value: f64,
    },
}

/// A bar of known length in display pixels.
#[derive(Clone, Debug, PartialEq)]
pub struct ScaleBar {
    ends_px: [[f64; 2]; 2],
    length_m: f64,
    u_length_m: f64,
    u_end_px: f64,
    assumed: bool,
}

impl ScaleBar {
    /// A bar between two display positions, with its length.
    ///
    /// * `u_length_m`: standard uncertainty of the length, m; None: ±0.5 mm, rectangular, said to be assumed.
    /// * `u_end_px`: standard uncertainty of an end's reading along the bar, px; None: ±1 px, rectangular, said to be assumed.
    ///
    /// # Errors
    /// [`BarError`] with the number that cannot be.
    pub fn new(
        ends_px: [[f64; 2]; 2],
        length_m: f64,
        u_length_m: Option<f64>,
        u_end_px: Option<f64>,
    ) -> Result<Self, BarError> {
        for (what, value) in [
            ("X1", ends_px[0][0]),
            ("Y1", ends_px[0][1]),
            ("X2", ends_px[1][0]),
            ("Y2", ends_px[1][1]),
            ("the length", length_m),
            ("the length's uncertainty", u_length_m.unwrap_or(0.0)),
            ("the ends' uncertainty", u_end_px.unwrap_or(0.0)),
        ] {
            if !value.is_finite() {
                return Err(BarError::NotFinite { what, value });
            }
        }
        if length_m <= 0.0 {
            return Err(BarError::Length { length_m });
        }
        let length_px = distance(ends_px);
        if length_px < SHORTEST_BAR_PX {
            return Err(BarError::TooShort {
                length_px,
                least_px: SHORTEST_BAR_PX,
            });
        }
        let root3 = 3.0_f64.sqrt();
        let assumed = u_length_m.is_none() || u_end_px.is_none();
        let u_length_m = u_length_m.unwrap_or(ASSUMED_LENGTH_LIMIT_M / root3);
        let u_end_px = u_end_px.unwrap_or(ASSUMED_END_LIMIT_PX / root3);
        if !(0.0..length_m).contains(&u_length_m) {
            return Err(BarError::Uncertainty {
                what: "a length uncertainty in m",
                value: u_length_m,
            });
        }
        if !(0.0..length_px).contains(&u_end_px) {
            return Err(BarError::Uncertainty {
                what: "an end uncertainty in px",
                value: u_end_px,
            });
        }
        Ok(Self {
            ends_px,
            length_m,
            u_length_m,
            u_end_px,
            assumed,
        })
    }

    /// The two ends, display px.
    #[must_use]
    pub fn ends_px(&self) -> [[f64; 2]; 2] {
        self.ends_px
    }

    /// The length, m.
    #[must_use]
    pub fn length_m(&self) -> f64 {
        self.length_m
    }

    /// Standard uncertainty of the length, m.
    #[must_use]
    pub fn u_length_m(&self) -> f64 {
        self.u_length_m
    }

    /// Standard uncertainty of an end's reading along the bar, display px.
    #[must_use]
    pub fn u_end_px(&self) -> f64 {
        self.u_end_px
    }

    /// True where one of the uncertainties is our default.
    #[must_use]
    pub fn assumed(&self) -> bool {
        self.assumed
    }

    /// Length of the bar in the picture, display px.
    #[must_use]
    pub fn length_px(&self) -> f64 {
        distance(self.ends_px)
    }

    /// Scale, m per display px.
    #[must_use]
    pub fn m_per_px(&self) -> f64 {
        self.length_m / self.length_px()
    }

    /// Relative standard uncertainty of the scale: √((u_L/L)² + 2 (u_end/ℓ)²), ℓ the bar's length in px.
    #[must_use]
    pub fn u_rel(&self) -> f64 {
        let length = self.u_length_m / self.length_m;
        let ends = std::f64::consts::SQRT_2 * self.u_end_px / self.length_px();
        length.hypot(ends)
    }
}

fn distance([[x1, y1], [x2, y2]]: [[f64; 2]; 2]) -> f64 {
    (x2 - x1).hypot(y2 - y1)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_three_four_five_bar_is_scaled_by_its_diagonal() {
        let bar = ScaleBar::new(
            [[10.0, 20.0], [310.0, 420.0]],
            0.5,
            Some(0.0005),
            Some(0.25),
        )
        .unwrap();
        assert!((bar.m_per_px() - 0.001).abs() < 1e-15);
        let wanted = (1e-6_f64 + 2.0 * (0.25 / 500.0_f64).powi(2)).sqrt();
        assert!((bar.u_rel() - wanted).abs() < 1e-15);
        assert!(!bar.assumed());
        assert!(
            ScaleBar::new([[0.0, 0.0], [500.0, 0.0]], 0.5, Some(0.0005), None)
                .unwrap()
                .assumed()
        );
    }

    #[test]
    fn a_bar_that_cannot_be_is_refused_by_name() {
        let ends = [[0.0, 0.0], [500.0, 0.0]];
        assert!(matches!(
            ScaleBar::new([[5.0, 5.0]; 2], 0.5, None, None),
            Err(BarError::TooShort { .. })
        ));
        for length in [0.0, -0.5] {
            assert!(matches!(
                ScaleBar::new(ends, length, None, None),
                Err(BarError::Length { .. })
            ));
        }
        for length in [f64::NAN, f64::INFINITY] {
            assert!(matches!(
                ScaleBar::new(ends, length, None, None),
                Err(BarError::NotFinite { .. })
            ));
        }
        assert!(matches!(
            ScaleBar::new(ends, 0.5, Some(-0.1), None),
            Err(BarError::Uncertainty { .. })
        ));
        assert!(matches!(
            ScaleBar::new(ends, 0.5, None, Some(f64::NAN)),
            Err(BarError::NotFinite { .. })
        ));
    }
}
