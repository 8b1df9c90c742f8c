//! Single files and folders outside a result: the demo's clip, still frames.

use std::fs;
use std::io::Write as _;
use std::path::{Path, PathBuf};

use super::error::RecordError;

/// Makes a folder, and those above it, where it does not exist yet.
///
/// # Errors
/// [`RecordError::NotWritable`] where the system refuses, or a file stands there.
pub fn create_folder(folder: &Path) -> Result<(), RecordError> {
    fs::create_dir_all(folder).map_err(|source| RecordError::NotWritable {
        parent: folder.to_owned(),
        source,
    })
}

/// Writes a file whole or not at all: into a temporary sibling, then renamed.
///
/// # Errors
/// [`RecordError::Write`] where the disk refuses; what stood there is still there.
pub fn write_file(path: &Path, bytes: &[u8]) -> Result<(), RecordError> {
    let folder = match path.parent() {
        Some(parent) if !parent.as_os_str().is_empty() => parent.to_owned(),
        _ => PathBuf::from("."),
    };
    let failed = |source| RecordError::Write {
        path: path.to_owned(),
        source,
    };
    let mut builder = tempfile::Builder::new();
    // Temporary files are for their owner alone; a clip or a still is for whom the system's mask says.
    #[cfg(unix)]
    builder.permissions(std::os::unix::fs::PermissionsExt::from_mode(0o666));
    let mut file = builder
        .prefix(".ebbmark-")
        .tempfile_in(folder)
        .map_err(failed)?;
    file.write_all(bytes).map_err(failed)?;
    file.persist(path).map_err(|error| failed(error.error))?;
    Ok(())
}
