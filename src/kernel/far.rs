//! Many far triangles at once: the exact moments of each panel up to degree four.
//!
//! The expansion about the centroid is
//! `∫dS/r = (A/R) Σ_n ⟨|y|ⁿ P_n(cos γ)⟩ / Rⁿ`, `R` the distance from the centroid, `⟨⟩` the mean over
//! the triangle; degree one vanishes (Jackson, Classical Electrodynamics, section 4.1).  In the plane of
//! the panel with its principal axes the means are 1, 2, 4 and 5 moments.

use super::rules;
use crate::base::Vec3;
use crate::geom::Triangle;

/// Panels evaluated together.
const LANES: usize = 8;

/// Distance from the centroid, in longest edges, from which the expansion serves [1].
///
/// Worst relative error over 1,000 random triangles and slivers (`tests/it/kernels.rs`): 3e-5 at 2,
/// 4e-6 at 3, 1e-6 at 4, 3e-7 at 5.  At 4 it stays an order below the smallest error of a capacitance
/// seen, 1e-5; a larger value moves no digit of the cube at 5,900 panels that counts.
pub const FAR_IN_EDGES: f64 = 4.0;

type Lane = [f64; LANES];

/// Moments of eight panels, lane by lane.
#[derive(Clone, Debug)]
struct Block {
    centre: [Lane; 3],
    u: [Lane; 3],
    v: [Lane; 3],
    /// Square of the distance from which the expansion serves [m²].
    far_sq: Lane,
    area: Lane,
    second: [Lane; 2],
    third: [Lane; 4],
    fourth: [Lane; 5],
}

impl Block {
    const EMPTY: Block = Block {
        centre: [[0.0; LANES]; 3],
        u: [[0.0; LANES]; 3],
        v: [[0.0; LANES]; 3],
        far_sq: [-1.0; LANES],
        area: [0.0; LANES],
        second: [[0.0; LANES]; 2],
        third: [[0.0; LANES]; 4],
        fourth: [[0.0; LANES]; 5],
    };

    fn set(&mut self, k: usize, tri: &Triangle) {
        let (centre, [u, v]) = (tri.centroid(), principal_axes(tri));
        let far = FAR_IN_EDGES * tri.longest_edge();
        for i in 0..3 {
            (self.centre[i][k], self.u[i][k], self.v[i][k]) = (centre[i], u[i], v[i]);
        }
        self.far_sq[k] = far * far;
        self.area[k] = tri.area();
        let mean = |i: i32, j: i32| -> f64 {
            let term = |(w, weight): &([f64; 3], f64)| {
                let y = tri.at(*w) - centre;
                weight * y.dot(&u).powi(i) * y.dot(&v).powi(j)
            };
            rules::SIX.iter().map(term).sum()
        };
        self.second[0][k] = mean(2, 0);
        self.second[1][k] = mean(0, 2);
        for j in 0..4 {
            self.third[j as usize][k] = mean(3 - j, j);
        }
        for j in 0..5 {
            self.fourth[j as usize][k] = mean(4 - j, j);
        }
    }

    /// Writes `∫dS/r` of its panels, or not-a-number where `x` is too near.
    #[inline(always)]
    fn potentials(&self, x: &[f64; 3], out: &mut [f64; LANES]) {
        for (k, value) in out.iter_mut().enumerate() {
            let d = [x[0] - self.centre[0][k], x[1] - self.centre[1][k], x[2] - self.centre[2][k]];
            let u = d[0] * self.u[0][k] + d[1] * self.u[1][k] + d[2] * self.u[2][k];
            let v = d[0] * self.v[0][k] + d[1] * self.v[1][k] + d[2] * self.v[2][k];
            let r_sq = d[0] * d[0] + d[1] * d[1] + d[2] * d[2];
            let (uu, uv, vv) = (u * u, u * v, v * v);
            let (m20, m02) = (self.second[0][k], self.second[1][k]);
            let [t30, t21, t12, t03] =
                [self.third[0][k], self.third[1][k], self.third[2][k], self.third[3][k]];
            let [f40, f31, f22, f13, f04] = [
                self.fourth[0][k],
                self.fourth[1][k],
                self.fourth[2][k],
                self.fourth[3][k],
                self.fourth[4][k],
            ];
            let second = 1.5 * (uu * m20 + vv * m02) - 0.5 * r_sq * (m20 + m02);
            let third = 2.5 * (u * (uu * t30 + 3.0 * vv * t12) + v * (3.0 * uu * t21 + vv * t03))
                - 1.5 * r_sq * (u * (t30 + t12) + v * (t21 + t03));
            let fourth = 4.375
                * (uu * uu * f40 + 4.0 * uv * (uu * f31 + vv * f13) + 6.0 * uu * vv * f22 + vv * vv * f04)
                - 3.75 * r_sq * (uu * (f40 + f22) + 2.0 * uv * (f31 + f13) + vv * (f22 + f04))
                + 0.375 * r_sq * r_sq * (f40 + 2.0 * f22 + f04);
            let (i2, i1) = (1.0 / r_sq, 1.0 / r_sq.sqrt());
            let i4 = i2 * i2;
            let sum = 1.0 + i4 * (second + i2 * (third + i2 * fourth));
            *value = if r_sq < self.far_sq[k] { f64::NAN } else { self.area[k] * i1 * sum };
        }
    }
}

/// Directions in the plane of the triangle along which its second moment is diagonal.
fn principal_axes(tri: &Triangle) -> [Vec3; 2] {
    let (c, n) = (tri.centroid(), tri.normal());
    let e = (tri.corners[1] - tri.corners[0]).try_normalize(0.0).unwrap_or_else(Vec3::x);
    let f = n.cross(&e);
    let (mut xx, mut xy, mut yy) = (0.0, 0.0, 0.0);
    for p in &tri.corners {
        let (a, b) = ((p - c).dot(&e), (p - c).dot(&f));
        (xx, xy, yy) = (xx + a * a, xy + a * b, yy + b * b);
    }
    let (sin, cos) = (0.5 * (2.0 * xy).atan2(xx - yy)).sin_cos();
    [e * cos + f * sin, f * cos - e * sin]
}

/// The moments of a set of panels.
#[derive(Clone, Debug)]
pub struct Moments {
    blocks: Vec<Block>,
    n: usize,
}

impl Moments {
    /// Moments of `panels`, in their order.
    pub fn build(panels: &[Triangle]) -> Self {
        let blocks = panels
            .chunks(LANES)
            .map(|chunk| {
                let mut block = Block::EMPTY;
                chunk.iter().enumerate().for_each(|(k, tri)| block.set(k, tri));
                block
            })
            .collect();
        Moments { blocks, n: panels.len() }
    }

    /// Length that an output of [`Moments::potentials`] must have: the count of panels, rounded up.
    pub fn padded(&self) -> usize {
        self.blocks.len() * LANES
    }

    /// Writes `∫dS/r` of every panel as seen from `x` [m]; not-a-number for panels to which `x` is
    /// nearer than [`FAR_IN_EDGES`] longest edges.
    ///
    /// # Panics
    /// If `out` is not of length [`Moments::padded`].
    pub fn potentials(&self, x: &Vec3, out: &mut [f64]) {
        assert_eq!(out.len(), self.padded(), "output length");
        pulp::Arch::new().dispatch(Job { blocks: &self.blocks, x: [x.x, x.y, x.z], out });
        out[self.n..].fill(0.0);
    }
}

struct Job<'a> {
    blocks: &'a [Block],
    x: [f64; 3],
    out: &'a mut [f64],
}

impl pulp::WithSimd for Job<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: pulp::Simd>(self, _simd: S) {
        let (chunks, _) = self.out.as_chunks_mut::<LANES>();
        for (block, out) in self.blocks.iter().zip(chunks) {
            block.potentials(&self.x, out);
        }
    }
}
