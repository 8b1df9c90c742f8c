//! What can go wrong in a rehearsal, sorted by whose fault it is: the scene's text, its values, the encoder, the disk.
use std::path::PathBuf;

/// Why there is no film. Each message is one sentence: what, where, what to do.
#[derive(Debug, thiserror::Error)]
pub enum RehearsalError {
    /// The scene is not TOML, or holds a key or word that no scene has.
    #[error("the scene cannot be read at line {line}, column {column}: {message}")]
    SceneText {
        /// Line of the offending text, from 1.
        line: usize,
        /// Column of the offending text in characters, from 1.
        column: usize,
        /// What the parser says about it, without a final stop.
        message: String,
    },
    /// A value that no film can be made of.
    #[error("the scene's {key} cannot be {found}: {wanted}")]
    SceneValue {
        /// The key with its table, such as `camera.rate_hz`.
        key: &'static str,
        /// The value found, as text.
        found: String,
        /// What the key accepts.
        wanted: &'static str,
    },
    /// The clip's path has no file name, or no extension to choose a container by.
    #[error(
        "{path:?} does not name a clip: give a file name whose extension names a container, such as .mp4, .mov, .mkv or .webm"
    )]
    ClipName {
        /// The path as given.
        path: PathBuf,
    },
    /// This FFmpeg was built without the encoder.
    #[error(
        "the FFmpeg on this system has no {encoder} encoder: choose another codec.name or install one that has it"
    )]
    EncoderMissing {
        /// FFmpeg's name of the encoder.
        encoder: &'static str,
    },
    /// FFmpeg refused something.
    #[error(
        "FFmpeg could not {doing} for {path:?} ({source}): check that codec.pixel_format and the container fit codec.name"
    )]
    Ffmpeg {
        /// What was being done.
        doing: &'static str,
        /// The clip that was to be written.
        path: PathBuf,
        /// FFmpeg's answer.
        source: ffmpeg_next::Error,
    },
    /// The folder could not be written to.
    #[error(
        "could not {doing} {path:?} ({source}): check the folder, its rights and the space on the disk"
    )]
    Io {
        /// What was being done.
        doing: &'static str,
        /// File or folder.
        path: PathBuf,
        /// The system's answer.
        source: std::io::Error,
    },
    /// A thread that renders ended before its last picture; the film is not kept.
    #[error(
        "rendering stopped before picture {picture}: this is a defect of ours, please report it with the scene"
    )]
    Renderer {
        /// Index of the first picture that is missing.
        picture: usize,
    },
    /// The truth could not be put into JSON.
    #[error(
        "the truth of {path:?} could not be written as JSON ({source}): report it with the scene"
    )]
    Json {
        /// The truth file.
        path: PathBuf,
        /// The writer's answer.
        source: serde_json::Error,
    },
}

/// Stops a number outside its range.
pub(super) fn within(
    key: &'static str,
    found: f64,
    low: f64,
    high: f64,
    wanted: &'static str,
) -> Result<(), RehearsalError> {
    // NaN is in no range, so that this stops it too.
    require((low..=high).contains(&found), key, found, wanted)
}

/// Stops a value that does not fit.
pub(super) fn require(
    fits: bool,
    key: &'static str,
    found: impl ToString,
    wanted: &'static str,
) -> Result<(), RehearsalError> {
    if fits {
        Ok(())
    } else {
        Err(RehearsalError::SceneValue {
            key,
            found: found.to_string(),
            wanted,
        })
    }
}
