//! The part of a scene that says how its film is stored: stamps, codec, layout of the samples.
use serde::Deserialize;

/// The time stamps of the container.
#[derive(Clone, Copy, Debug, Default, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct StampScene {
    /// How they relate to the times of exposure.
    pub kind: StampKind,
    /// Root mean square departure of the exposures from the grid, s; kind "variable" only.
    pub jitter_s: f64,
    /// Ticks a second; 90000, or 600 for kind "rounded", when left out. Matroska and WebM have 1000 whatever is asked.
    pub ticks_per_s: Option<u32>,
}

/// How the stamps relate to the times of exposure.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum StampKind {
    /// Exposures on a uniform grid, and the stamps say so.
    #[default]
    Steady,
    /// Exposures off the grid, and the stamps follow them.
    Variable,
    /// Exposures on the grid, the stamps rounded to coarse ticks.
    Rounded,
}

/// The compression. The container follows from the clip's extension.
#[derive(Clone, Copy, Debug, PartialEq, Deserialize)]
#[serde(deny_unknown_fields, default)]
pub struct CodecScene {
    /// Which codec.
    pub name: CodecName,
    /// Bits a second; constant quality when left out.
    pub bit_rate: Option<u64>,
    /// Constant quality on the encoder's own scale, small is good (h264, hevc, vp9: 0…51 or 63; mpeg4, mjpeg: 1…31).
    pub crf: Option<u32>,
    /// Pictures from one key picture to the next.
    pub gop: u32,
    /// Bidirectional pictures in a row.
    pub b_frames: u32,
    /// Layout of the samples; the codec's usual one when left out.
    pub pixel_format: Option<PixelFormat>,
    /// How hard h264 and hevc try: their encoders' word, from "ultrafast" to "veryslow".
    pub preset: Preset,
    /// Encoder threads. Part of the scene, because some encoders write other bytes with other numbers.
    pub threads: u32,
    /// Slow motion: pictures a second of true time; the stamps then stretch time by `capture_fps`/`rate_hz`.
    /// Written as the text of the key `com.android.capture.fps`; phones write the same key as a binary number, which FFmpeg 5.1 cannot.
    pub capture_fps: Option<f64>,
}

/// A codec, named as in a scene.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum CodecName {
    /// H.264 by libx264.
    H264,
    /// H.265 by libx265.
    Hevc,
    /// Motion JPEG.
    Mjpeg,
    /// VP9 by libvpx.
    Vp9,
    /// ProRes 422.
    Prores,
    /// MPEG-4 part 2.
    Mpeg4,
}

/// Effort of the encoder, by the words of x264 and x265.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum Preset {
    /// No search worth the name: fastest, largest.
    Ultrafast,
    /// A little search.
    Superfast,
    /// The usual one here: about what a phone's encoder does.
    Veryfast,
    /// More reference pictures.
    Faster,
    /// More still.
    Fast,
    /// The encoders' own usual one.
    Medium,
    /// For clips that must be small.
    Slow,
    /// Slower, a few per cent smaller.
    Slower,
    /// Slowest, smallest.
    Veryslow,
}

/// Layout and depth of the stored samples.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Deserialize)]
#[serde(rename_all = "lowercase")]
pub enum PixelFormat {
    /// 8 bits, chroma halved both ways, limited range.
    Yuv420p,
    /// 8 bits, chroma halved both ways, full range.
    Yuvj420p,
    /// 8 bits, chroma halved across, limited range.
    Yuv422p,
    /// 8 bits, chroma halved across, full range.
    Yuvj422p,
    /// 10 bits, chroma halved both ways, limited range.
    Yuv420p10,
    /// 10 bits, chroma halved across, limited range.
    Yuv422p10,
}

impl Default for CodecScene {
    fn default() -> Self {
        Self {
            name: CodecName::H264,
            bit_rate: None,
            crf: None,
            gop: 60,
            b_frames: 0,
            pixel_format: None,
            preset: Preset::Veryfast,
            threads: 1,
            capture_fps: None,
        }
    }
}
