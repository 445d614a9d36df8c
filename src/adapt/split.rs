//! Bisection of panels at the middle of one edge; neighbours need not follow.

use crate::geom::Triangle;
use crate::panel;
use crate::panel::Origin;
use crate::panel::Panels;

/// Panels with each `cuts[k] = (panel, edge)` cut at the middle of its edge; edge `e` runs from corner
/// `e` to corner `e + 1`.  Children stand where their parent stood.
///
/// # Panics
/// If the cuts are not in rising order of panels.
pub fn bisect(panels: &Panels, cuts: &[(usize, usize)]) -> Panels {
    assert!(cuts.windows(2).all(|pair| pair[0].0 < pair[1].0), "cuts in rising order of panels");
    let mut next = cuts.iter().peekable();
    let mut origins: Vec<Origin> = Vec::with_capacity(panels.len() + cuts.len());
    for p in 0..panels.len() {
        let origin = panels.origin(p);
        match next.next_if(|cut| cut.0 == p) {
            Some((_, edge)) => origins.extend(halves(&origin, *edge)),
            None => origins.push(origin),
        }
    }
    panel::from_origins(panels.assembly.clone(), panels.plane, &origins)
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

/// Panels cut along their longest edges until each body has at least `count` of them.
pub fn at_least(count: usize, mut panels: Panels) -> Panels {
    loop {
        let mut held = vec![0_usize; panels.assembly.bodies.len()];
        panels.body.iter().for_each(|body| held[*body as usize] += 1);
        let cuts: Vec<(usize, usize)> = (0..panels.len())
            .filter(|p| held[panels.body[*p] as usize] < count)
            .map(|p| (p, longest(&panels.triangles[p])))
            .collect();
        if cuts.is_empty() {
            return panels;
        }
        panels = bisect(&panels, &cuts);
    }
}

fn longest(tri: &Triangle) -> usize {
    let length = |k: usize| (tri.corners[(k + 1) % 3] - tri.corners[k]).norm_squared();
    (1..3).fold(0, |best, k| if length(best) < length(k) { k } else { best })
}
