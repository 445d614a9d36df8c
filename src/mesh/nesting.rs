//! Which shells of an electrode are its outside and which are walls of its cavities.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Triangle;
use crate::geom::winding;
use crate::geom::winding::Winding;
use crate::mesh::Welded;
use crate::mesh::edges;
use crate::mesh::flat;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;
use crate::mesh::repair;
use crate::mesh::shells;
use crate::mesh::weld;

/// Facets of a shell whose centroids vote on whether it lies in another one [1]; odd.  One would
/// do for shells that do not touch; where they touch, single ones may lie on the other shell.
const VOTES: usize = 5;

/// The same where the shells of a file are parted into bodies [1]: no more than a name hangs on it.
const FILE_VOTES: usize = 3;

/// Turns each closed shell so that its normals point out of the metal, by nesting parity: a
/// shell inside an odd number of others bounds a cavity.  Open shells of a sheet stay as they
/// are.
///
/// A refusal where a closed shell of a solid encloses no volume; notes on what was turned and on
/// what is a cavity wall.
pub(in crate::mesh) fn orient(shells: &mut [Welded], sheet: bool, name: &str, diagonal: f64) -> Vec<Finding> {
    let mut empty = Listing::new(name, Severity::Refusal, "no_volume");
    let mut turned = Listing::new(name, Severity::Note, "shell_turned");
    let mut walls = Listing::new(name, Severity::Note, "cavity_wall");
    let depths = depths(shells, sheet);
    for (s, (shell, depth)) in shells.iter_mut().zip(depths).enumerate() {
        if sheet && !is_closed(shell) {
            continue;
        }
        let place = shell.points[0];
        let volume = shells::volume(shell);
        if 2.0 * volume.abs() <= flat::FLAT_REL * diagonal * area(shell) {
            if !sheet {
                empty.add(place, || {
                    format!("shell {s} at {} encloses no volume; a body with thickness is wanted", at(&place))
                });
            }
            continue;
        }
        let is_wall = depth % 2 == 1 && !sheet;
        if is_wall {
            walls.add(place, || format!("shell {s} at {} is the wall of a cavity", at(&place)));
        }
        if (volume < 0.0) != is_wall {
            shell.facets.iter_mut().for_each(|corners| corners.swap(1, 2));
            turned.add(place, || {
                format!("shell {s} at {} turned: its normals pointed into the metal", at(&place))
            });
        }
    }
    [empty.finish(), turned.finish(), walls.finish()].concat()
}

fn area(shell: &Welded) -> f64 {
    shells::triangles(shell).iter().map(Triangle::area).sum()
}

/// Whether no side is open.
pub(in crate::mesh) fn is_closed(shell: &Welded) -> bool {
    edges::open_sides(&edges::sides(&shell.facets)).is_empty()
}

/// For each shell, the number of others that hold it.
fn depths(shells: &[Welded], sheet: bool) -> Vec<usize> {
    if sheet || shells.len() < 2 {
        return vec![0; shells.len()];
    }
    holders(shells, &vec![true; shells.len()], VOTES).iter().map(Vec::len).collect()
}

/// The shells of a file by body: each outer shell, then the walls of its cavities.
///
/// A shell inside an odd number of others is the wall of a cavity of the innermost of them; inside
/// an even number it is a body of its own.  Open shells hold nothing and are no walls.
pub fn with_cavities(shells: &[Welded]) -> Vec<Vec<usize>> {
    let closed: Vec<bool> = shells.iter().map(is_closed).collect();
    let holders = holders(shells, &closed, FILE_VOTES);
    let mut groups: Vec<Vec<usize>> = vec![Vec::new(); shells.len()];
    for (k, held) in holders.iter().enumerate() {
        let innermost = held.iter().copied().max_by_key(|outer| holders[*outer].len());
        match innermost.filter(|_| held.len() % 2 == 1) {
            Some(outer) if holders[outer].len().is_multiple_of(2) => groups[outer].push(k),
            _ => groups[k].insert(0, k),
        }
    }
    groups.retain(|group| !group.is_empty());
    groups
}

/// For each of the shells that count, the others of them that hold it; nothing holds the rest.
fn holders(shells: &[Welded], counts: &[bool], votes: usize) -> Vec<Vec<usize>> {
    let boxes: Vec<(Vec3, Vec3)> = shells.iter().map(|s| weld::bounds(&s.points)).collect();
    let mut by_x: Vec<usize> = (0..shells.len()).filter(|k| counts[*k]).collect();
    by_x.sort_by(|&s, &t| boxes[s].0.x.total_cmp(&boxes[t].0.x));
    let mut holders = vec![Vec::new(); shells.len()];
    for &outer in &by_x {
        let (lo, hi) = boxes[outer];
        let first = by_x.partition_point(|&s| boxes[s].0.x < lo.x);
        let mut prepared: Option<Winding> = None;
        for &inner in by_x[first..].iter().take_while(|&&s| boxes[s].0.x <= hi.x) {
            let within = (0..3).all(|k| lo[k] <= boxes[inner].0[k] && boxes[inner].1[k] <= hi[k]);
            if inner == outer || !within {
                continue;
            }
            let prepared =
                prepared.get_or_insert_with(|| winding::prepare(shells::triangles(&shells[outer])));
            // Whichever way its normals point.
            let holds = |x: &Vec3| winding::INSIDE <= prepared.at(x).abs();
            if votes < 2 * voters(&shells[inner], votes).filter(holds).count() {
                holders[inner].push(outer);
            }
        }
    }
    holders
}

/// Centroids of `votes` facets spread over a shell.
fn voters(shell: &Welded, votes: usize) -> impl Iterator<Item = Vec3> {
    let n = shell.facets.len();
    (0..votes).map(move |k| repair::centroid(&shell.points, &shell.facets[k * n / votes]))
}
