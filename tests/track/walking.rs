//! Through films in memory: where the marker was, and what is said when it is not there.

use crate::track::film::{Film, MARKER_PX, Shot};
use ebbmark::track::{FilmTrack, PixelBox, Plan, SightingOutcome, TrackError, walk};

/// Position of frame `k` of a swing of 100 px with 40 frames a period: 16 px a frame at the most.
fn swing(k: usize) -> [f64; 2] {
    let phase = k as f64 * std::f64::consts::TAU / 40.0;
    [160.3 + 100.0 * phase.cos(), 60.4 + 0.5 * phase.cos()]
}

fn swinging(n: usize) -> Vec<Shot> {
    (0..n).map(|k| Shot::of(swing(k)[0], swing(k)[1])).collect()
}

/// The box a user would draw around the marker of a frame.
fn plan(at_frame: usize) -> Plan {
    let [x, y] = swing(at_frame);
    let corner = |centre: f64| (centre - (MARKER_PX as f64 - 1.0) / 2.0).round() as i64;
    let marker = PixelBox {
        left: corner(x),
        top: corner(y),
        width: MARKER_PX,
        height: MARKER_PX,
    };
    Plan {
        marker,
        at_frame,
        steady: None,
        along: [1.0, 0.0],
    }
}

fn follow(film: &mut Film, plan: &Plan) -> FilmTrack {
    walk(film, plan, &mut |_| {}).unwrap()
}

/// RMS distance of the sightings from the truth, their common offset taken off, px; and how many there are.
fn rms_px(track: &FilmTrack) -> (f64, usize) {
    let off: Vec<[f64; 2]> = track
        .marker
        .iter()
        .enumerate()
        .filter_map(|(k, outcome)| {
            outcome
                .seen()
                .map(|seen| [seen.p_px[0] - swing(k)[0], seen.p_px[1] - swing(k)[1]])
        })
        .collect();
    let n = off.len() as f64;
    let mean = [0, 1].map(|axis| off.iter().map(|off| off[axis]).sum::<f64>() / n);
    let square: f64 = off
        .iter()
        .map(|off| (off[0] - mean[0]).powi(2) + (off[1] - mean[1]).powi(2))
        .sum();
    ((square / n).sqrt(), off.len())
}

#[test]
fn a_marker_is_followed_to_hundredths_of_a_pixel() {
    let track = follow(&mut Film::new(swinging(90)), &plan(0));
    let (rms_px, n) = rms_px(&track);
    println!("rms {rms_px:.4} px over {n} frames");
    assert_eq!(n, 90);
    assert!(rms_px < 0.03, "{rms_px}");
}

#[test]
fn from_a_later_start_frame_the_beginning_is_followed_backwards() {
    let mut film = Film::new(swinging(90));
    let track = follow(&mut film, &plan(50));
    let (rms_px, n) = rms_px(&track);
    println!("rms {rms_px:.4} px over {n} frames");
    assert_eq!(n, 90);
    assert!(rms_px < 0.03, "{rms_px}");
    assert!(track.streaks[0].lines.iter().all(Option::is_some));
    let forwards = follow(&mut Film::new(swinging(90)), &plan(50));
    assert_eq!(track, forwards, "two walks differ");
}

#[test]
fn a_long_beginning_is_followed_in_groups_that_fit_the_memory() {
    let mut film = Film::new(swinging(200));
    let track = follow(&mut film, &plan(180));
    assert_eq!(rms_px(&track).1, 200);
    // Once through, and the first 181 frames again in groups of 64, each from the start of its own group of pictures.
    assert!(film.n_drawn < 200 + 181 + 3 * 12, "{}", film.n_drawn);
}

#[test]
fn a_marker_behind_a_hand_is_reported_lost_and_found_again_not_bridged() {
    let mut shots = swinging(120);
    for shot in &mut shots[45..60] {
        shot.hand_to_px = 320;
    }
    let track = follow(&mut Film::new(shots), &plan(0));
    assert!(
        track.marker[45..60]
            .iter()
            .all(|outcome| *outcome == SightingOutcome::Lost)
    );
    assert!(
        track.marker[60..]
            .iter()
            .all(|outcome| outcome.seen().is_some())
    );
    let (rms_px, n) = rms_px(&track);
    assert_eq!(n, 105);
    assert!(rms_px < 0.03, "{rms_px}");
}

#[test]
fn a_marker_that_leaves_and_comes_back_is_lost_only_while_it_is_away() {
    let mut shots = swinging(100);
    for shot in &mut shots[30..50] {
        shot.marker = None;
    }
    let track = follow(&mut Film::new(shots), &plan(0));
    let lost: Vec<usize> = (0..100)
        .filter(|&k| track.marker[k].seen().is_none())
        .collect();
    assert_eq!(lost, (30..50).collect::<Vec<_>>());
}

#[test]
fn a_change_of_light_does_not_move_the_marker() {
    let mut shots = swinging(60);
    for (k, shot) in shots.iter_mut().enumerate() {
        shot.light = 1.0 - 0.3 * (k as f64 / 60.0) - if k % 7 == 0 { 0.1 } else { 0.0 };
    }
    let (rms_px, n) = rms_px(&follow(&mut Film::new(shots), &plan(0)));
    assert_eq!(n, 60);
    assert!(rms_px < 0.03, "{rms_px}");
}

#[test]
fn a_look_alike_at_rest_is_not_mistaken_for_the_marker() {
    let mut shots = swinging(120);
    for shot in &mut shots {
        shot.other = Some([160.0, 95.0]);
    }
    let (rms_px, n) = rms_px(&follow(&mut Film::new(shots), &plan(0)));
    assert_eq!(n, 120);
    assert!(rms_px < 0.03, "{rms_px}");
}

#[test]
fn a_damaged_frame_is_left_out_and_a_damaged_start_refused() {
    let mut shots = swinging(40);
    shots[12].damaged = true;
    let track = follow(&mut Film::new(shots.clone()), &plan(0));
    assert_eq!(track.marker[12], SightingOutcome::Damaged);
    assert!(track.marker[13].seen().is_some());
    let refused = walk(&mut Film::new(shots), &plan(12), &mut |_| {});
    assert!(matches!(
        refused,
        Err(TrackError::DamagedStart { frame: 12 })
    ));
}

#[test]
fn a_start_frame_beyond_the_end_is_refused_with_the_number_there_is() {
    let refused = walk(&mut Film::new(swinging(5)), &plan(5), &mut |_| {});
    let Err(TrackError::NoSuchFrame {
        frame: 5,
        n_frames: 5,
    }) = refused
    else {
        panic!("{refused:?}")
    };
}

#[test]
fn a_steady_patch_is_followed_beside_the_marker() {
    let steady = PixelBox {
        left: 20,
        top: 80,
        width: 40,
        height: 30,
    };
    let track = follow(
        &mut Film::new(swinging(30)),
        &Plan {
            steady: Some(steady),
            ..plan(0)
        },
    );
    let steady: Vec<_> = track
        .steady
        .unwrap()
        .iter()
        .map(|outcome| *outcome.seen().unwrap())
        .collect();
    for seen in &steady {
        let moved = [0, 1].map(|axis| (seen.p_px[axis] - steady[0].p_px[axis]).abs());
        assert!(
            moved[0] < 0.1 && moved[1] < 0.1,
            "{seen:?} against {:?}",
            steady[0]
        );
    }
}
