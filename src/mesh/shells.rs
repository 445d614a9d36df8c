//! Connected shells of a welded mesh.

use crate::base::Vec3;
use crate::geom::Triangle;
use crate::geom::winding;
use crate::mesh::Welded;
use crate::mesh::edges;
use std::collections::HashMap;

/// The shells, facets joined across shared edges, in the order of their first facets.
///
/// Facets that share a corner only are not joined.  Each shell keeps the order of its facets and
/// has its own points, in the order of first use.
pub fn split(welded: &Welded) -> Vec<Welded> {
    let mut roots = Roots((0..welded.facets.len()).collect());
    for edge in edges::by_edge(&edges::sides(&welded.facets)) {
        for pair in edge.windows(2) {
            roots.join(pair[0].facet as usize, pair[1].facet as usize);
        }
    }
    let mut numbers: HashMap<usize, usize> = HashMap::new();
    let mut shells: Vec<Vec<[u32; 3]>> = Vec::new();
    for (f, corners) in welded.facets.iter().enumerate() {
        let number = *numbers.entry(roots.of(f)).or_insert(shells.len());
        if number == shells.len() {
            shells.push(Vec::new());
        }
        shells[number].push(*corners);
    }
    let mut place = vec![None; welded.points.len()];
    shells.into_iter().map(|facets| compact(welded, facets, &mut place)).collect()
}

/// One shell with its own points; `place` is scratch, all `None` before and after.
fn compact(welded: &Welded, facets: Vec<[u32; 3]>, place: &mut [Option<u32>]) -> Welded {
    let mut used: Vec<u32> = Vec::new();
    let facets = facets
        .into_iter()
        .map(|corners| {
            corners.map(|p| {
                *place[p as usize].get_or_insert_with(|| {
                    used.push(p);
                    used.len() as u32 - 1
                })
            })
        })
        .collect();
    for &p in &used {
        place[p as usize] = None;
    }
    Welded { points: used.iter().map(|&p| welded.points[p as usize]).collect(), facets }
}

/// Index of the innermost shell that holds `x` [m]: of least volume, whichever way it runs.
///
/// Open shells count by the solid angle they cover: over half of the sphere is holding.
pub fn holding(shells: &[Welded], x: &Vec3) -> Option<usize> {
    let holds = |shell: &Welded| winding::INSIDE <= winding::winding_number(&triangles(shell), x).abs();
    (0..shells.len())
        .filter(|&s| holds(&shells[s]))
        .min_by(|&s, &t| volume(&shells[s]).abs().total_cmp(&volume(&shells[t]).abs()))
}

/// Volume inside a closed shell [m³]; negative if its normals point inwards.
///
/// By the divergence theorem, from its first corner.
pub fn volume(shell: &Welded) -> f64 {
    let x = |p: u32| shell.points[p as usize] - shell.points[0];
    shell.facets.iter().map(|&[a, b, c]| x(a).dot(&x(b).cross(&x(c)))).sum::<f64>() / 6.0
}

/// The facets of a shell by their corners [m].
pub fn triangles(shell: &Welded) -> Vec<Triangle> {
    shell.facets.iter().map(|corners| Triangle::new(corners.map(|p| shell.points[p as usize]))).collect()
}

/// All shells in one mesh again, in order.
pub fn join(shells: &[Welded]) -> Welded {
    let mut all = Welded::default();
    for shell in shells {
        let first = all.points.len() as u32;
        all.points.extend_from_slice(&shell.points);
        all.facets.extend(shell.facets.iter().map(|corners| corners.map(|p| p + first)));
    }
    all
}

/// Disjoint sets with the smallest member as root.
struct Roots(Vec<usize>);

impl Roots {
    fn of(&mut self, mut f: usize) -> usize {
        while self.0[f] != f {
            self.0[f] = self.0[self.0[f]];
            f = self.0[f];
        }
        f
    }

    fn join(&mut self, a: usize, b: usize) {
        let (a, b) = (self.of(a), self.of(b));
        self.0[a.max(b)] = a.min(b);
    }
}
