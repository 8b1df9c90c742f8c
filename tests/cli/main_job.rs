//! The main job on films whose truth is known.

use crate::cli::bench::{Bench, SMALL, measure, names, small_with};
use ebbmark::rehearsal::Truth;
use serde_json::Value;

const RESULT_FILES: [&str; 6] = [
    "cycles.csv",
    "positions.csv",
    "report.html",
    "result.json",
    "run.toml",
    "streak.png",
];

/// A quantity's value, its expanded uncertainty (k = 2) and its difference from the truth, printed for the reader.
#[track_caller]
fn compare(result: &Value, key: &str, truth: f64) -> (f64, f64) {
    let value = result[key]["value"].as_f64().unwrap();
    let expanded = 2.0 * result[key]["u"].as_f64().unwrap();
    println!(
        "{key}: {value:.9} ± {expanded:.2e}, truth {truth:.9}: {:+.2e} ({:+.1} ppm)",
        value - truth,
        (value / truth - 1.0) * 1e6
    );
    assert!(value.is_finite() && expanded.is_finite() && expanded > 0.0);
    (value - truth, expanded)
}

/// Root mean square of the sightings' distance along x from the truth, a common offset taken off, px.
fn tracking_rms_px(positions: &[u8], truth: &Truth) -> f64 {
    let mut table = csv::Reader::from_reader(positions);
    let header = table.headers().unwrap().clone();
    let column = header.iter().position(|name| name == "x_px").unwrap();
    let off: Vec<f64> = table
        .records()
        .enumerate()
        .filter_map(|(frame, row)| {
            row.unwrap()[column]
                .parse::<f64>()
                .ok()
                .map(|x_px| x_px - truth.marker_px[frame][0])
        })
        .collect();
    let mean = off.iter().sum::<f64>() / off.len() as f64;
    (off.iter().map(|off| (off - mean).powi(2)).sum::<f64>() / off.len() as f64).sqrt()
}

/// Closeness asked of the demo: 20 ppm of the period with the clock taken as exact, 0.03 px of tracking.
#[test]
fn the_demo_finds_the_truth_that_was_planted_in_it() {
    let bench = Bench::new();
    let done = bench.run(["demo"]).succeeds();
    assert!(
        done.stdout
            .contains("ebbmark-demo/rail-7.ebbmark/report.html"),
        "{}",
        done.stdout
    );
    assert_eq!(
        names(&bench.path("ebbmark-demo/rail-7.ebbmark")),
        RESULT_FILES
    );
    let text = include_str!("../../fixtures/demo/rail-7.truth.json");
    let truth: Truth = serde_json::from_str(text).unwrap();
    bench
        .run([
            "measure",
            "ebbmark-demo/rail-7.ebbmark/run.toml",
            "--clock-ppm",
            "0",
            "--quiet",
        ])
        .succeeds();
    let result = bench.json("rail-7.ebbmark/result.json");
    let (off, _) = compare(&result, "period", truth.law.damped_period_s);
    assert!((off / truth.law.damped_period_s).abs() < 20e-6);
    for (key, truth) in [
        ("period", truth.law.damped_period_s),
        ("damping_ratio", truth.law.damping_ratio),
        ("amplitude", truth.law.amplitude_m),
        (
            "energy_loss_per_cycle",
            truth.law.energy_loss_per_cycle.unwrap(),
        ),
    ] {
        let (off, expanded) = compare(&result, key, truth);
        assert!(off.abs() < expanded, "{key}");
    }
    let rms_px = tracking_rms_px(&bench.read("rail-7.ebbmark/positions.csv"), &truth);
    println!("tracking: {rms_px:.4} px rms");
    assert!(rms_px <= 0.03);
}

#[test]
fn two_runs_and_a_run_from_the_sheet_give_the_same_bytes() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    for out in ["one", "two"] {
        bench
            .run(measure(
                "small.mp4",
                &truth,
                &["--out", out, "--mass", "0.2411", "--quiet"],
            ))
            .succeeds();
    }
    bench
        .run(["measure", "one/run.toml", "--out", "three", "--quiet"])
        .succeeds();
    for name in RESULT_FILES {
        let wanted = bench.read(&format!("one/{name}"));
        assert!(!wanted.is_empty());
        for out in ["two", "three"] {
            assert!(
                bench.read(&format!("{out}/{name}")) == wanted,
                "{out}/{name} differs"
            );
        }
    }
    std::fs::create_dir(bench.path("elsewhere")).unwrap();
    bench
        .run([
            "measure",
            "one/run.toml",
            "--out",
            "elsewhere/four",
            "--quiet",
        ])
        .succeeds();
    assert!(
        bench.read("elsewhere/four/result.json") == bench.read("one/result.json"),
        "a result depends on its place"
    );
}

#[test]
fn a_box_drawn_in_a_later_frame_gives_the_same_motion() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    bench
        .run(measure("small.mp4", &truth, &["--out", "first", "--quiet"]))
        .succeeds();
    let mut arguments = measure(
        "small.mp4",
        &truth,
        &["--out", "later", "--quiet", "--at-frame", "100"],
    );
    let marker = truth.marker_box_at(100).unwrap();
    arguments[3] = format!("{},{},{},{}", marker.x, marker.y, marker.w, marker.h);
    bench.run(arguments).succeeds();
    let (first, later) = (
        bench.json("first/result.json"),
        bench.json("later/result.json"),
    );
    for result in [&first, &later] {
        let (off, expanded) = compare(result, "damping_ratio", truth.law.damping_ratio);
        assert!(off.abs() < expanded);
        assert_eq!(result["frames"]["n_used"], 180);
    }
}

#[test]
fn a_film_turned_by_its_display_matrix_gives_the_same_figures() {
    let bench = Bench::new();
    for rotation in [0, 90, 180, 270] {
        let scene = small_with(&[(
            "exposure_s = 0.004",
            &format!("exposure_s = 0.004\nrotation_deg = {rotation}"),
        )]);
        let name = format!("turned-{rotation}.mp4");
        let truth = bench.film(&name, &scene);
        bench
            .run(measure(&name, &truth, &["--out", "out", "--quiet"]))
            .succeeds();
        let result = bench.json("out/result.json");
        assert_eq!(result["clip"]["rotation_deg"], rotation);
        for (key, truth) in [
            ("period", truth.law.damped_period_s),
            ("amplitude", truth.law.amplitude_m),
            ("damping_ratio", truth.law.damping_ratio),
        ] {
            let (off, expanded) = compare(&result, key, truth);
            assert!(off.abs() < expanded, "{rotation}°: {key}");
        }
        assert!(tracking_rms_px(&bench.read("out/positions.csv"), &truth) < 0.05);
    }
}

#[test]
fn slow_motion_is_measured_in_capture_time_from_the_file_or_from_the_user() {
    let bench = Bench::new();
    let slow = [
        ("rate_hz = 30", "rate_hz = 30"),
        ("duration_s = 6.0", "duration_s = 2.4"),
        ("gop = 30", "gop = 30\ncapture_fps = 120.0"),
    ];
    let truth = bench.film("slow.mp4", &small_with(&slow));
    bench
        .run(measure(
            "slow.mp4",
            &truth,
            &["--out", "told", "--capture-rate", "120", "--quiet"],
        ))
        .succeeds();
    let (off, expanded) = compare(
        &bench.json("told/result.json"),
        "period",
        truth.law.damped_period_s,
    );
    assert!(off.abs() < expanded);
    bench
        .run(measure("slow.mp4", &truth, &["--out", "read", "--quiet"]))
        .succeeds();
    let read = bench.json("read/result.json");
    let (off, expanded) = compare(&read, "period", truth.law.damped_period_s);
    assert!(off.abs() < expanded);
    let warned = read["warnings"]
        .as_array()
        .unwrap()
        .iter()
        .any(|warning| warning["key"] == "slow_motion");
    assert!(warned, "a stretch taken from the file must be said");
}

#[test]
fn a_hand_before_the_marker_costs_frames_but_not_the_figures() {
    let bench = Bench::new();
    let hand = [(
        "[scale_bar]",
        "[mishap]\nocclusion = { from_s = 2.5, to_s = 3.0 }\n\n[scale_bar]",
    )];
    let truth = bench.film("hand.mp4", &small_with(&hand));
    bench
        .run(measure("hand.mp4", &truth, &["--quiet"]))
        .succeeds();
    let result = bench.json("hand.ebbmark/result.json");
    assert!(
        result["frames"]["n_lost"].as_u64().unwrap() >= 10,
        "{}",
        result["frames"]
    );
    for (key, truth) in [
        ("period", truth.law.damped_period_s),
        ("damping_ratio", truth.law.damping_ratio),
    ] {
        let (off, expanded) = compare(&result, key, truth);
        assert!(off.abs() < expanded, "{key}");
    }
}

#[test]
fn dropped_frames_and_rounded_stamps_do_not_move_the_period() {
    let bench = Bench::new();
    for (name, change) in [
        (
            "drops.mp4",
            "[mishap]\ndrop_frames = [40, 41, 90]\n\n[scale_bar]",
        ),
        (
            "rounded.mov",
            "[stamps]\nkind = \"rounded\"\nticks_per_s = 600\n\n[scale_bar]",
        ),
        (
            "uneven.mp4",
            "[stamps]\nkind = \"variable\"\njitter_s = 0.002\n\n[scale_bar]",
        ),
    ] {
        let truth = bench.film(name, &small_with(&[("[scale_bar]", change)]));
        bench
            .run(measure(
                name,
                &truth,
                &["--out", "out", "--clock-ppm", "0", "--quiet"],
            ))
            .succeeds();
        let result = bench.json("out/result.json");
        let (off, expanded) = compare(&result, "period", truth.law.damped_period_s);
        assert!(off.abs() < expanded, "{name}");
        assert!((off / truth.law.damped_period_s).abs() < 100e-6, "{name}");
    }
}

/// Ordinary phone files lose frames without a trace in their stamps.
#[test]
fn frames_lost_behind_even_stamps_are_found_and_do_not_move_the_period() {
    let bench = Bench::new();
    let lost = [(
        "[scale_bar]",
        "[mishap]\nslip_frames = [37, 90, 141]\n\n[scale_bar]",
    )];
    let truth = bench.film("slips.mp4", &small_with(&lost));
    bench
        .run(measure(
            "slips.mp4",
            &truth,
            &["--clock-ppm", "0", "--quiet"],
        ))
        .succeeds();
    let result = bench.json("slips.ebbmark/result.json");
    let slips = result["frames"]["slips"].as_array().unwrap();
    let total: i64 = slips
        .iter()
        .map(|slip| slip["n_frames"].as_i64().unwrap())
        .sum();
    assert_eq!((slips.len(), total), (3, 3), "{slips:?}");
    for key in ["period", "damping_ratio"] {
        let wanted = if key == "period" {
            truth.law.damped_period_s
        } else {
            truth.law.damping_ratio
        };
        let (off, expanded) = compare(&result, key, wanted);
        assert!(off.abs() < expanded, "{key}");
    }
    let warned = result["warnings"]
        .as_array()
        .unwrap()
        .iter()
        .any(|warning| warning["key"] == "frames_slipped");
    assert!(warned, "a correction must be said");
}

/// A stream without a container has no stamps; the rate the user gives stands for them.
#[test]
fn a_bare_stream_is_measured_at_the_rate_that_is_given() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    let done = std::process::Command::new("ffmpeg")
        .args(["-v", "error", "-i"])
        .arg(bench.path("small.mp4"))
        .args(["-c", "copy", "-bsf:v", "h264_mp4toannexb"])
        .arg(bench.path("bare.h264"))
        .status();
    assert!(done.unwrap().success());
    bench
        .run(measure("bare.h264", &truth, &[]))
        .fails(3, &["bare.h264", "--capture-rate"]);
    bench
        .run(measure(
            "bare.h264",
            &truth,
            &["--capture-rate", "30", "--quiet"],
        ))
        .succeeds();
    let (off, expanded) = compare(
        &bench.json("bare.ebbmark/result.json"),
        "period",
        truth.law.damped_period_s,
    );
    assert!(off.abs() < expanded);
}
