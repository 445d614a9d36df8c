//! Shells to an accepted surface, or everything that is wrong with them.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Triangle;
use crate::mesh::Surface;
use crate::mesh::Welded;
use crate::mesh::edges;
use crate::mesh::edges::Side;
use crate::mesh::flat;
use crate::mesh::holes;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;
use crate::mesh::listing::short;
use crate::mesh::nesting;
use crate::mesh::orient;
use crate::mesh::repair;
use crate::mesh::shells;
use crate::mesh::size;
use crate::mesh::weld;

/// Longest side over height from which a facet is a sliver [1].
///
/// A cylinder of 100 facets round, ten diameters long, has 320; needles that exports leave where
/// round bodies meet had 1,030 to 11,400 on the ball with stub and ring named at
/// `WELD_REL_TOL`.
pub const SLIVER: f64 = 1000.0;

/// Corners of a hole that are named in its finding.
const NAMED_CORNERS: usize = 8;

/// Welds, repairs, splits and accepts the facets of one electrode [m].
///
/// # Errors
/// As [`accept`]; the findings of the repairs come first.
pub fn body(facets: &[[Vec3; 3]], sheet: bool, name: &str) -> Result<(Surface, Vec<Finding>), Vec<Finding>> {
    body_of(&[facets], sheet, name)
}

/// The same for an electrode of several solids or files [m].
///
/// Solids that are closed, each for itself, are kept apart even where they touch; otherwise, as
/// for a sheet and for exports of one solid a face, all are welded together.
///
/// # Errors
/// As [`accept`]; the findings of the repairs come first.
pub fn body_of(
    solids: &[&[[Vec3; 3]]],
    sheet: bool,
    name: &str,
) -> Result<(Surface, Vec<Finding>), Vec<Finding>> {
    let mend = |facets: &[[Vec3; 3]]| {
        let welded = weld::weld(facets, weld::WELD_REL_TOL);
        repair::repair(welded, sheet, name)
    };
    let mut mended: Vec<(Welded, Vec<Finding>)> = solids.iter().map(|facets| mend(facets)).collect();
    let is_closed = |(welded, _): &(Welded, Vec<Finding>)| nesting::is_closed(welded);
    if 1 < solids.len() && (sheet || !mended.iter().all(is_closed)) {
        mended = vec![mend(&solids.concat())];
    }
    let parts: Vec<Welded> = mended.iter().flat_map(|(welded, _)| shells::split(welded)).collect();
    let mut findings: Vec<Finding> = mended.into_iter().flat_map(|(_, findings)| findings).collect();
    match accept(parts, sheet, name) {
        Ok((surface, more)) => {
            findings.extend(more);
            Ok((surface, findings))
        }
        Err(more) => {
            findings.extend(more);
            Err(findings)
        }
    }
}

/// The repaired shells of one electrode as one surface, normals out of the metal, with warnings
/// and notes.
///
/// A solid must consist of closed shells in which each edge has two facets that run against each
/// other.  A shell inside an odd number of others is a cavity wall, whatever its orientation in
/// the file, and its normals point into the cavity.  A `sheet` may be open, and more than two of
/// its facets may meet at an edge.
///
/// Not looked for here: facets that cut through one another.
///
/// # Errors
/// All findings, at least one of them a refusal, each kind in facet order.
pub fn accept(
    mut shells: Vec<Welded>,
    sheet: bool,
    name: &str,
) -> Result<(Surface, Vec<Finding>), Vec<Finding>> {
    let whole = shells::join(&shells);
    if whole.facets.is_empty() {
        let text = format!("`{name}`: no facets are left; a surface with at least one facet is wanted");
        return Err(vec![Finding { severity: Severity::Refusal, code: "no_facets", text, place: None }]);
    }
    let (lo, hi) = weld::bounds(&whole.points);
    let mut findings = check(&whole, sheet, name, (hi - lo).norm());
    if findings.iter().all(|f| f.severity != Severity::Refusal) {
        let wall = nesting::orient(&mut shells, sheet, name, (hi - lo).norm());
        findings.extend(wall);
    }
    findings.extend(size::unit_suspicion(&(hi - lo), name));
    if findings.iter().any(|f| f.severity == Severity::Refusal) {
        return Err(findings);
    }
    Ok((seal(shells::join(&shells), sheet), findings))
}

/// The surface as drawn: each facet with its own normal, no creases.
fn seal(welded: Welded, sheet: bool) -> Surface {
    let normals = welded
        .facets
        .iter()
        .map(|corners| [Triangle::new(corners.map(|p| welded.points[p as usize])).normal(); 3])
        .collect();
    Surface { welded, sheet, normals, creases: Vec::new(), rims_as_drawn: true }
}

fn check(whole: &Welded, sheet: bool, name: &str, diagonal: f64) -> Vec<Finding> {
    let sides = edges::sides(&whole.facets);
    let mut findings = shapes(whole, name, diagonal);
    findings.extend(double_faces(whole, name));
    findings.extend(crowded_edges(whole, &sides, sheet, name));
    findings.extend(sidedness(whole, &sides, sheet, name));
    if !sheet {
        findings.extend(open_edges(whole, &sides, name));
    }
    findings
}

/// Facets without area are refused, slivers warned of.
fn shapes(whole: &Welded, name: &str, diagonal: f64) -> Vec<Finding> {
    let mut flat = Listing::new(name, Severity::Refusal, "zero_area");
    let mut slivers = Listing::new(name, Severity::Warning, "sliver");
    for corners in &whole.facets {
        let (_, length, height) = flat::longest(&whole.points, corners);
        let place = repair::centroid(&whole.points, corners);
        if height <= flat::FLAT_REL * diagonal {
            flat.add(place, || {
                format!("facet without area at {} that could not be taken out; mend it in CAD", at(&place))
            });
        } else if SLIVER * height < length {
            slivers.add(place, || {
                format!("sliver at {}: {:.0} times as long as high", at(&place), length / height)
            });
        }
    }
    [flat.finish(), slivers.finish()].concat()
}

fn double_faces(whole: &Welded, name: &str) -> Vec<Finding> {
    let mut list = Listing::new(name, Severity::Refusal, "double_face");
    for (f, reversed) in repair::repeated(&whole.facets) {
        let place = repair::centroid(&whole.points, &whole.facets[f]);
        let what = if reversed { "back to back, a wall without thickness" } else { "on one another" };
        list.add(place, || {
            format!("two facets {what}, at {}; give the wall a thickness or take it out", at(&place))
        });
    }
    list.finish()
}

fn crowded_edges(whole: &Welded, sides: &[Side], sheet: bool, name: &str) -> Vec<Finding> {
    let (severity, code) =
        if sheet { (Severity::Note, "sheet_junction") } else { (Severity::Refusal, "non_manifold_edge") };
    let mut list = Listing::new(name, severity, code);
    for edge in edges::by_edge(sides).filter(|edge| 2 < edge.len()) {
        let [a, b] = edge[0].ends.map(|p| whole.points[p as usize]);
        list.add((a + b) * 0.5, || {
            let wanted = if sheet { "sheets join there" } else { "two are wanted on a solid" };
            format!("{} facets meet at the edge from {} to {}; {wanted}", edge.len(), at(&a), at(&b))
        });
    }
    list.finish()
}

/// Facets that run against their neighbours, and patches with one side only.
fn sidedness(whole: &Welded, sides: &[Side], sheet: bool, name: &str) -> Vec<Finding> {
    let orientation = orient::flood(&whole.facets, sides);
    let severity = if sheet { Severity::Warning } else { Severity::Refusal };
    let mut twisted = Listing::new(name, severity, "one_sided");
    for ends in &orientation.twisted {
        let [a, b] = ends.map(|p| whole.points[p as usize]);
        let place = (a + b) * 0.5;
        twisted.add(place, || {
            format!(
                "one-sided surface: orientations clash at {}; a surface with two sides is wanted",
                at(&place)
            )
        });
    }
    let mut against = Listing::new(name, severity, "flipped_facet");
    if orientation.twisted.is_empty() {
        for (corners, _) in whole.facets.iter().zip(&orientation.flip).filter(|(_, flip)| **flip) {
            let place = repair::centroid(&whole.points, corners);
            against.add(place, || format!("facet at {} runs against its neighbours", at(&place)));
        }
    }
    [twisted.finish(), against.finish()].concat()
}

fn open_edges(whole: &Welded, sides: &[Side], name: &str) -> Vec<Finding> {
    let mut list = Listing::new(name, Severity::Refusal, "hole");
    for hole in holes::loops(&edges::open_sides(sides)) {
        let place = hole.middle(&whole.points);
        list.add(place, || {
            let kind = if hole.closed { "hole" } else { "gap" };
            let corners: Vec<String> =
                hole.corners.iter().take(NAMED_CORNERS).map(|&p| at(&whole.points[p as usize])).collect();
            let more = if NAMED_CORNERS < hole.corners.len() { ", …" } else { "" };
            format!(
                "{kind} of {} corners and perimeter {} m, along {}{more}; close it in CAD, or say `sheet = true` \
                 if the metal is a sheet",
                hole.corners.len(),
                short(hole.perimeter(&whole.points)),
                corners.join(", "),
            )
        });
    }
    list.finish()
}
