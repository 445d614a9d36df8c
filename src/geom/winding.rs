//! How often a surface winds around a point: whether the point lies inside.

use crate::base::Vec3;
use crate::geom::Triangle;
use crate::geom::bounds::Bounds;
use crate::geom::tree;
use crate::geom::tree::Tree;
use std::f64::consts::PI;

/// Winding number from which a point counts as inside [1]: half way between 0 and 1.
pub const INSIDE: f64 = 0.5;

/// Distance, in radii of a cluster, from which one dipole stands for its facets [1].
///
/// Largest error of the winding number over 4,000 points in and around a torus of 4,096 facets:
/// 0.056, 0.022 and 0.010 at 2, 3 and 4; the decision needs 0.25.
const FAR_IN_RADII: f64 = 3.0;

/// Winding number [1] of `triangles` around `x`: 1 inside a closed surface whose normals point
/// outward, 0 outside, −1 in a cavity seen alone; values between on open surfaces.
///
/// Sum of solid angles over 4π (van Oosterom and Strackee, IEEE Trans. Biomed. Eng. 30, 1983,
/// 125, eq. 8; Jacobson et al., ACM Trans. Graph. 32, 2013, 33).  On the surface itself the value
/// jumps and is not to be trusted.
pub fn winding_number(triangles: &[Triangle], x: &Vec3) -> f64 {
    triangles.iter().map(|t| solid_angle(t, x)).sum::<f64>() / (4.0 * PI)
}

/// Whether the closed surface `triangles` holds `x`.
pub fn holds(triangles: &[Triangle], x: &Vec3) -> bool {
    INSIDE <= winding_number(triangles, x)
}

/// Solid angle [sr] of `triangle` seen from `x`, positive from behind; zero in its plane beside it.
pub fn solid_angle(triangle: &Triangle, x: &Vec3) -> f64 {
    let [a, b, c] = triangle.corners.map(|p| p - x);
    let (la, lb, lc) = (a.norm(), b.norm(), c.norm());
    let above = a.dot(&b.cross(&c));
    let below = la * lb * lc + a.dot(&b) * lc + b.dot(&c) * la + c.dot(&a) * lb;
    if above == 0.0 { 0.0 } else { 2.0 * above.atan2(below) }
}

/// A surface prepared for many questions after its winding number.
#[derive(Clone, Debug, PartialEq)]
pub struct Winding {
    triangles: Vec<Triangle>,
    tree: Tree,
    clusters: Vec<Cluster>,
}

/// What a node of the tree looks like from far away.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Cluster {
    /// Middle, weighted by area [m].
    middle: Vec3,
    /// Largest distance of a corner from it, at most [m].
    radius: f64,
    /// Sum of area times unit normal [m²].
    dipole: Vec3,
}

/// Prepares `triangles`; takes `n log n` steps.
pub fn prepare(triangles: Vec<Triangle>) -> Winding {
    let boxes: Vec<Bounds> = triangles.iter().map(|t| Bounds::of(&t.corners)).collect();
    let tree = tree::build(&boxes);
    let clusters = tree
        .nodes
        .iter()
        .map(|node| {
            let items = || tree.slots(node).map(|s| &triangles[tree.order[s] as usize]);
            let area: f64 = items().map(Triangle::area).sum();
            let middle = items().map(|t| t.centroid() * t.area()).sum::<Vec3>() / area;
            let middle = if middle.iter().all(|m| m.is_finite()) { middle } else { node.bounds.centre() };
            let far = (middle - node.bounds.lo).abs().sup(&(node.bounds.hi - middle).abs());
            Cluster { middle, radius: far.norm(), dipole: items().map(Triangle::cross).sum::<Vec3>() * 0.5 }
        })
        .collect();
    Winding { triangles, tree, clusters }
}

impl Winding {
    /// Winding number [1] around `x`, [`winding_number`] does within 0.03.
    ///
    /// Clusters of facets far away count as one dipole (Barill et al., ACM Trans. Graph. 37, 2018, 43).
    pub fn at(&self, x: &Vec3) -> f64 {
        let mut sum = 0.0;
        let mut todo = if self.tree.nodes.is_empty() { vec![] } else { vec![0_usize] };
        while let Some(at) = todo.pop() {
            let (node, cluster) = (&self.tree.nodes[at], &self.clusters[at]);
            let r = cluster.middle - x;
            let distance = r.norm();
            if FAR_IN_RADII * cluster.radius < distance {
                sum += cluster.dipole.dot(&r) / distance.powi(3);
            } else if node.second == 0 {
                let near = self.tree.slots(node).map(|s| &self.triangles[self.tree.order[s] as usize]);
                sum += near.map(|t| solid_angle(t, x)).sum::<f64>();
            } else {
                todo.extend([node.second as usize, at + 1]);
            }
        }
        sum / (4.0 * PI)
    }

    /// Whether the closed surface holds `x`.
    pub fn holds(&self, x: &Vec3) -> bool {
        self.tree.nodes.first().is_some_and(|root| root.bounds.holds(x)) && INSIDE <= self.at(x)
    }

    /// The box around the surface.
    pub fn bounds(&self) -> Bounds {
        self.tree.nodes.first().map_or_else(Bounds::empty, |root| root.bounds)
    }

    /// The tree over its facets.
    pub fn tree(&self) -> &Tree {
        &self.tree
    }

    /// Its facets.
    pub fn triangles(&self) -> &[Triangle] {
        &self.triangles
    }
}
