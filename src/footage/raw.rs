//! The few things the safe wrapper of FFmpeg does not give: how a pixel format lays out its luma.
#![allow(
    unsafe_code,
    reason = "FFmpeg's pixel-format descriptors and line sizes are reachable through raw pointers only"
)]

use super::luma::Sample;
use ffmpeg_next::ffi::{
    AV_PIX_FMT_FLAG_BE, AV_PIX_FMT_FLAG_BITSTREAM, AV_PIX_FMT_FLAG_HWACCEL, AV_PIX_FMT_FLAG_PAL,
    AV_PIX_FMT_FLAG_RGB,
};
use ffmpeg_next::frame::Video;

/// How the luma of a frame can be read in place; `None` where the frame must be converted first.
///
/// In place means: a plane of its own, one sample a step, little-endian, rows running downwards.
pub(super) fn luma_sample(frame: &Video) -> Option<Sample> {
    let descriptor = frame.format().descriptor()?;
    // SAFETY: `descriptor` points into libavutil's static table of formats, which lives as long as the program.
    let (flags, luma) = unsafe {
        let raw = &*descriptor.as_ptr();
        (raw.flags, raw.comp[0])
    };
    let unfit = [
        AV_PIX_FMT_FLAG_BE,
        AV_PIX_FMT_FLAG_PAL,
        AV_PIX_FMT_FLAG_BITSTREAM,
        AV_PIX_FMT_FLAG_HWACCEL,
        AV_PIX_FMT_FLAG_RGB,
    ]
    .into_iter()
    .any(|flag| flags & u64::try_from(flag).unwrap_or(u64::MAX) != 0);
    // SAFETY: `frame` owns its AVFrame; `linesize` is a plain array of ints.
    let upside_down = unsafe { (*frame.as_ptr()).linesize[0] <= 0 };
    if unfit || upside_down || luma.plane != 0 || luma.offset != 0 {
        return None;
    }
    let (shift, depth) = (
        u32::try_from(luma.shift).ok()?,
        u32::try_from(luma.depth).ok()?,
    );
    match (luma.step, depth) {
        (1, 8) => Some(Sample::Eight),
        (2, 9..=16) => Some(Sample::Sixteen { shift, depth }),
        _ => None,
    }
}
