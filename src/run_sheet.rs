//! The run sheet: the TOML that repeats a run. Flags and sheet are two faces of it.
//!
//! This is the first of two layers: what was typed, checked for form only. [`RunSheet::film_run`] makes the second, a
//! [`FilmRun`] whose numbers are known to be usable; no file is touched in either.

mod run;

pub use run::{ClockLimit, FilmRun, FitRun};

use serde::{Deserialize, Serialize};

/// A run as typed. Every key but those of the marker and the scale is optional; an unknown key is an error.
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct RunSheet {
    /// The film; a relative path starts from the sheet's folder.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub clip: Option<String>,
    /// A table of positions and times in place of a film; a relative path starts from the sheet's folder.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub positions: Option<String>,
    /// The marker.
    #[serde(default, skip_serializing_if = "is_default")]
    pub marker: MarkerSheet,
    /// The scale bar.
    #[serde(default, skip_serializing_if = "is_default")]
    pub scale: ScaleSheet,
    /// Time and clock.
    #[serde(default, skip_serializing_if = "is_default")]
    pub time: TimeSheet,
    /// The patch that stands still.
    #[serde(default, skip_serializing_if = "is_default")]
    pub steady: SteadySheet,
    /// The moving body.
    #[serde(default, skip_serializing_if = "is_default")]
    pub glider: GliderSheet,
}

/// `[marker]`
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct MarkerSheet {
    /// Box around the marker: left, top, width, height, display px.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub box_px: Option<[f64; 4]>,
    /// Frame the box was drawn in, from 0.
    #[serde(default)]
    pub at_frame: usize,
}

/// `[scale]`
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct ScaleSheet {
    /// Ends of the bar: x1, y1, x2, y2, display px.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub bar_px: Option<[f64; 4]>,
    /// Length of the bar, m.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub length_m: Option<f64>,
    /// Standard uncertainty of the length, m.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub u_length_m: Option<f64>,
    /// Standard uncertainty of the reading of one end along the bar, display px.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub u_end_px: Option<f64>,
}

/// `[time]`
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct TimeSheet {
    /// Start of the part that is fitted, s of the film's own time.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub from_s: Option<f64>,
    /// End of the part that is fitted, s of the film's own time.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub to_s: Option<f64>,
    /// Rate the frames were captured at, Hz, for slow motion.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub capture_rate_hz: Option<f64>,
    /// Limit of error of the clock's rate, ppm (rectangular).
    #[serde(skip_serializing_if = "Option::is_none")]
    pub clock_ppm: Option<f64>,
    /// Time the sensor takes to read a picture from its first row to its last, ms.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub readout_ms: Option<f64>,
}

/// `[steady]`
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct SteadySheet {
    /// Box around a patch that stands still: left, top, width, height, display px.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub box_px: Option<[f64; 4]>,
}

/// `[glider]`
#[derive(Clone, Debug, Default, PartialEq, Serialize, Deserialize)]
#[serde(deny_unknown_fields)]
pub struct GliderSheet {
    /// Moving mass, kg: glider, what it carries, and its share of the springs.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub mass_kg: Option<f64>,
    /// Standard uncertainty of the mass, kg.
    #[serde(skip_serializing_if = "Option::is_none")]
    pub u_mass_kg: Option<f64>,
}

fn is_default<T: Default + PartialEq>(value: &T) -> bool {
    *value == T::default()
}

/// What is wrong with a sheet or with the flags that stand for one.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum SheetError {
    /// The text is no TOML, or holds a key or a value that a sheet does not know.
    #[error("line {line}, column {column}: {reason}; the keys of a run sheet stand in the README")]
    Text {
        /// Line, from 1.
        line: usize,
        /// Column, from 1.
        column: usize,
        /// What is wrong there.
        reason: String,
    },
    /// A key that is needed is missing.
    #[error("{key} is missing; give {flag}, or {key} in the run sheet")]
    Missing {
        /// Key of the sheet.
        key: &'static str,
        /// Flag that stands for it.
        flag: &'static str,
    },
    /// A number cannot be.
    #[error("{key} = {value}: must be {wanted}")]
    Number {
        /// Key of the sheet.
        key: &'static str,
        /// Its value.
        value: f64,
        /// What it must be.
        wanted: &'static str,
    },
    /// The part to be fitted ends before it starts.
    #[error(
        "the part to be fitted ends at {to_s} s, before it starts at {from_s} s; give a --to that lies after --from"
    )]
    EmptyPart {
        /// Start, s.
        from_s: f64,
        /// End, s.
        to_s: f64,
    },
    /// An uncertainty of something that was not given.
    #[error("{key} is given without {needs}; give both, or neither")]
    Alone {
        /// Key of the sheet.
        key: &'static str,
        /// The key it belongs to.
        needs: &'static str,
    },
    /// The sheet could not be put into words.
    #[error("the run sheet cannot be written as TOML: {reason}")]
    NotWritable {
        /// The library's words.
        reason: String,
    },
}

impl RunSheet {
    /// A sheet from its TOML text.
    ///
    /// # Errors
    /// [`SheetError::Text`] with line and column: no TOML, an unknown key, a value of the wrong kind.
    pub fn from_toml(text: &str) -> Result<Self, SheetError> {
        toml::from_str(text).map_err(|error| {
            let at = error.span().map_or(0, |span| span.start).min(text.len());
            let before = text.get(..at).unwrap_or(text);
            let line = before.matches('\n').count() + 1;
            let column = before
                .rsplit('\n')
                .next()
                .map_or(0, |tail| tail.chars().count())
                + 1;
            SheetError::Text {
                line,
                column,
                reason: error.message().replace('\n', " ").trim().to_owned(),
            }
        })
    }

    /// The same sheet for a film of this name or path.
    #[must_use]
    pub fn with_source(&self, clip: &str) -> Self {
        Self {
            clip: Some(clip.to_owned()),
            positions: None,
            ..self.clone()
        }
    }

    /// The same sheet for a table of this name or path.
    #[must_use]
    pub fn with_table(&self, table: &str) -> Self {
        Self {
            clip: None,
            positions: Some(table.to_owned()),
            ..self.clone()
        }
    }

    /// Name or path of the film or table, empty where the sheet names none.
    #[must_use]
    pub fn source_name(&self) -> &str {
        self.clip
            .as_deref()
            .or(self.positions.as_deref())
            .unwrap_or("")
    }

    /// The sheet as TOML text.
    ///
    /// # Errors
    /// [`SheetError::NotWritable`] where the library cannot.
    pub fn to_toml(&self) -> Result<String, SheetError> {
        toml::to_string(self).map_err(|error| SheetError::NotWritable {
            reason: error.to_string(),
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    const SHEET: &str = "clip = \"rail-7.mp4\"\n\n[marker]\nbox_px = [10, 20.5, 48, 48]\n\n[scale]\nbar_px = [0, 400, 900, 401]\nlength_m = 0.5\n";

    #[test]
    fn a_sheet_written_and_read_again_is_the_same() {
        let mut sheet = RunSheet::from_toml(SHEET).unwrap();
        sheet.time.clock_ppm = Some(0.1 + 0.2);
        sheet.glider.mass_kg = Some(0.2411);
        assert_eq!(
            RunSheet::from_toml(&sheet.to_toml().unwrap()).unwrap(),
            sheet
        );
    }

    #[test]
    fn an_unknown_key_is_an_error_with_line_and_column() {
        let text = SHEET.replace("length_m = 0.5", "length_mm = 500");
        let Err(SheetError::Text {
            line,
            column,
            reason,
        }) = RunSheet::from_toml(&text)
        else {
            panic!("accepted")
        };
        assert_eq!((line, column), (8, 1), "{reason}");
        assert!(reason.contains("length_mm"), "{reason}");
        let Err(SheetError::Text { line, .. }) = RunSheet::from_toml("clip = \"a\"\n[marker\n")
        else {
            panic!("accepted")
        };
        assert_eq!(line, 2);
    }
}
