//! Tracking error of a clip whose truth is known.
//!
//! Usage: `cargo run --release --example tracking_error -- CLIP TRUTH.json X,Y,W,H`
//! The truth file holds `marker_px`: the marker's centre in display pixels for every frame.

fn main() -> Result<(), Box<dyn std::error::Error>> {
    use ebbmark::footage::{Footage, Limits};
    use ebbmark::track::{PixelBox, Plan, walk};
    let args: Vec<String> = std::env::args().skip(1).collect();
    let truth: serde_json::Value = serde_json::from_str(&std::fs::read_to_string(&args[1])?)?;
    let numbers: Vec<i64> = args[2]
        .split(',')
        .map(str::parse)
        .collect::<Result<_, _>>()?;
    let marker = PixelBox {
        left: numbers[0],
        top: numbers[1],
        width: numbers[2] as usize,
        height: numbers[3] as usize,
    };
    let mut footage = Footage::open(args[0].as_ref(), Limits::default())?;
    let orientation = footage.facts().orientation;
    let at_frame = args.get(3).map_or(Ok(0), |a| a.parse())?;
    let plan = Plan {
        marker,
        at_frame,
        steady: None,
        along: [1.0, 0.0],
    };
    let start = std::time::Instant::now();
    let track = walk(&mut footage, &plan, &mut |_| {})?;
    let elapsed = start.elapsed();
    let wanted: Vec<[f64; 2]> = serde_json::from_value(truth["marker_px"].clone())?;
    let mut d = Vec::new();
    for (k, (outcome, w)) in track.marker.iter().zip(&wanted).enumerate() {
        match outcome.seen() {
            Some(s) => {
                let p = orientation.display_from_coded(s.p_px);
                d.push((
                    k,
                    p[0] - w[0],
                    p[1] - w[1],
                    s.u_along_px([1.0, 0.0]),
                    s.match_score,
                    track.notes[k].kind,
                ));
            }
            None => println!("frame {k}: {outcome:?}"),
        }
    }
    let n = d.len() as f64;
    let (mx, my) = (
        d.iter().map(|r| r.1).sum::<f64>() / n,
        d.iter().map(|r| r.2).sum::<f64>() / n,
    );
    let rms = |f: &dyn Fn(&(usize, f64, f64, f64, f64, ebbmark::footage::PictureKind)) -> f64| {
        (d.iter().map(|r| f(r).powi(2)).sum::<f64>() / n).sqrt()
    };
    println!("frames {} of {}  {:.2?}", d.len(), wanted.len(), elapsed);
    println!(
        "offset {mx:.4} {my:.4}  rms about it {:.4} {:.4}",
        rms(&|r| r.1 - mx),
        rms(&|r| r.2 - my)
    );
    println!(
        "mean u {:.4}  score {:.4}..{:.4} sd(err/u) {:.3}",
        d.iter().map(|r| r.3).sum::<f64>() / n,
        d.iter().map(|r| r.4).fold(2.0, f64::min),
        d.iter().map(|r| r.4).fold(0.0, f64::max),
        rms(&|r| (r.1 - mx) / r.3)
    );
    Ok(())
}
