//! The rehearsal itself: threads take the pictures, one encoder writes them in order, and clip and truth appear together.
use std::fs::{self, File};
use std::io::Write as _;
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, SyncSender, sync_channel};
use std::thread;

use super::camera::Camera;
use super::codec::Luma;
use super::encoder::Encoder;
use super::scene::Scene;
use super::shutter::{self, Exposure};
use super::{RehearsalError, Truth};

/// Pictures that each rendering thread may be ahead of the encoder.
const AHEAD: usize = 2;

/// Films a scene: writes the clip and, beside it, CLIP-STEM.truth.json.
///
/// * `clip_path`: its extension chooses the container. An existing clip and truth are replaced.
/// * Returns the truth that was written.
///
/// Both files are made in a temporary folder beside the clip and renamed into place, so that an interrupted run leaves what was
/// there. Same scene and same FFmpeg, same bytes: rendering does not depend on the number of threads, and encoders run with the
/// scene's.
///
/// # Errors
/// [`RehearsalError`], one sentence each: the scene's values, the clip's name, the encoder, the disk.
pub fn rehearse(scene: &Scene, clip_path: &Path) -> Result<Truth, RehearsalError> {
    super::limits::check(scene)?;
    let unnamed = || RehearsalError::ClipName {
        path: clip_path.to_path_buf(),
    };
    let file_name = clip_path
        .file_name()
        .and_then(|name| name.to_str())
        .ok_or_else(unnamed)?;
    let folder = match clip_path.parent() {
        Some(parent) if parent != Path::new("") => parent,
        _ => Path::new("."),
    };
    if clip_path.extension().is_none() || clip_path.to_str().is_none_or(|path| path.contains('\0'))
    {
        return Err(unnamed());
    }
    let io = |doing: &'static str, path: &Path| {
        let path = path.to_path_buf();
        move |source| RehearsalError::Io {
            doing,
            path,
            source,
        }
    };
    let making = tempfile::Builder::new()
        .prefix(".rehearsal-")
        .tempdir_in(folder)
        .map_err(io("write in", folder))?;
    let made_clip = making.path().join(file_name);
    let camera = Camera::new(scene);
    let exposures = shutter::exposures(scene);
    shoot(scene, &camera, &exposures, &made_clip)?;

    let truth = Truth::new(scene, &camera, &exposures, file_name.to_owned());
    let truth_path = truth_path(clip_path);
    let json = truth.to_json().map_err(|source| RehearsalError::Json {
        path: truth_path.clone(),
        source,
    })?;
    let made_truth = making.path().join("truth.json");
    File::create(&made_truth)
        .and_then(|mut file| file.write_all(json.as_bytes()))
        .map_err(io("write", &truth_path))?;
    fs::rename(&made_clip, clip_path).map_err(io("put in place", clip_path))?;
    fs::rename(&made_truth, &truth_path).map_err(io("put in place", &truth_path))?;
    Ok(truth)
}

/// The clip's path with `.truth.json` in place of its extension.
fn truth_path(clip_path: &Path) -> PathBuf {
    clip_path.with_extension("truth.json")
}

/// Renders and encodes: thread k of n takes pictures k, k + n, …, and the encoder asks the threads in turn.
fn shoot(
    scene: &Scene,
    camera: &Camera,
    exposures: &[Exposure],
    clip_path: &Path,
) -> Result<(), RehearsalError> {
    let mut encoder = Encoder::create(clip_path, scene)?;
    let n_threads = thread::available_parallelism()
        .map_or(1, usize::from)
        .min(exposures.len().max(1));
    thread::scope(|scope| {
        let lanes: Vec<Receiver<Luma>> = (0..n_threads)
            .map(|lane| {
                let (sender, receiver) = sync_channel(AHEAD);
                scope.spawn(move || {
                    render_lane(
                        scene,
                        camera,
                        exposures.iter().skip(lane).step_by(n_threads),
                        &sender,
                    )
                });
                receiver
            })
            .collect();
        for (at, exposure) in exposures.iter().enumerate() {
            let luma = lanes[at % n_threads]
                .recv()
                .map_err(|_| RehearsalError::Renderer { picture: at })?;
            encoder.write(&luma, exposure.stamp_ticks)?;
        }
        // The lanes are dropped with this closure: a thread that still renders finds no taker and ends.
        Ok(())
    })?;
    encoder.finish()
}

fn render_lane<'a>(
    scene: &Scene,
    camera: &Camera,
    exposures: impl Iterator<Item = &'a Exposure>,
    to: &SyncSender<Luma>,
) {
    let codes = scene.codec.layout().codes();
    for exposure in exposures {
        let luma = Luma::stored(&camera.shoot(exposure), scene.camera.rotation_deg, codes);
        if to.send(luma).is_err() {
            return;
        }
    }
}
