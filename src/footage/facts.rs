//! What a file says about itself, and what its stamps say about its clock.

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
    /// Clockwise turn for display, degrees (0, 90, 180, 270), and whether the picture is mirrored.
    pub rotation_deg: i32,
    /// True where the display matrix mirrors the picture.
    pub mirrored: bool,
    /// Width over height of a pixel, as a fraction.
    pub pixel_aspect: [u32; 2],
    /// Time base of the stream, s per tick, as a fraction.
    pub time_base: [i64; 2],
    /// Capture rate found in the container's metadata, Hz, with the key it stood under.
    pub capture_rate_metadata: Option<(f64, String)>,
    /// Frames decoded.
    pub n_frames: usize,
    /// Packets or pictures the decoder reported as damaged.
    pub n_damaged: usize,
}

/// How even the clock of the stamps is.
#[derive(Clone, Debug, PartialEq)]
pub struct FrameClock {
    /// True: the stamps lie within one rounding step of a uniform grid, and the grid's times are used.
    pub steady: bool,
    /// Frame interval of the grid (steady) or median interval (variable), s.
    pub interval_s: f64,
    /// One tick of the container's time base, s.
    pub tick_s: f64,
    /// Step to which the stamps are rounded, s; at least one tick.
    pub rounding_step_s: f64,
    /// RMS deviation of the stamps from the uniform grid, s.
    pub jitter_rms_s: f64,
    /// Frames missing from the grid: gaps in the stamps.
    pub n_dropped: usize,
    /// Frames whose stamp does not lie after the one before.
    pub n_repeated: usize,
    /// Standard uncertainty of a frame's time, s: 0 for a steady clock.
    pub u_t_s: f64,
    /// Capture time over file time: 1 for ordinary film; 1/8 for 240 Hz in a 30 Hz file.
    pub time_scale: f64,
}
