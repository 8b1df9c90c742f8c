//! Twice, if need be: fast, and where the film is damaged again with patience.

use super::{Damage, Footage, FootageError, Limits};
use std::path::Path;

/// Opens a film and works through it with all threads; where damage is met, opens it anew and works through it with one.
///
/// * `work` starts from the first frame each time and must not keep anything of a first attempt.
/// * `damaged` tells whether an error of `work` is [`FootageError::Damaged`].
///
/// # Errors
/// What opening says, or `work`.
pub fn with_patience<T, E: From<FootageError>>(
    path: &Path,
    limits: Limits,
    mut work: impl FnMut(&mut Footage) -> Result<T, E>,
    damaged: impl Fn(&E) -> bool,
) -> Result<(T, Footage), E> {
    let mut footage = Footage::open(path, limits)?;
    match work(&mut footage) {
        Err(error) if damaged(&error) => {
            let mut footage = Footage::open(
                path,
                Limits {
                    damage: Damage::Patch,
                    ..limits
                },
            )?;
            let done = work(&mut footage)?;
            Ok((done, footage))
        }
        other => Ok((other?, footage)),
    }
}
