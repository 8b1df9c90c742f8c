//! The result folder: composed in memory, written into a hidden sibling, renamed into place.
//!
//! Whatever stood at the destination stays until the new folder is complete, and comes back if the last rename fails.

use std::fs::{self, File};
use std::io::{self, Write as _};
use std::path::{Path, PathBuf};

use super::error::RecordError;
use super::json::result_json_text;
use super::report::report_html;
use super::streak::streak_png;
use super::tables::{cycles_csv, positions_csv};
use crate::measurement::Measurement;

/// Every name a result folder can hold; a folder with anything else in it is not ours to replace.
const OUR_NAMES: [&str; 6] = [
    "result.json",
    "positions.csv",
    "cycles.csv",
    "report.html",
    "streak.png",
    "run.toml",
];

/// Where the new and the old folder wait while they change places: beside the destination, so that a rename suffices.
const STAGING_PREFIX: &str = ".ebbmark-";

/// A file of the result: its name and its bytes.
type Entry = (&'static str, Vec<u8>);

/// Writes the result folder of a measurement, replacing an earlier result at the same place.
///
/// `run_toml` is the sheet that repeats the run, its paths counted from `out_dir`.
/// `out_dir` appears complete or stays as it was. A table has no film and so no `streak.png`.
///
/// # Errors
/// Those of [`check_destination`]; [`RecordError::Compose`] where a part cannot be made; [`RecordError::Write`],
/// [`RecordError::Replace`] or [`RecordError::Stranded`] where the disk refuses.
pub fn write(measurement: &Measurement, run_toml: &str, out_dir: &Path) -> Result<(), RecordError> {
    let destination = resolve(out_dir)?;
    refuse_what_is_not_ours(&destination)?;
    place(&compose(measurement, run_toml)?, &destination)
}

/// Finds out, before the work begins, whether a result can be written to `out_dir`; leaves nothing behind.
///
/// # Errors
/// [`RecordError::NoName`], [`RecordError::DestinationIsFile`], [`RecordError::ForeignFolder`],
/// [`RecordError::ParentMissing`] or [`RecordError::NotWritable`].
pub fn check_destination(out_dir: &Path) -> Result<(), RecordError> {
    let destination = resolve(out_dir)?;
    refuse_what_is_not_ours(&destination)?;
    staging_beside(&destination).map(drop)
}

/// All files of a result, in memory, so that nothing is written unless all of them can be made.
fn compose(measurement: &Measurement, run_toml: &str) -> Result<Vec<Entry>, RecordError> {
    let mut entries = vec![
        ("result.json", result_json_text(measurement).into_bytes()),
        ("positions.csv", positions_csv(measurement)?),
        ("cycles.csv", cycles_csv(measurement)?),
        ("report.html", report_html(measurement)?.into_bytes()),
        ("run.toml", run_toml.as_bytes().to_vec()),
    ];
    if let Some(png) = streak_png(measurement)? {
        entries.push(("streak.png", png));
    }
    Ok(entries)
}

/// The folder a path stands for: links are followed, or the rename would replace the link and leave its target.
fn resolve(out_dir: &Path) -> Result<PathBuf, RecordError> {
    // `name/.` and `name/` are `name`: a rename cannot be asked of them.
    let out_dir = &out_dir.components().collect::<PathBuf>();
    if fs::symlink_metadata(out_dir).is_ok_and(|facts| facts.is_symlink()) {
        return fs::canonicalize(out_dir).map_err(|source| RecordError::NotWritable {
            parent: out_dir.to_owned(),
            source,
        });
    }
    match out_dir.file_name() {
        Some(_) => Ok(out_dir.to_owned()),
        None => Err(RecordError::NoName {
            path: out_dir.to_owned(),
        }),
    }
}

fn parent_of(destination: &Path) -> &Path {
    match destination.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent,
        _ => Path::new("."),
    }
}

fn refuse_what_is_not_ours(destination: &Path) -> Result<(), RecordError> {
    let parent = parent_of(destination);
    if !parent.is_dir() {
        return Err(RecordError::ParentMissing {
            parent: parent.to_owned(),
        });
    }
    match fs::metadata(destination) {
        Err(error) if error.kind() == io::ErrorKind::NotFound => Ok(()),
        Err(source) => Err(RecordError::NotWritable {
            parent: destination.to_owned(),
            source,
        }),
        Ok(facts) if facts.is_dir() => match first_stranger(destination)? {
            Some(stranger) => Err(RecordError::ForeignFolder {
                path: destination.to_owned(),
                stranger,
            }),
            None => Ok(()),
        },
        Ok(_) => Err(RecordError::DestinationIsFile {
            path: destination.to_owned(),
        }),
    }
}

/// The alphabetically first entry of a folder that is not a plain file with one of our names.
fn first_stranger(folder: &Path) -> Result<Option<String>, RecordError> {
    let refused = |source| RecordError::NotWritable {
        parent: folder.to_owned(),
        source,
    };
    let mut strangers = Vec::new();
    for entry in fs::read_dir(folder).map_err(refused)? {
        let entry = entry.map_err(refused)?;
        let name = entry.file_name().to_string_lossy().into_owned();
        let is_file = entry.file_type().map_err(refused)?.is_file();
        if !(is_file && OUR_NAMES.contains(&name.as_str())) {
            strangers.push(name);
        }
    }
    Ok(strangers.into_iter().min())
}

fn staging_beside(destination: &Path) -> Result<tempfile::TempDir, RecordError> {
    let parent = parent_of(destination);
    tempfile::Builder::new()
        .prefix(STAGING_PREFIX)
        .tempdir_in(parent)
        .map_err(|source| RecordError::NotWritable {
            parent: parent.to_owned(),
            source,
        })
}

/// Writes the entries into a staging folder and lets them take the destination's place.
fn place(entries: &[Entry], destination: &Path) -> Result<(), RecordError> {
    let staging = staging_beside(destination)?;
    // A folder inside the staging folder: the latter is readable by its owner alone, a result should follow the user's habit.
    let new = staging.path().join("new");
    fs::create_dir(&new).map_err(|source| RecordError::Write {
        path: new.clone(),
        source,
    })?;
    for (name, bytes) in entries {
        write_file(&new.join(name), bytes).map_err(|source| RecordError::Write {
            path: destination.join(name),
            source,
        })?;
    }
    exchange(&new, staging, destination)
}

fn write_file(path: &Path, bytes: &[u8]) -> io::Result<()> {
    let mut file = File::create_new(path)?;
    file.write_all(bytes)?;
    // Before the rename, or a power cut could leave a complete folder of empty files.
    file.sync_all()
}

/// Old folder out, new folder in. Between the two renames there is no folder; a failure there brings the old one back.
fn exchange(new: &Path, staging: tempfile::TempDir, destination: &Path) -> Result<(), RecordError> {
    let refused = |source| RecordError::Replace {
        path: destination.to_owned(),
        source,
    };
    let old = staging.path().join("old");
    let had_old = destination.exists();
    if had_old {
        fs::rename(destination, &old).map_err(refused)?;
    }
    let Err(source) = fs::rename(new, destination) else {
        return Ok(());
    };
    if had_old && fs::rename(&old, destination).is_err() {
        // The staging folder now holds the only copy: it must outlive this run.
        let kept = staging.keep().join("old");
        return Err(RecordError::Stranded {
            path: destination.to_owned(),
            kept,
            source,
        });
    }
    Err(refused(source))
}

#[cfg(test)]
mod tests {
    use super::*;

    fn names(folder: &Path) -> Vec<String> {
        let mut names: Vec<String> = fs::read_dir(folder)
            .unwrap()
            .map(|e| e.unwrap().file_name().into_string().unwrap())
            .collect();
        names.sort();
        names
    }

    #[test]
    fn a_failed_write_leaves_the_old_folder_and_nothing_else() {
        let room = tempfile::tempdir().unwrap();
        let destination = room.path().join("run.ebbmark");
        place(&[("result.json", b"old".to_vec())], &destination).unwrap();
        // The second name lies in a folder that does not exist, so the write fails half way.
        let broken = [
            ("result.json", b"new".to_vec()),
            ("missing/report.html", b"new".to_vec()),
        ];
        let error = place(&broken, &destination).unwrap_err();
        assert!(matches!(error, RecordError::Write { .. }), "{error}");
        assert_eq!(fs::read(destination.join("result.json")).unwrap(), b"old");
        assert_eq!(names(room.path()), ["run.ebbmark"]);
    }

    #[test]
    fn a_new_folder_that_cannot_move_in_brings_the_old_one_back() {
        let room = tempfile::tempdir().unwrap();
        let destination = room.path().join("run.ebbmark");
        place(&[("result.json", b"old".to_vec())], &destination).unwrap();
        let staging = staging_beside(&destination).unwrap();
        let error =
            exchange(&staging.path().join("never made"), staging, &destination).unwrap_err();
        assert!(matches!(error, RecordError::Replace { .. }), "{error}");
        assert_eq!(fs::read(destination.join("result.json")).unwrap(), b"old");
        assert_eq!(names(room.path()), ["run.ebbmark"]);
    }

    #[test]
    fn a_replaced_folder_keeps_nothing_of_the_old_one() {
        let room = tempfile::tempdir().unwrap();
        let destination = room.path().join("run.ebbmark");
        place(&[("streak.png", b"old".to_vec())], &destination).unwrap();
        place(&[("result.json", b"new".to_vec())], &destination).unwrap();
        assert_eq!(names(&destination), ["result.json"]);
        assert_eq!(names(room.path()), ["run.ebbmark"]);
    }
}
