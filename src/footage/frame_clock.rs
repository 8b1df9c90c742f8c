//! What the stamps say about the clock that made them.
//!
//! In: the stamps of all frames, in ticks. Out: a diagnosis and a time for every frame. A *steady* clock is one whose
//! stamps lie within one rounding step of a uniform grid; the grid's times are used and the rounding noise is gone. A
//! *variable* clock keeps its stamps and passes their uncertainty on.

use super::FootageError;
use super::grid::{Grid, count, median, round, to_f64};
use std::path::Path;

/// How even the clock of the stamps is.
#[derive(Clone, Debug, PartialEq)]
pub struct FrameClock {
    /// True: the stamps lie within one rounding step of a uniform grid, and the grid's times are used.
    pub steady: bool,
    /// Frame interval of the grid (steady) or median interval (variable), in file time, s.
    pub interval_s: f64,
    /// One tick of the container's time base, s.
    pub tick_s: f64,
    /// Step to which the stamps are rounded, s; at least one tick.
    pub rounding_step_s: f64,
    /// RMS deviation of the stamps from the uniform grid, s.
    pub jitter_rms_s: f64,
    /// Frames missing from the grid: gaps in the stamps.
    pub n_dropped: usize,
    /// Frames whose stamp does not lie after the one before.
    pub n_repeated: usize,
    /// Standard uncertainty of a frame's time, in capture time, s: 0 for a steady clock.
    pub u_t_s: f64,
    /// Capture time over file time: 1 for ordinary film; 1/8 for 240 Hz in a 30 Hz file.
    pub time_scale: f64,
}

/// A time for every frame.
#[derive(Clone, Debug, PartialEq)]
pub struct FrameTimes {
    /// Times in capture time, s, one a frame.
    pub t_s: Vec<f64>,
    /// True where the frame's stamp does not lie after the one before: its time means nothing.
    pub repeated: Vec<bool>,
}

/// Diagnoses the stamps of a film and gives every frame its time, in file time (`time_scale` 1).
///
/// * `stamps`: ticks in presentation order; `time_base`: s per tick as a fraction.
/// * The grid's first frame keeps its own stamp up to rounding, so that start offsets are honoured.
///
/// # Errors
/// [`FootageError::NoStamps`] where fewer than two frames carry a stamp, a stamp is missing, or none lies after another.
pub fn frame_clock(
    stamps: &[Option<i64>],
    time_base: [i64; 2],
    path: &Path,
) -> Result<(FrameClock, FrameTimes), FootageError> {
    let no_stamps = |reason: String| FootageError::NoStamps {
        path: path.to_path_buf(),
        reason,
    };
    if time_base[0] <= 0 || time_base[1] <= 0 {
        return Err(no_stamps(format!(
            "the time base is {}/{} s",
            time_base[0], time_base[1]
        )));
    }
    if let Some(frame) = stamps.iter().position(Option::is_none) {
        return Err(no_stamps(format!("frame {frame} has no stamp")));
    }
    let ticks: Vec<i64> = stamps.iter().flatten().copied().collect();
    let repeated = repeated_frames(&ticks);
    let kept: Vec<i64> = ticks
        .iter()
        .zip(&repeated)
        .filter(|(_, repeated)| !**repeated)
        .map(|(&tick, _)| tick)
        .collect();
    if kept.len() < 2 {
        return Err(no_stamps(
            "fewer than two frames have stamps of their own".to_owned(),
        ));
    }
    let tick_s = to_f64(time_base[0]) / to_f64(time_base[1]);
    let grid = Grid::through(&kept);
    let steady = grid.is_steady();
    let median_s = median_interval(&kept) * tick_s;
    let rounding_step_s = to_f64(grid.rounding_step) * tick_s;
    let clock = FrameClock {
        steady,
        interval_s: if steady {
            grid.interval * tick_s
        } else {
            median_s
        },
        tick_s,
        rounding_step_s,
        jitter_rms_s: grid.rms * tick_s,
        n_dropped: if steady {
            grid.n_dropped()
        } else {
            long_intervals(&kept)
        },
        n_repeated: repeated.iter().filter(|repeated| **repeated).count(),
        // A variable clock's stamp is rounded to its step: rectangular, half-width half a step.
        u_t_s: if steady {
            0.0
        } else {
            rounding_step_s / 12.0_f64.sqrt()
        },
        time_scale: 1.0,
    };
    let mut grid_times = grid.times();
    let t_s = ticks
        .iter()
        .zip(&repeated)
        .map(|(&tick, &repeated)| match (repeated, steady) {
            (false, true) => grid_times.next().unwrap_or(to_f64(tick)) * tick_s,
            // Divided last: numerator and tick are whole, so that a stamp such as 3003/90000 is rounded once only.
            _ => to_f64(tick) * to_f64(time_base[0]) / to_f64(time_base[1]),
        })
        .collect();
    Ok((clock, FrameTimes { t_s, repeated }))
}

/// Times of a film without stamps whose frames are known to be 1/`rate_hz` apart.
#[must_use]
pub fn even_times(n_frames: usize, rate_hz: f64) -> (FrameClock, FrameTimes) {
    let interval_s = 1.0 / rate_hz;
    let clock = FrameClock {
        steady: true,
        interval_s,
        tick_s: interval_s,
        rounding_step_s: interval_s,
        jitter_rms_s: 0.0,
        n_dropped: 0,
        n_repeated: 0,
        u_t_s: 0.0,
        time_scale: 1.0,
    };
    let t_s = (0..n_frames)
        .map(|frame| count(frame) * interval_s)
        .collect();
    (
        clock,
        FrameTimes {
            t_s,
            repeated: vec![false; n_frames],
        },
    )
}

/// True for each frame whose stamp does not lie after every stamp before it.
fn repeated_frames(ticks: &[i64]) -> Vec<bool> {
    let mut latest = None;
    ticks
        .iter()
        .map(|&tick| {
            let repeated = latest.is_some_and(|latest| tick <= latest);
            latest = latest.max(Some(tick));
            repeated
        })
        .collect()
}

fn median_interval(ticks: &[i64]) -> f64 {
    median(
        ticks
            .windows(2)
            .map(|pair| to_f64(pair[1].saturating_sub(pair[0])))
            .collect(),
    )
}

/// Frames that seem missing from a variable clock: whole median intervals beyond the first in each gap.
fn long_intervals(ticks: &[i64]) -> usize {
    let middle = median_interval(ticks);
    ticks
        .windows(2)
        .map(|pair| {
            usize::try_from(
                round(to_f64(pair[1].saturating_sub(pair[0])) / middle).saturating_sub(1),
            )
            .unwrap_or(0)
        })
        .sum()
}

#[cfg(test)]
mod tests {
    use super::*;

    fn clock_of(ticks: &[i64], time_base: [i64; 2]) -> (FrameClock, FrameTimes) {
        let stamps: Vec<Option<i64>> = ticks.iter().copied().map(Some).collect();
        frame_clock(&stamps, time_base, Path::new("clip")).unwrap()
    }

    #[test]
    fn stamps_rounded_to_a_six_hundredth_become_the_uniform_grid_they_came_from() {
        let interval = 600.0 * 1001.0 / 60000.0;
        let ticks: Vec<i64> = (0..900).map(|k| round(interval * to_f64(k))).collect();
        let (clock, times) = clock_of(&ticks, [1, 600]);
        assert!(clock.steady);
        assert!(
            (clock.interval_s * 60000.0 / 1001.0 - 1.0).abs() < 1e-6,
            "{}",
            clock.interval_s
        );
        let worst = (0..900)
            .map(|k| (times.t_s[k] - count(k) * 1001.0 / 60000.0).abs())
            .fold(0.0, f64::max);
        // The rounding is ±0.83 ms; that every one of 900 stamps comes from one grid leaves a hundredth of it.
        assert!(worst < 1e-5, "{worst}");
    }

    #[test]
    fn milliseconds_in_a_microsecond_time_base_are_found_as_the_step() {
        let ticks: Vec<i64> = (0..400)
            .map(|k| 1000 * round(to_f64(k) * 1000.0 / 29.967))
            .collect();
        let (clock, _) = clock_of(&ticks, [1, 1_000_000]);
        assert!(clock.steady);
        assert!(
            (clock.rounding_step_s - 1e-3).abs() < 1e-12 && (clock.tick_s - 1e-6).abs() < 1e-15
        );
        assert!(
            clock.jitter_rms_s > 2e-4 && clock.jitter_rms_s < 4e-4,
            "{}",
            clock.jitter_rms_s
        );
    }

    #[test]
    fn a_dropped_frame_is_a_gap_in_a_steady_grid() {
        let ticks: Vec<i64> = (0..100)
            .filter(|k| *k != 40 && *k != 41)
            .map(|k| 512 * k + 1024)
            .collect();
        let (clock, times) = clock_of(&ticks, [1, 15360]);
        assert!(clock.steady);
        assert_eq!(clock.n_dropped, 2);
        assert!((times.t_s[0] - 1024.0 / 15360.0).abs() < 1e-12);
        assert!((times.t_s[97] - (99.0 * 512.0 + 1024.0) / 15360.0).abs() < 1e-12);
    }

    #[test]
    fn real_jitter_is_kept_and_passed_on() {
        // ±3 ms of a deterministic, uneven pattern on 33.3 ms, in a 1/90000 s time base.
        let ticks: Vec<i64> = (0..300)
            .map(|k| 3000 * k + (k * k * 37 % 541) - 270)
            .collect();
        let (clock, times) = clock_of(&ticks, [1, 90000]);
        assert!(!clock.steady);
        assert!(clock.u_t_s > 0.0);
        for (t_s, tick) in times.t_s.iter().zip(&ticks) {
            assert!((t_s - to_f64(*tick) / 90000.0).abs() < 1e-12);
        }
    }

    #[test]
    fn a_repeated_stamp_is_marked_and_does_not_bend_the_grid() {
        let mut ticks: Vec<i64> = (0..50).map(|k| 100 * k).collect();
        ticks.insert(20, 1900);
        let (clock, times) = clock_of(&ticks, [1, 3000]);
        assert!(clock.steady);
        assert_eq!(clock.n_repeated, 1);
        assert!(times.repeated[20] && !times.repeated[19]);
        assert!((times.t_s[50] - 4900.0 / 3000.0).abs() < 1e-12);
    }

    #[test]
    fn stamps_that_say_nothing_are_refused() {
        let path = Path::new("clip");
        for stamps in [
            vec![],
            vec![Some(3)],
            vec![None, None],
            vec![Some(1), None, Some(3)],
            vec![Some(5); 9],
        ] {
            assert!(
                matches!(
                    frame_clock(&stamps, [1, 30], path),
                    Err(FootageError::NoStamps { .. })
                ),
                "{stamps:?}"
            );
        }
        assert!(frame_clock(&[Some(0), Some(1)], [0, 1], path).is_err());
        assert!(frame_clock(&[Some(i64::MIN), Some(i64::MAX)], [1, 1], path).is_ok());
    }
}
