//! Bisection of panels at the middle of one edge; neighbours need not follow.

use crate::geom::Triangle;
use crate::panel;
use crate::panel::Origin;
use crate::panel::Panels;

/// Panels with each `cuts[k] = (panel, edge)` cut at the middle of its edge; edge `e` runs from corner
/// `e` to corner `e + 1`.  Children stand where their parent stood.  In a ring every cut is made in all sectors.
///
/// # Panics
/// If the cuts are not in rising order of panels.
pub fn bisect(panels: &Panels, cuts: &[(usize, usize)]) -> Panels {
    assert!(cuts.windows(2).all(|pair| pair[0].0 < pair[1].0), "cuts in rising order of panels");
    let cuts = panels.in_all_sectors(cuts);
    let mut next = cuts.iter().peekable();
    let mut origins: Vec<Origin> = Vec::with_capacity(panels.len() + cuts.len());
    for p in 0..panels.len() {
        let origin = panels.origin(p);
        match next.next_if(|cut| cut.0 == p) {
            Some((_, edge)) => origins.extend(halves(&origin, *edge)),
            None => origins.push(origin),
        }
    }
    let next =
        panel::from_origins(panels.assembly.clone(), panels.charts.clone(), panels.images.clone(), &origins);
    match &panels.ring {
        Some(ring) => panel::ring::turned(next, ring.clone()),
        None => next,
    }
}

fn halves(origin: &Origin, edge: usize) -> [Origin; 2] {
    let (a, b, c) = (edge, (edge + 1) % 3, (edge + 2) % 3);
    let bary = &origin.bary;
    let middle = [0, 1, 2].map(|k| 0.5 * (bary[a][k] + bary[b][k]));
    [
        Origin { bary: [bary[a], middle, bary[c]], ..*origin },
        Origin { bary: [middle, bary[b], bary[c]], ..*origin },
    ]
}

/// Edge of panel `p` along which the surface departs most from the straight side, and by how much [m].
pub(super) fn most_bent(panels: &Panels, p: usize) -> (usize, f64) {
    let bends = bends(panels, p);
    let most = (1..3).fold(0, |best, k| if bends[best] < bends[k] { k } else { best });
    (most, bends[most])
}

/// Departure of the surface from the middle of each side of panel `p` [m].
fn bends(panels: &Panels, p: usize) -> [f64; 3] {
    let middle = |k: usize| {
        let mut w = [0.5; 3];
        w[(k + 2) % 3] = 0.0;
        w
    };
    let corner = |k: usize| [0, 1, 2].map(|c| if c == k { 1.0 } else { 0.0 });
    let ends = [0, 1, 2].map(|k| panels.spot(p, corner(k)).point);
    let bend = |k: usize| (panels.spot(p, middle(k)).point - (ends[k] + ends[(k + 1) % 3]) * 0.5).norm();
    [0, 1, 2].map(bend)
}

/// Largest departure of the surface from a side of a panel, in heights of the panel [1].
///
/// A panel that is longer along a bend than this turns over or tilts: its third corner comes to lie beyond
/// the chord of the other two.  Halving the height doubles the ratio, so at most 0.3 is met.
const MOST_BENT: f64 = 0.15;

/// The longest edge of panel `p` if it must be cut for the panel to follow its surface at all.
pub(super) fn overbent(panels: &Panels, p: usize) -> Option<usize> {
    let tri = &panels.triangles[p];
    let edge = longest(tri);
    let height = tri.cross().norm() / tri.longest_edge().max(f64::MIN_POSITIVE);
    (MOST_BENT * height < bends(panels, p)[edge]).then_some(edge)
}

/// The longest edge of a triangle.
pub(super) fn longest(tri: &Triangle) -> usize {
    let length = |k: usize| (tri.corners[(k + 1) % 3] - tri.corners[k]).norm_squared();
    (1..3).fold(0, |best, k| if length(best) < length(k) { k } else { best })
}
