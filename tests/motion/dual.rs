//! Numbers that carry their exact derivatives, so that each certified model is written down once.

#![allow(
    clippy::suspicious_arithmetic_impl,
    reason = "the product and quotient rules mix the operations"
)]

use std::ops::{Add, Div, Mul, Neg, Sub};

/// No certified model has more parameters.
pub(crate) const MAX_PARAMETERS: usize = 9;

/// A value and its derivatives with respect to the parameters.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Dual {
    pub(crate) value: f64,
    pub(crate) slope: [f64; MAX_PARAMETERS],
}

impl Dual {
    pub(crate) fn constant(value: f64) -> Self {
        Self {
            value,
            slope: [0.0; MAX_PARAMETERS],
        }
    }
    pub(crate) fn parameter(value: f64, index: usize) -> Self {
        let mut dual = Self::constant(value);
        dual.slope[index] = 1.0;
        dual
    }
    /// f(self), given f and f′ there.
    fn chain(self, value: f64, derivative: f64) -> Self {
        Self {
            value,
            slope: self.slope.map(|s| s * derivative),
        }
    }
    pub(crate) fn exp(self) -> Self {
        self.chain(self.value.exp(), self.value.exp())
    }
    pub(crate) fn ln(self) -> Self {
        self.chain(self.value.ln(), 1.0 / self.value)
    }
    pub(crate) fn sin(self) -> Self {
        self.chain(self.value.sin(), self.value.cos())
    }
    pub(crate) fn cos(self) -> Self {
        self.chain(self.value.cos(), -self.value.sin())
    }
    pub(crate) fn atan(self) -> Self {
        self.chain(self.value.atan(), 1.0 / (1.0 + self.value * self.value))
    }
    pub(crate) fn square(self) -> Self {
        self * self
    }
    pub(crate) fn powf(self, exponent: impl Into<Dual>) -> Self {
        (exponent.into() * self.ln()).exp()
    }
}

impl From<f64> for Dual {
    fn from(value: f64) -> Self {
        Self::constant(value)
    }
}

fn both(
    a: [f64; MAX_PARAMETERS],
    b: [f64; MAX_PARAMETERS],
    join: impl Fn(f64, f64) -> f64,
) -> [f64; MAX_PARAMETERS] {
    std::array::from_fn(|i| join(a[i], b[i]))
}

impl<T: Into<Dual>> Add<T> for Dual {
    type Output = Self;
    fn add(self, other: T) -> Self {
        let other = other.into();
        Self {
            value: self.value + other.value,
            slope: both(self.slope, other.slope, |a, b| a + b),
        }
    }
}
impl<T: Into<Dual>> Sub<T> for Dual {
    type Output = Self;
    fn sub(self, other: T) -> Self {
        let other = other.into();
        Self {
            value: self.value - other.value,
            slope: both(self.slope, other.slope, |a, b| a - b),
        }
    }
}
impl<T: Into<Dual>> Mul<T> for Dual {
    type Output = Self;
    fn mul(self, other: T) -> Self {
        let other = other.into();
        Self {
            value: self.value * other.value,
            slope: both(self.slope, other.slope, |a, b| {
                a * other.value + self.value * b
            }),
        }
    }
}
impl<T: Into<Dual>> Div<T> for Dual {
    type Output = Self;
    fn div(self, other: T) -> Self {
        let other = other.into();
        let value = self.value / other.value;
        Self {
            value,
            slope: both(self.slope, other.slope, |a, b| {
                (a - value * b) / other.value
            }),
        }
    }
}
impl Neg for Dual {
    type Output = Self;
    fn neg(self) -> Self {
        self * -1.0
    }
}

#[test]
fn derivatives_agree_with_finite_differences() {
    let f = |b: Dual| (b.sin() * b.exp() - b.atan() / b.square()).powf(1.5) + b.cos().ln();
    let (at, step) = (1.2, 1e-6);
    let exact = f(Dual::parameter(at, 0)).slope[0];
    let numeric =
        (f(Dual::constant(at + step)).value - f(Dual::constant(at - step)).value) / (2.0 * step);
    assert!(
        (exact / numeric - 1.0).abs() < 1e-8,
        "exact {exact}, numeric {numeric}"
    );
}
