//! The door of the motion room: a record is checked here, once, and becomes plain columns.

use super::{MotionError, PositionRecord};

/// Five parameters, and three readings more to judge the scatter by.
pub(super) const MIN_POSITIONS: usize = 8;

/// A checked record: finite, strictly increasing in time, with usable uncertainties.
///
/// Times count from the first reading and positions from the median, so that a record that starts at 1e9 s or lies at 1e3 m keeps its digits.
#[derive(Clone, Debug)]
pub(super) struct Readings {
    /// Time of the first reading, s.
    pub(super) t_ref_s: f64,
    /// Median position, m.
    pub(super) x_ref_m: f64,
    /// t − `t_ref_s`, s.
    pub(super) tau_s: Vec<f64>,
    /// x − `x_ref_m`, m.
    pub(super) x_m: Vec<f64>,
    /// Standard uncertainty of the position, m; 1 for all where the record states none.
    pub(super) u_x_m: Vec<f64>,
    /// Standard uncertainty of the time, s.
    pub(super) u_t_s: Vec<f64>,
}

impl Readings {
    /// Checks a record.
    ///
    /// # Errors
    /// Too few positions, a value that is not finite, a time that does not grow, an uncertainty that cannot be a weight.
    pub(super) fn new(records: &[PositionRecord]) -> Result<Self, MotionError> {
        if records.len() < MIN_POSITIONS {
            return Err(MotionError::TooFewPositions {
                n_positions: records.len(),
                n_needed: MIN_POSITIONS,
            });
        }
        let unweighted = records.iter().all(|r| r.u_x_m == 0.0 && r.u_t_s == 0.0);
        for (i, record) in records.iter().enumerate() {
            check(record, i + 1, unweighted)?;
            if i > 0 && record.t_s <= records[i - 1].t_s {
                return Err(MotionError::TimeNotIncreasing {
                    row: i + 1,
                    t_s: record.t_s,
                    previous_s: records[i - 1].t_s,
                });
            }
        }
        check_span(records.iter().map(|r| r.t_s), "the times", "s")?;
        check_span(records.iter().map(|r| r.x_m), "the positions", "m")?;
        let t_ref_s = records[0].t_s;
        let x_ref_m = median(records.iter().map(|r| r.x_m).collect());
        Ok(Self {
            t_ref_s,
            x_ref_m,
            tau_s: records.iter().map(|r| r.t_s - t_ref_s).collect(),
            x_m: records.iter().map(|r| r.x_m - x_ref_m).collect(),
            u_x_m: records
                .iter()
                .map(|r| if unweighted { 1.0 } else { r.u_x_m })
                .collect(),
            u_t_s: records.iter().map(|r| r.u_t_s).collect(),
        })
    }

    /// Adds an uncertainty that all readings share, m, in squares.
    pub(super) fn widen(&mut self, u_m: f64) {
        for u_x_m in &mut self.u_x_m {
            *u_x_m = u_x_m.hypot(u_m);
        }
    }

    pub(super) fn len(&self) -> usize {
        self.tau_s.len()
    }

    /// Time from the first reading to the last, s.
    pub(super) fn span_s(&self) -> f64 {
        self.tau_s[self.len() - 1]
    }

    /// Median interval of neighbouring readings, s: gaps and a variable clock do not move it.
    pub(super) fn interval_s(&self) -> f64 {
        median(
            self.tau_s
                .windows(2)
                .map(|pair| pair[1] - pair[0])
                .collect(),
        )
    }

    /// The readings for which `keep` is true; times and positions count from where they did.
    pub(super) fn only(&self, keep: &[bool]) -> Self {
        let pick = |column: &[f64]| {
            let kept = column.iter().zip(keep).filter(|(_, k)| **k);
            kept.map(|(v, _)| *v).collect::<Vec<f64>>()
        };
        Self {
            t_ref_s: self.t_ref_s,
            x_ref_m: self.x_ref_m,
            tau_s: pick(&self.tau_s),
            x_m: pick(&self.x_m),
            u_x_m: pick(&self.u_x_m),
            u_t_s: pick(&self.u_t_s),
        }
    }
}

/// Spans that an experiment can have, s or m; beyond them the arithmetic would run into the ends of `f64`.
const SPANS: std::ops::RangeInclusive<f64> = 1e-9..=1e12;

/// Refuses values all over the range of `f64`; values that are all the same are refused later, as no motion.
fn check_span(
    values: impl Iterator<Item = f64>,
    quantity: &'static str,
    unit: &'static str,
) -> Result<(), MotionError> {
    let (low, high) = values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| {
        (low.min(v), high.max(v))
    });
    let span = high - low;
    if span == 0.0 || SPANS.contains(&span) {
        return Ok(());
    }
    Err(MotionError::AbsurdSpan {
        quantity,
        span,
        unit,
    })
}

fn check(record: &PositionRecord, row: usize, unweighted: bool) -> Result<(), MotionError> {
    // Taken apart by name: a new field must be checked too.
    let PositionRecord {
        t_s,
        u_t_s,
        x_m,
        u_x_m,
    } = *record;
    let values = [
        ("the time", t_s),
        ("the position", x_m),
        ("the uncertainty of the time", u_t_s),
        ("the uncertainty of the position", u_x_m),
    ];
    if let Some((quantity, _)) = values.into_iter().find(|(_, value)| !value.is_finite()) {
        return Err(MotionError::NotFinite { quantity, row });
    }
    if u_t_s < 0.0 {
        return Err(MotionError::UnusableUncertainty {
            quantity: "the uncertainty of the time",
            row,
            value: u_t_s,
        });
    }
    // Beside |v|·u_t a reading needs a u_x of its own: v is 0 at the turning points, and the weight would be infinite.
    if u_x_m < 0.0 || (u_x_m == 0.0 && !unweighted) {
        return Err(MotionError::UnusableUncertainty {
            quantity: "the uncertainty of the position",
            row,
            value: u_x_m,
        });
    }
    Ok(())
}

/// Median; the mean of the middle two of an even number; 0 of nothing.
pub(super) fn median(mut values: Vec<f64>) -> f64 {
    if values.is_empty() {
        return 0.0;
    }
    let middle = values.len() / 2;
    let (below, upper, _) = values.select_nth_unstable_by(middle, f64::total_cmp);
    let upper = *upper;
    if below.len() == middle && middle > 0 && (below.len() * 2) == values.len() {
        let lower = values[..middle]
            .iter()
            .copied()
            .fold(f64::NEG_INFINITY, f64::max);
        return 0.5 * (lower + upper);
    }
    upper
}

#[cfg(test)]
mod tests {
    use super::*;

    fn record() -> Vec<PositionRecord> {
        (0..10)
            .map(|i| PositionRecord {
                t_s: 0.1 * f64::from(i),
                u_t_s: 0.0,
                x_m: f64::from(i),
                u_x_m: 1e-4,
            })
            .collect()
    }

    #[test]
    fn a_value_that_is_not_finite_is_named_with_its_row() {
        let mut records = record();
        records[3].x_m = f64::NAN;
        assert_eq!(
            Readings::new(&records).err(),
            Some(MotionError::NotFinite {
                quantity: "the position",
                row: 4
            })
        );
        records[3].x_m = 0.0;
        records[9].u_t_s = f64::INFINITY;
        assert_eq!(
            Readings::new(&records).err(),
            Some(MotionError::NotFinite {
                quantity: "the uncertainty of the time",
                row: 10
            })
        );
    }

    #[test]
    fn a_time_that_does_not_grow_is_refused_with_its_row() {
        let mut records = record();
        records[5].t_s = records[4].t_s;
        assert!(matches!(
            Readings::new(&records),
            Err(MotionError::TimeNotIncreasing { row: 6, .. })
        ));
    }

    #[test]
    fn an_uncertainty_of_zero_is_refused_unless_no_reading_states_any() {
        let mut records = record();
        records[1].u_x_m = 0.0;
        assert!(matches!(
            Readings::new(&records),
            Err(MotionError::UnusableUncertainty { row: 2, .. })
        ));
        records.iter_mut().for_each(|r| r.u_x_m = 0.0);
        assert!(
            Readings::new(&records)
                .is_ok_and(|readings| readings.u_x_m.iter().all(|u| (u - 1.0).abs() < 1e-15))
        );
    }

    #[test]
    fn seven_positions_are_too_few() {
        assert_eq!(
            Readings::new(&record()[..7]).err(),
            Some(MotionError::TooFewPositions {
                n_positions: 7,
                n_needed: 8
            })
        );
    }

    #[test]
    fn medians_by_eye() {
        for (values, want) in [
            (vec![3.0, 1.0, 2.0], 2.0),
            (vec![4.0, 1.0, 3.0, 2.0], 2.5),
            (vec![7.0], 7.0),
            (vec![], 0.0),
        ] {
            assert!(
                (median(values.clone()) - want).abs() < 1e-15,
                "median of {values:?}"
            );
        }
    }
}
