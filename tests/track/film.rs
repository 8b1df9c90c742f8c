//! A film in memory: a textured marker drawn at known places on a still, textured wall.

use ebbmark::footage::{FootageError, Frame, FrameSource, LumaView, PictureKind};

pub(crate) const WIDTH: usize = 320;
pub(crate) const HEIGHT: usize = 120;
/// Side of the marker, px.
pub(crate) const MARKER_PX: usize = 24;

/// What one frame shows.
#[derive(Clone, Copy)]
pub(crate) struct Shot {
    /// Marker's centre, px; None: it is not there.
    pub(crate) marker: Option<[f64; 2]>,
    /// A second, similar marker.
    pub(crate) other: Option<[f64; 2]>,
    /// A dark, textured block over x < this column.
    pub(crate) hand_to_px: usize,
    /// Factor on the luma.
    pub(crate) light: f64,
    pub(crate) damaged: bool,
}

impl Shot {
    pub(crate) fn of(x: f64, y: f64) -> Self {
        Self {
            marker: Some([x, y]),
            other: None,
            hand_to_px: 0,
            light: 1.0,
            damaged: false,
        }
    }
}

/// A value without order in −0.5…0.5 for a pixel.
fn grain(x: i64, y: i64, salt: u64) -> f64 {
    let mut z = (x as u64).wrapping_mul(0x9E37_79B9_7F4A_7C15)
        ^ (y as u64).wrapping_mul(0xBF58_476D_1CE4_E5B9)
        ^ salt;
    z = (z ^ (z >> 30)).wrapping_mul(0xBF58_476D_1CE4_E5B9);
    z = (z ^ (z >> 27)).wrapping_mul(0x94D0_49BB_1331_11EB);
    ((z ^ (z >> 31)) >> 11) as f64 / (1_u64 << 53) as f64 - 0.5
}

/// The marker's pattern at a place from its centre, px, and how much of the pixel it covers: four quarters, soft edges.
fn pattern(dx: f64, dy: f64) -> (f64, f64) {
    let half = MARKER_PX as f64 / 2.0 - 2.0;
    let inside = |d: f64| 0.5 - 0.5 * ((d.abs() - half) / 0.8).tanh();
    (
        128.0 + 90.0 * (dx / 1.2).tanh() * (dy / 1.2).tanh(),
        inside(dx) * inside(dy),
    )
}

fn draw(shot: &Shot, number: usize) -> Vec<u8> {
    let mut grey = Vec::with_capacity(WIDTH * HEIGHT);
    for y in 0..HEIGHT {
        for x in 0..WIDTH {
            let (xf, yf) = (x as f64, y as f64);
            let wall = 120.0
                + 25.0 * (0.11 * xf).sin() * (0.07 * yf).cos()
                + 30.0 * grain((x / 5) as i64, (y / 5) as i64, 7);
            let mut value = wall;
            for [mx, my] in [shot.marker, shot.other].into_iter().flatten() {
                let (marker, cover) = pattern(xf - mx, yf - my);
                value += cover * (marker - value);
            }
            if x < shot.hand_to_px {
                value = 70.0 + 40.0 * (0.2 * xf + 0.13 * yf).sin();
            }
            let noisy = value * shot.light + 3.0 * grain(x as i64, y as i64, 1000 + number as u64);
            grey.push(noisy.round().clamp(0.0, 255.0) as u8);
        }
    }
    grey
}

/// Frames at 30 Hz in ticks of 1/600 s, drawn as they are asked for.
pub(crate) struct Film {
    pub(crate) shots: Vec<Shot>,
    next: usize,
    picture: Vec<u8>,
    /// Frames between places where reading may start again, as in a compressed film.
    pub(crate) group: usize,
    pub(crate) n_drawn: usize,
}

impl Film {
    pub(crate) fn new(shots: Vec<Shot>) -> Self {
        Self {
            shots,
            next: 0,
            picture: Vec::new(),
            group: 12,
            n_drawn: 0,
        }
    }
}

impl FrameSource for Film {
    fn next_frame(&mut self) -> Result<Option<Frame<'_>>, FootageError> {
        let Some(shot) = self.shots.get(self.next) else {
            return Ok(None);
        };
        self.picture = draw(shot, self.next);
        self.n_drawn += 1;
        let index = self.next;
        self.next += 1;
        Ok(Some(Frame {
            index,
            stamp: Some(20 * index as i64 + 100),
            luma: LumaView::from_grey(&self.picture, WIDTH, HEIGHT).unwrap(),
            kind: PictureKind::Unknown,
            damaged: shot.damaged,
            interlaced: false,
        }))
    }

    fn go_to(&mut self, stamp: i64, _frame: usize) -> Result<(), FootageError> {
        let frame = ((stamp - 100) / 20) as usize;
        self.next = frame / self.group * self.group;
        Ok(())
    }
}
