//! Fewer points for a drawing, so that the file of a long record stays small.

/// A point of a drawing: time, value.
pub(super) type Point = (f64, f64);

/// At least `n_kept` points at an even stride, and the lowest and highest of each of `n_shares` shares of the series.
///
/// The stride alone would hide a lone reading far out; the extremes alone would leave the middle empty and make noise look
/// like two bands. A series of up to 2 · `n_kept` points comes back as it is. For drawing only: no figure rests on it.
pub(super) fn thinned(points: &[Point], n_kept: usize, n_shares: usize) -> Vec<Point> {
    let stride = points.len() / n_kept.max(1);
    if stride < 2 {
        return points.to_vec();
    }
    let mut kept: Vec<usize> = (0..points.len()).step_by(stride).collect();
    for share in 0..n_shares {
        let within = share * points.len() / n_shares..(share + 1) * points.len() / n_shares;
        let by_value = |a: &usize, b: &usize| points[*a].1.total_cmp(&points[*b].1);
        kept.extend(within.clone().min_by(by_value));
        kept.extend(within.max_by(by_value));
    }
    kept.sort_unstable();
    kept.dedup();
    kept.into_iter().map(|i| points[i]).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn a_lone_reading_far_out_survives_in_its_place() {
        let points: Vec<Point> = (0..10u32)
            .map(|i| (f64::from(i), if i == 5 { 9.0 } else { 1.0 }))
            .collect();
        let kept = thinned(&points, 3, 1);
        assert_eq!(
            kept.iter().map(|p| p.0).collect::<Vec<_>>(),
            [0.0, 3.0, 5.0, 6.0, 9.0],
            "{kept:?}"
        );
        assert_eq!(thinned(&points, 6, 2), points, "short enough already");
    }
}
