//! Tracking error of a clip whose truth is known.
//!
//! Usage: `cargo run --release --example tracking_error -- CLIP TRUTH.json X,Y,W,H [AT_FRAME]`
//!
//! The truth file holds `marker_px`, the marker's centre in display pixels for every frame. Printed: the constant offset of
//! the box' centre from the marker's, the rms error about it right and down, and how the sightings' own uncertainties
//! compare with their errors (1 is right, below 1 they are too large).
#![allow(clippy::print_stdout, reason = "it prints its figures")]

use ebbmark::footage::{Footage, Limits};
use ebbmark::track::{PixelBox, Plan, walk};
use std::error::Error;

/// Error right and down, and the sighting's own uncertainty, px.
type Miss = ([f64; 2], f64);

fn main() -> Result<(), Box<dyn Error>> {
    let mut arguments = std::env::args().skip(1);
    let mut next = || {
        arguments
            .next()
            .ok_or("usage: CLIP TRUTH.json X,Y,W,H [AT_FRAME]")
    };
    let (clip, truth, marker) = (next()?, next()?, next()?);
    let at_frame = next().map_or(Ok(0), |text| text.parse())?;
    let truth: serde_json::Value = serde_json::from_slice(&std::fs::read(truth)?)?;
    let wanted: Vec<[f64; 2]> = serde_json::from_value(truth["marker_px"].clone())?;
    let sides: Vec<usize> = marker
        .split(',')
        .map(str::parse)
        .collect::<Result<_, _>>()?;
    let [left, top, width, height] = sides[..] else {
        return Err("the box is X,Y,W,H".into());
    };
    let marker = PixelBox {
        left: left.try_into()?,
        top: top.try_into()?,
        width,
        height,
    };
    let mut footage = Footage::open(clip.as_ref(), Limits::default())?;
    let orientation = footage.facts().orientation;
    let plan = Plan {
        marker,
        at_frame,
        steady: None,
        along: [1.0, 0.0],
    };
    let track = walk(&mut footage, &plan, &mut |_| {})?;

    let mut errors = Vec::new();
    for (outcome, wanted) in track.marker.iter().zip(&wanted) {
        if let Some(sighting) = outcome.seen() {
            let found = orientation.display_from_coded(sighting.p_px);
            errors.push((
                [found[0] - wanted[0], found[1] - wanted[1]],
                sighting.u_along_px([1.0, 0.0]),
            ));
        }
    }
    let mean =
        |value: &dyn Fn(&Miss) -> f64| errors.iter().map(value).sum::<f64>() / errors.len() as f64;
    let offset = [mean(&|(error, _)| error[0]), mean(&|(error, _)| error[1])];
    let rms = |axis: usize| mean(&|(error, _)| (error[axis] - offset[axis]).powi(2)).sqrt();
    let normalised = mean(&|(error, u)| ((error[0] - offset[0]) / u).powi(2)).sqrt();
    println!("frames found  {} of {}", errors.len(), wanted.len());
    println!("offset        {:+.4} {:+.4} px", offset[0], offset[1]);
    println!("rms error     {:.4} {:.4} px", rms(0), rms(1));
    println!(
        "mean u        {:.4} px; rms of error/u {normalised:.2}",
        mean(&|(_, u)| *u)
    );
    Ok(())
}
