//! What a file says about itself.

use super::Orientation;

/// Facts of a video stream known before the first frame is decoded.
#[derive(Clone, Debug, PartialEq)]
pub struct StreamFacts {
    /// Container's name as FFmpeg gives it.
    pub container: String,
    /// Codec's name as FFmpeg gives it.
    pub codec: String,
    /// Pixel format's name as FFmpeg gives it.
    pub pixel_format: String,
    /// How coded pixels lie on the display.
    pub orientation: Orientation,
    /// Time base of the stream, s per tick, as a fraction.
    pub time_base: [i64; 2],
    /// Frames the container promises; None where it does not say.
    pub n_frames_promised: Option<usize>,
    /// Capture rate found in the container's metadata, Hz, with the key it stood under.
    pub capture_rate_metadata: Option<(f64, String)>,
}

/// Facts of the video stream a clip was measured from.
#[derive(Clone, Debug, PartialEq)]
pub struct ClipFacts {
    /// File name without its folder.
    pub file_name: String,
    /// SHA-256 of the file, lower-case hexadecimal.
    pub sha256: String,
    /// Container's name as FFmpeg gives it.
    pub container: String,
    /// Codec's name as FFmpeg gives it.
    pub codec: String,
    /// Pixel format's name as FFmpeg gives it.
    pub pixel_format: String,
    /// Width and height of the coded picture, px.
    pub coded_size_px: [u32; 2],
    /// Width and height as displayed: after rotation and pixel aspect, px.
    pub display_size_px: [f64; 2],
    /// Clockwise turn for display, degrees: 0, 90, 180 or 270.
    pub rotation_deg: i32,
    /// True where the display matrix mirrors the picture (left and right exchanged before the turn).
    pub mirrored: bool,
    /// Width over height of a pixel, as a fraction.
    pub pixel_aspect: [u32; 2],
    /// Time base of the stream, s per tick, as a fraction.
    pub time_base: [i64; 2],
    /// Capture rate found in the container's metadata, Hz, with the key it stood under.
    pub capture_rate_metadata: Option<(f64, String)>,
    /// Frames decoded.
    pub n_frames: usize,
    /// Frames the container promises; None where it does not say.
    pub n_frames_promised: Option<usize>,
    /// Packets or pictures the decoder reported as damaged.
    pub n_damaged: usize,
    /// Frames made of two fields taken one after the other.
    pub n_interlaced: usize,
}
