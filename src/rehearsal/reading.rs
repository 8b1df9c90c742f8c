//! A scene from its text: parsed, then checked, so that what comes out can be filmed.
use super::scene::Scene;
use super::{RehearsalError, limits};

impl Scene {
    /// A scene from its TOML text, checked: what this returns can be filmed.
    ///
    /// # Errors
    /// [`RehearsalError::SceneText`] with line and column for text that is not a scene, [`RehearsalError::SceneValue`] for a value outside its limits.
    pub fn from_toml(text: &str) -> Result<Self, RehearsalError> {
        let scene: Self = toml::from_str(text).map_err(|error| {
            let (line, column) = line_and_column(text, error.span().map_or(0, |span| span.start));
            RehearsalError::SceneText {
                line,
                column,
                message: error.message().trim().replace('\n', "; "),
            }
        })?;
        limits::check(&scene)?;
        Ok(scene)
    }
}

/// Line and column, from 1, of a byte offset; columns count characters.
fn line_and_column(text: &str, offset: usize) -> (usize, usize) {
    let before = text.get(..offset).unwrap_or(text);
    let line_start = before.rfind('\n').map_or(0, |at| at + 1);
    (
        before.matches('\n').count() + 1,
        before[line_start..].chars().count() + 1,
    )
}
