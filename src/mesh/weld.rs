//! Corners that stand for one point become one point.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::mesh::Welded;
use std::collections::HashMap;

/// Distance within which corners are one point, in diagonals of the part [1].
///
/// A corner computed twice and rounded to single precision lies at most one spacing, 1.2e-7 of
/// the coordinate, apart in each direction: 2e-7 for a part near the origin.  Measured on three
/// OpenSCAD bodies of 1,000 to 16,000 facets (bored disc, ball with stub and ring, filleted plate
/// with letters): corners meant as one lay up to 3e-8 apart, the closest two meant as two 2.4e-5.
pub const WELD_REL_TOL: f64 = 1e-6;

/// Share of the smallest gap that the spacing of the coordinates may have [1].
pub const SPACING_OF_GAP: f64 = 0.01;

/// The facets with shared corners: each corner takes the nearest earlier point within `rel_tol`
/// diagonals of the box of all facets, or becomes a new point.
///
/// Points stand in the order of first use, so the result depends on the order of the facets and
/// on nothing else; −0 is 0.  Facets whose corners fall together stay in the list, with equal
/// indices, for `repair` to report.
///
/// The merge is not transitive: of three points in a row, each within the tolerance of the next,
/// the third may stay apart from the first.
pub fn weld(facets: &[[Vec3; 3]], rel_tol: f64) -> Welded {
    let (lo, hi) = bounds(facets.iter().flatten());
    let mut grid = Grid::new(lo, (hi - lo).norm(), rel_tol);
    let facets = facets.iter().map(|corners| corners.map(|x| grid.index(&x))).collect();
    Welded { points: grid.points, facets }
}

/// Smallest and largest coordinates [m]; zeros when there are no points.
pub fn bounds<'a>(points: impl IntoIterator<Item = &'a Vec3>) -> (Vec3, Vec3) {
    let mut points = points.into_iter();
    let Some(first) = points.next() else {
        return (Vec3::zeros(), Vec3::zeros());
    };
    points.fold((*first, *first), |(lo, hi), x| (lo.inf(x), hi.sup(x)))
}

/// Distance from `x` to the next number in single precision, in the unit of `x`.
pub fn f32_spacing(x: f64) -> f64 {
    let near = x.abs() as f32;
    f64::from(near.next_up()) - f64::from(near)
}

/// A warning where single precision at `coordinate` is coarser than 1 % of the smallest `gap`.
///
/// Both in the unit of the file, `coordinate` the largest magnitude in it: the corners of an STL
/// file are no finer than that, so the gap is known no better.
pub fn spacing_finding(coordinate: f64, gap: f64, name: &str) -> Option<Finding> {
    let spacing = f32_spacing(coordinate);
    (SPACING_OF_GAP * gap < spacing).then(|| Finding {
        severity: Severity::Warning,
        code: "float_spacing",
        text: format!(
            "`{name}`: coordinates near {coordinate:.6e} are {spacing:.1e} apart in the single precision of STL, \
             over 1 % of the smallest gap of {gap:.3e}; draw the part near the origin and shift it with `place`"
        ),
        place: None,
    })
}

/// Points found by place: cells of a few tolerances, each with a chain of its points.
struct Grid {
    lo: Vec3,
    abs_tol: f64,
    cell: f64,
    points: Vec<Vec3>,
    /// The latest point of each cell; only looked up, never walked.
    heads: HashMap<[i64; 3], u32>,
    /// The point before it in the same cell.
    before: Vec<Option<u32>>,
}

impl Grid {
    fn new(lo: Vec3, diagonal: f64, rel_tol: f64) -> Grid {
        let abs_tol = rel_tol * diagonal;
        // A cell of at least 1e-6 diagonals keeps the numbers small for any tolerance, and the
        // smallest normal number keeps the division finite when all corners are one point.
        let cell = (4.0 * abs_tol).max(1e-6 * diagonal).max(f64::MIN_POSITIVE);
        Grid { lo, abs_tol, cell, points: Vec::new(), heads: HashMap::new(), before: Vec::new() }
    }

    fn cell(&self, x: &Vec3) -> [i64; 3] {
        [0, 1, 2].map(|k| ((x[k] - self.lo[k]) / self.cell).floor() as i64)
    }

    /// The index of the point that `x` is, new or old.
    fn index(&mut self, x: &Vec3) -> u32 {
        let x = x.map(|c| c + 0.0);
        if let Some(found) = self.nearest(&x) {
            return found;
        }
        let new = u32::try_from(self.points.len()).expect("the reader admits fewer facets than u32::MAX / 3");
        self.points.push(x);
        self.before.push(self.heads.insert(self.cell(&x), new));
        new
    }

    /// The nearest point within the tolerance, the earliest of equals.
    fn nearest(&self, x: &Vec3) -> Option<u32> {
        let reach = Vec3::repeat(self.abs_tol);
        let (lo, hi) = (self.cell(&(x - reach)), self.cell(&(x + reach)));
        let mut best: Option<(f64, u32)> = None;
        for i in lo[0]..=hi[0] {
            for j in lo[1]..=hi[1] {
                for k in lo[2]..=hi[2] {
                    let mut next = self.heads.get(&[i, j, k]).copied();
                    while let Some(p) = next {
                        let distance = (self.points[p as usize] - x).norm();
                        if distance <= self.abs_tol && best.is_none_or(|b| (distance, p) < b) {
                            best = Some((distance, p));
                        }
                        next = self.before[p as usize];
                    }
                }
            }
        }
        best.map(|(_, p)| p)
    }
}
