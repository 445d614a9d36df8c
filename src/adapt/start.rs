//! The panels of the first round.

use super::split;
use crate::panel::Panels;
use crate::physics::gap;

/// Most that the surface may turn between the corners of a panel [rad]: 25°.
const MOST_TURN: f64 = 0.44;

/// Most that the surface may depart from a panel, in distances to the next conductor [1].
const GAP_SHARE: f64 = 0.1;

/// Most passes; each halves what is cut.
const MOST_PASSES: usize = 40;

/// Cuts panels until each body has at least `count` of them, the surface turns little over each, and
/// none departs from it by a good part of the gap at which it stands; `most` panels at most, if given.
///
/// Cuts go across the way in which the surface bends, so a panel of a cylinder becomes long and narrow.
pub fn start(count: usize, most: Option<usize>, mut panels: Panels) -> Panels {
    for _ in 0..MOST_PASSES {
        let mut held = vec![0_usize; panels.assembly.bodies.len()];
        panels.body.iter().for_each(|body| held[*body as usize] += 1);
        let gaps = gap::gaps(&panels);
        let mut cuts: Vec<(usize, usize)> = Vec::new();
        for (p, gap) in gaps.iter().enumerate() {
            let (bent, bend) = split::most_bent(&panels, p);
            let (turned, turn) = most_turned(&panels, p);
            // Drawn facets of free surfaces are told by their normals as well as they can be.
            let exact = panels.is_exact(p);
            if let Some(edge) = split::overbent(&panels, p).filter(|_| exact) {
                cuts.push((p, edge));
            } else if exact && MOST_TURN < turn {
                cuts.push((p, turned));
            } else if 0.0 < bend && GAP_SHARE * gap < 2.0 * lift(&panels, p) {
                cuts.push((p, bent));
            } else if held[panels.body[p] as usize] < count {
                cuts.push((p, split::longest(&panels.triangles[p])));
            }
        }
        cuts.truncate(most.map_or(usize::MAX, |most| most.saturating_sub(panels.len())));
        if cuts.is_empty() {
            break;
        }
        panels = split::bisect(&panels, &cuts);
    }
    panels
}

/// Mean height of the surface over the panel before it was moved there [m].
fn lift(panels: &Panels, p: usize) -> f64 {
    let tri = &panels.triangles[p];
    let n = tri.normal();
    let corner = |k: usize| [0, 1, 2].map(|c| if c == k { 1.0 } else { 0.0 });
    let heights = [0, 1, 2].map(|k| (panels.spot(p, corner(k)).point - tri.corners[k]).dot(&n).abs());
    heights.into_iter().fold(0.0, f64::max)
}

/// The edge of panel `p` between whose ends the normal of the surface turns most, and that turn [rad].
///
/// On a saddle the normal turns along lines that do not bend, so bends alone do not tell.
fn most_turned(panels: &Panels, p: usize) -> (usize, f64) {
    let corner = |k: usize| [0, 1, 2].map(|c| if c == k { 1.0 } else { 0.0 });
    let n = [0, 1, 2].map(|k| panels.spot(p, corner(k)).normal);
    let turn = |k: usize| n[k].cross(&n[(k + 1) % 3]).norm().atan2(n[k].dot(&n[(k + 1) % 3]));
    let turns = [0, 1, 2].map(turn);
    let most = (1..3).fold(0, |best, k| if turns[best] < turns[k] { k } else { best });
    (most, turns[most])
}
