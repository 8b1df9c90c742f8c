//! The sheet that repeats a run, its paths counted from the result folder it lies in.

use super::outcome::Failure;
use crate::measurement::MeasureError;
use crate::run_sheet::RunSheet;
use std::path::{Component, Path, PathBuf};

/// `run.toml` of a film.
pub(super) fn film_sheet(sheet: &RunSheet, clip: &Path, folder: &Path) -> Result<String, Failure> {
    Ok(sheet
        .with_source(&relative(clip, folder)?)
        .to_toml()
        .map_err(MeasureError::from)?)
}

/// `run.toml` of a table.
pub(super) fn table_sheet(
    sheet: &RunSheet,
    table: &Path,
    folder: &Path,
) -> Result<String, Failure> {
    Ok(sheet
        .with_table(&relative(table, folder)?)
        .to_toml()
        .map_err(MeasureError::from)?)
}

/// The way from a folder, which need not exist yet, to a file; slashes on every system.
fn relative(file: &Path, folder: &Path) -> Result<String, Failure> {
    let unknown = |path: &Path, error: std::io::Error| {
        Failure::input(format!(
            "{}: cannot be found again ({error})",
            path.display()
        ))
    };
    let file = std::fs::canonicalize(file).map_err(|error| unknown(file, error))?;
    let parent = folder
        .parent()
        .filter(|parent| !parent.as_os_str().is_empty())
        .unwrap_or(Path::new("."));
    let mut from = std::fs::canonicalize(parent).map_err(|error| unknown(parent, error))?;
    from.extend(folder.file_name());
    let way = way(&from, &file).to_string_lossy().into_owned();
    // Elsewhere a backslash is a letter like others.
    Ok(if cfg!(windows) {
        way.replace('\\', "/")
    } else {
        way
    })
}

/// The way between two absolute paths; the second itself where they share no root.
fn way(from: &Path, to: &Path) -> PathBuf {
    let (from, parts): (Vec<Component<'_>>, Vec<Component<'_>>) =
        (from.components().collect(), to.components().collect());
    let n_shared = from.iter().zip(&parts).take_while(|(a, b)| a == b).count();
    if n_shared == 0 {
        return to.to_path_buf();
    }
    let up = from[n_shared..].iter().map(|_| Component::ParentDir);
    up.chain(parts[n_shared..].iter().copied()).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_way_goes_up_and_down_again() {
        assert_eq!(
            way(Path::new("/a/b/out"), Path::new("/a/b/clip.mp4")),
            Path::new("../clip.mp4")
        );
        assert_eq!(
            way(Path::new("/a/out"), Path::new("/a/films/x/clip.mp4")),
            Path::new("../films/x/clip.mp4")
        );
        assert_eq!(
            way(Path::new("/a"), Path::new("/a/clip.mp4")),
            Path::new("clip.mp4")
        );
    }
}
