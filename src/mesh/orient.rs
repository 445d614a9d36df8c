//! Consistent orientation by flooding across sides.

use crate::mesh::edges;
use crate::mesh::edges::Side;

/// What flooding found.
pub(in crate::mesh) struct Orientation {
    /// Facets that run against their patch, the fewer ones of each patch.
    pub(in crate::mesh) flip: Vec<bool>,
    /// Edges at which no choice of flips helps: the patch has one side only.
    pub(in crate::mesh) twisted: Vec<[u32; 2]>,
}

/// Floods from facet to facet across edges that exactly two facets share.
///
/// Within a patch the fewer facets are to be flipped; of equally many those that differ from the
/// first facet.
pub(in crate::mesh) fn flood(facets: &[[u32; 3]], sides: &[Side]) -> Orientation {
    let beside = beside(facets.len(), sides);
    let mut turned: Vec<Option<bool>> = vec![None; facets.len()];
    let mut twisted = Vec::new();
    for start in 0..facets.len() {
        if turned[start].is_some() {
            continue;
        }
        turned[start] = Some(false);
        let mut patch = vec![start];
        let mut next = 0;
        while next < patch.len() {
            let f = patch[next];
            let own = turned[f] == Some(true);
            next += 1;
            for (k, neighbour) in beside[f].iter().enumerate() {
                let Some((g, against)) = *neighbour else { continue };
                let wanted = own != against;
                match turned[g as usize] {
                    None => {
                        turned[g as usize] = Some(wanted);
                        patch.push(g as usize);
                    }
                    Some(is) if is != wanted && f < g as usize => {
                        let (a, b) = (facets[f][k], facets[f][(k + 1) % 3]);
                        twisted.push([a.min(b), a.max(b)]);
                    }
                    Some(_) => {}
                }
            }
        }
        let n_turned = patch.iter().filter(|&&f| turned[f] == Some(true)).count();
        if patch.len() < 2 * n_turned {
            for &f in &patch {
                turned[f] = turned[f].map(|t| !t);
            }
        }
    }
    Orientation { flip: turned.into_iter().map(|t| t == Some(true)).collect(), twisted }
}

/// The facet behind each side, where there is exactly one, and whether it runs the same way
/// along it, that is against the orientation.
fn beside(n_facets: usize, sides: &[Side]) -> Vec<[Option<(u32, bool)>; 3]> {
    let mut beside = vec![[None; 3]; n_facets];
    for edge in edges::by_edge(sides) {
        if let [s, t] = edge
            && s.facet != t.facet
        {
            let against = s.forward == t.forward;
            beside[s.facet as usize][s.side as usize] = Some((t.facet, against));
            beside[t.facet as usize][t.side as usize] = Some((s.facet, against));
        }
    }
    beside
}
