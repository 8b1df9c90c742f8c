//! Rehearsals as a caller sees them: a scene in, a clip and its truth out, checked with another program where one is at hand.
use std::error::Error;
use std::fs;
use std::path::{Path, PathBuf};
use std::process::Command;

use ebbmark::rehearsal::{
    Camera, Exposure, MarkerKind, Motion, RehearsalError, Scene, Truth, exposures, rehearse,
};

type Outcome = Result<(), Box<dyn Error>>;

const SMALL: &str = include_str!("../fixtures/scenes/small.toml");
const EVERY_KEY: &str = include_str!("../fixtures/scenes/every-key.toml");

fn fixture(path: &str) -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR"))
        .join("fixtures")
        .join(path)
}

/// The small scene with some of its text replaced; each replacement must find its text.
fn small_with(changes: &[(&str, &str)]) -> String {
    changes.iter().fold(SMALL.to_owned(), |text, (from, to)| {
        assert!(text.contains(from), "the small scene has no {from:?}");
        text.replace(from, to)
    })
}

/// A motion by its coefficients alone.
fn motion(table: &str) -> Result<Motion, RehearsalError> {
    let scene = format!(
        "[motion]\n{table}\n[camera]\nwidth_px = 64\nheight_px = 64\nrate_hz = 30\nduration_s = 400\npx_per_m = 100\n"
    );
    Ok(Motion::new(&Scene::from_toml(&scene)?))
}

/// Rows of a table under fixtures/reference/oscillation, without its header.
fn table(name: &str) -> Result<Vec<Vec<String>>, Box<dyn Error>> {
    let text = fs::read_to_string(fixture("reference/oscillation").join(name))?;
    Ok(text
        .lines()
        .skip(1)
        .map(|line| line.split(',').map(str::to_owned).collect())
        .collect())
}

/// ffprobe's answer as lines, or None where it is not installed.
fn probe(clip: &Path, entries: &str) -> Result<Option<Vec<String>>, Box<dyn Error>> {
    let asked = Command::new("ffprobe")
        .args([
            "-v",
            "error",
            "-select_streams",
            "v:0",
            "-of",
            "csv=p=0",
            "-show_entries",
            entries,
        ])
        .arg(clip)
        .output();
    let Ok(answer) = asked else {
        println!("left out: no ffprobe here");
        return Ok(None);
    };
    assert!(
        answer.status.success(),
        "{}",
        String::from_utf8_lossy(&answer.stderr)
    );
    let text = String::from_utf8(answer.stdout)?;
    Ok(Some(
        text.lines()
            .map(|line| line.trim_end_matches(',').to_owned())
            .filter(|line| !line.is_empty())
            .collect(),
    ))
}

/// One decoded luma plane as ffmpeg displays it (turned by its metadata), or None where it is not installed.
fn displayed(
    clip: &Path,
    frame: usize,
    [width, height]: [usize; 2],
) -> Result<Option<Vec<u8>>, Box<dyn Error>> {
    let asked = Command::new("ffmpeg")
        .args(["-v", "error", "-i"])
        .arg(clip)
        .args([
            "-vf",
            &format!("select=eq(n\\,{frame}),format=gray"),
            "-frames:v",
            "1",
            "-f",
            "rawvideo",
            "-",
        ])
        .output();
    let Ok(answer) = asked else {
        println!("left out: no ffmpeg here");
        return Ok(None);
    };
    assert_eq!(
        answer.stdout.len(),
        width * height,
        "{}",
        String::from_utf8_lossy(&answer.stderr)
    );
    Ok(Some(answer.stdout))
}

mod laws {
    use super::*;

    #[test]
    fn viscous_motion_is_the_formula_itself() -> Outcome {
        let motion = motion(
            "period_s = 1.2\namplitude_m = 0.1\nphase_rad = 0.7\ncentre_m = 0.02\ndamping_ratio = 0.05",
        )?;
        let omega_0 = std::f64::consts::TAU / 1.2;
        let (gamma, omega_d) = (0.05 * omega_0, omega_0 * (1.0_f64 - 0.05 * 0.05).sqrt());
        for t in [-0.01, 0.0, 0.3, 7.7, 40.0_f64] {
            let wanted = 0.02 + 0.1 * (-gamma * t).exp() * (omega_d * t + 0.7).cos();
            let got = motion.position_m(t);
            assert!(
                (got - wanted).abs() < 1e-15,
                "t = {t} s: wanted {wanted} m, got {got} m"
            );
        }
        Ok(())
    }

    /// Turning points in 40-digit arithmetic, released from rest; the table prints 1e-13 m.
    #[test]
    fn dry_and_viscous_turns_match_the_table() -> Outcome {
        let rows = table("coulomb_turning_points.csv")?;
        let mut n_checked = 0;
        for start in rows.iter().filter(|row| row[3] == "0") {
            let (zeta, step_m, release_m): (f64, f64, f64) =
                (start[1].parse()?, start[2].parse()?, start[4].parse()?);
            // A start from rest is A cos φ with tan φ = −γ/ω_d.
            let phase = -(zeta / (1.0 - zeta * zeta).sqrt()).atan();
            let amplitude = release_m / phase.cos();
            let motion = motion(&format!(
                "period_s = 1.0\namplitude_m = {amplitude:?}\nphase_rad = {phase:?}\ndamping_ratio = {zeta:?}\ndry_step_m = {step_m:?}"
            ))?;
            let turns: Vec<f64> = motion
                .turning_points(400.0)
                .iter()
                .map(|turn| turn.x_m)
                .collect();
            // Rounding can leave a start from rest with a speed of 1e-17 m/s: then it is no turn of its own.
            let skip = usize::from((turns[0] - release_m).abs() > 1e-9);
            for row in rows
                .iter()
                .filter(|row| row[1] == start[1] && row[2] == start[2] && !row[4].is_empty())
            {
                let (n, wanted): (usize, f64) = (row[3].parse()?, row[4].parse()?);
                let got = if n == 0 { release_m } else { turns[n - skip] };
                assert!((got - wanted).abs() < 1e-12, "{row:?}: got {got} m");
                n_checked += 1;
            }
        }
        assert!(n_checked > 100, "only {n_checked} rows");
        Ok(())
    }

    /// Amplitude of every turn under quadratic drag, from the exact energy relation; the table prints 1e-13.
    #[test]
    fn drag_turns_match_the_table() -> Outcome {
        for row in table("quadratic_drag.csv")? {
            let (drag, n, wanted): (f64, usize, f64) =
                (row[0].parse()?, row[1].parse()?, row[2].parse()?);
            let turns = motion(&format!(
                "period_s = 1.0\namplitude_m = 1.0\ndrag_per_m = {drag:?}"
            ))?
            .turning_points(400.0);
            let got = turns[n].x_m.abs();
            assert!(
                (got - wanted).abs() < 1e-12,
                "β = {drag}/m, turn {n}: wanted {wanted} m, got {got} m"
            );
            if let Ok(mean_period) = row[4].parse::<f64>() {
                let got = turns[n].t_s / (0.5 * n as f64);
                assert!(
                    (got - mean_period).abs() < 1e-11,
                    "β = {drag}/m: mean period {mean_period}, got {got}"
                );
            }
        }
        Ok(())
    }

    /// Period of a stiffening or softening spring by elliptic integrals; the table prints 1e-12.
    #[test]
    fn stiffened_periods_match_the_table() -> Outcome {
        for row in table("duffing_period.csv")? {
            let (stiffening, wanted): (f64, f64) = (row[0].parse()?, row[1].parse()?);
            if !(-0.5..=8.0).contains(&stiffening) {
                continue;
            }
            let turns = motion(&format!(
                "period_s = 1.0\namplitude_m = 1.0\nstiffening_per_m2 = {stiffening:?}"
            ))?
            .turning_points(400.0);
            let got = turns[2].t_s;
            assert!(
                (got - wanted).abs() < 2e-12,
                "κA² = {stiffening}: wanted {wanted} s, got {got} s"
            );
        }
        Ok(())
    }

    /// The series with coefficients too small to matter against the exact solutions: 1e-12 m anywhere, also between turns.
    #[test]
    fn integrated_motion_agrees_with_the_exact_laws() -> Outcome {
        for (what, exact) in [
            ("viscous", "damping_ratio = 0.02"),
            (
                "dry and viscous",
                "damping_ratio = 0.004\ndry_step_m = 0.0006",
            ),
        ] {
            let common = format!(
                "period_s = 1.3\namplitude_m = 0.1\nphase_rad = 0.4\ncentre_m = -0.01\n{exact}"
            );
            // 1e-300 chooses the integrator and moves nothing.
            let (exact, integrated) = (
                motion(&common)?,
                motion(&format!("{common}\ndrag_per_m = 1e-300"))?,
            );
            for n in 0..4000 {
                let t_s = 0.0103 * f64::from(n) - 0.01;
                let (wanted, got) = (exact.position_m(t_s), integrated.position_m(t_s));
                assert!(
                    (wanted - got).abs() < 1e-12,
                    "{what} at {t_s} s: wanted {wanted} m, got {got} m"
                );
            }
        }
        Ok(())
    }
}

mod scenes {
    use super::*;

    #[test]
    fn the_example_with_every_key_is_a_scene() -> Outcome {
        let scene = Scene::from_toml(EVERY_KEY)?;
        assert_eq!(scene.camera.pixel_aspect, [1, 1]);
        Ok(())
    }

    #[test]
    fn every_scene_among_the_fixtures_can_be_filmed() -> Outcome {
        let mut n_read = 0;
        for folder in ["scenes", "demo"] {
            for entry in fs::read_dir(fixture(folder))? {
                let path = entry?.path();
                if path
                    .extension()
                    .is_some_and(|extension| extension == "toml")
                {
                    Scene::from_toml(&fs::read_to_string(&path)?)
                        .map_err(|error| format!("{}: {error}", path.display()))?;
                    n_read += 1;
                }
            }
        }
        assert!(n_read >= 4, "only {n_read} scenes");
        Ok(())
    }

    #[test]
    fn an_unknown_key_is_named_with_line_and_column() {
        let text = small_with(&[(
            "amplitude_m = 0.05",
            "amplitude_m = 0.05\n  amplitude_mm = 50",
        )]);
        let said = Scene::from_toml(&text)
            .map_or_else(|error| error.to_string(), |_| "accepted".to_owned());
        let line = 1 + text
            .lines()
            .position(|line| line.contains("amplitude_mm"))
            .unwrap_or(0);
        assert!(
            said.contains(&format!("line {line}, column 3")) && said.contains("amplitude_mm"),
            "{said}"
        );
        assert!(!said.contains('\n'), "more than one line: {said}");
    }

    #[test]
    fn scenes_that_cannot_be_filmed_are_refused_by_key() {
        for (from, to, key) in [
            ("width_px = 320", "width_px = 0", "camera.width_px"),
            ("width_px = 320", "width_px = 321", "camera.width_px"),
            ("width_px = 320", "width_px = 4000000000", "camera.width_px"),
            ("rate_hz = 30", "rate_hz = 0", "camera.rate_hz"),
            ("rate_hz = 30", "rate_hz = nan", "camera.rate_hz"),
            ("rate_hz = 30", "rate_hz = [30, 0]", "camera.rate_hz"),
            ("rate_hz = 30", "rate_hz = -inf", "camera.rate_hz"),
            (
                "duration_s = 6.0",
                "duration_s = 1e300",
                "camera.duration_s",
            ),
            ("duration_s = 6.0", "duration_s = -1.0", "camera.duration_s"),
            ("px_per_m = 1200.0", "px_per_m = nan", "camera.px_per_m"),
            (
                "exposure_s = 0.004",
                "exposure_s = 5.0",
                "camera.exposure_s",
            ),
            ("period_s = 1.1", "period_s = 0.0", "motion.period_s"),
            ("period_s = 1.1", "period_s = nan", "motion.period_s"),
            (
                "amplitude_m = 0.05",
                "amplitude_m = -0.05",
                "motion.amplitude_m",
            ),
            (
                "damping_ratio = 0.01",
                "damping_ratio = 1.0",
                "motion.damping_ratio",
            ),
            ("damping_ratio = 0.01", "dry_step_m = 0.01", "motion.law"),
            ("size_px = 24.0", "size_px = -24.0", "marker.size_px"),
            ("size_px = 24.0", "size_px = 1e9", "marker.size_px"),
            ("length_px = 60.0", "length_px = 1e12", "glider.length_px"),
            ("length_m = 0.2", "length_m = inf", "scale_bar.length_m"),
            ("bit_rate = 1500000", "bit_rate = 1", "codec.bit_rate"),
            ("gop = 30", "gop = 0", "codec.gop"),
            ("gop = 30", "name = \"vp9\"\nb_frames = 2", "codec.b_frames"),
            (
                "gop = 30",
                "name = \"prores\"\npixel_format = \"yuv420p\"",
                "codec.pixel_format",
            ),
            (
                "noise_grey = 1.0",
                "pixel_aspect = [0, 1]",
                "camera.pixel_aspect",
            ),
            (
                "noise_grey = 1.0",
                "pixel_aspect = [4, 3]\nrotation_deg = 90",
                "camera.pixel_aspect",
            ),
            (
                "noise_grey = 1.0",
                "rotation_deg = 45",
                "camera.rotation_deg",
            ),
        ] {
            let said = Scene::from_toml(&small_with(&[(from, to)]))
                .map_or_else(|error| error.to_string(), |_| "accepted".to_owned());
            assert!(said.contains(&format!("{key} cannot be")), "{to:?}: {said}");
        }
    }

    #[test]
    fn every_cut_of_a_scene_is_read_or_refused() {
        for end in (0..EVERY_KEY.len())
            .step_by(37)
            .filter(|end| EVERY_KEY.is_char_boundary(*end))
        {
            if let Err(error) = Scene::from_toml(&EVERY_KEY[..end]) {
                assert!(!error.to_string().contains('\n'), "cut at {end}: {error}");
            }
        }
    }

    #[test]
    fn lost_slipped_and_repeated_pictures_keep_their_own_times() -> Outcome {
        let mishap =
            "gop = 30\n[mishap]\ndrop_frames = [2]\nslip_frames = [4]\nrepeat_frames = [6]";
        let scene = Scene::from_toml(&small_with(&[
            ("duration_s = 6.0", "duration_s = 0.3"),
            ("gop = 30", mishap),
        ]))?;
        let told: Vec<(usize, String, i64)> = exposures(&scene)
            .iter()
            .map(|e| {
                (
                    e.picture,
                    format!("{:.0}", e.t_s * 30.0),
                    e.stamp_ticks / 3000,
                )
            })
            .collect();
        // picture, interval truly shown, interval stamped: 2 is a gap, 4 vanishes from the stamps, 6 shows 5.
        assert_eq!(
            told,
            [
                (0, "0".to_owned(), 0),
                (1, "1".to_owned(), 1),
                (3, "3".to_owned(), 3),
                (5, "5".to_owned(), 4),
                (6, "5".to_owned(), 5),
                (7, "7".to_owned(), 6),
                (8, "8".to_owned(), 7)
            ]
        );
        Ok(())
    }

    #[test]
    fn rounded_stamps_are_the_nearest_ticks() -> Outcome {
        let scene = Scene::from_toml(&small_with(&[
            ("rate_hz = 30", "rate_hz = [30000, 1001]"),
            ("[codec]", "[stamps]\nkind = \"rounded\"\n[codec]"),
        ]))?;
        let first: Vec<i64> = exposures(&scene)
            .iter()
            .take(5)
            .map(|e| e.stamp_ticks)
            .collect();
        // 600 · 1001/30000 = 20.02 ticks an interval.
        assert_eq!(first, [0, 20, 40, 60, 80]);
        assert_eq!(exposures(&scene)[30].stamp_ticks, 601, "30 · 20.02 = 600.6");
        Ok(())
    }

    #[test]
    fn variable_stamps_follow_the_exposures_within_a_tick() -> Outcome {
        let scene = Scene::from_toml(&small_with(&[(
            "[codec]",
            "[stamps]\nkind = \"variable\"\njitter_s = 0.002\n[codec]",
        )]))?;
        let taken = exposures(&scene);
        let off_s: Vec<f64> = taken
            .iter()
            .map(|e| e.t_s - e.picture as f64 / 30.0)
            .collect();
        let rms_s = (off_s.iter().map(|off| off * off).sum::<f64>() / off_s.len() as f64).sqrt();
        assert!((0.0017..0.0023).contains(&rms_s), "jitter {rms_s} s");
        for e in taken {
            assert!(
                (e.stamp_ticks as f64 / 90_000.0 - e.t_s).abs() < 1.0 / 90_000.0,
                "{e:?}"
            );
        }
        Ok(())
    }
}

mod pictures {
    use super::*;

    /// Centre of light of what the marker adds to a black body, less where the truth says, both axes, px.
    fn centroid_error_px(scene: &Scene) -> Result<[f64; 2], Box<dyn Error>> {
        let camera = Camera::new(scene);
        let exposure = Exposure {
            picture: 0,
            shown: 0,
            t_s: 0.0,
            stamp_ticks: 0,
        };
        let mut unmarked = scene.clone();
        unmarked.marker.kind = MarkerKind::Plain;
        let (picture, unmarked) = (
            camera.shoot(&exposure),
            Camera::new(&unmarked).shoot(&exposure),
        );
        let (mut weight, mut sum) = (0.0, [0.0; 2]);
        for (at, (grey, without)) in picture.grey.iter().zip(&unmarked.grey).enumerate() {
            let light = f64::from(grey - without);
            weight += light;
            sum[0] += light * (at % picture.width) as f64;
            sum[1] += light * (at / picture.width) as f64;
        }
        let ([x, y], seen_s) = camera.marker_px(0.0);
        let mean_m = (0..1000)
            .map(|i| scene.camera.exposure_s * ((f64::from(i) + 0.5) / 1000.0 - 0.5))
            .map(|off_s| camera.motion().position_m(seen_s + off_s))
            .sum::<f64>()
            / 1000.0;
        let along_px = (mean_m - camera.motion().position_m(seen_s)) * scene.camera.px_per_m;
        let (sin, cos) = scene.camera.axis_angle_deg.to_radians().sin_cos();
        Ok([
            sum[0] / weight - x - along_px * cos,
            sum[1] / weight - y - along_px * sin,
        ])
    }

    /// Pixel phase sweeps one pixel, both ways; the marker's centre of light must stay with the truth, smeared or not.
    #[test]
    fn marker_stands_where_the_truth_says_at_every_pixel_phase() -> Outcome {
        for (angle_deg, exposure_s, readout_s, turn) in [
            (0.0, 0.0, 0.0, 0),
            (0.0, 0.02, 0.0, 0),
            (30.0, 0.0, 0.0, 0),
            (30.0, 0.02, 0.0, 0),
            (90.0, 0.01, 0.0, 0),
            (0.0, 0.01, 0.02, 0),
            (0.0, 0.01, 0.02, 90),
            (0.0, 0.01, 0.02, 270),
            (0.0, 0.01, 0.02, 180),
        ] {
            let (mut worst, mut largest) = (0.0_f64, [f64::INFINITY, f64::NEG_INFINITY]);
            for phase in 0..16 {
                let centre = 80.0 + f64::from(phase) / 16.0;
                let text = format!(
                    "[motion]\nlaw = \"none\"\nperiod_s = 1.0\namplitude_m = 0.01\nphase_rad = 0.9\n[camera]\nwidth_px = 160\nheight_px = 160\nrate_hz = 30\n\
                     duration_s = 1\npx_per_m = 1000\naxis_angle_deg = {angle_deg:?}\ncentre_px = [{centre:?}, {:?}]\nexposure_s = {exposure_s:?}\nreadout_s = {readout_s:?}\nrotation_deg = {turn}\n\
                     [marker]\nsize_px = 33.0\n[glider]\nlength_px = 33.0\nheight_px = 33.0\ngrey = 0\n",
                    80.3 + 0.37 * f64::from(phase)
                );
                let [dx, dy] = centroid_error_px(&Scene::from_toml(&text)?)?;
                let along = dx.hypot(dy);
                worst = worst.max(along);
                largest = [largest[0].min(along), largest[1].max(along)];
            }
            println!(
                "axis {angle_deg} deg, exposure {exposure_s} s, readout {readout_s} s, turn {turn}: worst {worst:.6} px, spread {:.6} px",
                largest[1] - largest[0]
            );
            assert!(
                worst < 0.002,
                "axis {angle_deg}°, exposure {exposure_s} s, readout {readout_s} s, turn {turn}: {worst} px from the truth"
            );
        }
        Ok(())
    }

    #[test]
    fn a_long_exposure_smears_evenly() -> Outcome {
        // 0.1 m · 2π/1 s · 1000 px/m · 0.02 s: 12.6 px of smear. In the middle of the plain body the grey must not ripple.
        let text = "[motion]\nlaw = \"none\"\nperiod_s = 1.0\namplitude_m = 0.1\nphase_rad = -1.5707963\n[camera]\nwidth_px = 160\nheight_px = 64\nrate_hz = 30\n\
                    duration_s = 1\npx_per_m = 1000\nexposure_s = 0.02\n[marker]\nkind = \"plain\"\nsize_px = 20\n[glider]\nlength_px = 60\nheight_px = 40\n";
        let camera = Camera::new(&Scene::from_toml(text)?);
        let picture = camera.shoot(&Exposure {
            picture: 0,
            shown: 0,
            t_s: 0.0,
            stamp_ticks: 0,
        });
        let line = &picture.grey[32 * 160..33 * 160];
        // The edge is a ramp 12.6 px wide: each step from pixel to pixel within it is alike.
        let steps: Vec<f32> = line[45..54]
            .windows(2)
            .map(|pair| pair[1] - pair[0])
            .collect();
        let mean = steps.iter().sum::<f32>() / steps.len() as f32;
        assert!(mean < -1.0, "no ramp: {line:?}");
        assert!(
            steps.iter().all(|step| (step / mean - 1.0).abs() < 0.05),
            "ripple: {steps:?}"
        );
        Ok(())
    }

    #[test]
    fn grain_has_the_spread_asked_for_and_no_fixed_pattern() -> Outcome {
        let scene = Scene::from_toml(&small_with(&[
            ("texture = \"bench\"", "texture = \"plain\""),
            ("noise_grey = 1.0", "noise_grey = 2.0"),
        ]))?;
        let camera = Camera::new(&scene);
        let strip = |picture: usize| {
            camera
                .shoot(&Exposure {
                    picture,
                    shown: picture,
                    t_s: 0.0,
                    stamp_ticks: 0,
                })
                .grey[..320 * 40]
                .to_vec()
        };
        let (one, other) = (strip(0), strip(1));
        let product = |a: &[f32], b: &[f32]| {
            a.iter()
                .zip(b)
                .map(|(a, b)| f64::from((a - 128.0) * (b - 128.0)))
                .sum::<f64>()
                / a.len() as f64
        };
        let spread = product(&one, &one).sqrt();
        assert!((spread - 2.0).abs() < 0.06, "spread {spread} grey levels");
        // 12800 independent pairs: the correlation of two pictures is below 4/√12800.
        let correlation = product(&one, &other) / (spread * spread);
        assert!(
            correlation.abs() < 0.036,
            "pictures correlate by {correlation}"
        );
        Ok(())
    }

    #[test]
    fn rolling_shutter_delays_the_marker_by_its_row() -> Outcome {
        let scene = Scene::from_toml(&small_with(&[(
            "noise_grey = 1.0",
            "readout_s = 0.018\naxis_angle_deg = 90.0",
        )]))?;
        let camera = Camera::new(&scene);
        for t_s in [0.0, 0.2, 0.45] {
            let ([_, y_px], seen_s) = camera.marker_px(t_s);
            assert!(
                (seen_s - t_s - 0.018 * y_px / 180.0).abs() < 1e-9,
                "row {y_px} seen at {seen_s} s"
            );
        }
        Ok(())
    }
}

mod films {
    use super::*;

    fn film(text: &str, file: &str) -> Result<(tempfile::TempDir, PathBuf, Truth), Box<dyn Error>> {
        let folder = tempfile::tempdir()?;
        let clip = folder.path().join(file);
        let truth = rehearse(&Scene::from_toml(text)?, &clip)?;
        Ok((folder, clip, truth))
    }

    #[test]
    fn same_scene_same_bytes() -> Outcome {
        let text = small_with(&[("noise_grey = 1.0", "noise_grey = 1.0\nshake_px = 0.4")]);
        let (_one, clip, _) = film(&text, "a.mp4")?;
        let (_two, again, _) = film(&text, "a.mp4")?;
        assert!(
            fs::read(&clip)? == fs::read(&again)?,
            "two films of one scene differ"
        );
        assert!(
            fs::read(clip.with_extension("truth.json"))?
                == fs::read(again.with_extension("truth.json"))?
        );
        let (_three, other, _) = film(&text.replace("seed = 3", "seed = 4"), "a.mp4")?;
        assert!(
            fs::read(&clip)? != fs::read(&other)?,
            "another seed must show"
        );
        Ok(())
    }

    #[test]
    fn truth_beside_the_clip_is_the_truth_returned_and_nothing_else_is_left() -> Outcome {
        let (folder, clip, truth) = film(
            &small_with(&[("duration_s = 6.0", "duration_s = 0.5")]),
            "short.mov",
        )?;
        let read: Truth =
            serde_json::from_str(&fs::read_to_string(clip.with_extension("truth.json"))?)?;
        assert_eq!(read, truth);
        let mut left: Vec<_> = fs::read_dir(folder.path())?
            .map(|entry| entry.map(|entry| entry.file_name()))
            .collect::<Result<_, _>>()?;
        left.sort();
        assert_eq!(left, ["short.mov", "short.truth.json"]);
        assert_eq!(truth.t_s.len(), 15);
        Ok(())
    }

    #[test]
    fn a_path_that_names_no_clip_is_refused() -> Outcome {
        let folder = tempfile::tempdir()?;
        let scene = Scene::from_toml(SMALL)?;
        for name in ["clip", "clip.xyzzy", ".."] {
            let refused = rehearse(&scene, &folder.path().join(name));
            assert!(
                matches!(refused, Err(RehearsalError::ClipName { .. })),
                "{name}: {refused:?}"
            );
        }
        let nowhere = rehearse(&scene, &folder.path().join("missing").join("a.mp4"));
        assert!(
            matches!(nowhere, Err(RehearsalError::Io { .. })),
            "{nowhere:?}"
        );
        assert_eq!(fs::read_dir(folder.path())?.count(), 0);
        Ok(())
    }

    #[test]
    fn a_failed_film_leaves_the_one_that_was_there() -> Outcome {
        let folder = tempfile::tempdir()?;
        let clip = folder.path().join("kept.webm");
        fs::write(&clip, "as it was")?;
        // WebM does not take H.264.
        let refused = rehearse(&Scene::from_toml(SMALL)?, &clip);
        assert!(
            matches!(refused, Err(RehearsalError::Ffmpeg { .. })),
            "{refused:?}"
        );
        assert_eq!(fs::read_to_string(&clip)?, "as it was");
        assert_eq!(fs::read_dir(folder.path())?.count(), 1);
        Ok(())
    }

    /// Each codec in a container of its own: as many pictures and the very stamps that the truth tells, counted by ffprobe.
    #[test]
    fn every_codec_keeps_pictures_and_stamps() -> Outcome {
        for (codec, file, tolerance_s) in [
            ("name = \"h264\"\nb_frames = 2", "a.mp4", 1e-6),
            ("name = \"h264\"\nb_frames = 2", "a.mkv", 6e-4),
            (
                "name = \"h264\"\npixel_format = \"yuv422p10\"",
                "a.mov",
                1e-6,
            ),
            ("name = \"hevc\"\npreset = \"ultrafast\"", "a.mp4", 1e-6),
            ("name = \"mjpeg\"", "a.mov", 1e-6),
            ("name = \"mjpeg\"", "a.avi", 2e-2),
            ("name = \"vp9\"", "a.webm", 6e-4),
            ("name = \"prores\"", "a.mov", 1e-6),
            ("name = \"mpeg4\"", "a.mp4", 1e-6),
        ] {
            let mishap = if file == "a.avi" {
                ""
            } else {
                "[mishap]\ndrop_frames = [5]\n"
            };
            let text = small_with(&[
                ("duration_s = 6.0", "duration_s = 0.7"),
                (
                    "bit_rate = 1500000\ngop = 30",
                    &format!("{codec}\ngop = 10\n{mishap}"),
                ),
            ]);
            let (_folder, clip, truth) = match film(&text, file) {
                Err(error) if error.to_string().contains("has no") => {
                    println!("left out: {error}");
                    continue;
                }
                made => made?,
            };
            let Some(lines) = probe(&clip, "frame=best_effort_timestamp_time")? else {
                return Ok(());
            };
            let stamps_s: Vec<f64> = lines
                .iter()
                .map(|line| line.split(',').next().unwrap_or(line).parse())
                .collect::<Result<_, _>>()?;
            assert_eq!(stamps_s.len(), truth.t_s.len(), "{codec:?} in {file}");
            for (n, (got, wanted)) in stamps_s.iter().zip(&truth.stamp_s).enumerate() {
                assert!(
                    (got - stamps_s[0] - wanted).abs() < tolerance_s,
                    "{codec:?} in {file}, picture {n}: wanted {wanted} s, got {got} s"
                );
            }
        }
        Ok(())
    }

    /// A film stored on its side is displayed as the scene: the turned pictures are those of the upright film.
    #[test]
    fn a_stored_turn_is_undone_by_display() -> Outcome {
        let short = [
            ("duration_s = 6.0", "duration_s = 0.4"),
            ("bit_rate = 1500000", "crf = 4"),
            ("noise_grey = 1.0", "noise_grey = 0.0"),
        ];
        let (_upright, clip, _) = film(&small_with(&short), "upright.mp4")?;
        let Some(wanted) = displayed(&clip, 6, [320, 180])? else {
            return Ok(());
        };
        for turn in [90, 180, 270] {
            let text =
                small_with(&short).replace("noise_grey = 0.0", &format!("rotation_deg = {turn}"));
            let (_turned, clip, truth) = film(&text, "turned.mp4")?;
            let Some(got) = displayed(&clip, 6, [320, 180])? else {
                return Ok(());
            };
            let worst = wanted.iter().zip(&got).map(|(a, b)| a.abs_diff(*b)).max();
            assert!(
                worst < Some(16),
                "turned by {turn}: a pixel differs by {worst:?}"
            );
            assert_eq!(truth.size_px, [320, 180]);
            let stored = probe(&clip, "stream=width,height")?
                .unwrap_or_default()
                .join("");
            assert!(
                stored.starts_with(if turn == 180 { "320,180" } else { "180,320" }),
                "{stored}"
            );
        }
        Ok(())
    }

    #[test]
    fn pixel_aspect_and_capture_rate_reach_the_file() -> Outcome {
        let text = small_with(&[
            ("duration_s = 6.0", "duration_s = 0.1"),
            ("noise_grey = 1.0", "pixel_aspect = [4, 3]"),
            ("bit_rate = 1500000", "capture_fps = 240"),
        ]);
        let (_folder, clip, truth) = film(
            &text.replace("width_px = 320", "width_px = 256"),
            "slow.mov",
        )?;
        let Some(lines) = probe(
            &clip,
            "stream=width,height,sample_aspect_ratio:format_tags=com.android.capture.fps",
        )?
        else {
            return Ok(());
        };
        assert_eq!(lines, ["192,180,4:3", "240.000000"]);
        // 0.1 s at 240 Hz are 24 pictures, which play for 0.8 s at 30 Hz.
        assert_eq!(truth.t_s.len(), 24);
        assert!(
            (truth.t_s[23] - 23.0 / 240.0).abs() < 1e-9
                && (truth.stamp_s[23] - 23.0 / 30.0).abs() < 1e-9
        );
        Ok(())
    }

    #[test]
    fn truth_says_when_the_marker_is_hidden_or_gone() -> Outcome {
        let mishap = "gop = 30\n[mishap]\nocclusion = { from_s = 1.0, to_s = 1.5 }\nleave_frame = { from_s = 3.0, speed_m_per_s = 0.2 }";
        let (_folder, _, truth) = film(&small_with(&[("gop = 30", mishap)]), "a.mp4")?;
        for (t_s, visible) in truth.t_s.iter().zip(&truth.visible) {
            let hidden = (1.0..=1.5).contains(t_s);
            if *t_s < 3.0 {
                assert_eq!(*visible, !hidden, "at {t_s} s");
            }
        }
        assert_eq!(truth.visible.last(), Some(&false));
        assert_eq!(truth.mishaps.len(), 2);
        Ok(())
    }

    /// The clip inside the binary is the film of the scene beside it, and small enough to be there.
    #[test]
    fn the_demo_is_what_its_scene_says() -> Outcome {
        let scene = Scene::from_toml(&fs::read_to_string(fixture("demo/rail-7.toml"))?)?;
        let truth: Truth =
            serde_json::from_str(&fs::read_to_string(fixture("demo/rail-7.truth.json"))?)?;
        let size = fs::metadata(fixture("demo/rail-7.mp4"))?.len();
        assert!(size <= 1_500_000, "{size} bytes");
        let motion = Motion::new(&scene);
        assert_eq!(truth.scene, scene.name);
        assert_eq!(truth.t_s.len(), exposures(&scene).len());
        for (t_s, x_m) in truth.t_s.iter().zip(&truth.x_m) {
            assert!((motion.position_m(*t_s) - x_m).abs() < 1e-11, "at {t_s} s");
        }
        Ok(())
    }
}
