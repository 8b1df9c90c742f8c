//! The second layer: a run whose numbers are known to be usable.

use super::{RunSheet, SheetError};

/// A run on a film whose numbers can be used.
#[derive(Clone, Debug, PartialEq)]
pub struct FilmRun {
    /// Box around the marker: left, top, width, height, display px.
    pub marker_box_px: [f64; 4],
    /// Frame the boxes were drawn in, from 0.
    pub at_frame: usize,
    /// Ends of the bar, display px.
    pub bar_px: [[f64; 2]; 2],
    /// Length of the bar, m.
    pub length_m: f64,
    /// Standard uncertainty of the length, m; None: a default that is said to be assumed.
    pub u_length_m: Option<f64>,
    /// Standard uncertainty of the reading of one end, px; None: a default that is said to be assumed.
    pub u_end_px: Option<f64>,
    /// Rate the frames were captured at, Hz.
    pub capture_rate_hz: Option<f64>,
    /// Time from the first row of a picture to its last, s.
    pub readout_s: Option<f64>,
    /// Box around a patch that stands still, display px.
    pub steady_box_px: Option<[f64; 4]>,
    /// What film and table have in common.
    pub fit: FitRun,
}

/// What is needed to fit a record, whether it comes from a film or from a table.
#[derive(Clone, Debug, PartialEq)]
pub struct FitRun {
    /// Start of the part that is fitted, s of the film's own time.
    pub from_s: Option<f64>,
    /// End of the part that is fitted, s of the film's own time.
    pub to_s: Option<f64>,
    /// Limit of error of the clock's rate.
    pub clock: ClockLimit,
    /// Moving mass, kg.
    pub mass_kg: Option<f64>,
    /// Standard uncertainty of the mass, kg.
    pub u_mass_kg: Option<f64>,
}

/// Limit of error of a clock's rate, with a rectangular distribution between ± the limit.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ClockLimit {
    /// Half-width, ppm.
    pub limit_ppm: f64,
    /// True where it is our default, not the user's figure.
    pub assumed: bool,
}

/// Limit of error of a phone's clock where the user gives none, ppm. Common practice for quartz in phones, no source.
const ASSUMED_CLOCK_PPM: f64 = 50.0;

impl ClockLimit {
    /// The user's limit, or ±50 ppm that is said to be assumed.
    #[must_use]
    pub fn given_or_assumed(limit_ppm: Option<f64>) -> Self {
        Self {
            limit_ppm: limit_ppm.unwrap_or(ASSUMED_CLOCK_PPM),
            assumed: limit_ppm.is_none(),
        }
    }

    /// Relative standard uncertainty of the rate: limit/√3 (GUM 4.3.7).
    #[must_use]
    pub fn u_rel(&self) -> f64 {
        self.limit_ppm * 1e-6 / 3.0_f64.sqrt()
    }
}

impl RunSheet {
    /// The run on a film that the sheet stands for, its numbers checked.
    ///
    /// # Errors
    /// [`SheetError`]: a key that is needed is missing, or a number cannot be.
    pub fn film_run(&self) -> Result<FilmRun, SheetError> {
        let missing = |key, flag| SheetError::Missing { key, flag };
        let marker_box_px = self
            .marker
            .box_px
            .ok_or(missing("marker.box_px", "--marker X,Y,W,H"))?;
        let [x1, y1, x2, y2] = self
            .scale
            .bar_px
            .ok_or(missing("scale.bar_px", "--scale-bar X1,Y1,X2,Y2"))?;
        let length_m = self
            .scale
            .length_m
            .ok_or(missing("scale.length_m", "--length METRES"))?;
        Ok(FilmRun {
            marker_box_px,
            at_frame: self.marker.at_frame,
            bar_px: [[x1, y1], [x2, y2]],
            length_m,
            u_length_m: self.scale.u_length_m,
            u_end_px: self.scale.u_end_px,
            capture_rate_hz: self.time.capture_rate_hz,
            readout_s: self.time.readout_ms.map(|readout_ms| readout_ms * 1e-3),
            steady_box_px: self.steady.box_px,
            fit: self.fit_run()?,
        })
    }

    /// What the sheet says of the fit alone, its numbers checked.
    ///
    /// # Errors
    /// [`SheetError::Number`] with key and value, [`SheetError::EmptyPart`], [`SheetError::Alone`].
    pub fn fit_run(&self) -> Result<FitRun, SheetError> {
        self.check_numbers()?;
        Ok(FitRun {
            from_s: self.time.from_s,
            to_s: self.time.to_s,
            clock: ClockLimit::given_or_assumed(self.time.clock_ppm),
            mass_kg: self.glider.mass_kg,
            u_mass_kg: self.glider.u_mass_kg,
        })
    }

    /// Every number that is given, against what it must be; then the pairs.
    fn check_numbers(&self) -> Result<(), SheetError> {
        let corner =
            |given: Option<[f64; 4]>| given.map_or(vec![], |[left, top, ..]| vec![left, top]);
        let sides =
            |given: Option<[f64; 4]>| given.map_or(vec![], |[.., wide, high]| vec![wide, high]);
        let one = |given: Option<f64>| given.into_iter().collect::<Vec<f64>>();
        let (scale, time, glider) = (&self.scale, &self.time, &self.glider);
        let table: [(&'static str, Vec<f64>, Wanted); 15] = [
            ("marker.box_px", corner(self.marker.box_px), NOT_NEGATIVE),
            ("marker.box_px", sides(self.marker.box_px), ABOVE_ZERO),
            ("steady.box_px", corner(self.steady.box_px), NOT_NEGATIVE),
            ("steady.box_px", sides(self.steady.box_px), ABOVE_ZERO),
            (
                "scale.bar_px",
                scale.bar_px.map_or(vec![], |ends| ends.to_vec()),
                FINITE,
            ),
            ("scale.length_m", one(scale.length_m), ABOVE_ZERO),
            ("scale.u_length_m", one(scale.u_length_m), NOT_NEGATIVE),
            ("scale.u_end_px", one(scale.u_end_px), NOT_NEGATIVE),
            ("time.from_s", one(time.from_s), FINITE),
            ("time.to_s", one(time.to_s), FINITE),
            (
                "time.capture_rate_hz",
                one(time.capture_rate_hz),
                ABOVE_ZERO,
            ),
            ("time.clock_ppm", one(time.clock_ppm), CLOCK_PPM),
            ("time.readout_ms", one(time.readout_ms), NOT_NEGATIVE),
            ("glider.mass_kg", one(glider.mass_kg), ABOVE_ZERO),
            ("glider.u_mass_kg", one(glider.u_mass_kg), NOT_NEGATIVE),
        ];
        for (key, values, (wanted, fits)) in table {
            if let Some(&value) = values.iter().find(|value| !fits(**value)) {
                return Err(SheetError::Number { key, value, wanted });
            }
        }
        if let (Some(from_s), Some(to_s)) = (time.from_s, time.to_s)
            && to_s <= from_s
        {
            return Err(SheetError::EmptyPart { from_s, to_s });
        }
        if glider.u_mass_kg.is_some() && glider.mass_kg.is_none() {
            return Err(SheetError::Alone {
                key: "glider.u_mass_kg",
                needs: "glider.mass_kg",
            });
        }
        Ok(())
    }
}

/// What a number must be, in words and as a test.
type Wanted = (&'static str, fn(f64) -> bool);

/// A clock that may be a tenth wrong is no clock.
const CLOCK_PPM: Wanted = ("a number of ppm from 0 to 100000", |value| {
    (0.0..=1e5).contains(&value)
});
const FINITE: Wanted = ("a finite number", f64::is_finite);
const ABOVE_ZERO: Wanted = ("a finite number above 0", |value| {
    value.is_finite() && value > 0.0
});
const NOT_NEGATIVE: Wanted = ("a finite number, not negative", |value| {
    value.is_finite() && value >= 0.0
});

#[cfg(test)]
mod tests {
    use super::*;

    const SHEET: &str = "[marker]\nbox_px = [10, 20.5, 48, 48]\n[scale]\nbar_px = [0, 400, 900, 401]\nlength_m = 0.5\n";

    #[test]
    fn numbers_that_cannot_be_are_refused_by_key() {
        let change = |change: fn(&mut RunSheet)| {
            let mut sheet = RunSheet::from_toml(SHEET).unwrap();
            change(&mut sheet);
            sheet.film_run().map(|_| ()).unwrap_err().to_string()
        };
        assert!(
            change(|s| s.marker.box_px = Some([f64::NAN, 0.0, 1.0, 1.0])).contains("marker.box_px")
        );
        assert!(
            change(|s| s.marker.box_px = Some([0.0, 0.0, -1.0, 1.0])).contains("marker.box_px")
        );
        assert!(change(|s| s.marker.box_px = None).contains("--marker"));
        assert!(change(|s| s.scale.length_m = Some(0.0)).contains("scale.length_m"));
        assert!(change(|s| s.time.clock_ppm = Some(-1.0)).contains("time.clock_ppm"));
        assert!(change(|s| s.glider.mass_kg = Some(f64::INFINITY)).contains("glider.mass_kg"));
        assert!(change(|s| s.glider.u_mass_kg = Some(0.1)).contains("without"));
        assert!(change(|s| (s.time.from_s, s.time.to_s) = (Some(3.0), Some(3.0))).contains("--to"));
    }
}
