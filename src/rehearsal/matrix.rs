//! The two things about a stream that ffmpeg-next has no safe word for: its display matrix and its pixel aspect.
#![allow(
    unsafe_code,
    reason = "stream side data and the stream's own aspect are reached by FFmpeg's raw calls only; nothing else is done here"
)]
use ffmpeg_next::{self as ffmpeg, ffi};

/// One in 16.16 fixed point, and in the 2.30 of the matrix's last column.
const ONE_16: i32 = 1 << 16;
const ONE_30: i32 = 1 << 30;

/// The matrix that turns a stored picture clockwise for display; the translation brings it back to the origin.
///
/// # Source
/// [ISO base media file format](crate::sources::Iso14496_12), track header: row vectors (i, j, 1) times the matrix.
pub(super) fn display_matrix(rotation_deg: u32, stored_width: u32, stored_height: u32) -> [i32; 9] {
    let fixed = |px: u32| i32::try_from(px).unwrap_or(0) * ONE_16;
    let (width, height) = (fixed(stored_width), fixed(stored_height));
    match rotation_deg {
        90 => [0, ONE_16, 0, -ONE_16, 0, 0, height, 0, ONE_30],
        180 => [-ONE_16, 0, 0, 0, -ONE_16, 0, width, height, ONE_30],
        270 => [0, -ONE_16, 0, ONE_16, 0, 0, 0, width, ONE_30],
        _ => [ONE_16, 0, 0, 0, ONE_16, 0, 0, 0, ONE_30],
    }
}

/// Gives the only stream of a file that is about to be written its display matrix and pixel aspect.
///
/// # Errors
/// FFmpeg's "unknown" where there is no stream, "out of memory" where it has none.
pub(super) fn dress_stream(
    output: &mut ffmpeg::format::context::Output,
    matrix: Option<[i32; 9]>,
    aspect: [u32; 2],
) -> Result<(), ffmpeg::Error> {
    // SAFETY: the context is alive and ours; its stream pointers are valid up to nb_streams, and the side data that FFmpeg
    // returns is as long as was asked for, 36 bytes, into which exactly 36 bytes are copied.
    unsafe {
        let context = output.as_mut_ptr();
        if (*context).nb_streams == 0 {
            return Err(ffmpeg::Error::Unknown);
        }
        let stream = *(*context).streams;
        (*stream).sample_aspect_ratio = ffi::AVRational {
            num: aspect[0].cast_signed(),
            den: aspect[1].cast_signed(),
        };
        if let Some(matrix) = matrix {
            let bytes = size_of_val(&matrix);
            let data = ffi::av_stream_new_side_data(
                stream,
                ffi::AVPacketSideDataType::AV_PKT_DATA_DISPLAYMATRIX,
                bytes,
            );
            if data.is_null() {
                return Err(ffmpeg::Error::Other {
                    errno: ffmpeg::error::ENOMEM,
                });
            }
            std::ptr::copy_nonoverlapping(matrix.as_ptr().cast::<u8>(), data, bytes);
        }
    }
    Ok(())
}
