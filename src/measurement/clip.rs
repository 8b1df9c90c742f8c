//! The clip itself: its check sum, the walk through it, and what can be said of it afterwards.

use super::MeasureError;
use crate::footage::{
    ClipFacts, Footage, FootageError, Limits, Orientation, StreamFacts, with_patience,
};
use crate::run_sheet::FilmRun;
use crate::track::{self, FilmTrack, PixelBox, Plan, TrackError};
use sha2::{Digest, Sha256};
use std::path::Path;

/// SHA-256 of a file, lower-case hexadecimal.
pub(super) fn sha256(path: &Path) -> std::io::Result<String> {
    let mut hasher = Sha256::new();
    std::io::copy(&mut std::fs::File::open(path)?, &mut hasher)?;
    Ok(hasher
        .finalize()
        .iter()
        .map(|byte| format!("{byte:02x}"))
        .collect())
}

/// Walks through a film; where it is damaged once more, with patience.
pub(super) fn walk(
    clip: &Path,
    run: &FilmRun,
    progress: &mut dyn FnMut(usize, Option<usize>),
) -> Result<(FilmTrack, Footage), MeasureError> {
    let work = |footage: &mut Footage| {
        let plan = plan(run, footage.facts())?;
        let n_promised = footage.facts().n_frames_promised;
        Ok(track::walk(footage, &plan, &mut |n| {
            progress(n, n_promised)
        })?)
    };
    let damaged = |error: &MeasureError| {
        matches!(
            error,
            MeasureError::Track(TrackError::Footage(FootageError::Damaged { .. }))
        )
    };
    match with_patience(clip, Limits::default(), work, damaged) {
        Err(MeasureError::Track(TrackError::NoSuchFrame { n_frames: 0, .. })) => {
            Err(FootageError::NoPictures {
                path: clip.to_path_buf(),
            }
            .into())
        }
        other => other,
    }
}

/// What to follow, in coded pixels.
fn plan(run: &FilmRun, facts: &StreamFacts) -> Result<Plan, MeasureError> {
    let orientation = &facts.orientation;
    let [[x1, y1], [x2, y2]] = run.bar_px;
    let marker = coded_box(run.marker_box_px, orientation, "marker")?;
    let steady = run
        .steady_box_px
        .map(|box_px| coded_box(box_px, orientation, "steady"))
        .transpose()?;
    Ok(Plan {
        marker,
        at_frame: run.at_frame,
        steady,
        along: orientation.coded_direction([x2 - x1, y2 - y1]),
    })
}

/// The coded pixels of a display box, which must lie in the picture.
fn coded_box(
    box_px: [f64; 4],
    orientation: &Orientation,
    what: &'static str,
) -> Result<PixelBox, TrackError> {
    let [left, top, width, height] = box_px;
    let [picture_width, picture_height] = orientation.display_size_px();
    // Half a pixel of slack: a box drawn to the very edge is inside.
    if left + width > picture_width + 0.5 || top + height > picture_height + 0.5 {
        return Err(TrackError::OutsidePicture {
            what,
            left,
            top,
            width,
            height,
            picture_width,
            picture_height,
        });
    }
    // Edges, not centres, so that a turn keeps the box' size.
    let corner = |x: f64, y: f64| {
        orientation
            .coded_from_display([x - 0.5, y - 0.5])
            .map(|at| at + 0.5)
    };
    let (a, b) = (corner(left, top), corner(left + width, top + height));
    let span = |axis: usize| {
        let (low, high) = (a[axis].min(b[axis]).round(), a[axis].max(b[axis]).round());
        (whole(low), usize::try_from(whole(high - low)).unwrap_or(0))
    };
    let ((left, width), (top, height)) = (span(0), span(1));
    Ok(PixelBox {
        left,
        top,
        width,
        height,
    })
}

/// Facts of the clip after it was decoded.
pub(super) fn clip_facts(
    footage: &Footage,
    clip: &Path,
    track: &FilmTrack,
    sha256: std::thread::Result<std::io::Result<String>>,
) -> Result<ClipFacts, MeasureError> {
    let unreadable = |reason: String| FootageError::Unreadable {
        path: clip.to_path_buf(),
        reason,
    };
    let sha256 = sha256
        .map_err(|_| unreadable("its check sum could not be taken".to_owned()))?
        .map_err(|error| unreadable(error.to_string()))?;
    let facts = footage.facts().clone();
    let (rotation_deg, mirrored) = facts.orientation.turn();
    Ok(ClipFacts {
        file_name: clip
            .file_name()
            .map_or_else(String::new, |name| name.to_string_lossy().into_owned()),
        sha256,
        container: facts.container,
        codec: facts.codec,
        pixel_format: facts.pixel_format,
        coded_size_px: facts.orientation.coded_size_px(),
        display_size_px: facts.orientation.display_size_px(),
        rotation_deg,
        mirrored,
        pixel_aspect: facts.orientation.pixel_aspect(),
        time_base: facts.time_base,
        capture_rate_metadata: facts.capture_rate_metadata,
        n_frames: track.notes.len(),
        n_frames_promised: facts.n_frames_promised,
        n_damaged: footage.n_damaged(),
        n_interlaced: track.notes.iter().filter(|note| note.interlaced).count(),
    })
}

#[expect(
    clippy::cast_possible_truncation,
    reason = "`as` saturates; the value is a rounded pixel number"
)]
fn whole(value: f64) -> i64 {
    value as i64
}
