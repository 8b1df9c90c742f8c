//! Following a marker from frame to frame: predict, look, accept or lose it, find it again.

use super::TrackError;
use super::search::{CoarseTemplate, Match, search_window};
use super::sighting::{Sighting, SightingOutcome};
use super::template::{PixelBox, Template};
use crate::footage::LumaView;
use crate::number::to_f64;

/// Least score that can be a marker at all.
const LEAST_SCORE: f64 = 0.5;
/// Share of the usual score below which the marker counts as covered. Smear at full speed costs a third of the score on
/// rehearsed films; half a hand over the marker costs more.
const COVERED_SHARE: f64 = 0.6;
/// Share of the usual score needed to believe a marker found again somewhere.
const FOUND_AGAIN_SHARE: f64 = 0.75;
/// Contrast of a match over the template's, at the least and at the most. Correlation knows no contrast: a faint stain on a
/// wall can resemble a marker in everything else. Smear and a dim light halve a marker's contrast, no more.
const CONTRAST: std::ops::RangeInclusive<f64> = 0.3..=3.0;
/// How quickly the usual score follows: the mean of about this many frames.
const USUAL_SCORE_FRAMES: f64 = 30.0;
/// Least half-width of the search window around a prediction, px.
const LEAST_RADIUS_PX: f64 = 5.0;
/// Share of the last step by which a prediction may be off: with three sightings it errs by (ω Δt)³ of the amplitude.
const RADIUS_PER_STEP: f64 = 0.25;
/// Largest half-width of a search window, px, before the whole picture is searched instead.
const MOST_RADIUS_PX: f64 = 120.0;

/// Follows one patch through the frames, forwards or backwards.
#[derive(Clone, Debug)]
pub struct Follower {
    template: Template,
    coarse: Option<CoarseTemplate>,
    /// Offset of the box' centre from its corner, px.
    half_px: [f64; 2],
    /// The latest sightings: time and corner, newest last, three at most, none older than a loss.
    history: Vec<(f64, [f64; 2])>,
    last_corner_px: [f64; 2],
    usual_score: f64,
    lost_run: usize,
    scratch: Vec<i16>,
}

impl Follower {
    /// A follower for a box drawn in a frame.
    ///
    /// * `along`: direction of the motion in coded px, as far as it is known; `what`: `marker` or `steady`, for messages.
    ///
    /// # Errors
    /// [`TrackError`]: the box cannot be used, with the reason.
    pub fn new(
        luma: &LumaView<'_>,
        pixel_box: PixelBox,
        along: [f64; 2],
        what: &'static str,
        frame: usize,
    ) -> Result<Self, TrackError> {
        let template = Template::of_box(luma, pixel_box, along, what, frame)?;
        let corner = [pixel_box.left, pixel_box.top].map(|at| usize::try_from(at).unwrap_or(0));
        let coarse = CoarseTemplate::of_box(
            luma,
            corner[0],
            corner[1],
            pixel_box.width,
            pixel_box.height,
        );
        let half_px = [pixel_box.width, pixel_box.height].map(|side| (to_f64(side) - 1.0) / 2.0);
        let last_corner_px = corner.map(to_f64);
        Ok(Self {
            template,
            coarse,
            half_px,
            history: Vec::new(),
            last_corner_px,
            usual_score: 1.0,
            lost_run: 0,
            scratch: Vec::new(),
        })
    }

    /// Looks for the patch in the next frame.
    ///
    /// * `time`: any clock that runs evenly with the frames, forwards or backwards; only differences count.
    pub fn step(&mut self, luma: &LumaView<'_>, time: f64) -> SightingOutcome {
        let found = self.look(luma, time);
        let Some(Match {
            corner_px,
            covariance_px2,
            score,
            ..
        }) = found
        else {
            self.lost_run += 1;
            self.history.clear();
            return SightingOutcome::Lost;
        };
        if self.history.len() == 3 {
            self.history.remove(0);
        }
        self.history.push((time, corner_px));
        self.last_corner_px = corner_px;
        self.lost_run = 0;
        self.usual_score += (score - self.usual_score) / USUAL_SCORE_FRAMES;
        SightingOutcome::Seen(Sighting {
            p_px: [
                corner_px[0] + self.half_px[0],
                corner_px[1] + self.half_px[1],
            ],
            covariance_px2,
            match_score: score,
        })
    }

    fn look(&mut self, luma: &LumaView<'_>, time: f64) -> Option<Match> {
        let covered = (COVERED_SHARE * self.usual_score).max(LEAST_SCORE);
        let (corner, radius) = self.predict(time);
        let near = |radius: f64, scratch: &mut Vec<i16>, template: &Template| {
            search_window(luma, template, corner, whole(radius), scratch)
                .filter(|found| found.score >= covered && CONTRAST.contains(&found.contrast))
        };
        if self.lost_run == 0 {
            // Twice: the second window, four times as wide, catches a knock or a frame the stamps do not know of.
            for radius in [radius, 4.0 * radius + 8.0] {
                if let Some(found) = near(
                    radius.min(MOST_RADIUS_PX),
                    &mut self.scratch,
                    &self.template,
                ) {
                    return Some(found);
                }
            }
        }
        let again = (FOUND_AGAIN_SHARE * self.usual_score).max(LEAST_SCORE);
        self.coarse
            .as_ref()?
            .search_picture(luma, &self.template, &mut self.scratch)
            .filter(|found| found.score >= again && CONTRAST.contains(&found.contrast))
    }

    /// Expected corner and half-width of the window around it, px: the polynomial through the last sightings.
    fn predict(&self, time: f64) -> ([f64; 2], f64) {
        let step = |a: [f64; 2], b: [f64; 2]| (a[0] - b[0]).hypot(a[1] - b[1]);
        match self.history[..] {
            // Nothing is known of the speed yet: a marker moves by less than its own size from frame to frame.
            [] => (
                self.last_corner_px,
                2.0 * self.half_px[0].max(self.half_px[1]) + LEAST_RADIUS_PX,
            ),
            [(_, only)] => (
                only,
                2.0 * self.half_px[0].max(self.half_px[1]) + LEAST_RADIUS_PX,
            ),
            [(t0, p0), (t1, p1)] => {
                let share = (time - t0) / (t1 - t0);
                let corner = [0, 1].map(|axis| p0[axis] + share * (p1[axis] - p0[axis]));
                (corner, LEAST_RADIUS_PX + step(p1, p0))
            }
            [.., (t0, p0), (t1, p1), (t2, p2)] => {
                // Lagrange's form: frames need not be evenly spaced.
                let l0 = (time - t1) * (time - t2) / ((t0 - t1) * (t0 - t2));
                let l1 = (time - t0) * (time - t2) / ((t1 - t0) * (t1 - t2));
                let l2 = (time - t0) * (time - t1) / ((t2 - t0) * (t2 - t1));
                let corner = [0, 1].map(|axis| l0 * p0[axis] + l1 * p1[axis] + l2 * p2[axis]);
                (corner, LEAST_RADIUS_PX + RADIUS_PER_STEP * step(p2, p1))
            }
        }
    }
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "a radius of at most MOST_RADIUS_PX"
)]
fn whole(radius: f64) -> i64 {
    radius.ceil() as i64
}
