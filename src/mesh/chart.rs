//! Triangles over which the rebuilt surface is told, and the surface over them (DESIGN 3.6).

use crate::base::Vec3;
use crate::geom::Triangle;
use crate::mesh::Surface;
use crate::mesh::borders::Curve;
use crate::mesh::form::Form;
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
    /// A facet of the body that it stands for; the chart lies on the patch of that facet.
    pub facet: u32,
    /// Corners, on the surface [m].
    pub corners: [Vec3; 3],
    /// Unit normals of the surface at the corners, where it is told by them [1].
    pub normals: [Vec3; 3],
    /// Curves on which its sides lie, as indices in the patches of the surface; side `k` runs from corner `k`
    /// to corner `k + 1`.
    pub curves: [Option<u32>; 3],
    /// Sides on which its patch ends.
    pub borders: [bool; 3],
    /// Whether it stands for many facets.
    pub merged: bool,
    /// Mean height of the surface over the facets it stands for, where there are many [m].
    pub drawn: f64,
}

impl Chart {
    /// The chart of one facet.
    pub fn of_facet(surface: &Surface, facet: u32) -> Self {
        let corners = surface.welded.facets[facet as usize].map(|k| surface.welded.points[k as usize]);
        let normals = surface.normals[facet as usize];
        Chart { facet, corners, normals, curves: [None; 3], borders: [false; 3], merged: false, drawn: 0.0 }
    }

    /// The same with sides on `curves`, where it lies on a recognised form.
    pub fn on(self, surface: &Surface, curves: [Option<u32>; 3]) -> Self {
        if !self.is_exact(surface) {
            return self;
        }
        let formed = Chart::of_form(surface, self.facet, self.corners, curves);
        Chart { curves: formed.curves, borders: formed.borders, ..self }
    }

    /// A chart on the recognised form of the patch of `facet`, with sides on `curves`.
    pub fn of_form(surface: &Surface, facet: u32, corners: [Vec3; 3], curves: [Option<u32>; 3]) -> Self {
        let borders = curves.map(|c| c.is_some());
        let curves =
            curves.map(|c| c.filter(|c| matches!(surface.patches.curves[*c as usize], Curve::Arc { .. })));
        Chart { facet, corners, normals: [Vec3::zeros(); 3], curves, borders, merged: true, drawn: 0.0 }
    }

    /// The chart moved without change of shape.
    pub fn moved(&self, to: impl Fn(&Vec3) -> Vec3) -> Self {
        let way = |n: &Vec3| to(n) - to(&Vec3::zeros());
        Chart { corners: self.corners.map(|x| to(&x)), normals: self.normals.map(|n| way(&n)), ..*self }
    }

    fn form<'a>(&self, surface: &'a Surface) -> &'a Form {
        &surface.patches.forms[surface.patches.of_facet[self.facet as usize] as usize]
    }

    /// Whether it lies on a recognised form.
    pub fn is_exact(&self, surface: &Surface) -> bool {
        *self.form(surface) != Form::Free
    }

    /// Angle that the arc of side `k` takes [rad]; 0 on a straight side.
    pub fn turn_of_side(&self, surface: &Surface, k: usize) -> f64 {
        let Some(Curve::Arc { centre, .. }) = self.curves[k].map(|c| surface.patches.curves[c as usize])
        else {
            return 0.0;
        };
        let (p, q) = (self.corners[k] - centre, self.corners[(k + 1) % 3] - centre);
        p.cross(&q).norm().atan2(p.dot(&q))
    }

    /// Whether a side at corner `k` is an arc.
    pub fn is_beside_arc(&self, k: usize) -> bool {
        self.curves[k].is_some() || self.curves[(k + 2) % 3].is_some()
    }

    /// Angle inside at corner `k` between its sides, arcs along their tangents, positive about `n` [rad].
    pub fn angle_at(&self, surface: &Surface, k: usize, n: &Vec3) -> f64 {
        let leaving = |side: usize| {
            let (a, b) = (self.corners[k], self.corners[(k + 1) % 3]);
            let other = if side == k { b } else { self.corners[(k + 2) % 3] };
            match self.curves[side].map(|c| surface.patches.curves[c as usize]) {
                Some(Curve::Arc { centre, .. }) => {
                    let out = (a - centre).try_normalize(0.0).unwrap_or_else(Vec3::zeros);
                    other - a - out * (other - a).dot(&out)
                }
                _ => other - a,
            }
        };
        let (p, q) = (leaving(k), leaving((k + 2) % 3));
        p.cross(&q).dot(n).atan2(p.dot(&q))
    }

    /// The flat triangle at `w`, bowed where sides are arcs: on side `k` the arc, inside its offset from the chord
    /// falling off with the square of the distance from the corner across.
    pub fn bowed(&self, surface: &Surface, w: [f64; 3]) -> Vec3 {
        let mut x = self.corners[0] * w[0] + self.corners[1] * w[1] + self.corners[2] * w[2];
        for k in 0..3 {
            let Some(Curve::Arc { centre, .. }) = self.curves[k].map(|c| surface.patches.curves[c as usize])
            else {
                continue;
            };
            let (i, j) = (k, (k + 1) % 3);
            let (share, turn) = (w[i] + w[j], self.turn_of_side(surface, k));
            if share <= 0.0 || turn <= 0.0 {
                continue;
            }
            let t = w[j] / share;
            let (p, q) = (self.corners[i] - centre, self.corners[j] - centre);
            let arc = (p * ((1.0 - t) * turn).sin() + q * (t * turn).sin()) / turn.sin();
            x += (arc - p * (1.0 - t) - q * t) * (share * share);
        }
        x
    }

    /// The flat triangle.
    pub fn flat(&self) -> Triangle {
        Triangle::new(self.corners)
    }

    /// The surface at barycentric coordinates `w`.
    ///
    /// On a recognised form its nearest point; else the cubic of Vlachos et al., curved PN triangles, I3D 2001,
    /// through the corner normals, with their mean as normal.
    pub fn spot(&self, surface: &Surface, w: [f64; 3]) -> Spot {
        match self.form(surface) {
            Form::Free => self.cubic(w),
            form => {
                let x = self.bowed(surface, w);
                let (point, normal) = form.nearest(&x).unwrap_or_else(|| (x, self.flat().normal()));
                Spot { point, normal }
            }
        }
    }

    fn cubic(&self, w: [f64; 3]) -> Spot {
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

    /// Principal curvatures at `w`, positive where the metal bulges out [1/m]: of the form, or
    /// from the change of the normals over the triangle.
    pub fn curvatures(&self, surface: &Surface, w: [f64; 3]) -> [f64; 2] {
        let form = self.form(surface);
        if *form != Form::Free {
            return form.curvatures(&self.bowed(surface, w));
        }
        let n = self.spot(surface, w).normal;
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
