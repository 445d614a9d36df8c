//! Error bars from the residuals (DESIGN 3.3).

use crate::base::si::EPS0;
use crate::geom::Triangle;
use crate::kernel::rules;
use crate::panel::Panels;
use crate::physics::gap;
use crate::physics::unit::Residuals;
use nalgebra::Matrix2;
use nalgebra::Matrix6;
use nalgebra::Vector2;
use nalgebra::Vector6;

/// Weighted residual gradients of all unit solutions, ready for any combination of entries.
///
/// `η_ij,T = ε Σ_q w_q A ∇r_i(x_q)ᵀ H ∇r_j(x_q)`, `H = √18 M^½`, `M` the mean of `x xᵀ` over the panel about its
/// centroid, `∇r` the surface gradient of the quadratic through the six points.  Stored are
/// `√(ε w_q A) H^½ ∇r`, so that every η is a plain sum of products; on panels that stand at a narrow gap
/// times the root of [`gap::steps`].
#[derive(Clone, Debug, PartialEq)]
pub struct Estimate {
    /// `slope[j][p][q]`.
    slope: Vec<Vec<[Vector2<f64>; 6]>>,
}

/// The two parts of an η on one panel: of the mean gradient, and of its variation.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Eta {
    /// η̄ [F].
    pub mean: f64,
    /// η̃ [F].
    pub variation: f64,
}

/// Local frame of a panel: gradients of the reference coordinates and the root of H.
struct Frame {
    /// Columns: gradients of the second and third barycentric coordinate [1/m].
    grads: Matrix2<f64>,
    /// `H^½` [m^½].
    root: Matrix2<f64>,
}

/// `differences()[k]` maps six values to the derivative along barycentric coordinate `k + 1` at the
/// six points.
fn differences() -> [Matrix6<f64>; 2] {
    let basis = |x: f64, y: f64| Vector6::new(1.0, x, y, x * x, x * y, y * y).transpose();
    let values = Matrix6::from_rows(&rules::SIX.map(|(w, _)| basis(w[1], w[2])));
    let fit = values.try_inverse().expect("the six points determine a quadratic");
    let d_x = |y: [f64; 3]| Vector6::new(0.0, 1.0, 0.0, 2.0 * y[1], y[2], 0.0).transpose();
    let d_y = |y: [f64; 3]| Vector6::new(0.0, 0.0, 1.0, 0.0, y[1], 2.0 * y[2]).transpose();
    [
        Matrix6::from_rows(&rules::SIX.map(|(w, _)| d_x(w))) * fit,
        Matrix6::from_rows(&rules::SIX.map(|(w, _)| d_y(w))) * fit,
    ]
}

/// Corners of a panel in its own plane, the first at the origin [m].
fn flat(tri: &Triangle) -> [Vector2<f64>; 3] {
    let n = tri.normal();
    let e = (tri.corners[1] - tri.corners[0]).normalize();
    let f = n.cross(&e);
    tri.corners.map(|p| Vector2::new((p - tri.corners[0]).dot(&e), (p - tri.corners[0]).dot(&f)))
}

/// Root of a symmetric positive definite 2 × 2 matrix (Cayley–Hamilton).
fn root(m: &Matrix2<f64>) -> Matrix2<f64> {
    let d = m.determinant().max(0.0).sqrt();
    let t = (m.trace() + 2.0 * d).max(0.0).sqrt();
    if 0.0 < t { (m + Matrix2::identity() * d) / t } else { Matrix2::zeros() }
}

impl Frame {
    fn new(tri: &Triangle) -> Self {
        let corners = flat(tri);
        let jacobian = Matrix2::from_columns(&[corners[1] - corners[0], corners[2] - corners[0]]);
        let centroid = (corners[0] + corners[1] + corners[2]) / 3.0;
        let second =
            corners.iter().fold(Matrix2::zeros(), |sum, p| sum + (p - centroid) * (p - centroid).transpose());
        let h = root(&(second / 12.0)) * 18.0_f64.sqrt();
        let grads = jacobian.try_inverse().map_or_else(Matrix2::zeros, |inverse| inverse.transpose());
        Frame { grads, root: root(&h) }
    }
}

/// Works out the weighted gradients.
pub fn estimate(panels: &Panels, residuals: &Residuals, gaps: &[f64], eps_r: f64) -> Estimate {
    let [d_x, d_y] = differences();
    let steps: Vec<f64> =
        panels.triangles.iter().zip(gaps).map(|(tri, gap)| gap::steps(tri.longest_edge(), *gap)).collect();
    let frames: Vec<Frame> = panels.triangles.iter().map(Frame::new).collect();
    let of_panel = |p: usize, at: &[f64; 6]| {
        let values = Vector6::from_column_slice(at);
        let (x, y) = (d_x * values, d_y * values);
        let area = panels.triangles[p].area();
        let mut slopes = [Vector2::zeros(); 6];
        for (q, slope) in slopes.iter_mut().enumerate() {
            let weight = (EPS0 * eps_r * rules::SIX[q].1 * area * steps[p]).sqrt();
            *slope = frames[p].root * (frames[p].grads * Vector2::new(x[q], y[q])) * weight;
        }
        slopes
    };
    let of_row = |at: &Vec<[f64; 6]>| at.iter().enumerate().map(|(p, at)| of_panel(p, at)).collect();
    Estimate { slope: residuals.at.iter().map(of_row).collect() }
}

impl Estimate {
    fn combined(&self, u: &[f64], p: usize) -> [Vector2<f64>; 6] {
        let mut sum = [Vector2::zeros(); 6];
        for (weight, row) in u.iter().zip(&self.slope) {
            if *weight != 0.0 {
                sum.iter_mut().zip(&row[p]).for_each(|(sum, slope)| *sum += slope * *weight);
            }
        }
        sum
    }

    /// η of panel `p` for the combination `uᵀ C v` [F × units of u and v].
    pub fn eta(&self, u: &[f64], v: &[f64], p: usize) -> Eta {
        let (a, b) = (self.combined(u, p), self.combined(v, p));
        let full: f64 = a.iter().zip(&b).map(|(a, b)| a.dot(b)).sum();
        // √w is folded into the slopes: the mean gradient is Σ √w · slope.
        let mean = |s: &[Vector2<f64>; 6]| {
            s.iter().zip(rules::SIX).fold(Vector2::zeros(), |sum, (s, (_, w))| sum + s * w.sqrt())
        };
        let mean = mean(&a).dot(&mean(&b));
        Eta { mean, variation: full - mean }
    }

    /// `Σ_T |η_T|` for the combination `uᵀ C v` [F × units of u and v].
    pub fn total(&self, u: &[f64], v: &[f64]) -> f64 {
        let n = self.slope.first().map_or(0, Vec::len);
        (0..n).map(|p| self.eta(u, v, p)).map(|eta| (eta.mean + eta.variation).abs()).sum()
    }

    /// How much the residual changes along each edge of each panel, summed over rows with weights
    /// `weight[j]`: the edge that changes most is the one to cut (DESIGN 3.4).
    pub fn steepest_edge(panels: &Panels, residuals: &Residuals, weight: &[f64], p: usize) -> usize {
        let [d_x, d_y] = differences();
        let mut change = [0.0; 3];
        for (row, weight) in residuals.at.iter().zip(weight) {
            let values = Vector6::from_column_slice(&row[p]);
            let mean =
                |d: &Matrix6<f64>| (d * values).iter().zip(rules::SIX).map(|(g, (_, w))| g * w).sum::<f64>();
            // In barycentric coordinates the edges are (1, 0), (−1, 1) and (0, −1).
            let (x, y) = (mean(&d_x), mean(&d_y));
            for (change, along) in change.iter_mut().zip([x, y - x, -y]) {
                *change += weight * along.abs();
            }
        }
        let lengths = [0, 1, 2].map(|k| {
            let c = &panels.triangles[p].corners;
            (c[(k + 1) % 3] - c[k]).norm()
        });
        // A panel without slope is cut along its longest edge.
        let key = |k: usize| (change[k], lengths[k]);
        (1..3).fold(0, |best, k| if key(best) < key(k) { k } else { best })
    }
}
