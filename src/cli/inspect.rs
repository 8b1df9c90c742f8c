//! `ebbmark inspect CLIP [--stills DIR]`

use super::outcome::{Failure, print};
use super::progress::Progress;
use crate::footage::{
    Footage, FootageError, FrameClock, FrameSource, Limits, PictureKind, StreamFacts, frame_clock,
    time_scale, with_patience,
};
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
    /// Show no progress bar
    #[arg(long)]
    quiet: bool,
}

/// Number of still frames taken of a film.
const N_STILLS: usize = 5;

/// What a walk through the film gathers.
#[derive(Default)]
struct Seen {
    stamps: Vec<Option<i64>>,
    n_intra: usize,
    n_interlaced: usize,
}

/// Decodes the whole film and says what it is.
pub(super) fn run(arguments: &Arguments) -> Result<(), Failure> {
    let bar = Progress::new(arguments.quiet);
    let damaged = |failure: &Failure| matches!(failure, Failure::Damaged);
    let (seen, footage) = with_patience(
        &arguments.clip,
        Limits::default(),
        |footage| look(footage, arguments, &bar),
        damaged,
    )?;
    drop(bar);
    let facts = footage.facts();
    if seen.stamps.is_empty() {
        return Err(FootageError::NoPictures {
            path: arguments.clip.clone(),
        }
        .into());
    }
    let mut text = stream_text(&arguments.clip, facts, &seen, footage.n_damaged());
    let (clock, times) = frame_clock(&seen.stamps, facts.time_base, &arguments.clip)?;
    text.push_str(&clock_text(&clock, &times.t_s, facts)?);
    if let Some(folder) = &arguments.stills {
        text.push_str(&format!(
            "Stills         {}\nNext           read marker box and bar ends off the stills, then: ebbmark measure {} --marker X,Y,W,H --scale-bar X1,Y1,X2,Y2 --length METRES\n",
            folder.display(),
            arguments.clip.display()
        ));
    }
    print(&text)
}

/// Walks through the film and keeps stills on the way.
fn look(footage: &mut Footage, arguments: &Arguments, bar: &Progress) -> Result<Seen, Failure> {
    if let Some(folder) = &arguments.stills {
        record::create_folder(folder)?;
    }
    let n_promised = footage.facts().n_frames_promised;
    let orientation = footage.facts().orientation;
    let wanted = stills_wanted(n_promised);
    let mut seen = Seen::default();
    while let Some(frame) = footage.next_frame()? {
        if let Some(folder) = arguments
            .stills
            .as_ref()
            .filter(|_| wanted.contains(&frame.index))
        {
            record::write_still(folder, frame.index, &frame.luma, &orientation)?;
        }
        seen.n_intra += usize::from(frame.kind == PictureKind::Intra);
        seen.n_interlaced += usize::from(frame.interlaced);
        seen.stamps.push(frame.stamp);
        bar.tell(seen.stamps.len(), n_promised);
    }
    Ok(seen)
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

fn stream_text(clip: &Path, facts: &StreamFacts, seen: &Seen, n_damaged: usize) -> String {
    let Seen {
        stamps,
        n_intra,
        n_interlaced,
    } = seen;
    let n_frames = stamps.len();
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
        "Clip           {}\nStream         {} in {}, {}\nPicture        {coded_width} × {coded_height} px coded, {width:.0} × {height:.0} px displayed (turned {turn}°{mirror}, pixel aspect {aspect_width}:{aspect_height})\nFrames         {n_frames}{promised}, {n_intra} of them coded by themselves (I pictures), {n_interlaced} interlaced, {n_damaged} damaged packets or pictures\n{capture}",
        clip.display(),
        facts.codec,
        facts.container,
        facts.pixel_format,
    )
}

fn clock_text(clock: &FrameClock, t_s: &[f64], facts: &StreamFacts) -> Result<String, Failure> {
    let rate_hz = 1.0 / clock.interval_s;
    let (stretch, _) = time_scale(rate_hz, None, facts.capture_rate_metadata.as_ref())?;
    let (first_s, last_s) = (
        t_s.first().copied().unwrap_or(0.0),
        t_s.last().copied().unwrap_or(0.0),
    );
    let kind = if clock.steady {
        "steady: an even grid explains every stamp, and its times are used"
    } else {
        "variable: the stamps are used as they stand"
    };
    let rounding = if (clock.rounding_step_s / clock.interval_s - 1.0).abs() < 1e-9 {
        "all steps between stamps are equal".to_owned()
    } else {
        format!("stamps rounded to {:.4} ms", clock.rounding_step_s * 1e3)
    };
    let slow = if stretch < 1.0 {
        format!("Slow motion    times are multiplied by {stretch:.6}\n")
    } else {
        String::new()
    };
    Ok(format!(
        "Time           {first_s:.4} s to {last_s:.4} s\nFrame clock    {kind}\nRate           {rate_hz:.4} Hz ({:.4} ms a frame)\nTick           {:.4} ms; {}\nJitter         {:.4} ms rms off the even grid\nGaps           {} frames missing, {} stamps repeated\n{slow}",
        clock.interval_s * 1e3,
        clock.tick_s * 1e3,
        rounding,
        clock.jitter_rms_s * 1e3,
        clock.n_dropped,
        clock.n_repeated,
    ))
}
