//! Triangles over which the rebuilt surface is told, and the surface over them (DESIGN 3.6).

use crate::base::Vec3;
use crate::geom::Triangle;
use nalgebra::Matrix2;

/// A place on the rebuilt surface.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Spot {
    /// The place [m].
    pub point: Vec3,
    /// Unit normal out of the metal [1].
    pub normal: Vec3,
}

/// A triangle with the surface over it.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Chart {
    /// A facet of the body that it stands for.
    pub facet: u32,
    /// Corners, on the surface [m].
    pub corners: [Vec3; 3],
    /// Unit normals of the surface at the corners [1].
    pub normals: [Vec3; 3],
}

impl Chart {
    /// The flat triangle.
    pub fn flat(&self) -> Triangle {
        Triangle::new(self.corners)
    }

    /// The surface at barycentric coordinates `w`: the cubic of Vlachos et al., curved PN triangles, I3D
    /// 2001, through the corner normals; the normal is their mean.
    pub fn spot(&self, w: [f64; 3]) -> Spot {
        let flat = self.flat();
        let own = flat.normal();
        let sum = self.normals[0] * w[0] + self.normals[1] * w[1] + self.normals[2] * w[2];
        let normal = sum.try_normalize(0.0).unwrap_or(own);
        let [a, b, c] = self.corners;
        // Offsets of the control points b210 … from the straight side, along the corner normals.
        let side = |i: usize, j: usize| {
            let (p, q) = (self.corners[i], self.corners[j]);
            self.normals[i] * (-(q - p).dot(&self.normals[i]) / 3.0)
        };
        let mut bulge = Vec3::zeros();
        let mut mean = Vec3::zeros();
        for i in 0..3 {
            for j in (0..3).filter(|j| *j != i) {
                let h = side(i, j);
                bulge += h * (3.0 * w[i] * w[i] * w[j]);
                mean += h / 6.0;
            }
        }
        bulge += mean * (6.0 * 1.5 * w[0] * w[1] * w[2]);
        Spot { point: a * w[0] + b * w[1] + c * w[2] + bulge, normal }
    }

    /// Principal curvatures at `w`, positive where the metal bulges out [1/m]: from the change of the
    /// normals over the triangle.
    pub fn curvatures(&self, w: [f64; 3]) -> [f64; 2] {
        let n = self.spot(w).normal;
        let [a, b, c] = self.corners;
        let Some(e) = (b - a - n * (b - a).dot(&n)).try_normalize(0.0) else { return [0.0; 2] };
        let f = n.cross(&e);
        let flat = |d: Vec3| nalgebra::Vector2::new(d.dot(&e), d.dot(&f));
        let jacobian = Matrix2::from_columns(&[flat(b - a), flat(c - a)]);
        let turned = Matrix2::from_columns(&[
            flat(self.normals[1] - self.normals[0]),
            flat(self.normals[2] - self.normals[0]),
        ]);
        let Some(inverse) = jacobian.try_inverse() else { return [0.0; 2] };
        let s = turned * inverse;
        let (p, q, r) = (s[(0, 0)], 0.5 * (s[(0, 1)] + s[(1, 0)]), s[(1, 1)]);
        let (mean, half) = (0.5 * (p + r), (0.25 * (p - r) * (p - r) + q * q).sqrt());
        [mean + half, mean - half]
    }
}
