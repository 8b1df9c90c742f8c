//! Slow motion: a file that plays at 30 Hz may have been captured at 240 Hz.
//!
//! The rate of capture comes from the container or from the user; it is never guessed from the picture.

use super::FootageError;

/// Where the rate of capture was taken from.
#[derive(Clone, Debug, PartialEq)]
pub enum CaptureRate {
    /// The stamps are real time.
    AsStamped,
    /// The user's figure, Hz.
    Given(f64),
    /// The container's figure, Hz, under a key, where it differs from the stamps' rate.
    FromMetadata(f64, String),
}

/// Containers' keys for the rate of capture.
///
/// `com.android.capture.fps`: written by the system's recorder as an `mdta` key, a float that FFmpeg shows as text.
/// The other is the same word as some recorders write it in a track. Apple's slow motion keeps real-time stamps and needs no key.
const KEYS: [&str; 2] = ["com.android.capture.fps", "capture.fps"];

/// The first usable rate of capture among metadata pairs, with its key.
pub fn capture_rate_from_metadata<'a>(
    pairs: impl Iterator<Item = (&'a str, &'a str)>,
) -> Option<(f64, String)> {
    pairs
        .filter(|(key, _)| KEYS.contains(key))
        .find_map(|(key, text)| {
            text.trim()
                .parse()
                .ok()
                .filter(|&rate_hz: &f64| rate_hz.is_finite() && rate_hz > 0.0)
                .map(|rate_hz| (rate_hz, key.to_owned()))
        })
}

/// A rate of capture within this share of the stamps' rate is the same rate, written as a nominal figure.
const SAME_RATE_REL: f64 = 0.05;
/// A stretch of the stamps within this share of a whole number is that number: recorders stretch by whole numbers, while
/// the rates that the quotient is taken of are nominal.
const WHOLE_STRETCH_REL: f64 = 0.01;

/// Capture time over file time for a film whose stamps run at `file_rate_hz`, and where the figure comes from.
///
/// A rate the user gives is taken as exact: frames are 1/rate apart. A rate in the metadata says by how much the stamps were
/// stretched; the stretch is brought to a whole number where it lies within 1 % of one.
///
/// # Errors
/// [`FootageError::CaptureRate`] where `given_hz` is not a finite number above 0.
pub fn time_scale(
    file_rate_hz: f64,
    given_hz: Option<f64>,
    metadata: Option<&(f64, String)>,
) -> Result<(f64, CaptureRate), FootageError> {
    if let Some(rate_hz) = given_hz {
        if !(rate_hz.is_finite() && rate_hz > 0.0) {
            return Err(FootageError::CaptureRate { rate_hz });
        }
        return Ok((file_rate_hz / rate_hz, CaptureRate::Given(rate_hz)));
    }
    let Some((rate_hz, key)) = metadata else {
        return Ok((1.0, CaptureRate::AsStamped));
    };
    let stretch = rate_hz / file_rate_hz;
    if (stretch - 1.0).abs() <= SAME_RATE_REL {
        return Ok((1.0, CaptureRate::AsStamped));
    }
    let whole = stretch.round();
    let stretch = if whole >= 2.0 && (stretch / whole - 1.0).abs() <= WHOLE_STRETCH_REL {
        whole
    } else {
        stretch
    };
    Ok((
        1.0 / stretch,
        CaptureRate::FromMetadata(*rate_hz, key.clone()),
    ))
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn slow_motion_is_read_from_the_key_and_nothing_else() {
        let pairs = [
            ("com.android.version", "14"),
            ("com.android.capture.fps", "240.000000"),
        ];
        assert_eq!(
            capture_rate_from_metadata(pairs.into_iter()),
            Some((240.0, "com.android.capture.fps".to_owned()))
        );
        assert_eq!(
            capture_rate_from_metadata([("com.android.capture.fps", "nan")].into_iter()),
            None
        );
        assert_eq!(
            capture_rate_from_metadata([("title", "240")].into_iter()),
            None
        );
    }

    #[test]
    fn a_nominal_rate_does_not_stretch_real_time_but_a_slow_motion_file_is_stretched_by_a_whole_number()
     {
        let key = |rate| Some((rate, "com.android.capture.fps".to_owned()));
        assert_eq!(
            time_scale(29.97, None, key(30.0).as_ref()).unwrap(),
            (1.0, CaptureRate::AsStamped)
        );
        let (scale, _) = time_scale(29.97, None, key(240.0).as_ref()).unwrap();
        assert!((scale - 0.125).abs() < 1e-15, "{scale}");
        let (scale, source) = time_scale(30.0, Some(239.5), key(240.0).as_ref()).unwrap();
        assert!((scale - 30.0 / 239.5).abs() < 1e-15);
        assert_eq!(source, CaptureRate::Given(239.5));
    }

    #[test]
    fn a_capture_rate_that_cannot_be_is_refused() {
        for rate in [0.0, -30.0, f64::NAN, f64::INFINITY] {
            assert!(
                matches!(
                    time_scale(30.0, Some(rate), None),
                    Err(FootageError::CaptureRate { .. })
                ),
                "{rate}"
            );
        }
    }
}
