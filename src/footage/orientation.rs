//! Coded pixels and display pixels.
//!
//! Pixels are never turned: coordinates are. Display pixels are what a viewer shows: pixel aspect first, then the
//! display matrix; the centre of the top-left pixel is (0, 0) in both spaces.

/// The map between coded and display pixels of one stream.
///
/// # Source
/// Display matrix: [ISO/IEC 14496-12](crate::sources::Iso14496_12), track header: x′ = a x + c y + x₀, y′ = b x + d y + y₀.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Orientation {
    coded_width: u32,
    coded_height: u32,
    /// Width over height of a pixel, as a fraction.
    pixel_aspect: [u32; 2],
    /// a, b, c, d of the display matrix as −1, 0 or 1.
    turn: [i8; 4],
}

impl Orientation {
    /// The map of a picture of `coded_width` × `coded_height` px whose pixels are `pixel_aspect` wide to high, turned by
    /// the display matrix' upper left entries a, b, c, d (16.16 fixed point; `None`: not turned).
    ///
    /// Returns `None` where the matrix is no multiple of a right angle, with or without mirroring. An aspect with a zero
    /// in it stands for "not known" and counts as 1 : 1.
    #[must_use]
    pub fn new(
        coded_width: u32,
        coded_height: u32,
        pixel_aspect: [u32; 2],
        matrix: Option<[i32; 4]>,
    ) -> Option<Self> {
        let pixel_aspect = if pixel_aspect.contains(&0) {
            [1, 1]
        } else {
            pixel_aspect
        };
        let turn = match matrix {
            None => [1, 0, 0, 1],
            Some(entries) => right_angle(entries)?,
        };
        Some(Self {
            coded_width,
            coded_height,
            pixel_aspect,
            turn,
        })
    }

    /// Coded width and height, px.
    #[must_use]
    pub fn coded_size_px(&self) -> [u32; 2] {
        [self.coded_width, self.coded_height]
    }

    /// Width over height of a pixel, as a fraction.
    #[must_use]
    pub fn pixel_aspect(&self) -> [u32; 2] {
        self.pixel_aspect
    }

    /// Width over height of a pixel.
    fn aspect(&self) -> f64 {
        f64::from(self.pixel_aspect[0]) / f64::from(self.pixel_aspect[1])
    }

    /// Width and height on the display, px; not whole numbers where the pixel aspect is not 1.
    #[must_use]
    pub fn display_size_px(&self) -> [f64; 2] {
        let wide = f64::from(self.coded_width) * self.aspect();
        let high = f64::from(self.coded_height);
        if self.turn[0] == 0 {
            [high, wide]
        } else {
            [wide, high]
        }
    }

    /// Clockwise turn for display in degrees (0, 90, 180, 270) and whether left and right are exchanged before it.
    #[must_use]
    pub fn turn(&self) -> (i32, bool) {
        let [a, b, c, d] = self.turn;
        let mirrored = a * d - b * c < 0;
        // With the mirror x → −x taken first, the rest of the matrix is a pure turn.
        let (a, b) = if mirrored { (-a, -b) } else { (a, b) };
        let degrees = match (a, b) {
            (0, 1) => 90,
            (-1, 0) => 180,
            (0, -1) => 270,
            _ => 0,
        };
        (degrees, mirrored)
    }

    /// Offset that brings the turned picture's corner to (0, 0).
    fn shift(&self) -> [f64; 2] {
        let wide = f64::from(self.coded_width) * self.aspect();
        let high = f64::from(self.coded_height);
        let [a, b, c, d] = self.turn.map(f64::from);
        [
            -(a * wide).min(0.0) - (c * high).min(0.0),
            -(b * wide).min(0.0) - (d * high).min(0.0),
        ]
    }

    /// Display position of a coded position, px.
    #[must_use]
    pub fn display_from_coded(&self, p_px: [f64; 2]) -> [f64; 2] {
        let (x, y) = ((p_px[0] + 0.5) * self.aspect(), p_px[1] + 0.5);
        let [a, b, c, d] = self.turn.map(f64::from);
        let shift = self.shift();
        [
            a * x + c * y + shift[0] - 0.5,
            b * x + d * y + shift[1] - 0.5,
        ]
    }

    /// Coded position of a display position, px.
    #[must_use]
    pub fn coded_from_display(&self, p_px: [f64; 2]) -> [f64; 2] {
        let shift = self.shift();
        let (x, y) = (p_px[0] + 0.5 - shift[0], p_px[1] + 0.5 - shift[1]);
        // A turn with or without mirror is orthogonal: its inverse is its transpose.
        let [a, b, c, d] = self.turn.map(f64::from);
        [(a * x + b * y) / self.aspect() - 0.5, c * x + d * y - 0.5]
    }

    /// Coded direction (not of unit length) of a display direction.
    #[must_use]
    pub fn coded_direction(&self, direction: [f64; 2]) -> [f64; 2] {
        let origin = self.coded_from_display([0.0, 0.0]);
        let end = self.coded_from_display(direction);
        [end[0] - origin[0], end[1] - origin[1]]
    }
}

/// The entries as −1, 0 or 1, if the matrix is a turn by a right angle; a size other than 1 is left to the viewer.
fn right_angle(entries: [i32; 4]) -> Option<[i8; 4]> {
    let signs = entries.map(|entry| match entry {
        0 => 0,
        entry if entry > 0 => 1,
        _ => -1,
    });
    match signs {
        [a, 0, 0, d] if a != 0 && d != 0 => Some(signs),
        [0, b, c, 0] if b != 0 && c != 0 => Some(signs),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    /// ISO/IEC 14496-12, track header matrix; the display positions are worked out by hand for a stored picture of 6 × 4 px.
    #[test]
    fn each_display_matrix_moves_a_pixel_where_the_standard_says() {
        let one = 65536;
        let (w, h) = (6.0, 4.0);
        let (i, j) = (1.0, 2.0);
        let cases = [
            ([one, 0, 0, one], [i, j], (0, false)),
            ([0, one, -one, 0], [h - 1.0 - j, i], (90, false)),
            ([-one, 0, 0, -one], [w - 1.0 - i, h - 1.0 - j], (180, false)),
            ([0, -one, one, 0], [j, w - 1.0 - i], (270, false)),
            ([-one, 0, 0, one], [w - 1.0 - i, j], (0, true)),
        ];
        for (matrix, wanted, turn) in cases {
            let orientation = Orientation::new(6, 4, [1, 1], Some(matrix)).unwrap();
            let got = orientation.display_from_coded([i, j]);
            let off = [got[0] - wanted[0], got[1] - wanted[1]];
            assert!(
                off.iter().all(|off| off.abs() < 1e-12),
                "{matrix:?}: {got:?}"
            );
            assert_eq!(orientation.turn(), turn, "{matrix:?}");
        }
    }

    #[test]
    fn there_and_back_is_the_same_pixel_for_all_eight_turns_and_wide_pixels() {
        for matrix in [
            [1, 0, 0, 1],
            [0, 1, -1, 0],
            [-1, 0, 0, -1],
            [0, -1, 1, 0],
            [-1, 0, 0, 1],
            [0, 1, 1, 0],
            [1, 0, 0, -1],
            [0, -1, -1, 0],
        ] {
            let orientation = Orientation::new(720, 576, [16, 11], Some(matrix)).unwrap();
            let p = [100.25, 17.75];
            let back = orientation.coded_from_display(orientation.display_from_coded(p));
            assert!(
                (back[0] - p[0]).abs() < 1e-10 && (back[1] - p[1]).abs() < 1e-10,
                "{matrix:?}: {back:?}"
            );
            let size = orientation.display_size_px();
            let corner = orientation.display_from_coded([-0.5, -0.5]);
            let other = orientation.display_from_coded([719.5, 575.5]);
            let low = [corner[0].min(other[0]), corner[1].min(other[1])];
            let high = [corner[0].max(other[0]), corner[1].max(other[1])];
            assert!(
                (low[0] + 0.5).abs() < 1e-9 && (low[1] + 0.5).abs() < 1e-9,
                "{matrix:?}: {low:?}"
            );
            assert!(
                (high[0] - size[0] + 0.5).abs() < 1e-9 && (high[1] - size[1] + 0.5).abs() < 1e-9,
                "{matrix:?}: {high:?}"
            );
        }
    }

    #[test]
    fn a_slanted_matrix_is_no_orientation() {
        assert!(Orientation::new(6, 4, [1, 1], Some([46341, 46341, -46341, 46341])).is_none());
        assert!(Orientation::new(6, 4, [1, 1], Some([0, 0, 0, 0])).is_none());
    }
}
