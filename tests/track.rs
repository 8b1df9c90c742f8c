//! Outside checks of the tracking room: scores another library computed, and films whose every position is known.

#[path = "track/film.rs"]
mod film;
#[path = "track/opencv.rs"]
mod opencv;
#[path = "track/walking.rs"]
mod walking;
