//! Boxes with sides along the axes.

use crate::base::Vec3;

/// A box with sides along the axes; empty while `lo` lies above `hi`.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Bounds {
    /// Lowest coordinates [m].
    pub lo: Vec3,
    /// Highest coordinates [m].
    pub hi: Vec3,
}

impl Bounds {
    /// The box that holds nothing.
    pub fn empty() -> Self {
        Bounds { lo: Vec3::repeat(f64::INFINITY), hi: Vec3::repeat(f64::NEG_INFINITY) }
    }

    /// Smallest box around `points` [m].
    pub fn of<'a>(points: impl IntoIterator<Item = &'a Vec3>) -> Self {
        points.into_iter().fold(Bounds::empty(), |b, p| Bounds { lo: b.lo.inf(p), hi: b.hi.sup(p) })
    }

    /// Smallest box around both.
    pub fn joined(&self, other: &Bounds) -> Self {
        Bounds { lo: self.lo.inf(&other.lo), hi: self.hi.sup(&other.hi) }
    }

    /// The box moved outward by `by` [m] on every side.
    pub fn grown(&self, by: f64) -> Self {
        Bounds { lo: self.lo.add_scalar(-by), hi: self.hi.add_scalar(by) }
    }

    /// Whether the boxes share a point.
    pub fn meets(&self, other: &Bounds) -> bool {
        (0..3).all(|k| self.lo[k] <= other.hi[k] && other.lo[k] <= self.hi[k])
    }

    /// Whether `x` lies in the box or on its sides.
    pub fn holds(&self, x: &Vec3) -> bool {
        (0..3).all(|k| self.lo[k] <= x[k] && x[k] <= self.hi[k])
    }

    /// Lengths of the sides [m]; zero for an empty box.
    pub fn sides(&self) -> Vec3 {
        (self.hi - self.lo).map(|s| s.max(0.0))
    }

    /// Length of the diagonal [m].
    pub fn diagonal(&self) -> f64 {
        self.sides().norm()
    }

    /// Middle [m].
    pub fn centre(&self) -> Vec3 {
        (self.lo + self.hi) * 0.5
    }

    /// Square of the distance between the boxes [m²]; zero where they meet.
    pub fn distance_sq(&self, other: &Bounds) -> f64 {
        (0..3).map(|k| (self.lo[k] - other.hi[k]).max(other.lo[k] - self.hi[k]).max(0.0).powi(2)).sum()
    }

    /// Largest absolute coordinate [m]; zero for an empty box.
    pub fn reach(&self) -> f64 {
        let reach = self.lo.amax().max(self.hi.amax());
        if self.lo.x <= self.hi.x { reach } else { 0.0 }
    }
}
