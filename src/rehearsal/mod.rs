//! Films with known truth: a scene, given as TOML, becomes a clip and the truth about every frame of it.
//!
//! In: a [`Scene`]. Out: a video file and, beside it, a [`Truth`] in JSON. Nothing in the pipeline uses this room; the
//! tests, the demo and anyone who wants to know what the pipeline is worth do.
//!
//! The path of a picture: [`Motion`] says where the marker is, [`exposures`] when each picture is taken and which stamp it
//! carries, [`Camera`] what the sensor sees meanwhile; an encoder puts it into a file, and [`Truth`] tells what was planted.
//!
//! Pixels are display pixels: x to the right, y down, the centre of the top-left pixel at (0, 0).

mod backdrop;
mod camera;
mod camera_limits;
mod codec;
mod encoder;
mod equation;
mod error;
mod film;
mod grain;
mod integrate;
mod law;
mod limits;
mod marker;
mod matrix;
mod picture;
mod reading;
mod scene;
mod shutter;
mod sprite;
mod storage;
mod truth;
mod workshop;

pub use camera::Camera;
pub use equation::TurningPoint;
pub use error::RehearsalError;
pub use film::rehearse;
pub use law::Motion;
pub use picture::Picture;
pub use scene::{
    BackgroundScene, CameraScene, Flicker, GliderScene, LawName, LeaveFrame, MarkerKind,
    MarkerScene, MishapScene, MotionScene, Occlusion, Rate, ScaleBarScene, Scene, Texture,
};
pub use shutter::{Exposure, exposures};
pub use storage::{CodecName, CodecScene, PixelFormat, Preset, StampKind, StampScene};
pub use truth::{BarTruth, LawTruth, PixelBox, Truth};
