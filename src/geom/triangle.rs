//! The flat triangle.

use crate::base::Vec3;

/// A flat triangle; its normal follows the right hand through the corners.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Triangle {
    /// Corners [m].
    pub corners: [Vec3; 3],
}

impl Triangle {
    /// The triangle through three corners [m].
    pub fn new(corners: [Vec3; 3]) -> Self {
        Triangle { corners }
    }

    /// Normal times twice the area [m²].
    pub fn cross(&self) -> Vec3 {
        let [a, b, c] = &self.corners;
        (b - a).cross(&(c - a))
    }

    /// Area [m²].
    pub fn area(&self) -> f64 {
        0.5 * self.cross().norm()
    }

    /// Unit normal [1]; zero for a triangle without area.
    pub fn normal(&self) -> Vec3 {
        self.cross().try_normalize(0.0).unwrap_or_else(Vec3::zeros)
    }

    /// Centroid [m].
    pub fn centroid(&self) -> Vec3 {
        let [a, b, c] = &self.corners;
        (a + b + c) / 3.0
    }

    /// Length of the longest edge [m].
    pub fn longest_edge(&self) -> f64 {
        let [a, b, c] = &self.corners;
        (b - a).norm().max((c - b).norm()).max((a - c).norm())
    }

    /// Point with barycentric coordinates `w` [m].
    pub fn at(&self, w: [f64; 3]) -> Vec3 {
        self.corners[0] * w[0] + self.corners[1] * w[1] + self.corners[2] * w[2]
    }
}
