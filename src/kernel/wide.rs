//! Numbers of twice the length, for the determinants of slivers and the distance from a near line.
//!
//! Sums and products without error: Dekker, Numer. Math. 18 (1971) 224; about 31 digits.

use crate::base::Vec3;
use std::array::from_fn;

/// An unevaluated sum of a number and its rounding error.
#[derive(Clone, Copy, Debug)]
pub(super) struct Wide(f64, f64);

/// A vector of such numbers.
pub(super) type Wide3 = [Wide; 3];

impl Wide {
    /// `a − b` without error.
    fn difference(a: f64, b: f64) -> Self {
        let hi = a - b;
        let back = hi - a;
        Wide(hi, (a - (hi - back)) - (b + back))
    }

    fn plus(self, other: Self) -> Self {
        let Wide(hi, lo) = Wide::difference(self.0, -other.0);
        let lo = lo + (self.1 + other.1);
        let sum = hi + lo;
        Wide(sum, lo - (sum - hi))
    }

    fn times(self, other: Self) -> Self {
        let hi = self.0 * other.0;
        let lo = self.0.mul_add(other.0, -hi) + (self.0 * other.1 + self.1 * other.0);
        let sum = hi + lo;
        Wide(sum, lo - (sum - hi))
    }

    fn negated(self) -> Self {
        Wide(-self.0, -self.1)
    }
}

/// `a − b` without error.
pub(super) fn difference(a: &Vec3, b: &Vec3) -> Wide3 {
    from_fn(|i| Wide::difference(a[i], b[i]))
}

/// `a × b`.
pub(super) fn cross(a: &Wide3, b: &Wide3) -> Wide3 {
    from_fn(|i| {
        let (j, k) = ((i + 1) % 3, (i + 2) % 3);
        a[j].times(b[k]).plus(a[k].times(b[j]).negated())
    })
}

/// `a · b`, rounded once.
pub(super) fn dot(a: &Wide3, b: &Wide3) -> f64 {
    let sum = a[0].times(b[0]).plus(a[1].times(b[1])).plus(a[2].times(b[2]));
    sum.0 + sum.1
}

/// The nearest vector of ordinary numbers.
pub(super) fn rounded(a: &Wide3) -> Vec3 {
    Vec3::new(a[0].0 + a[0].1, a[1].0 + a[1].1, a[2].0 + a[2].1)
}
