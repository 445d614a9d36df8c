//! T-joints: a corner of one facet on the inside of an open side of another.

use crate::base::Vec3;
use crate::geom::bounds::Bounds;
use crate::geom::tree;
use crate::geom::tree::Tree;
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
    let corners = Corners::new(&welded.points, &open, abs_tol);
    // The facets that an original facet has become, itself first.
    let mut parts: BTreeMap<u32, Vec<usize>> = BTreeMap::new();
    for side in &open {
        let on = corners.on_side(&welded.points, side, &welded.facets[side.facet as usize]);
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
struct Corners {
    abs_tol: f64,
    corners: Vec<u32>,
    tree: Tree,
}

impl Corners {
    fn new(points: &[Vec3], open: &[Side], abs_tol: f64) -> Corners {
        let mut corners: Vec<u32> = open.iter().flat_map(|s| s.ends).collect();
        corners.sort_unstable();
        corners.dedup();
        let boxes: Vec<Bounds> = corners.iter().map(|&p| Bounds::of([&points[p as usize]])).collect();
        Corners { abs_tol, corners, tree: tree::build(&boxes) }
    }

    /// The points inside a side, in the direction of the facet.
    fn on_side(&self, points: &[Vec3], side: &Side, own: &[u32; 3]) -> Vec<u32> {
        let [a, b] = side.run().map(|p| points[p as usize]);
        let length = (b - a).norm();
        let mut on: Vec<(f64, u32)> = Vec::new();
        let mut todo = if self.tree.nodes.is_empty() { vec![] } else { vec![0] };
        while let Some(at) = todo.pop() {
            let node = &self.tree.nodes[at];
            if !passes(&a, &b, &node.bounds.grown(self.abs_tol)) {
                continue;
            }
            if node.second != 0 {
                todo.extend([node.second as usize, at + 1]);
                continue;
            }
            for slot in self.tree.slots(node) {
                let p = self.corners[self.tree.order[slot] as usize];
                let from_a = points[p as usize] - a;
                let along = from_a.dot(&(b - a)) / length;
                let off = (from_a - (b - a) * (along / length)).norm();
                let inside = self.abs_tol < along && along < length - self.abs_tol;
                if inside && off <= self.abs_tol && !own.contains(&p) {
                    on.push((along, p));
                }
            }
        }
        on.sort_unstable_by(|s, t| s.0.total_cmp(&t.0).then(s.1.cmp(&t.1)));
        on.into_iter().map(|(_, p)| p).collect()
    }
}

/// Whether the segment `ab` passes through a box: the slabs of the three axes share a stretch.
fn passes(a: &Vec3, b: &Vec3, bounds: &Bounds) -> bool {
    let (mut from, mut to) = (0.0_f64, 1.0_f64);
    for k in 0..3 {
        let step = b[k] - a[k];
        let ends = [bounds.lo[k] - a[k], bounds.hi[k] - a[k]];
        if step == 0.0 {
            if 0.0 < ends[0] || ends[1] < 0.0 {
                return false;
            }
            continue;
        }
        let [s, t] = ends.map(|end| end / step);
        (from, to) = (from.max(s.min(t)), to.min(s.max(t)));
    }
    from <= to
}
