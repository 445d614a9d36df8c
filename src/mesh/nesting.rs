//! Which shells of an electrode are its outside and which are walls of its cavities.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Triangle;
use crate::geom::winding;
use crate::mesh::Welded;
use crate::mesh::edges;
use crate::mesh::flat;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;
use crate::mesh::repair;
use crate::mesh::weld;

/// Facets of a shell whose centroids vote on whether it lies in another one [1]; odd.  One would
/// do for shells that do not touch; where they touch, single ones may lie on the other shell.
const VOTES: usize = 5;

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
        let volume = volume(shell);
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

/// Volume inside a closed shell [m³]; negative if its normals point inwards.
///
/// By the divergence theorem, from its first corner.
pub(in crate::mesh) fn volume(shell: &Welded) -> f64 {
    let x = |p: u32| shell.points[p as usize] - shell.points[0];
    shell.facets.iter().map(|&[a, b, c]| x(a).dot(&x(b).cross(&x(c)))).sum::<f64>() / 6.0
}

fn area(shell: &Welded) -> f64 {
    triangles(shell).iter().map(Triangle::area).sum()
}

fn triangles(shell: &Welded) -> Vec<Triangle> {
    shell.facets.iter().map(|corners| Triangle::new(corners.map(|p| shell.points[p as usize]))).collect()
}

fn is_closed(shell: &Welded) -> bool {
    edges::open_sides(&edges::sides(&shell.facets)).is_empty()
}

/// For each shell, the number of others that hold it.
fn depths(shells: &[Welded], sheet: bool) -> Vec<usize> {
    if sheet || shells.len() < 2 {
        return vec![0; shells.len()];
    }
    let boxes: Vec<(Vec3, Vec3)> = shells.iter().map(|s| weld::bounds(&s.points)).collect();
    let mut depths = vec![0; shells.len()];
    for (outer, shell) in shells.iter().enumerate() {
        let inside_box = |x: &Vec3| (0..3).all(|k| boxes[outer].0[k] < x[k] && x[k] < boxes[outer].1[k]);
        let mut facets: Option<Vec<Triangle>> = None;
        for (inner, other) in shells.iter().enumerate().filter(|&(inner, _)| inner != outer) {
            let votes = voters(other).filter(inside_box);
            let held = votes.filter(|x| holds(facets.get_or_insert_with(|| triangles(shell)), x)).count();
            if VOTES < 2 * held {
                depths[inner] += 1;
            }
        }
    }
    depths
}

/// Centroids of facets spread over a shell, [`VOTES`] of them.
fn voters(shell: &Welded) -> impl Iterator<Item = Vec3> {
    let n = shell.facets.len();
    (0..VOTES).map(move |k| repair::centroid(&shell.points, &shell.facets[k * n / VOTES]))
}

/// Whether a closed shell holds a point, whichever way its normals point.
fn holds(facets: &[Triangle], x: &Vec3) -> bool {
    winding::INSIDE <= winding::winding_number(facets, x).abs()
}
