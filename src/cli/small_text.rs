//! Text that a person wrote: a run sheet, a scene.

use super::outcome::Failure;
use std::path::Path;

/// Longest text that is read, bytes: no sheet comes near it, and a hostile one must not fill the memory.
const MOST_BYTES: u64 = 1 << 20;

/// Reads a text file of at most a megabyte.
///
/// * `what`: `run sheet` or `scene`, for messages.
///
/// # Errors
/// A sentence with exit code 3: missing, no ordinary file, too long, not UTF-8.
pub(super) fn read(path: &Path, what: &str) -> Result<String, Failure> {
    let failed = |reason: String| {
        Failure::input(format!(
            "{}: the {what} cannot be read ({reason}); check its name",
            path.display()
        ))
    };
    let facts = std::fs::metadata(path).map_err(|error| failed(error.to_string()))?;
    if !facts.is_file() {
        return Err(failed("no ordinary file".to_owned()));
    }
    if facts.len() > MOST_BYTES {
        return Err(failed(format!(
            "{} bytes, and {MOST_BYTES} are the most",
            facts.len()
        )));
    }
    std::fs::read_to_string(path).map_err(|error| failed(error.to_string()))
}
