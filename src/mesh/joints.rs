//! T-joints: a corner of one facet on the inside of an open side of another.

use crate::base::Vec3;
use crate::mesh::Welded;
use crate::mesh::edges;
use crate::mesh::edges::Side;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;
use std::collections::BTreeMap;

/// Distance of a corner from an open side within which it lies on it, in diagonals of the part
/// [1]: that of welding, since the corner is rounded as the ends of the side are.
pub(in crate::mesh) const JOINT_REL: f64 = 1e-6;

/// Cuts facets at the corners that lie on their open sides, each with a line in `list`.
///
/// Only corners of open sides are looked at, since only there can something fit together.
pub(in crate::mesh) fn split(welded: &mut Welded, abs_tol: f64, list: &mut Listing<'_>) {
    let open = edges::open_sides(&edges::sides(&welded.facets));
    let grid = Grid::new(&welded.points, &open, abs_tol);
    // The facets that an original facet has become, itself first.
    let mut parts: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
    for side in &open {
        let on = grid.on_side(&welded.points, side, &welded.facets[side.facet as usize]);
        if on.is_empty() {
            continue;
        }
        for &p in &on {
            let place = welded.points[p as usize];
            list.add(place, || {
                format!("T-joint closed at {}: the side that passes there is cut", at(&place))
            });
        }
        let parts = parts.entry(side.facet).or_insert_with(|| vec![side.facet as usize]);
        cut(&mut welded.facets, parts, side.run(), &on);
    }
}

/// Replaces the part that owns the side `a` → `b` by a fan over the points on it.
fn cut(facets: &mut Vec<[u32; 3]>, parts: &mut Vec<usize>, [a, b]: [u32; 2], on: &[u32]) {
    let runs = |f: usize| (0..3).find(|&k| facets[f][k] == a && facets[f][(k + 1) % 3] == b);
    let Some((owner, d)) = parts.iter().find_map(|&f| runs(f).map(|k| (f, facets[f][(k + 2) % 3]))) else {
        return;
    };
    let mut last = a;
    for &p in on.iter().chain([&b]) {
        if last == a {
            facets[owner] = [a, p, d];
        } else {
            parts.push(facets.len());
            facets.push([last, p, d]);
        }
        last = p;
    }
}

/// Corners of open sides, found by place.
struct Grid {
    abs_tol: f64,
    cell: f64,
    lo: Vec3,
    /// Cell and point, sorted.
    cells: Vec<([i64; 3], u32)>,
}

impl Grid {
    /// Cells as long as the mean open side: then a walk along all sides visits few more cells
    /// than there are sides, and a cell holds few points.
    fn new(points: &[Vec3], open: &[Side], abs_tol: f64) -> Grid {
        let x = |p: u32| points[p as usize];
        let sum: f64 = open.iter().map(|s| (x(s.ends[1]) - x(s.ends[0])).norm()).sum();
        let cell = (sum / open.len().max(1) as f64).max(4.0 * abs_tol).max(f64::MIN_POSITIVE);
        let (lo, _) = crate::mesh::weld::bounds(points);
        let mut grid = Grid { abs_tol, cell, lo, cells: Vec::new() };
        let mut corners: Vec<u32> = open.iter().flat_map(|s| s.ends).collect();
        corners.sort_unstable();
        corners.dedup();
        grid.cells = corners.iter().map(|&p| (grid.cell(&x(p)), p)).collect();
        grid.cells.sort_unstable();
        grid
    }

    fn cell(&self, x: &Vec3) -> [i64; 3] {
        [0, 1, 2].map(|k| ((x[k] - self.lo[k]) / self.cell).floor() as i64)
    }

    /// The points inside a side, in the direction of the facet.
    fn on_side(&self, points: &[Vec3], side: &Side, corners: &[u32; 3]) -> Vec<u32> {
        let [a, b] = side.run().map(|p| points[p as usize]);
        let length = (b - a).norm();
        let mut on: Vec<(f64, u32)> = Vec::new();
        let steps = (2.0 * length / self.cell).ceil().max(1.0) as usize;
        for step in 0..=steps {
            self.visit(&(a + (b - a) * (step as f64 / steps as f64)), |p| {
                let along = (points[p as usize] - a).dot(&(b - a)) / length;
                let off = (points[p as usize] - a - (b - a) * (along / length)).norm();
                let inside = self.abs_tol < along && along < length - self.abs_tol;
                if inside && off <= self.abs_tol && !corners.contains(&p) {
                    on.push((along, p));
                }
            });
        }
        on.sort_unstable_by(|s, t| s.0.total_cmp(&t.0).then(s.1.cmp(&t.1)));
        on.dedup_by_key(|(_, p)| *p);
        on.into_iter().map(|(_, p)| p).collect()
    }

    /// Calls `take` with all points within a quarter of a cell and the tolerance of `x`.
    fn visit(&self, x: &Vec3, mut take: impl FnMut(u32)) {
        let reach = Vec3::repeat(0.25 * self.cell + self.abs_tol);
        let (lo, hi) = (self.cell(&(x - reach)), self.cell(&(x + reach)));
        for i in lo[0]..=hi[0] {
            for j in lo[1]..=hi[1] {
                let first = self.cells.partition_point(|(cell, _)| *cell < [i, j, lo[2]]);
                let row = self.cells[first..].iter().take_while(|(cell, _)| *cell <= [i, j, hi[2]]);
                row.for_each(|(_, p)| take(*p));
            }
        }
    }
}
