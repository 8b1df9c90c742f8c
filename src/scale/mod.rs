//! Scale: from display pixels to metres along the motion axis.
//!
//! In: the scale bar's ends and length, and the marker's path in display pixels. Out: a [`ScaleAxis`] that turns a
//! display position into a position along the axis and a distance from it.

mod axis;
mod bar;

pub use axis::{MotionAxis, ScaleError, motion_axis};
pub use bar::{BarError, ScaleBar};

/// Length of a pixel along the motion, and the axis.
#[derive(Clone, Debug, PartialEq)]
pub struct ScaleAxis {
    /// The bar the scale rests on.
    pub bar: ScaleBar,
    /// The axis found in the marker's path.
    pub axis: MotionAxis,
}

impl ScaleAxis {
    /// Position along the axis and distance from it, m, of a display position.
    #[must_use]
    pub fn metres_from_px(&self, p_px: [f64; 2]) -> [f64; 2] {
        self.axis
            .along_and_off_px(p_px)
            .map(|distance_px| distance_px * self.bar.m_per_px())
    }

    /// Angle between bar and axis, rad, 0…π/2.
    #[must_use]
    pub fn bar_angle_rad(&self) -> f64 {
        let [[x1, y1], [x2, y2]] = self.bar.ends_px();
        let [dx, dy] = self.axis.direction;
        let cross = (x2 - x1) * dy - (y2 - y1) * dx;
        let dot = (x2 - x1) * dx + (y2 - y1) * dy;
        cross.abs().atan2(dot.abs())
    }
}
