//! Outside checks of the tracking room: scores another library computed, and films whose every position is known.

mod film;
mod opencv;
mod walking;
