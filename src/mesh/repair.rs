//! Safe repairs, each listed.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::mesh::Welded;
use crate::mesh::edges;
use crate::mesh::flat;
use crate::mesh::holes;
use crate::mesh::joints;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;
use crate::mesh::orient;
use crate::mesh::weld;

/// The mesh with what can safely be mended mended, and one note for each thing done.
///
/// In this order: facets without area and repeated facets are taken out, T-joints closed, facets
/// that run against their neighbours flipped (the fewer of each patch), and tiny holes filled
/// (not in a `sheet`, whose rims they are).  Of facets that lie on one another back to back one
/// is taken out of a sheet; in a solid they stay for `accept` to refuse, as do all other holes,
/// edges of more than two facets, and patches with one side only.  Which side of a shell is
/// outside is settled by `accept`.
///
/// `name` is the electrode in the messages.
pub fn repair(mut welded: Welded, sheet: bool, name: &str) -> (Welded, Vec<Finding>) {
    let (lo, hi) = weld::bounds(&welded.points);
    let diagonal = (hi - lo).norm();
    let mut findings = Vec::new();
    let mut step = |code, mend: &mut dyn FnMut(&mut Listing<'_>)| {
        let mut list = Listing::new(name, Severity::Note, code);
        mend(&mut list);
        findings.extend(list.finish());
    };
    step("zero_area_removed", &mut |list| flat::remove(&mut welded, flat::FLAT_REL * diagonal, list));
    step("duplicate_removed", &mut |list| remove_repeated(&mut welded, sheet, list));
    step("t_joint_closed", &mut |list| joints::split(&mut welded, joints::JOINT_REL * diagonal, list));
    step("facet_flipped", &mut |list| flip(&mut welded, list));
    if !sheet {
        step("tiny_hole_filled", &mut |list| {
            let open = edges::open_sides(&edges::sides(&welded.facets));
            holes::fill(&mut welded, &open, holes::TINY_PERIMETER_REL * diagonal, list);
        });
    }
    (welded, findings)
}

/// Facets that lie on one another: those to leave out, and whether each runs against the first.
pub(in crate::mesh) fn repeated(facets: &[[u32; 3]]) -> Vec<(usize, bool)> {
    let mut keyed: Vec<([u32; 3], usize)> = facets
        .iter()
        .enumerate()
        .map(|(f, corners)| {
            let mut key = *corners;
            key.sort_unstable();
            (key, f)
        })
        .collect();
    keyed.sort_unstable();
    let mut repeated: Vec<(usize, bool)> = keyed
        .chunk_by(|s, t| s.0 == t.0)
        .flat_map(|group| {
            let first = facets[group[0].1];
            group[1..].iter().map(move |&(_, f)| (f, !same_turn(&first, &facets[f])))
        })
        .collect();
    repeated.sort_unstable();
    repeated
}

/// Whether two facets of the same corners run the same way round.
fn same_turn(one: &[u32; 3], other: &[u32; 3]) -> bool {
    (0..3).any(|k| [one[k], one[(k + 1) % 3], one[(k + 2) % 3]] == *other)
}

fn remove_repeated(welded: &mut Welded, sheet: bool, list: &mut Listing<'_>) {
    let mut gone = vec![false; welded.facets.len()];
    for (f, reversed) in repeated(&welded.facets) {
        if reversed && !sheet {
            continue;
        }
        gone[f] = true;
        let place = centroid(&welded.points, &welded.facets[f]);
        let what = if reversed { "reversed copy" } else { "copy" };
        list.add(place, || format!("{what} of a facet taken out at {}", at(&place)));
    }
    let mut keep = gone.iter().map(|gone| !gone);
    welded.facets.retain(|_| keep.next().unwrap_or(true));
}

fn flip(welded: &mut Welded, list: &mut Listing<'_>) {
    let sides = edges::sides(&welded.facets);
    let orientation = orient::flood(&welded.facets, &sides);
    for (corners, _) in welded.facets.iter_mut().zip(&orientation.flip).filter(|(_, flip)| **flip) {
        corners.swap(1, 2);
        let place = centroid(&welded.points, corners);
        list.add(place, || format!("facet that ran against its neighbours flipped at {}", at(&place)));
    }
}

/// Centroid of a facet [m].
pub(in crate::mesh) fn centroid(points: &[Vec3], corners: &[u32; 3]) -> Vec3 {
    corners.iter().map(|&p| points[p as usize]).sum::<Vec3>() / 3.0
}
