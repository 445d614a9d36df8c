//! Cutting one facet along segments into convex cells, and putting equal cells together again.

use crate::base::Vec3;
use crate::geom::Triangle;

/// Most cells of one facet; a facet cut finer than that is refused.
///
/// A face of two facets that carries a disc of 5,000 rim edges stays below it; that took 15 s.
pub(crate) const MOST_CELLS: usize = 60_000;

/// Segments in a cell from which it is halved between them before it is cut along them.
const MANY: usize = 16;

/// A corner of a cell.
#[derive(Clone, Copy, Debug, PartialEq)]
pub(crate) struct Corner {
    /// Coordinates in the plane of the facet [m].
    at: [f64; 2],
    /// Barycentric coordinates in the facet [1].
    pub(crate) bary: [f64; 3],
}

/// A convex part of the facet; an inner node of the tree of cuts once it was cut.
#[derive(Clone, Debug, PartialEq)]
struct Cell {
    polygon: Vec<Corner>,
    halves: Option<[usize; 2]>,
}

/// A facet and the cuts made so far.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Cutter {
    facet: Triangle,
    /// Two unit vectors of its plane.
    axes: [Vec3; 2],
    cells: Vec<Cell>,
    abs_tol: f64,
}

impl Cutter {
    /// The uncut facet; nothing for a facet without area.  Slices narrower than `abs_tol` [m] are
    /// never cut off.
    pub(crate) fn new(facet: Triangle, abs_tol: f64) -> Option<Self> {
        let normal = facet.cross().try_normalize(0.0)?;
        let u = (facet.corners[1] - facet.corners[0]).try_normalize(0.0)?;
        let mut cutter = Cutter { facet, axes: [u, normal.cross(&u)], cells: Vec::new(), abs_tol };
        let corner = |k: usize| {
            let mut bary = [0.0; 3];
            bary[k] = 1.0;
            Corner { at: cutter.flat(&facet.corners[k]), bary }
        };
        let polygon = vec![corner(0), corner(1), corner(2)];
        cutter.cells.push(Cell { polygon, halves: None });
        Some(cutter)
    }

    /// Coordinates of `x` in the plane of the facet [m].
    pub(crate) fn flat(&self, x: &Vec3) -> [f64; 2] {
        let r = x - self.facet.corners[0];
        [r.dot(&self.axes[0]), r.dot(&self.axes[1])]
    }

    /// Cuts the facet so that no segment passes through a cell, each cell along a segment's line.
    ///
    /// Where many segments meet a cell, it is first halved between them, so that the effort grows
    /// little faster than their number.
    ///
    /// # Errors
    /// When [`MOST_CELLS`] is reached; the cells are then of no use.
    pub(crate) fn cut(&mut self, segments: &[[Vec3; 2]]) -> Result<(), TooFine> {
        let lines =
            segments.iter().filter_map(|ends| Line::through(ends.map(|x| self.flat(&x)), self.abs_tol));
        let mut todo = vec![(0, lines.collect::<Vec<Line>>())];
        while let Some((at, mut lines)) = todo.pop() {
            lines.retain(|line| line.sides(&self.cells[at].polygon, self.abs_tol).is_some());
            let halving = (MANY < lines.len()).then(|| halving(&lines));
            let halves = halving.and_then(|line| line.sides(&self.cells[at].polygon, self.abs_tol));
            let sides = match (halves, lines.first()) {
                (Some(sides), _) => Some(sides),
                (None, Some(line)) => line.sides(&self.cells[at].polygon, self.abs_tol),
                (None, None) => None,
            };
            let Some(sides) = sides else { continue };
            if MOST_CELLS < self.cells.len() + 2 {
                return Err(TooFine);
            }
            let next = self.cells.len();
            self.cells[at].halves = Some([next, next + 1]);
            self.cells.extend(sides.map(|polygon| Cell { polygon, halves: None }));
            todo.push((next, lines.clone()));
            todo.push((next + 1, lines));
        }
        Ok(())
    }

    /// Asks `class` about the middle of every cell and returns the largest convex parts of one
    /// class with it.
    pub(crate) fn parts<C: Copy + PartialEq>(
        &self,
        mut class: impl FnMut(&Vec3) -> C,
    ) -> Vec<(C, Vec<Corner>)> {
        let mut whole: Vec<Option<C>> = vec![None; self.cells.len()];
        for (at, cell) in self.cells.iter().enumerate().rev() {
            whole[at] = match cell.halves {
                None => Some(class(&self.facet.at(middle(&cell.polygon)))),
                Some([p, q]) => whole[p].filter(|_| whole[p] == whole[q]),
            };
        }
        let (mut parts, mut todo) = (Vec::new(), vec![0]);
        while let Some(at) = todo.pop() {
            match (whole[at], self.cells[at].halves) {
                (Some(class), _) => parts.push((class, self.cells[at].polygon.clone())),
                (None, Some([p, q])) => todo.extend([q, p]),
                (None, None) => {}
            }
        }
        parts
    }

    /// Triangles [barycentric] that a convex part consists of: ears cut off, the stoutest first.
    pub(crate) fn triangles(&self, mut polygon: Vec<Corner>) -> Vec<[[f64; 3]; 3]> {
        let mut out = Vec::with_capacity(polygon.len().saturating_sub(2));
        while 3 <= polygon.len() {
            let n = polygon.len();
            let ear = |k: usize| [polygon[(k + n - 1) % n], polygon[k], polygon[(k + 1) % n]];
            let best = (0..n).fold((0, f64::NEG_INFINITY), |best, k| {
                let quality = stoutness(&ear(k));
                if best.1 < quality { (k, quality) } else { best }
            });
            let [a, b, c] = ear(best.0);
            if 0.0 < best.1 {
                out.push([a.bary, b.bary, c.bary]);
            }
            polygon.remove(best.0);
        }
        out
    }
}

/// A facet would fall into more than [`MOST_CELLS`] cells.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) struct TooFine;

/// Barycentric coordinates of the mean of the corners.
fn middle(polygon: &[Corner]) -> [f64; 3] {
    let n = polygon.len() as f64;
    [0, 1, 2].map(|k| polygon.iter().map(|c| c.bary[k]).sum::<f64>() / n)
}

/// Twice the area over the square of the longest side [1].
fn stoutness(ear: &[Corner; 3]) -> f64 {
    let side = |p: &Corner, q: &Corner| [q.at[0] - p.at[0], q.at[1] - p.at[1]];
    let (d, e, f) = (side(&ear[0], &ear[1]), side(&ear[0], &ear[2]), side(&ear[1], &ear[2]));
    let longest_sq = [d, e, f].iter().map(|s| s[0] * s[0] + s[1] * s[1]).fold(0.0, f64::max);
    if 0.0 < longest_sq { (d[0] * e[1] - d[1] * e[0]) / longest_sq } else { 0.0 }
}

/// A line between the middles of `lines`, across their wider spread.
fn halving(lines: &[Line]) -> Line {
    let middles = |axis: usize| {
        let mut at: Vec<f64> = lines.iter().map(|l| l.from[axis] + 0.5 * l.length * l.along[axis]).collect();
        at.sort_by(f64::total_cmp);
        at
    };
    let spread = |at: &[f64]| at[at.len() - 1] - at[0];
    let (x, y) = (middles(0), middles(1));
    let (from, along) = if spread(&y) < spread(&x) {
        ([x[x.len() / 2], 0.0], [0.0, 1.0])
    } else {
        ([0.0, y[y.len() / 2]], [1.0, 0.0])
    };
    Line { from, along, first: f64::NEG_INFINITY, length: f64::INFINITY }
}

/// The line of a segment in the plane of the facet.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Line {
    from: [f64; 2],
    along: [f64; 2],
    /// Where on the line the segment begins [m]; zero, or minus infinity for a whole line.
    first: f64,
    /// Where it ends [m].
    length: f64,
}

impl Line {
    /// The line through the ends of a segment longer than `abs_tol` [m].
    fn through([a, b]: [[f64; 2]; 2], abs_tol: f64) -> Option<Self> {
        let (dx, dy) = (b[0] - a[0], b[1] - a[1]);
        let length = dx.hypot(dy);
        let long = length.is_finite() && abs_tol < length;
        long.then(|| Line { from: a, along: [dx / length, dy / length], first: 0.0, length })
    }

    /// The two sides of a convex polygon, if the segment passes through it for more than
    /// `abs_tol` and both sides are wider than that.
    fn sides(&self, polygon: &[Corner], abs_tol: f64) -> Option<[Vec<Corner>; 2]> {
        let place = |c: &Corner| {
            let r = [c.at[0] - self.from[0], c.at[1] - self.from[1]];
            let left = self.along[0] * r[1] - self.along[1] * r[0];
            (if left.abs() <= abs_tol { 0.0 } else { left }, self.along[0] * r[0] + self.along[1] * r[1])
        };
        let places: Vec<(f64, f64)> = polygon.iter().map(place).collect();
        let widest = places.iter().fold((0.0_f64, 0.0_f64), |w, p| (w.0.min(p.0), w.1.max(p.0)));
        if widest.0 == 0.0 || widest.1 == 0.0 {
            return None;
        }
        let mut sides = [Vec::with_capacity(polygon.len() + 1), Vec::with_capacity(polygon.len() + 1)];
        let (mut enters, mut leaves) = (f64::INFINITY, f64::NEG_INFINITY);
        for (k, corner) in polygon.iter().enumerate() {
            let next = (k + 1) % polygon.len();
            let ((h, t), (g, u)) = (places[k], places[next]);
            if 0.0 <= h {
                sides[0].push(*corner);
            }
            if h <= 0.0 {
                sides[1].push(*corner);
            }
            if h == 0.0 {
                (enters, leaves) = (enters.min(t), leaves.max(t));
            }
            if h * g < 0.0 {
                let s = h / (h - g);
                let cross = between(corner, &polygon[next], s);
                sides.iter_mut().for_each(|side| side.push(cross));
                let t = t + (u - t) * s;
                (enters, leaves) = (enters.min(t), leaves.max(t));
            }
        }
        let inside = leaves.min(self.length) - enters.max(self.first);
        (abs_tol < inside).then_some(sides)
    }
}

/// The corner at `s` of the way from `p` to `q`.
fn between(p: &Corner, q: &Corner, s: f64) -> Corner {
    let mix = |a: f64, b: f64| a + (b - a) * s;
    Corner {
        at: [mix(p.at[0], q.at[0]), mix(p.at[1], q.at[1])],
        bary: [0, 1, 2].map(|k| mix(p.bary[k], q.bary[k])),
    }
}
