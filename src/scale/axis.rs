//! The motion axis: the straight line nearest to the marker's path.

/// Why no axis could be laid through a path.
#[derive(Clone, Debug, PartialEq, thiserror::Error)]
#[non_exhaustive]
pub enum ScaleError {
    /// Fewer than two sightings.
    #[error(
        "the marker was found in {n} frames, too few for an axis; check the marker box and the start frame"
    )]
    TooFewSightings {
        /// Number of sightings.
        n: usize,
    },
}

/// A line in display pixels with a direction of growing x.
#[derive(Clone, Debug, PartialEq)]
pub struct MotionAxis {
    /// Mean marker position: x = 0, display px.
    pub origin_px: [f64; 2],
    /// Unit vector of growing x, display px: to the right, or downwards for an axis nearer the upright.
    pub direction: [f64; 2],
    /// RMS distance of the sightings from the axis, display px.
    pub off_axis_rms_px: f64,
}

impl MotionAxis {
    /// Distance along the axis from its origin, and distance from it (to the right of its direction), display px.
    #[must_use]
    pub fn along_and_off_px(&self, p_px: [f64; 2]) -> [f64; 2] {
        let (x, y) = (p_px[0] - self.origin_px[0], p_px[1] - self.origin_px[1]);
        let [dx, dy] = self.direction;
        [x * dx + y * dy, y * dx - x * dy]
    }
}

/// Sightings farther from the axis than this many times the median distance are left out of it: a mislaid marker must not turn it.
const STRAY_MEDIANS: f64 = 10.0;
/// Times the axis is laid anew without strays.
const PASSES: usize = 3;

/// The axis through a marker's path by total least squares: the line with the least sum of squared distances.
///
/// * `path_px`: display px. The direction is the principal axis of the path's covariance.
///
/// # Errors
/// [`ScaleError::TooFewSightings`] below two sightings.
pub fn motion_axis(path_px: &[[f64; 2]]) -> Result<MotionAxis, ScaleError> {
    if path_px.len() < 2 {
        return Err(ScaleError::TooFewSightings { n: path_px.len() });
    }
    let mut axis = through(path_px);
    for _ in 0..PASSES {
        let distances: Vec<f64> = path_px
            .iter()
            .map(|&p_px| axis.along_and_off_px(p_px)[1].abs())
            .collect();
        let mut sorted = distances.clone();
        sorted.sort_by(f64::total_cmp);
        let limit = STRAY_MEDIANS * sorted[sorted.len() / 2];
        let near: Vec<[f64; 2]> = path_px
            .iter()
            .zip(&distances)
            .filter(|(_, distance)| **distance <= limit)
            .map(|(&p_px, _)| p_px)
            .collect();
        if near.len() < 2 || near.len() == path_px.len() {
            break;
        }
        axis = through(&near);
    }
    Ok(axis)
}

fn through(path_px: &[[f64; 2]]) -> MotionAxis {
    #[expect(clippy::cast_precision_loss, reason = "a number of frames")]
    let n = path_px.len() as f64;
    let mean = |axis: usize| path_px.iter().map(|p_px| p_px[axis]).sum::<f64>() / n;
    let origin_px = [mean(0), mean(1)];
    let (mut xx, mut xy, mut yy) = (0.0, 0.0, 0.0);
    for p_px in path_px {
        let (x, y) = (p_px[0] - origin_px[0], p_px[1] - origin_px[1]);
        xx += x * x;
        xy += x * y;
        yy += y * y;
    }
    // Half the angle of the covariance's double-angle vector: well defined whatever the slope. A path without extent
    // gives atan2(0, 0) = 0, an axis to the right.
    let angle = 0.5 * (2.0 * xy).atan2(xx - yy);
    let (mut dy, mut dx) = angle.sin_cos();
    // atan2/2 lies in −90°…90°: x grows to the right. Nearer the upright than 45° it grows downwards.
    if dy.abs() > dx.abs() && dy < 0.0 {
        (dx, dy) = (-dx, -dy);
    }
    let mut axis = MotionAxis {
        origin_px,
        direction: [dx, dy],
        off_axis_rms_px: 0.0,
    };
    let squares: f64 = path_px
        .iter()
        .map(|&p_px| axis.along_and_off_px(p_px)[1].powi(2))
        .sum();
    axis.off_axis_rms_px = (squares / n).sqrt();
    axis
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn a_planted_axis_is_found_at_any_angle(degrees in -180.0_f64..180.0, x0 in -500.0_f64..500.0) {
            let (sin, cos) = degrees.to_radians().sin_cos();
            let path: Vec<[f64; 2]> = (0..200)
                .map(|k| {
                    let along = 100.0 * (f64::from(k) * 0.1).sin();
                    [x0 + along * cos, 40.0 + along * sin]
                })
                .collect();
            let axis = motion_axis(&path).unwrap();
            let cross = axis.direction[0] * sin - axis.direction[1] * cos;
            prop_assert!(cross.abs() < 1e-12, "{axis:?}");
            prop_assert!(axis.off_axis_rms_px < 1e-9);
            let [dx, dy] = axis.direction;
            let growing = if dx.abs() >= dy.abs() { dx } else { dy };
            prop_assert!(growing > 0.0);
        }
    }

    #[test]
    fn a_few_strays_do_not_turn_the_axis() {
        let mut path: Vec<[f64; 2]> = (0..300)
            .map(|k| [f64::from(k % 100), 50.0 + 0.02 * f64::from(k % 3)])
            .collect();
        path[7] = [50.0, 400.0];
        path[90] = [10.0, 0.0];
        let axis = motion_axis(&path).unwrap();
        assert!(axis.direction[1].abs() < 1e-4, "{axis:?}");
        assert!(motion_axis(&path[..1]).is_err());
    }

    #[test]
    fn distance_from_the_axis_is_counted_to_the_right_of_it() {
        let axis = MotionAxis {
            origin_px: [10.0, 10.0],
            direction: [0.6, 0.8],
            off_axis_rms_px: 0.0,
        };
        let [along, off] = axis.along_and_off_px([10.0 + 0.6 * 5.0 - 0.8, 10.0 + 0.8 * 5.0 + 0.6]);
        assert!((along - 5.0).abs() < 1e-12 && (off - 1.0).abs() < 1e-12);
    }
}
