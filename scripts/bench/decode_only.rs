//! Decodes a clip and looks at nothing: what `measure` is compared with.
//!
//! Usage: `cargo run --release --example decode_only -- CLIP [THREADS]`
#![allow(clippy::print_stdout, reason = "it prints its figures")]

use ebbmark::footage::{Footage, FrameSource, Limits};
use std::error::Error;

fn main() -> Result<(), Box<dyn Error>> {
    let mut arguments = std::env::args().skip(1);
    let clip = arguments.next().ok_or("usage: CLIP [THREADS]")?;
    let threads = arguments.next().map_or(Ok(0), |text| text.parse())?;
    let mut footage = Footage::open(
        clip.as_ref(),
        Limits {
            threads,
            ..Limits::default()
        },
    )?;
    let mut n_frames = 0;
    while footage.next_frame()?.is_some() {
        n_frames += 1;
    }
    println!("{n_frames} frames");
    Ok(())
}
