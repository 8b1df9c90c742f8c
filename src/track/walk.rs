//! Through the film once, and back over its beginning.
//!
//! From the start frame on, the marker is followed as the frames are decoded: nothing but sightings and one line of luma
//! a frame is kept. What lies before the start frame is followed backwards in groups of frames short enough to be held.

use super::follow::Follower;
use super::sighting::SightingOutcome;
use super::streak_line::StreakLines;
use super::template::PixelBox;
use super::{FilmTrack, FrameNote, Plan, TrackError};
use crate::footage::{Frame, FrameSource, LumaCopy, LumaView};
use std::collections::BTreeMap;

/// Luma held at a time while the beginning is followed backwards, bytes.
const HELD_BYTES: usize = 96 << 20;
/// Largest and least number of frames held; the least keeps very large pictures from being decoded again for each frame.
const MOST_HELD_FRAMES: usize = 64;
const LEAST_HELD_FRAMES: usize = 8;

/// Follows the marker (and the steady patch) through every frame of a film.
///
/// * `progress` is told the number of frames done after each.
///
/// # Errors
/// [`TrackError`]: the film fails, the start frame does not exist or is damaged, or a box cannot be used.
pub fn walk(
    source: &mut dyn FrameSource,
    plan: &Plan,
    progress: &mut dyn FnMut(usize),
) -> Result<FilmTrack, TrackError> {
    let mut notes: Vec<FrameNote> = Vec::new();
    let mut clock = EvenClock::default();
    let mut crew: Option<Crew> = None;
    let mut held_size = 0;
    while let Some(frame) = source.next_frame()? {
        let index = notes.len();
        notes.push(FrameNote::of(&frame));
        let time = clock.tick(frame.stamp);
        if index == plan.at_frame {
            if frame.damaged {
                return Err(TrackError::DamagedStart { frame: index });
            }
            held_size = frame.luma.width() * frame.luma.height();
            crew = Some(Crew::start(&frame.luma, plan)?);
        }
        if let Some(crew) = crew.as_mut() {
            let luma = (!frame.damaged).then_some(&frame.luma);
            crew.see(index, luma, time);
        }
        progress(notes.len());
    }
    let Some(crew) = crew else {
        return Err(TrackError::NoSuchFrame {
            frame: plan.at_frame,
            n_frames: notes.len(),
        });
    };
    let mut track = crew.into_track(notes);
    if plan.at_frame > 0 {
        let held = (HELD_BYTES / held_size.max(1)).clamp(LEAST_HELD_FRAMES, MOST_HELD_FRAMES);
        walk_back(source, plan, held, &mut track)?;
    }
    Ok(track)
}

/// Follows the marker from the start frame to the first, group by group.
fn walk_back(
    source: &mut dyn FrameSource,
    plan: &Plan,
    held: usize,
    track: &mut FilmTrack,
) -> Result<(), TrackError> {
    let mut crew: Option<Crew> = None;
    let mut clock = EvenClock::default();
    // The start frame is part of the first group: the backward followers need its picture too.
    let mut end = plan.at_frame + 1;
    while end > 0 {
        let begin = end.saturating_sub(held);
        let mut group = collect(source, &track.notes, begin, end)?;
        for index in (begin..end).rev() {
            let copy = group.remove(&index);
            let time = clock.tick(track.notes[index].stamp.map(|stamp| stamp.saturating_neg()));
            if index == plan.at_frame {
                let Some(copy) = copy.as_ref() else {
                    return Err(TrackError::DamagedStart { frame: index });
                };
                crew = Some(Crew::start(&copy.view(), plan)?);
            }
            if let Some(crew) = crew.as_mut() {
                let view = copy.as_ref().map(LumaCopy::view);
                let luma = view.as_ref().filter(|_| !track.notes[index].damaged);
                crew.see(index, luma, time);
            }
        }
        end = begin;
    }
    if let Some(crew) = crew {
        track.take_beginning(crew.into_track(Vec::new()), plan.at_frame);
    }
    Ok(())
}

/// Copies of the frames `begin..end`, told by their stamps; one that does not come again is missing.
fn collect(
    source: &mut dyn FrameSource,
    notes: &[FrameNote],
    begin: usize,
    end: usize,
) -> Result<BTreeMap<usize, LumaCopy>, TrackError> {
    let wanted: BTreeMap<i64, usize> = (begin..end)
        .filter_map(|index| Some((notes[index].stamp?, index)))
        .collect();
    let mut group = BTreeMap::new();
    let (Some((&first, _)), Some((&last, _))) = (wanted.first_key_value(), wanted.last_key_value())
    else {
        return Ok(group);
    };
    source.go_to(first, begin)?;
    while let Some(frame) = source.next_frame()? {
        let Some(stamp) = frame.stamp else { continue };
        if let Some(&index) = wanted.get(&stamp) {
            group.insert(index, frame.luma.to_copy());
        }
        if stamp >= last {
            break;
        }
    }
    Ok(group)
}

/// Everyone who looks at a frame: the marker's follower, the steady patch's, and the streak.
struct Crew {
    marker: Follower,
    steady: Option<Follower>,
    marker_seen: BTreeMap<usize, SightingOutcome>,
    steady_seen: BTreeMap<usize, SightingOutcome>,
    streaks: [StreakLines; 2],
    last_p_px: [f64; 2],
    start: crate::footage::GreyPicture,
    start_shrunk_by: usize,
}

/// Widest still that is kept of the start frame, px.
const MOST_STILL_WIDTH: usize = 1280;

impl Crew {
    fn start(luma: &LumaView<'_>, plan: &Plan) -> Result<Self, TrackError> {
        let follower = |pixel_box: PixelBox, what| {
            Follower::new(luma, pixel_box, plan.along, what, plan.at_frame)
        };
        let [x, y] = plan.along;
        let streak = |direction| {
            StreakLines::new(
                plan.marker.centre_px(),
                direction,
                luma.width(),
                luma.height(),
            )
        };
        let shrunk_by = luma
            .width()
            .max(luma.height())
            .div_ceil(MOST_STILL_WIDTH)
            .max(1);
        Ok(Self {
            marker: follower(plan.marker, "marker")?,
            steady: plan
                .steady
                .map(|pixel_box| follower(pixel_box, "steady"))
                .transpose()?,
            marker_seen: BTreeMap::new(),
            steady_seen: BTreeMap::new(),
            // Along the bar, where the motion is as a rule, and across it, for a bar that stands upright.
            streaks: [streak([x, y]), streak([-y, x])],
            last_p_px: plan.marker.centre_px(),
            start: luma.shrunk(shrunk_by),
            start_shrunk_by: shrunk_by,
        })
    }

    /// Looks at one frame; `None` stands for a damaged or missing picture.
    fn see(&mut self, index: usize, luma: Option<&LumaView<'_>>, time: f64) {
        let Some(luma) = luma else {
            self.marker_seen.insert(index, SightingOutcome::Damaged);
            self.steady_seen.insert(index, SightingOutcome::Damaged);
            return;
        };
        let outcome = self.marker.step(luma, time);
        if let Some(sighting) = outcome.seen() {
            self.last_p_px = sighting.p_px;
        }
        self.marker_seen.insert(index, outcome);
        if let Some(steady) = self.steady.as_mut() {
            self.steady_seen.insert(index, steady.step(luma, time));
        }
        for streak in &mut self.streaks {
            streak.keep(index, luma, self.last_p_px);
        }
    }

    fn into_track(self, notes: Vec<FrameNote>) -> FilmTrack {
        let n_frames = notes.len().max(
            self.marker_seen
                .keys()
                .next_back()
                .map_or(0, |last| last + 1),
        );
        let all = |seen: &BTreeMap<usize, SightingOutcome>| {
            (0..n_frames)
                .map(|index| seen.get(&index).copied().unwrap_or(SightingOutcome::Lost))
                .collect::<Vec<_>>()
        };
        FilmTrack {
            notes,
            marker: all(&self.marker_seen),
            steady: self.steady.is_some().then(|| all(&self.steady_seen)),
            streaks: self.streaks,
            start_picture: self.start,
            start_shrunk_by: self.start_shrunk_by,
        }
    }
}

/// A clock for prediction: frame intervals as its unit, gaps counted, and no harm from stamps that stand still.
#[derive(Default)]
struct EvenClock {
    time: f64,
    last_stamp: Option<i64>,
    intervals: Vec<i64>,
}

impl EvenClock {
    /// Intervals remembered to know a usual one.
    const REMEMBERED: usize = 9;
    /// Longest gap that is believed, in frames.
    const MOST_STEPS: f64 = 10.0;

    fn tick(&mut self, stamp: Option<i64>) -> f64 {
        let interval = self
            .last_stamp
            .zip(stamp)
            .map(|(last, stamp)| stamp.saturating_sub(last))
            .filter(|&interval| interval > 0);
        let step = match (interval, self.usual()) {
            (Some(interval), Some(usual)) => {
                (to_f64(interval) / to_f64(usual)).clamp(0.5, Self::MOST_STEPS)
            }
            _ => 1.0,
        };
        if let Some(interval) = interval {
            if self.intervals.len() == Self::REMEMBERED {
                self.intervals.remove(0);
            }
            self.intervals.push(interval);
        }
        self.last_stamp = stamp.or(self.last_stamp);
        self.time += step;
        self.time
    }

    fn usual(&self) -> Option<i64> {
        let mut sorted = self.intervals.clone();
        sorted.sort_unstable();
        sorted.get(sorted.len() / 2).copied()
    }
}

#[expect(
    clippy::cast_precision_loss,
    reason = "intervals between frames in ticks"
)]
fn to_f64(ticks: i64) -> f64 {
    ticks as f64
}

impl FrameNote {
    fn of(frame: &Frame<'_>) -> Self {
        Self {
            stamp: frame.stamp,
            kind: frame.kind,
            damaged: frame.damaged,
            interlaced: frame.interlaced,
        }
    }
}
