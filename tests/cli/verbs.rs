//! The other verbs: inspect, refit, rehearse, help.

use crate::cli::bench::{Bench, SMALL, measure, names};

#[test]
fn inspect_says_what_a_clip_is_and_writes_stills_with_a_grid() {
    let bench = Bench::new();
    bench.film("small.mp4", SMALL);
    let done = bench
        .run(["inspect", "small.mp4", "--stills", "stills"])
        .succeeds();
    for words in ["h264", "320 × 180", "180", "steady", "30.0000 Hz"] {
        assert!(
            done.stdout.contains(words),
            "`{words}` is not in: {}",
            done.stdout
        );
    }
    let stills = names(&bench.path("stills"));
    assert_eq!(stills.len(), 5);
    assert_eq!(stills[0], "frame-00000.png");
    let still = image::open(bench.path("stills/frame-00000.png")).unwrap();
    assert_eq!((still.width(), still.height()), (320, 180));
}

#[test]
fn refit_of_a_films_table_gives_the_films_figures() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    bench
        .run(measure("small.mp4", &truth, &["--quiet"]))
        .succeeds();
    let done = bench
        .run(["refit", "small.ebbmark/positions.csv", "--out", "again"])
        .succeeds();
    assert!(done.stdout.contains("again/report.html"));
    let (film, table) = (
        bench.json("small.ebbmark/result.json"),
        bench.json("again/result.json"),
    );
    for key in ["period", "damping_ratio", "amplitude", "centre"] {
        let (a, b) = (
            film[key]["value"].as_f64().unwrap(),
            table[key]["value"].as_f64().unwrap(),
        );
        // The table is rounded to nanoseconds and nanometres: a hundredth of the uncertainty is far more than that changes.
        let u = film[key]["u"].as_f64().unwrap();
        assert!((a - b).abs() < 0.01 * u, "{key}: {a} {b}, u {u}");
    }
    assert_eq!(
        names(&bench.path("again")).len(),
        5,
        "a table has no streak"
    );
    bench
        .run(["measure", "again/run.toml", "--out", "repeated", "--quiet"])
        .succeeds();
    assert!(bench.read("repeated/result.json") == bench.read("again/result.json"));
}

#[test]
fn json_is_alone_on_stdout_and_the_same_as_the_file() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    let done = bench
        .run(measure("small.mp4", &truth, &["--json"]))
        .succeeds();
    assert_eq!(
        done.stdout.as_bytes(),
        bench.read("small.ebbmark/result.json")
    );
    let result: serde_json::Value = serde_json::from_str(&done.stdout).unwrap();
    assert_eq!(result["schema"], 1);
}

#[test]
fn rehearse_makes_a_film_with_its_truth_and_refuses_a_scene_with_a_mistake() {
    let bench = Bench::new();
    bench.write("scene.toml", SMALL);
    bench
        .run(["rehearse", "scene.toml", "--out", "film.mp4"])
        .succeeds();
    assert_eq!(bench.names(), ["film.mp4", "film.truth.json", "scene.toml"]);
    bench.write("typo.toml", SMALL.replace("gop = 30", "gob = 30"));
    bench
        .run(["rehearse", "typo.toml", "--out", "typo.mp4"])
        .fails(2, &["typo.toml", "line", "gob"]);
    bench
        .run(["rehearse", "none.toml", "--out", "none.mp4"])
        .fails(3, &["none.toml"]);
    assert_eq!(bench.names().len(), 4);
}

#[test]
fn help_and_version_are_normal_ends() {
    let bench = Bench::new();
    for arguments in [
        &["--help"][..],
        &["--version"],
        &["measure", "--help"],
        &["inspect", "--help"],
    ] {
        let done = bench.run(arguments).succeeds();
        assert!(done.stdout.contains("ebbmark"), "{}", done.stdout);
    }
}

#[test]
fn a_closed_pipe_is_a_normal_end() {
    let bench = Bench::new();
    let truth = bench.film("small.mp4", SMALL);
    let mut command = std::process::Command::new(env!("CARGO_BIN_EXE_ebbmark"));
    let mut child = command
        .args(measure("small.mp4", &truth, &["--json"]))
        .current_dir(bench.path("."))
        .stdout(std::process::Stdio::piped())
        .stderr(std::process::Stdio::piped())
        .spawn()
        .unwrap();
    drop(child.stdout.take());
    let output = child.wait_with_output().unwrap();
    assert_eq!(
        output.status.code(),
        Some(0),
        "{}",
        String::from_utf8_lossy(&output.stderr)
    );
    assert!(output.stderr.is_empty());
}
