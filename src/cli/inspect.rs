//! `ebbmark inspect CLIP [--stills DIR]`

use super::outcome::{Failure, print};
use super::progress::Progress;
use crate::footage::{
    Footage, FootageError, FrameClock, FrameSource, Limits, StreamFacts, frame_clock, time_scale,
};
use crate::measurement::MeasureError;
use crate::record;
use std::path::{Path, PathBuf};

/// What was typed after `inspect`.
#[derive(Debug, clap::Args)]
pub(super) struct Arguments {
    /// The film
    #[arg(value_name = "CLIP")]
    clip: PathBuf,
    /// Folder for still frames with a grid of display pixels, to read off marker box and scale bar
    #[arg(long, value_name = "DIR")]
    stills: Option<PathBuf>,
    /// Print no progress
    #[arg(long)]
    quiet: bool,
}

/// Number of still frames taken of a film.
const N_STILLS: usize = 5;

/// Decodes the whole film and says what it is.
pub(super) fn run(arguments: &Arguments) -> Result<(), Failure> {
    if let Some(folder) = &arguments.stills {
        record::create_folder(folder)?;
    }
    let mut footage =
        Footage::open(&arguments.clip, Limits::default()).map_err(MeasureError::from)?;
    let facts = footage.facts().clone();
    let wanted = stills_wanted(facts.n_frames_promised);
    let mut stamps = Vec::new();
    let (mut n_intra, mut n_interlaced) = (0, 0);
    {
        let bar = Progress::new(arguments.quiet);
        while let Some(frame) = footage.next_frame().map_err(MeasureError::from)? {
            if let Some(folder) = arguments
                .stills
                .as_ref()
                .filter(|_| wanted.contains(&frame.index))
            {
                record::write_still(folder, frame.index, &frame.luma, &facts.orientation)?;
            }
            n_intra += usize::from(frame.kind == crate::footage::PictureKind::Intra);
            n_interlaced += usize::from(frame.interlaced);
            stamps.push(frame.stamp);
            bar.tell(stamps.len(), facts.n_frames_promised);
        }
    }
    if stamps.is_empty() {
        let error = FootageError::NoPictures {
            path: arguments.clip.clone(),
            n_damaged: footage.n_damaged(),
        };
        return Err(MeasureError::from(error).into());
    }
    let mut text = stream_text(
        &arguments.clip,
        &facts,
        stamps.len(),
        n_intra,
        n_interlaced,
        footage.n_damaged(),
    );
    let (clock, times) =
        frame_clock(&stamps, facts.time_base, &arguments.clip).map_err(MeasureError::from)?;
    text.push_str(&clock_text(&clock, &times.t_s, &facts)?);
    if let Some(folder) = &arguments.stills {
        text.push_str(&format!("Stills         {}\n", folder.display()));
    }
    print(&text)
}

/// Frames to be kept as stills: evenly spread where the container says how many there are, else early ones.
fn stills_wanted(n_frames: Option<usize>) -> Vec<usize> {
    match n_frames {
        Some(n_frames) => (0..N_STILLS)
            .map(|k| k * n_frames.saturating_sub(1) / (N_STILLS - 1))
            .collect(),
        None => vec![0, 15, 30, 60, 120],
    }
}

fn stream_text(
    clip: &Path,
    facts: &StreamFacts,
    n_frames: usize,
    n_intra: usize,
    n_interlaced: usize,
    n_damaged: usize,
) -> String {
    let [coded_width, coded_height] = facts.orientation.coded_size_px();
    let [width, height] = facts.orientation.display_size_px();
    let [aspect_width, aspect_height] = facts.orientation.pixel_aspect();
    let (turn, mirrored) = facts.orientation.turn();
    let mirror = if mirrored { ", mirrored" } else { "" };
    let promised = match facts.n_frames_promised {
        Some(promised) if promised != n_frames => format!(" (the file announces {promised})"),
        _ => String::new(),
    };
    let capture = match &facts.capture_rate_metadata {
        Some((rate_hz, key)) => {
            format!("Capture rate   {rate_hz} Hz by the file's own word ({key})\n")
        }
        None => String::new(),
    };
    format!(
        "Clip           {}\nStream         {} in {}, {}\nPicture        {coded_width} × {coded_height} px coded, {width:.0} × {height:.0} px displayed (turned {turn}°{mirror}, pixel aspect {aspect_width}:{aspect_height})\nFrames         {n_frames}{promised}, {n_intra} of them intra-coded, {n_interlaced} interlaced, {n_damaged} damaged packets or pictures\n{capture}",
        clip.display(),
        facts.codec,
        facts.container,
        facts.pixel_format,
    )
}

fn clock_text(clock: &FrameClock, t_s: &[f64], facts: &StreamFacts) -> Result<String, Failure> {
    let rate_hz = 1.0 / clock.interval_s;
    let (stretch, _) = time_scale(rate_hz, None, facts.capture_rate_metadata.as_ref())
        .map_err(MeasureError::from)?;
    let (first_s, last_s) = (
        t_s.first().copied().unwrap_or(0.0),
        t_s.last().copied().unwrap_or(0.0),
    );
    let kind = if clock.steady {
        "steady: an even grid explains every stamp, and its times are used"
    } else {
        "variable: the stamps are used as they stand"
    };
    let slow = if stretch < 1.0 {
        format!("Slow motion    times are multiplied by {stretch:.6}\n")
    } else {
        String::new()
    };
    Ok(format!(
        "Time           {first_s:.4} s to {last_s:.4} s\nFrame clock    {kind}\nRate           {rate_hz:.4} Hz ({:.4} ms a frame)\nTick           {:.4} ms; stamps rounded to {:.4} ms\nJitter         {:.4} ms rms off the even grid\nGaps           {} frames missing, {} stamps repeated\n{slow}",
        clock.interval_s * 1e3,
        clock.tick_s * 1e3,
        clock.rounding_step_s * 1e3,
        clock.jitter_rms_s * 1e3,
        clock.n_dropped,
        clock.n_repeated,
    ))
}
