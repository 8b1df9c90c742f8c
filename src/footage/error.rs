//! Why a file could not be used as footage.

use std::path::PathBuf;

/// Every variant is the file's or the caller's fault, never a bug of ours; each says what to do.
#[derive(Debug, thiserror::Error)]
#[non_exhaustive]
pub enum FootageError {
    /// Nothing stands at the path.
    #[error("{}: there is no such file; check the name of the clip", path.display())]
    Missing {
        /// The path asked for.
        path: PathBuf,
    },
    /// The path names a folder.
    #[error("{}: this is a folder; name the film inside it", path.display())]
    Folder {
        /// The path asked for.
        path: PathBuf,
    },
    /// The path names a pipe, a device or a socket.
    #[error("{}: this is not an ordinary file; copy the film to disk first", path.display())]
    NotAFile {
        /// The path asked for.
        path: PathBuf,
    },
    /// The file holds no bytes.
    #[error("{}: the file is empty; copy the clip from the phone again", path.display())]
    Empty {
        /// The path asked for.
        path: PathBuf,
    },
    /// The file is larger than the limit.
    #[error("{}: the file has {bytes} bytes and the limit is {limit}; cut the clip to the oscillation", path.display())]
    TooLarge {
        /// The path asked for.
        path: PathBuf,
        /// Its size.
        bytes: u64,
        /// The limit.
        limit: u64,
    },
    /// The system refused to read the file.
    #[error("{}: cannot be read: {reason}; check its permissions", path.display())]
    Unreadable {
        /// The path asked for.
        path: PathBuf,
        /// The system's words.
        reason: String,
    },
    /// The name cannot be handed to FFmpeg.
    #[error("{}: the file's name is not valid UTF-8; rename the clip", path.display())]
    NameNotText {
        /// The path asked for.
        path: PathBuf,
    },
    /// FFmpeg recognises no film in the bytes.
    #[error("{}: is not a film that can be read ({reason}); the file may be cut short or no film at all: copy it again, or re-save it as MP4", path.display())]
    NotAFilm {
        /// The path asked for.
        path: PathBuf,
        /// FFmpeg's words.
        reason: String,
    },
    /// The container has no video stream.
    #[error("{}: holds no video stream (sound only?); name a clip with a picture", path.display())]
    NoVideo {
        /// The path asked for.
        path: PathBuf,
    },
    /// The codec is not built into the system's FFmpeg, or refused the stream.
    #[error("{}: the video codec {codec} cannot be decoded here ({reason}); re-save the clip as H.264", path.display())]
    Codec {
        /// The path asked for.
        path: PathBuf,
        /// FFmpeg's name of the codec.
        codec: String,
        /// FFmpeg's words.
        reason: String,
    },
    /// The pictures are larger than the limit.
    #[error("{}: its pictures have {width} × {height} px and the limit is {limit_px} px in all; film at a smaller size", path.display())]
    PictureTooLarge {
        /// The path asked for.
        path: PathBuf,
        /// Coded width, px.
        width: u32,
        /// Coded height, px.
        height: u32,
        /// Limit on width × height.
        limit_px: u64,
    },
    /// The display matrix turns by something else than a right angle.
    #[error("{}: its display matrix turns the picture by an angle that is no multiple of 90°; re-save the clip", path.display())]
    OddTurn {
        /// The path asked for.
        path: PathBuf,
    },
    /// A packet or picture is damaged, and the limits say to stop there.
    #[error("{}: frame {frame} is damaged; decode it with one thread to patch it up", path.display())]
    Damaged {
        /// The path asked for.
        path: PathBuf,
        /// Frame number, from 0, of the first that could not be had.
        frame: usize,
    },
    /// No picture came out of the decoder.
    #[error("{}: not one picture could be decoded; the film is damaged or empty: copy the clip again", path.display())]
    NoPictures {
        /// The path asked for.
        path: PathBuf,
    },
    /// The film is longer than the limit.
    #[error("{}: more than {limit} frames; cut the clip to the oscillation", path.display())]
    TooLong {
        /// The path asked for.
        path: PathBuf,
        /// Limit on the number of frames.
        limit: usize,
    },
    /// The pictures change size half-way.
    #[error("{}: frame {frame} has {width} × {height} px, unlike those before it; cut the clip there", path.display())]
    SizeChanged {
        /// The path asked for.
        path: PathBuf,
        /// Frame number, from 0.
        frame: usize,
        /// Its width, px.
        width: u32,
        /// Its height, px.
        height: u32,
    },
    /// A picture could not be turned into grey.
    #[error("{}: frame {frame} could not be read as grey ({reason}); re-save the clip as H.264, 4:2:0", path.display())]
    Conversion {
        /// The path asked for.
        path: PathBuf,
        /// Frame number, from 0.
        frame: usize,
        /// FFmpeg's words.
        reason: String,
    },
    /// Going back in the film failed.
    #[error("{}: cannot go back in the film to frame {frame} ({reason}); mark the marker in frame 0 instead", path.display())]
    Seek {
        /// The path asked for.
        path: PathBuf,
        /// Frame number, from 0.
        frame: usize,
        /// FFmpeg's words.
        reason: String,
    },
    /// The stamps give no time base to measure with.
    #[error("{}: its frames carry no usable time stamps ({reason}); give the frame rate with --capture-rate, or re-save the clip as MP4", path.display())]
    NoStamps {
        /// The path asked for.
        path: PathBuf,
        /// What is wrong with them.
        reason: String,
    },
    /// A capture rate that cannot be.
    #[error(
        "capture rate {rate_hz} Hz: must be a finite number above 0; give the rate the phone filmed at, for example 240"
    )]
    CaptureRate {
        /// The rate given.
        rate_hz: f64,
    },
}
