//! What can go wrong when a result is written.

use std::io;
use std::path::PathBuf;

/// Why a result folder was not written. Whatever stood at the destination is still there.
#[derive(Debug, thiserror::Error)]
pub enum RecordError {
    /// The destination has no name of its own (`/`, `..`).
    #[error("{path}: this is not a name for a result folder; give --out a folder that may be made anew", path = .path.display())]
    NoName {
        /// The destination as given.
        path: PathBuf,
    },
    /// A plain file stands where the folder should go.
    #[error("{path}: a file stands where the result folder should go; move it away or choose another --out", path = .path.display())]
    DestinationIsFile {
        /// The destination.
        path: PathBuf,
    },
    /// The folder there holds something that no measurement wrote.
    #[error("{path}: this folder holds {stranger:?}, which is not part of a result, and will not be replaced; choose another --out", path = .path.display())]
    ForeignFolder {
        /// The destination.
        path: PathBuf,
        /// Name of the first entry, in alphabetical order, that is not ours.
        stranger: String,
    },
    /// The folder that should hold the result folder does not exist.
    #[error("{parent}: there is no such folder to put the result into; make it first or choose another --out", parent = .parent.display())]
    ParentMissing {
        /// The folder that is missing.
        parent: PathBuf,
    },
    /// Nothing can be written beside the destination.
    #[error("{parent}: nothing can be written there ({source}); choose another --out", parent = .parent.display())]
    NotWritable {
        /// The folder that refused.
        parent: PathBuf,
        /// The system's reason.
        source: io::Error,
    },
    /// A file of the result could not be written.
    #[error("{path}: could not be written ({source}); make room or choose another --out", path = .path.display())]
    Write {
        /// The file.
        path: PathBuf,
        /// The system's reason.
        source: io::Error,
    },
    /// The finished folder could not take its place; what stood there is back.
    #[error("{path}: the new result could not be moved into place ({source}); close what holds the folder open and run again", path = .path.display())]
    Replace {
        /// The destination.
        path: PathBuf,
        /// The system's reason.
        source: io::Error,
    },
    /// The finished folder could not take its place, and neither could the old one return.
    #[error("{path}: the new result could not be moved into place ({source}); the earlier one is safe in {kept}, move it back by hand", path = .path.display(), kept = .kept.display())]
    Stranded {
        /// The destination.
        path: PathBuf,
        /// Where the earlier result lies now.
        kept: PathBuf,
        /// The system's reason.
        source: io::Error,
    },
    /// A part of the record could not be made from the measurement.
    #[error("{part}: could not be made ({reason}); please report this with the run sheet")]
    Compose {
        /// File or figure.
        part: &'static str,
        /// What the maker said.
        reason: String,
    },
}

impl RecordError {
    /// For `map_err`: a part that could not be made, with the maker's reason.
    pub(super) fn compose<E: std::fmt::Display>(part: &'static str) -> impl Fn(E) -> Self {
        move |error| Self::Compose {
            part,
            reason: error.to_string(),
        }
    }
}
