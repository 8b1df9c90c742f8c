//! From the track of a film to rows of the position–time record.

use super::part::{self, Part};
use super::{FilmPart, FrameSlip, MeasureError, RecordRow, RowStatus, ScaleFacts, Streak, still};
use crate::footage::{
    CaptureRate, ClipFacts, FootageError, FrameClock, FrameTimes, Orientation, StreamFacts,
    even_times, frame_clock, time_scale,
};
use crate::number::to_f64;
use crate::run_sheet::FilmRun;
use crate::scale::{ScaleAxis, ScaleBar, motion_axis};
use crate::track::{FilmTrack, Sighting};
use std::path::Path;

/// What the fit needs to know of a film beyond its positions.
#[derive(Clone, Copy, Debug)]
pub(super) struct FilmTerms {
    /// Relative standard uncertainty of the scale.
    pub(super) u_scale_rel: f64,
    /// True where a part of it is our default.
    pub(super) scale_assumed: bool,
    /// Time from frame to frame, s of capture time.
    pub(super) frame_interval_s: f64,
    /// True where the stamps are even: then lost frames leave no trace in them.
    pub(super) even_stamps: bool,
}

/// A film whose marker was followed, with its times, its axis and its scale.
pub(super) struct Film {
    track: FilmTrack,
    orientation: Orientation,
    clock: FrameClock,
    capture_rate: CaptureRate,
    times: FrameTimes,
    /// Marker in display px, camera shake taken off; None where it was not seen.
    path_px: Vec<Option<[f64; 2]>>,
    scale: ScaleAxis,
    n_unsteady: usize,
}

impl Film {
    /// Lays times and an axis through a track.
    pub(super) fn new(
        run: &FilmRun,
        bar: ScaleBar,
        facts: &StreamFacts,
        track: FilmTrack,
        clip: &Path,
    ) -> Result<Self, MeasureError> {
        if track.notes.is_empty() {
            return Err(FootageError::NoPictures {
                path: clip.to_path_buf(),
            }
            .into());
        }
        let stamps: Vec<Option<i64>> = track.notes.iter().map(|note| note.stamp).collect();
        let (mut clock, times) = match (
            frame_clock(&stamps, facts.time_base, clip),
            run.capture_rate_hz,
        ) {
            // A bare stream has no stamps; the user's rate stands for them.
            (Err(FootageError::NoStamps { .. }), Some(rate_hz)) => {
                even_times(stamps.len(), rate_hz)
            }
            (times, _) => times?,
        };
        let (stretch, capture_rate) = time_scale(
            1.0 / clock.interval_s,
            run.capture_rate_hz,
            facts.capture_rate_metadata.as_ref(),
        )?;
        clock.time_scale = stretch;
        clock.u_t_s *= stretch;
        let interval_s = clock.interval_s * stretch;
        if let Some(readout_s) = run.readout_s.filter(|&readout_s| readout_s > interval_s) {
            let (readout_ms, interval_ms) = (readout_s * 1e3, interval_s * 1e3);
            return Err(MeasureError::Readout {
                readout_ms,
                interval_ms,
            });
        }
        let (path_px, n_unsteady) = display_path(&track, &facts.orientation);
        let part = Part::of(&run.fit, &times)?;
        let seen: Vec<[f64; 2]> = part
            .frames(&times)
            .filter_map(|frame| path_px[frame])
            .collect();
        part.check_seen(&path_px, &times)?;
        let axis = motion_axis(&seen)?;
        part::check_travel(&axis, &seen)?;
        Ok(Self {
            track,
            orientation: facts.orientation,
            clock,
            capture_rate,
            times,
            path_px,
            scale: ScaleAxis { bar, axis },
            n_unsteady,
        })
    }

    /// What the fit needs to know of the film beyond its positions.
    pub(super) fn terms(&self) -> FilmTerms {
        FilmTerms {
            u_scale_rel: self.scale.bar.u_rel(),
            scale_assumed: self.scale.bar.assumed(),
            frame_interval_s: self.clock.interval_s * self.clock.time_scale,
            even_stamps: self.clock.steady,
        }
    }

    /// A row for every frame; the fit's columns are still empty.
    pub(super) fn rows(&self, run: &FilmRun) -> Result<Vec<RecordRow>, MeasureError> {
        let part = Part::of(&run.fit, &self.times)?;
        let direction = self.orientation.coded_direction(self.scale.axis.direction);
        // A coded px along the axis is this many display px long (pixels need not be square).
        let display_px_per_px = 1.0 / direction[0].hypot(direction[1]);
        let usual_u_px = self.usual_u_px(direction);
        let rows = (0..self.times.t_s.len()).map(|frame| {
            let sighting = self.track.marker[frame]
                .seen()
                .filter(|_| self.path_px[frame].is_some());
            let metres = self.path_px[frame].map(|p_px| self.scale.metres_from_px(p_px));
            // The start frame matches itself: what it leaves over says nothing of how well it is placed.
            let own = |sighting: &Sighting| {
                if frame == run.at_frame {
                    usual_u_px
                } else {
                    sighting.u_along_px(direction).max(0.5 * usual_u_px)
                }
            };
            let u_px = sighting.map(|sighting| own(sighting) * display_px_per_px);
            let outside = self.times.repeated[frame] || !part.holds(self.times.t_s[frame]);
            RecordRow {
                frame,
                t_s: self.capture_time_s(frame, sighting, run),
                u_t_s: self.clock.u_t_s,
                x_m: metres.map(|[along, _]| along),
                u_x_m: u_px.map(|u_px| u_px * self.scale.bar.m_per_px()),
                off_axis_m: metres.map(|[_, off]| off),
                p_px: self.path_px[frame],
                match_score: sighting.map(|sighting| sighting.match_score),
                status: match (metres, outside) {
                    (None, _) => RowStatus::Lost,
                    (Some(_), true) => RowStatus::Outside,
                    (Some(_), false) => RowStatus::Used,
                },
                fit_m: None,
                residual_m: None,
            }
        });
        Ok(rows.collect())
    }

    /// Median standard uncertainty of the sightings along a direction, coded px.
    fn usual_u_px(&self, direction: [f64; 2]) -> f64 {
        let seen = self
            .track
            .marker
            .iter()
            .filter_map(|outcome| outcome.seen());
        let mut all: Vec<f64> = seen
            .map(|sighting| sighting.u_along_px(direction))
            .collect();
        all.sort_by(f64::total_cmp);
        all.get(all.len() / 2).copied().unwrap_or(0.0)
    }

    /// When the marker's row of the sensor was read, s of capture time.
    fn capture_time_s(&self, frame: usize, sighting: Option<&Sighting>, run: &FilmRun) -> f64 {
        let t_s = self.times.t_s[frame] * self.clock.time_scale;
        let (Some(readout_s), Some(sighting)) = (run.readout_s, sighting) else {
            return t_s;
        };
        // Row r of a picture is read at t + readout · r/height (rolling shutter); the stamp is that of the first row.
        t_s + readout_s * (sighting.p_px[1] + 0.5) / f64::from(self.orientation.coded_size_px()[1])
    }

    /// What only a film has, for the record.
    pub(super) fn into_part(
        self,
        clip: ClipFacts,
        run: &FilmRun,
        rows: &[RecordRow],
        slips: &[FrameSlip],
        doubtful_phase: bool,
    ) -> FilmPart {
        let bar = &self.scale.bar;
        let scale = ScaleFacts {
            bar_px: bar.ends_px(),
            length_m: bar.length_m(),
            u_length_m: bar.u_length_m(),
            u_end_px: bar.u_end_px(),
            m_per_px: bar.m_per_px(),
            u_scale_rel: bar.u_rel(),
            assumed: bar.assumed(),
            origin_px: self.scale.axis.origin_px,
            direction: self.scale.axis.direction,
            off_axis_rms_m: self.scale.axis.off_axis_rms_px * bar.m_per_px(),
            bar_angle_rad: self.scale.bar_angle_rad(),
        };
        FilmPart {
            scale,
            marker_box_px: run.marker_box_px,
            at_frame: run.at_frame,
            steady_box_px: run.steady_box_px,
            still: still::upright(
                &self.track.start_picture,
                self.track.start_shrunk_by,
                &self.orientation,
            ),
            streak: self.streak(rows),
            n_unsteady: self.n_unsteady,
            rows_swept_rel: self.rows_swept_rel(),
            capture_rate: self.capture_rate,
            readout_given: run.readout_s.is_some(),
            slips: slips.to_vec(),
            doubtful_phase,
            frame_clock: self.clock,
            clip,
        }
    }

    /// Share of the sensor's rows over which the marker moves: nine tenths of the sightings, so that a stray does not count.
    fn rows_swept_rel(&self) -> f64 {
        let seen = self
            .track
            .marker
            .iter()
            .filter_map(|outcome| outcome.seen());
        let mut rows: Vec<f64> = seen.map(|sighting| sighting.p_px[1]).collect();
        rows.sort_by(f64::total_cmp);
        let at = |share: usize| rows.get(rows.len() * share / 100).copied().unwrap_or(0.0);
        (at(95) - at(5)) / f64::from(self.orientation.coded_size_px()[1])
    }

    /// The lines nearer to the axis, with positions counted along the axis from its origin.
    fn streak(&self, rows: &[RecordRow]) -> Streak {
        let display = |direction: [f64; 2]| {
            let origin = self.orientation.display_from_coded([0.0, 0.0]);
            let end = self.orientation.display_from_coded(direction);
            [end[0] - origin[0], end[1] - origin[1]]
        };
        let [dx, dy] = self.scale.axis.direction;
        // Display px along the axis for a coded px along the lines.
        let gain = |lines: &crate::track::StreakLines| {
            let [x, y] = display(lines.direction);
            x * dx + y * dy
        };
        let [along, across] = &self.track.streaks;
        let lines = if gain(along).abs() >= gain(across).abs() {
            along
        } else {
            across
        };
        let gain = gain(lines);
        let [start_px, _] = self
            .scale
            .axis
            .along_and_off_px(self.orientation.display_from_coded(lines.origin_px));
        let first_px = start_px + gain * lines.first_px;
        let mut streak = Streak {
            width: lines.width,
            lines: Vec::new(),
            t_s: Vec::new(),
            first_px,
            step_px: gain * lines.step_px,
        };
        for (row, line) in rows.iter().zip(&lines.lines) {
            if let Some(line) = line {
                streak.t_s.push(row.t_s);
                streak.lines.extend_from_slice(line);
            }
        }
        if streak.step_px < 0.0 {
            // The lines run against the axis: turn them round, so that x grows to the right.
            streak.first_px += streak.step_px * to_f64(streak.width.saturating_sub(1));
            streak.step_px = -streak.step_px;
            for line in streak.lines.chunks_exact_mut(streak.width.max(1)) {
                line.reverse();
            }
        }
        streak
    }
}

/// The marker's path in display px, less the steady patch's, and the number of frames lost with the patch alone.
fn display_path(track: &FilmTrack, orientation: &Orientation) -> (Vec<Option<[f64; 2]>>, usize) {
    let display = |sighting: &Sighting| orientation.display_from_coded(sighting.p_px);
    let Some(steady) = &track.steady else {
        return (
            track
                .marker
                .iter()
                .map(|outcome| outcome.seen().map(display))
                .collect(),
            0,
        );
    };
    let rest = steady
        .iter()
        .find_map(|outcome| outcome.seen())
        .map(display);
    let mut n_unsteady = 0;
    let path = track
        .marker
        .iter()
        .zip(steady)
        .map(|(marker, steady)| {
            let marker = marker.seen().map(display)?;
            let (Some(steady), Some(rest)) = (steady.seen().map(display), rest) else {
                n_unsteady += 1;
                return None;
            };
            Some([
                marker[0] - steady[0] + rest[0],
                marker[1] - steady[1] + rest[1],
            ])
        })
        .collect();
    (path, n_unsteady)
}
