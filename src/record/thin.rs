//! Fewer points for a drawing: the outline of a long series is kept, the file stays small.

/// A point of a drawing: time, value.
pub(super) type Point = (f64, f64);

/// The lowest and the highest point of each of `n_bins` equal shares of a series, in order of the series.
///
/// Returns at most 2 · `n_bins` points; a series that short comes back as it is. For drawing only: no figure rests on it.
pub(super) fn outline(points: &[Point], n_bins: usize) -> Vec<Point> {
    if n_bins == 0 || points.len() <= 2 * n_bins {
        return points.to_vec();
    }
    let mut kept = Vec::with_capacity(2 * n_bins);
    for bin in 0..n_bins {
        let share = &points[bin * points.len() / n_bins..(bin + 1) * points.len() / n_bins];
        let by_value = |a: &(usize, &Point), b: &(usize, &Point)| a.1.1.total_cmp(&b.1.1);
        let low = share.iter().enumerate().min_by(by_value);
        let high = share.iter().enumerate().max_by(by_value);
        if let (Some((i_low, low)), Some((i_high, high))) = (low, high) {
            match i_low.cmp(&i_high) {
                std::cmp::Ordering::Less => kept.extend([*low, *high]),
                std::cmp::Ordering::Greater => kept.extend([*high, *low]),
                std::cmp::Ordering::Equal => kept.push(*low),
            }
        }
    }
    kept
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn lowest_and_highest_of_each_share_stay_in_order() {
        let points = [(0.0, 1.0), (1.0, 5.0), (2.0, -2.0), (3.0, 0.0), (4.0, 3.0), (5.0, 4.0)];
        assert_eq!(outline(&points, 2), [(1.0, 5.0), (2.0, -2.0), (3.0, 0.0), (5.0, 4.0)]);
        assert_eq!(outline(&points, 3), points.to_vec(), "short enough already");
    }
}
