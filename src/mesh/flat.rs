//! Facets without area, and how to take them out without parting their neighbours.

use crate::base::Vec3;
use crate::mesh::Welded;
use crate::mesh::edges;
use crate::mesh::edges::Side;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;

/// Height of a facet below which it has no area, in diagonals of the part [1].
///
/// About the spacing of single precision, 1.2e-7, over which three corners drawn on one line
/// scatter when they are written.  Measured on the bodies named at `WELD_REL_TOL`: meant as flat,
/// 0; the lowest facet meant as one, 1.6e-6.
pub(in crate::mesh) const FLAT_REL: f64 = 2e-7;

/// Most passes; each takes out all flat facets that do not touch another one.
const MAX_PASSES: usize = 20;

/// Number of the longest side of a facet, its length [m] and the height above it [m].
pub(in crate::mesh) fn longest(points: &[Vec3], corners: &[u32; 3]) -> (usize, f64, f64) {
    let x = corners.map(|p| points[p as usize]);
    let length = [0, 1, 2].map(|k| (x[(k + 1) % 3] - x[k]).norm());
    let mut side = 0;
    for k in [1, 2] {
        if length[side] < length[k] {
            side = k;
        }
    }
    let doubled = (x[1] - x[0]).cross(&(x[2] - x[0])).norm();
    let height = if 0.0 < length[side] { doubled / length[side] } else { 0.0 };
    (side, length[side], height)
}

/// Takes out facets of no height, each with a line in `list`.
///
/// A facet with equal corners just goes.  Of a needle whose middle corner lies on its longest
/// side, the facet behind that side is cut at the corner, so that the neighbours stay joined.
/// Each such step replaces a side by a shorter one, so the passes end; what they leave (needles
/// at edges of three facets) is refused by `accept`.
pub(in crate::mesh) fn remove(welded: &mut Welded, abs_tol: f64, list: &mut Listing<'_>) {
    let Welded { points, facets } = welded;
    facets.retain(|&[a, b, c]| {
        let collapsed = a == b || b == c || c == a;
        if collapsed {
            list.add(points[a as usize], || {
                format!("facet without area taken out at {}", at(&points[a as usize]))
            });
        }
        !collapsed
    });
    for _ in 0..MAX_PASSES {
        if !pass(points, facets, abs_tol, list) {
            return;
        }
    }
}

/// One pass; says if anything was done.
fn pass(points: &[Vec3], facets: &mut Vec<[u32; 3]>, abs_tol: f64, list: &mut Listing<'_>) -> bool {
    let shapes: Vec<(usize, f64, f64)> = facets.iter().map(|f| longest(points, f)).collect();
    let is_flat = |f: usize| shapes[f].2 <= abs_tol;
    if !(0..facets.len()).any(is_flat) {
        return false;
    }
    let sides = edges::sides(facets);
    let mut touched = vec![false; facets.len()];
    let mut gone = vec![false; facets.len()];
    let mut done = false;
    for f in (0..facets.len()).filter(|&f| is_flat(f)) {
        let side = shapes[f].0;
        let [a, b, c] = [0, 1, 2].map(|k| facets[f][(side + k) % 3]);
        if touched[f] {
            continue;
        }
        match behind(&sides, [a.min(b), a.max(b)], f) {
            Behind::Nothing => gone[f] = true,
            Behind::Several => continue,
            Behind::One(g) => {
                let other = g.facet as usize;
                let d = facets[other][(g.side as usize + 2) % 3];
                if touched[other] || is_flat(other) && shapes[other].0 != g.side as usize {
                    continue;
                }
                touched[other] = true;
                if d == c {
                    (gone[f], gone[other]) = (true, true);
                } else {
                    let [p, q] = g.run();
                    (facets[other], facets[f]) = ([p, c, d], [c, q, d]);
                }
            }
        }
        touched[f] = true;
        done = true;
        let place = points[c as usize];
        list.add(place, || format!("facet without area taken out at {}, its neighbours joined", at(&place)));
    }
    let mut keep = gone.iter().map(|gone| !gone);
    facets.retain(|_| keep.next().unwrap_or(true));
    done
}

/// What lies behind a side of a facet.
enum Behind {
    Nothing,
    One(Side),
    Several,
}

fn behind(sides: &[Side], ends: [u32; 2], facet: usize) -> Behind {
    let first = sides.partition_point(|s| s.ends < ends);
    let mut others =
        sides[first..].iter().take_while(|s| s.ends == ends).filter(|s| s.facet as usize != facet);
    match (others.next(), others.next()) {
        (None, _) => Behind::Nothing,
        (Some(one), None) => Behind::One(*one),
        _ => Behind::Several,
    }
}
