//! `ebbmark rehearse SCENE.toml --out CLIP`

use super::outcome::{Failure, print};
use super::small_text;
use crate::rehearsal::{RehearsalError, Scene, rehearse};
use std::path::{Path, PathBuf};

/// What was typed after `rehearse`.
#[derive(Debug, clap::Args)]
pub(super) struct Arguments {
    /// The scene: law of motion, camera, marker, codec
    #[arg(value_name = "SCENE.toml")]
    scene: PathBuf,
    /// The film to make; its ending chooses the container
    #[arg(long, value_name = "CLIP")]
    out: PathBuf,
    /// Print nothing but errors
    #[arg(long)]
    quiet: bool,
}

/// Makes the film and its truth.
pub(super) fn run(arguments: &Arguments) -> Result<(), Failure> {
    let place = |error: RehearsalError| {
        let sentence = format!("{}: {error}", arguments.scene.display());
        match error {
            RehearsalError::SceneText { .. }
            | RehearsalError::SceneValue { .. }
            | RehearsalError::ClipName { .. } => Failure::usage(sentence),
            _ => Failure::input(sentence),
        }
    };
    let text = small_text::read(&arguments.scene, "scene")?;
    let scene = Scene::from_toml(&text).map_err(place)?;
    refuse_to_replace_footage(&arguments.out)?;
    rehearse(&scene, &arguments.out).map_err(place)?;
    if arguments.quiet {
        return Ok(());
    }
    let truth = arguments.out.with_extension("truth.json");
    print(&format!(
        "Film: {}\nTruth: {}\n",
        arguments.out.display(),
        truth.display()
    ))
}

/// A film with a truth beside it is a rehearsal and may be made anew; any other was filmed by somebody.
fn refuse_to_replace_footage(clip: &Path) -> Result<(), Failure> {
    if clip.exists() && !clip.with_extension("truth.json").exists() {
        return Err(Failure::usage(format!(
            "{}: a film stands there that is no rehearsal (no truth.json beside it); choose another --out",
            clip.display()
        )));
    }
    Ok(())
}
