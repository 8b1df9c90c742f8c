//! Input that cannot be used: each an exit code, one sentence, and no file left behind.

use crate::cli::bench::{Bench, SMALL, measure, small_with};
use ebbmark::rehearsal::Truth;

const GOOD_FLAGS: [&str; 6] = [
    "--marker",
    "10,10,24,24",
    "--scale-bar",
    "10,150,250,150",
    "--length",
    "0.2",
];

/// Runs `measure` on a file that is there, and expects that nothing but it is there afterwards.
#[track_caller]
fn refused(bench: &Bench, source: &str, more: &[&str], code: i32, words: &[&str]) {
    let before = bench.names();
    bench
        .run(["measure", source].iter().chain(more))
        .fails(code, words);
    assert_eq!(bench.names(), before, "files were left behind");
}

#[test]
fn files_that_are_no_films_are_refused_by_name() {
    let bench = Bench::new();
    bench.write("empty.mp4", "");
    bench.write(
        "words.mp4",
        "This is a page of text, renamed.\n".repeat(200),
    );
    bench.write(
        "playlist.mp4",
        "#EXTM3U\n#EXTINF:10,\nhttp://127.0.0.1:9/film.ts\n",
    );
    std::fs::create_dir(bench.path("folder.mp4")).unwrap();
    refused(
        &bench,
        "missing.mp4",
        &GOOD_FLAGS,
        3,
        &["missing.mp4", "no such file"],
    );
    refused(
        &bench,
        "folder.mp4",
        &GOOD_FLAGS,
        3,
        &["folder.mp4", "folder"],
    );
    refused(&bench, "empty.mp4", &GOOD_FLAGS, 3, &["empty.mp4", "empty"]);
    refused(
        &bench,
        "words.mp4",
        &GOOD_FLAGS,
        3,
        &["words.mp4", "not a film"],
    );
    refused(
        &bench,
        "playlist.mp4",
        &GOOD_FLAGS,
        3,
        &["playlist.mp4", "not a film"],
    );
    refused(
        &bench,
        "/dev/null",
        &GOOD_FLAGS,
        3,
        &["/dev/null", "ordinary file"],
    );
}

#[test]
fn a_truncated_film_is_refused_and_every_cut_ends_without_a_panic() {
    let bench = Bench::new();
    let truth = bench.film("whole.mp4", SMALL);
    let whole = bench.read("whole.mp4");
    bench.write("cut.mp4", &whole[..whole.len() / 2]);
    let mut names = bench.names();
    bench
        .run(measure("cut.mp4", &truth, &[]))
        .fails(3, &["cut.mp4", "cut short"]);
    assert_eq!(bench.names(), names);
    for at in (0..1000).step_by(37) {
        bench.write("head.mp4", &whole[..at]);
        names = bench.names();
        let done = bench.run(measure("head.mp4", &truth, &[]));
        assert_eq!(done.code, 3, "cut at {at}: {}", done.stderr);
        assert_eq!(bench.names(), names);
    }
}

#[test]
fn sound_alone_and_a_single_picture_are_no_film_of_a_motion() {
    let bench = Bench::new();
    let sound = std::process::Command::new("ffmpeg")
        .args([
            "-v",
            "error",
            "-f",
            "lavfi",
            "-i",
            "sine=duration=1",
            "-c:a",
            "aac",
        ])
        .arg(bench.path("sound.mp4"))
        .status();
    assert!(
        sound.unwrap().success(),
        "the system's ffmpeg is needed to make the sound"
    );
    refused(
        &bench,
        "sound.mp4",
        &GOOD_FLAGS,
        3,
        &["sound.mp4", "no video stream"],
    );
    let truth = bench.film(
        "one.mp4",
        &small_with(&[("duration_s = 6.0", "duration_s = 0.0334")]),
    );
    assert_eq!(truth.marker_px.len(), 1);
    let names = bench.names();
    bench
        .run(measure("one.mp4", &truth, &[]))
        .fails(3, &["one.mp4"]);
    assert_eq!(bench.names(), names);
}

#[test]
fn numbers_that_cannot_be_are_usage_errors_before_the_film_is_touched() {
    let bench = Bench::new();
    let with = |flag: &str, value: &str| {
        let mut flags: Vec<&str> = GOOD_FLAGS.to_vec();
        match flags.iter().position(|known| *known == flag) {
            Some(at) => flags[at + 1] = value,
            None => flags.extend([flag, value]),
        }
        flags
            .iter()
            .map(|&flag| flag.to_owned())
            .collect::<Vec<_>>()
    };
    for (flag, value, word) in [
        ("--marker", "nan,10,24,24", "marker.box_px"),
        ("--marker", "10,10,-24,24", "marker.box_px"),
        ("--marker", "10,10,24", "four numbers"),
        ("--marker", "a,b,c,d", "not a number"),
        ("--scale-bar", "10,10,10,10", "scale bar"),
        ("--scale-bar", "10,10,inf,10", "scale.bar_px"),
        ("--length", "0", "scale.length_m"),
        ("--length", "-0.5", "scale.length_m"),
        ("--length", "NaN", "scale.length_m"),
        ("--length-u", "-1", "scale.u_length_m"),
        ("--clock-ppm", "-5", "time.clock_ppm"),
        ("--capture-rate", "0", "time.capture_rate_hz"),
        ("--readout-ms", "nan", "time.readout_ms"),
        ("--mass", "-0.2", "glider.mass_kg"),
        ("--from", "inf", "time.from_s"),
        ("--at-frame", "-1", "--at-frame"),
        ("--at-frame", "1.5", "--at-frame"),
    ] {
        let flags = with(flag, value);
        let flags: Vec<&str> = flags.iter().map(String::as_str).collect();
        refused(&bench, "missing.mp4", &flags, 2, &[word]);
    }
    refused(&bench, "missing.mp4", &GOOD_FLAGS[2..], 2, &["--marker"]);
    refused(&bench, "missing.mp4", &GOOD_FLAGS[..4], 2, &["--length"]);
    refused(
        &bench,
        "missing.mp4",
        &["--colour", "red"],
        2,
        &["--colour"],
    );
    bench.run::<_, &str>([]).fails(2, &["ebbmark demo"]);
    bench.run(["survey"]).fails(2, &["survey"]);
}

#[test]
fn boxes_that_do_not_fit_the_film_are_usage_errors_that_name_the_picture() {
    let bench = Bench::new();
    bench.film("small.mp4", SMALL);
    let box_of = |marker: &'static str| {
        [
            "--marker",
            marker,
            "--scale-bar",
            "10,150,250,150",
            "--length",
            "0.2",
        ]
    };
    refused(
        &bench,
        "small.mp4",
        &box_of("310,100,24,24"),
        2,
        &["marker box", "320", "180"],
    );
    refused(
        &bench,
        "small.mp4",
        &box_of("5000,5000,24,24"),
        2,
        &["outside the picture"],
    );
    refused(
        &bench,
        "small.mp4",
        &box_of("100,100,4,4"),
        2,
        &["at least 8 px"],
    );
    refused(&bench, "small.mp4", &box_of("0,0,320,180"), 4, &["marker"]);
    let late = [GOOD_FLAGS.as_slice(), &["--at-frame", "900"]].concat();
    refused(&bench, "small.mp4", &late, 2, &["frame 900", "180 frames"]);
    let never = [GOOD_FLAGS.as_slice(), &["--from", "100", "--to", "110"]].concat();
    let done = bench.run(["measure", "small.mp4"].iter().chain(&never));
    assert!(done.code == 2 || done.code == 4, "{}", done.stderr);
}

#[test]
fn a_featureless_marker_is_refused_with_the_reason() {
    let bench = Bench::new();
    let plain = [
        ("size_px = 24.0", "size_px = 24.0\nkind = \"plain\""),
        (
            "length_px = 60.0\nheight_px = 32.0",
            "length_px = 120.0\nheight_px = 60.0",
        ),
    ];
    let truth = bench.film("plain.mp4", &small_with(&plain));
    // A patch in the middle of the plain marker and the plain glider around it.
    let [x, y] = truth.marker_px[0];
    let flags = format!("{},{},14,14", x.round() - 7.0, y.round() - 7.0);
    let names = bench.names();
    let mut arguments = measure("plain.mp4", &truth, &[]);
    arguments[3] = flags;
    bench.run(arguments).fails(4, &["texture", "marker"]);
    assert_eq!(bench.names(), names);
}

#[test]
fn a_film_that_shows_no_oscillation_is_not_measured() {
    let bench = Bench::new();
    let cases: [(&str, &str, &str); 3] = [
        (
            "still.mp4",
            "[scale_bar]",
            "[mishap]\nstill = true\n\n[scale_bar]",
        ),
        (
            "leaves.mp4",
            "[scale_bar]",
            "[mishap]\nleave_frame = { from_s = 3.0, speed_m_per_s = 0.3 }\n\n[scale_bar]",
        ),
        ("short.mp4", "duration_s = 6.0", "duration_s = 1.2"),
    ];
    for ((name, from, to), words) in
        cases
            .into_iter()
            .zip([&["does not move"][..], &["--to"], &["cycles"]])
    {
        let truth: Truth = bench.film(name, &small_with(&[(from, to)]));
        let names = bench.names();
        bench.run(measure(name, &truth, &[])).fails(4, words);
        assert_eq!(bench.names(), names);
    }
}

#[test]
fn an_output_that_cannot_be_is_refused_before_the_film_is_decoded() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    bench.write("taken", "a file of the user's");
    std::fs::create_dir(bench.path("theirs")).unwrap();
    bench.write("theirs/thesis.tex", "years of work");
    let names = bench.names();
    for (out, word) in [
        ("taken", "taken"),
        ("theirs", "thesis.tex"),
        ("no/such/place", "no such folder"),
        ("taken/below", "taken"),
    ] {
        let done = bench.run(measure("small.mp4", &truth, &["--out", out]));
        assert!(done.code == 2 || done.code == 3, "{out}: {}", done.stderr);
        assert!(done.stderr.contains(word), "{out}: {}", done.stderr);
    }
    assert_eq!(bench.names(), names);
    assert_eq!(bench.read("taken"), b"a file of the user's");
}

#[test]
fn sheets_with_mistakes_are_refused_with_line_and_column() {
    let bench = Bench::new();
    bench.write(
        "typo.toml",
        "clip = \"small.mp4\"\n[marker]\nbox = [1, 2, 3, 4]\n",
    );
    refused(
        &bench,
        "typo.toml",
        &[],
        2,
        &["typo.toml", "line 3, column 1", "box"],
    );
    bench.write("broken.toml", "clip = \"small.mp4\n");
    refused(&bench, "broken.toml", &[], 2, &["broken.toml", "line 1"]);
    bench.write("kind.toml", "[scale]\nlength_m = \"half\"\n");
    refused(&bench, "kind.toml", &[], 2, &["kind.toml", "line 2"]);
    bench.write("nobody.toml", "[marker]\nbox_px = [1, 2, 30, 30]\n");
    refused(&bench, "nobody.toml", &[], 2, &["nobody.toml", "clip"]);
    bench.write("bytes.toml", [0xff, 0xfe, 0x00]);
    refused(&bench, "bytes.toml", &[], 3, &["bytes.toml"]);
    refused(&bench, "missing.toml", &[], 3, &["missing.toml"]);
}

#[test]
fn tables_with_mistakes_are_refused_with_their_line() {
    let bench = Bench::new();
    bench.write("bad.csv", "t_s,x_m\n0,0\n0.1,left\n");
    bench.write("few.csv", "t_s,x_m\n0,0\n0.1,1\n0.2,0\n");
    bench.write(
        "back.csv",
        "t_s,x_m\n0,0\n0.1,1\n0.05,0\n0.2,0\n0.3,1\n0.4,0\n0.5,-1\n0.6,0\n0.7,1\n",
    );
    let names = bench.names();
    bench
        .run(["refit", "bad.csv"])
        .fails(3, &["bad.csv", "line 3", "left"]);
    bench.run(["refit", "few.csv"]).fails(4, &["few"]);
    bench
        .run(["refit", "back.csv"])
        .fails(3, &["back.csv", "position 3"]);
    bench
        .run(["refit", "none.csv"])
        .fails(3, &["none.csv", "no such file"]);
    assert_eq!(bench.names(), names);
}

/// A damaged film gives what it can, says so, and gives the same whatever the number of processors or the luck of threads.
#[test]
fn a_damaged_film_is_measured_with_a_warning_and_the_same_every_time() {
    let bench = Bench::new();
    let truth = bench.film("whole.mp4", SMALL);
    let mut bytes = bench.read("whole.mp4");
    let half = bytes.len() / 2;
    for at in (half..half + 3000).step_by(500) {
        bytes[at] ^= 0x55;
    }
    bench.write("hurt.mp4", &bytes);
    let first = bench
        .run(measure("hurt.mp4", &truth, &["--json"]))
        .succeeds()
        .stdout;
    let result: serde_json::Value = serde_json::from_str(&first).unwrap();
    let warned = result["warnings"]
        .as_array()
        .unwrap()
        .iter()
        .any(|warning| warning["key"] == "clip_damaged");
    assert!(warned, "{}", result["warnings"]);
    let off = result["period"]["value"].as_f64().unwrap() / truth.law.damped_period_s - 1.0;
    assert!(off.abs() < 1e-3, "{off}");
    for _ in 0..4 {
        assert!(
            bench
                .run(measure("hurt.mp4", &truth, &["--json"]))
                .succeeds()
                .stdout
                == first
        );
    }
}

#[test]
fn files_of_the_users_own_are_not_replaced() {
    let bench = Bench::new();
    std::fs::create_dir(bench.path("mine")).unwrap();
    bench.write("mine/rail-7.mp4", "a film of mine");
    bench
        .run(["demo", "--out", "mine"])
        .fails(2, &["mine", "rail-7.mp4"]);
    bench.write("holiday.mp4", "another");
    bench.write("scene.toml", SMALL);
    bench
        .run(["rehearse", "scene.toml", "--out", "holiday.mp4"])
        .fails(2, &["holiday.mp4", "rehearsal"]);
    assert_eq!(bench.read("mine/rail-7.mp4"), b"a film of mine");
    assert_eq!(bench.read("holiday.mp4"), b"another");
}

#[test]
fn a_name_that_would_steer_a_terminal_stays_on_one_line() {
    let bench = Bench::new();
    bench
        .run(["inspect", "no\nsuch\u{1b}[31m.mp4"])
        .fails(3, &["no such file"]);
    bench.run(["refit", "a\nb.csv"]).fails(3, &["no such file"]);
}
