//! `ebbmark rehearse SCENE.toml --out CLIP`

use super::outcome::{Failure, print};
use crate::rehearsal::{RehearsalError, Scene, rehearse};
use std::path::PathBuf;

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
    let text = std::fs::read_to_string(&arguments.scene).map_err(|error| {
        Failure::input(format!(
            "{}: the scene cannot be read ({error}); check its name",
            arguments.scene.display()
        ))
    })?;
    let scene = Scene::from_toml(&text).map_err(place)?;
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
