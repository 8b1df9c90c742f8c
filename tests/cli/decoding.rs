//! Frame counts and stamps against the system's `ffprobe`.

use crate::cli::bench::{Bench, small_with};
use ebbmark::footage::{Footage, FrameSource, Limits};
use std::path::Path;
use std::process::Command;

/// Stamps of the shown frames in order, by ffprobe, ticks of the stream's time base.
fn by_ffprobe(path: &Path) -> Vec<i64> {
    let output = Command::new("ffprobe")
        .args([
            "-v",
            "error",
            "-select_streams",
            "v:0",
            "-show_entries",
            "frame=best_effort_timestamp",
            "-of",
            "csv=p=0",
        ])
        .arg(path)
        .output()
        .unwrap();
    assert!(
        output.status.success(),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    let text = String::from_utf8(output.stdout).unwrap();
    // A frame with side data ends in a comma, and an empty line may follow it.
    text.lines()
        .filter_map(|line| line.split(',').next()?.parse().ok())
        .collect()
}

fn by_us(path: &Path, threads: usize) -> Vec<i64> {
    let mut footage = Footage::open(
        path,
        Limits {
            threads,
            ..Limits::default()
        },
    )
    .unwrap();
    let mut stamps = Vec::new();
    while let Some(frame) = footage.next_frame().unwrap() {
        stamps.push(frame.stamp.unwrap());
    }
    stamps
}

#[test]
fn frames_and_stamps_are_those_of_ffprobe_for_every_codec_and_container() {
    let bench = Bench::new();
    for (name, codec) in [
        ("plain.mp4", "gop = 30"),
        ("between.mp4", "gop = 30\nb_frames = 2"),
        ("film.mov", "gop = 12\nb_frames = 3"),
        ("film.mkv", "gop = 30"),
        (
            "pictures.avi",
            "name = \"mjpeg\"\npixel_format = \"yuvj420p\"",
        ),
        (
            "ten-bit.mp4",
            "name = \"hevc\"\npixel_format = \"yuv420p10\"",
        ),
        (
            "studio.mov",
            "name = \"prores\"\npixel_format = \"yuv422p10\"",
        ),
        ("web.webm", "name = \"vp9\""),
        ("old.mp4", "name = \"mpeg4\""),
    ] {
        let short = [
            ("duration_s = 6.0", "duration_s = 1.5"),
            ("gop = 30", codec),
        ];
        bench.film(name, &small_with(&short));
        let wanted = by_ffprobe(&bench.path(name));
        assert!(wanted.len() >= 44, "{name}: {}", wanted.len());
        for threads in [1, 2] {
            assert_eq!(
                by_us(&bench.path(name), threads),
                wanted,
                "{name}, {threads} threads"
            );
        }
    }
}

/// ISO/IEC 14496-12 edit lists, as FFmpeg's own muxer writes them for a start that is cut off and for a late start.
#[test]
fn edit_lists_and_start_offsets_are_honoured() {
    let bench = Bench::new();
    bench.film(
        "whole.mp4",
        &small_with(&[
            ("duration_s = 6.0", "duration_s = 2.0"),
            ("gop = 30", "gop = 30\nb_frames = 2"),
        ]),
    );
    let whole = bench.path("whole.mp4");
    for (name, before, after) in [
        ("cut.mp4", &["-ss", "0.5"][..], &["-c", "copy"][..]),
        (
            "late.mp4",
            &["-itsoffset", "0.5"],
            &["-c", "copy", "-avoid_negative_ts", "disabled"],
        ),
    ] {
        let done = Command::new("ffmpeg")
            .args(["-v", "error"])
            .args(before)
            .arg("-i")
            .arg(&whole)
            .args(after)
            .arg(bench.path(name))
            .status();
        assert!(done.unwrap().success());
        let stamps = by_us(&bench.path(name), 2);
        assert_eq!(stamps, by_ffprobe(&bench.path(name)), "{name}");
        assert!(!stamps.is_empty());
    }
    assert!(by_us(&bench.path("late.mp4"), 2)[0] > 0);
    assert!(by_us(&bench.path("cut.mp4"), 2).len() < by_us(&whole, 2).len());
}
