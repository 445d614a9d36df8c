//! Incoming inspection without solving.

use super::BodyLine;
use super::Inspection;
use super::StudyError;
use super::bodies;
use super::run;
use crate::base::Finding;
use crate::base::Vec3;
use crate::case::Case;
use crate::case::Shapes;
use crate::geom::Triangle;
use crate::mesh::Body;
use crate::mesh::Welded;
use crate::mesh::accept;
use crate::mesh::assembly;
use crate::mesh::edges;
use crate::mesh::shells;
use crate::mesh::smooth;
use crate::mesh::weld;
use crate::operator::dense;

/// Panels of a finished run over those of the first round, for a demand of 0.5 % [1].
///
/// Seen: 2 to 8 on bodies with edges, 1 on round ones; grows with the root of a tighter demand.
const GROWTH: f64 = 4.0;

/// Panels that a body with edges needs at 0.5 % [1].
const EDGED_BODY: usize = 400;

/// Inspects the bodies of a case without solving.
///
/// # Errors
/// None at present: refusals are among the findings.
pub fn inspect_case(case: &Case, shapes: &Shapes) -> Result<Inspection, StudyError> {
    let (bodies, mut findings) = match bodies::bodies(case, shapes) {
        Ok(found) => found,
        Err(findings) => return Ok(Inspection { findings, ..empty() }),
    };
    let lines = bodies.iter().map(line).collect();
    let repaired = bodies.iter().map(|body| (body.name.clone(), in_units(body, case.length_unit))).collect();
    let plane = case.earth_plane.as_ref().map(|earth| earth.plane);
    let mut effort = None;
    match assembly::expose(bodies, &case.bonds, plane.as_ref()) {
        Ok(exposed) => {
            let pieces = exposed.pieces.len();
            let least = exposed.bodies.len() * EDGED_BODY;
            let panels =
                if pieces < least { (GROWTH * pieces as f64).max(least as f64) as usize } else { pieces };
            effort = Some((panels, dense::bytes(panels, exposed.rows.len())));
            findings.extend(exposed.findings);
        }
        Err(more) => findings.extend(more),
    }
    if let Some((panels, bytes)) = effort
        && run::memory_limit(case) < bytes
    {
        let text = format!(
            "about {panels} panels and {:.1} GB are expected, more than the memory limit: raise it or draw fewer facets",
            bytes * 1e-9
        );
        findings.push(Finding {
            severity: crate::base::Severity::Warning,
            code: "effort",
            text,
            place: None,
        });
    }
    Ok(Inspection { findings, bodies: lines, effort, repaired })
}

fn empty() -> Inspection {
    Inspection { findings: Vec::new(), bodies: Vec::new(), effort: None, repaired: Vec::new() }
}

/// Inspects bare STL files: each shell on its own, in the unit of the file.
///
/// Findings of size and unit are left out, since no unit is declared; places are in file units.
pub fn inspect_files(shapes: &Shapes) -> Inspection {
    let read = match bodies::read_all(shapes) {
        Ok(read) => read,
        Err(findings) => return Inspection { findings, ..empty() },
    };
    let mut inspection = empty();
    for (file, read) in shapes.files.iter().zip(read) {
        inspection.findings.extend(read.findings);
        let parts = shells::split(&weld::weld(&read.solids.concat(), weld::WELD_REL_TOL));
        let many = 1 < parts.len();
        for (k, part) in parts.iter().enumerate() {
            let name = if many { format!("{} shell {k}", file.path) } else { file.path.clone() };
            inspect_shell(&name, part, &mut inspection);
        }
    }
    inspection.findings.retain(|finding| finding.code != "unit_suspicion");
    inspection
}

fn inspect_shell(name: &str, part: &Welded, inspection: &mut Inspection) {
    let open = !edges::open_sides(&edges::sides(&part.facets)).is_empty();
    let facets: Vec<[Vec3; 3]> = part.facets.iter().map(|f| f.map(|k| part.points[k as usize])).collect();
    // An open shell is inspected as a solid first, so that its holes are listed.
    match accept::body(&facets, false, name) {
        Ok((surface, more)) => {
            inspection.findings.extend(more);
            let smooth = smooth::recover(&surface.welded, smooth::CREASE_ANGLE);
            let body = Body { name: name.to_owned(), surface };
            inspection.findings.extend(assembly::crossings_within(&body.surface, name));
            inspection.findings.extend(creases(name, &smooth));
            inspection.bodies.push(line(&body));
            inspection.repaired.push((name.to_owned(), in_units(&body, 1.0)));
        }
        Err(more) => {
            inspection.findings.extend(more);
            let shown = line_of(name, part, !open);
            inspection.bodies.push(shown);
        }
    }
}

/// How many sharp creases a body has, and where the first is.
fn creases(name: &str, smooth: &smooth::Smooth) -> Option<Finding> {
    let count = smooth.creases.len();
    (0 < count).then(|| Finding {
        severity: crate::base::Severity::Note,
        code: "creases",
        text: format!("`{name}`: {count} sharp edges; the field is unbounded at outer ones"),
        place: None,
    })
}

fn line(body: &Body) -> BodyLine {
    let open = !edges::open_sides(&edges::sides(&body.surface.welded.facets)).is_empty();
    line_of(&body.name, &body.surface.welded, !open)
}

fn line_of(name: &str, welded: &Welded, closed: bool) -> BodyLine {
    let triangles: Vec<Triangle> =
        welded.facets.iter().map(|f| Triangle::new(f.map(|k| welded.points[k as usize]))).collect();
    let (lo, hi) = weld::bounds(&welded.points);
    let size = hi - lo;
    let signed = |tri: &Triangle| tri.corners[0].dot(&tri.corners[1].cross(&tri.corners[2])) / 6.0;
    BodyLine {
        name: name.to_owned(),
        facets: welded.facets.len(),
        closed,
        size: [size.x, size.y, size.z],
        area: triangles.iter().map(Triangle::area).sum(),
        volume: if closed { triangles.iter().map(signed).sum::<f64>() } else { 0.0 },
    }
}

fn in_units(body: &Body, unit: f64) -> Vec<[Vec3; 3]> {
    let welded = &body.surface.welded;
    welded.facets.iter().map(|f| f.map(|k| welded.points[k as usize] / unit)).collect()
}
