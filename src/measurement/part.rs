//! The part of a record that is fitted, and whether the marker was there to be seen in it.

use super::{MeasureError, RecordRow, RowStatus};
use crate::footage::FrameTimes;
use crate::number::to_f64;
use crate::run_sheet::FitRun;
use crate::scale::MotionAxis;

/// The part of the film that is fitted, in file time.
pub(super) struct Part {
    from_s: f64,
    to_s: f64,
}

/// Least length of the marker's path, px: a swing below it is lost in what compression does to a picture at rest.
const LEAST_TRAVEL_PX: f64 = 1.0;
/// Share of a part's frames from which a marker that never comes back counts as having left.
const LEFT_SHARE: f64 = 0.1;
/// Share of a part's frames in which the marker must be found.
const SEEN_SHARE: f64 = 0.5;

impl Part {
    pub(super) fn of(run: &FitRun, times: &FrameTimes) -> Result<Self, MeasureError> {
        let part = Self {
            from_s: run.from_s.unwrap_or(f64::NEG_INFINITY),
            to_s: run.to_s.unwrap_or(f64::INFINITY),
        };
        if part.frames(times).next().is_none() {
            let (first_s, last_s) = ends(&times.t_s);
            return Err(MeasureError::EmptyPart {
                from_s: part.from_s,
                to_s: part.to_s,
                first_s,
                last_s,
            });
        }
        Ok(part)
    }

    pub(super) fn holds(&self, t_s: f64) -> bool {
        (self.from_s..=self.to_s).contains(&t_s)
    }

    pub(super) fn frames<'a>(&'a self, times: &'a FrameTimes) -> impl Iterator<Item = usize> + 'a {
        (0..times.t_s.len()).filter(|&frame| self.holds(times.t_s[frame]) && !times.repeated[frame])
    }

    /// Refuses a part in which the marker left for good, or was seen too seldom.
    pub(super) fn check_seen(
        &self,
        path_px: &[Option<[f64; 2]>],
        times: &FrameTimes,
    ) -> Result<(), MeasureError> {
        let frames: Vec<usize> = self.frames(times).collect();
        let n_seen = frames
            .iter()
            .filter(|&&frame| path_px[frame].is_some())
            .count();
        let Some(&first_lost) = frames.iter().find(|&&frame| path_px[frame].is_none()) else {
            return Ok(());
        };
        let n_tail = frames
            .iter()
            .rev()
            .take_while(|&&frame| path_px[frame].is_none())
            .count();
        let share = |n: usize| to_f64(n) / to_f64(frames.len());
        if n_seen > 0 && share(n_tail) > LEFT_SHARE {
            let frame = frames[frames.len() - n_tail];
            return Err(MeasureError::MarkerLeft {
                frame,
                t_s: times.t_s[frame],
                n_after: n_tail,
            });
        }
        if share(n_seen) < SEEN_SHARE {
            return Err(MeasureError::MarkerLost {
                n_seen,
                n_frames: frames.len(),
                first_lost,
            });
        }
        Ok(())
    }
}

/// Refuses a marker that stays where it is.
pub(super) fn check_travel(axis: &MotionAxis, seen_px: &[[f64; 2]]) -> Result<(), MeasureError> {
    let along: Vec<f64> = seen_px
        .iter()
        .map(|&p_px| axis.along_and_off_px(p_px)[0])
        .collect();
    let (low, high) = ends(&along);
    if high - low < LEAST_TRAVEL_PX {
        return Err(MeasureError::NoMotion {
            extent_px: high - low,
            least_px: LEAST_TRAVEL_PX,
        });
    }
    Ok(())
}

/// Marks rows of a table before `--from` and after `--to`.
pub(super) fn mark_outside(rows: &mut [RecordRow], run: &FitRun) -> Result<(), MeasureError> {
    let times = FrameTimes {
        t_s: rows.iter().map(|row| row.t_s).collect(),
        repeated: vec![false; rows.len()],
    };
    let part = Part::of(run, &times)?;
    for row in rows
        .iter_mut()
        .filter(|row| row.status == RowStatus::Used && !part.holds(row.t_s))
    {
        row.status = RowStatus::Outside;
    }
    Ok(())
}

fn ends(t_s: &[f64]) -> (f64, f64) {
    t_s.iter()
        .fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), &t_s| {
            (low.min(t_s), high.max(t_s))
        })
}
