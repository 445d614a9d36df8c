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
use crate::mesh::nesting;
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

/// Inspects bare STL files: each shell with the walls of its cavities, in the unit of the file.
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
        let groups = nesting::with_cavities(&parts);
        let many = 1 < groups.len();
        for group in groups {
            let name = if many { format!("{} shell {}", file.path, group[0]) } else { file.path.clone() };
            let walls: Vec<Welded> = group.iter().map(|k| parts[*k].clone()).collect();
            inspect_shell(&name, &shells::join(&walls), &mut inspection);
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

#[cfg(test)]
mod tests {
    use super::*;
    use crate::case::ShapeFile;

    /// Facets of a cube about the origin, in ASCII STL.
    fn cube(half: f64, inward: bool) -> String {
        let corner = |k: usize| [k & 1, k >> 1 & 1, k >> 2 & 1].map(|b| if b == 1 { half } else { -half });
        let faces = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]];
        let facets = faces.iter().flat_map(|f| [[f[0], f[1], f[2]], [f[0], f[2], f[3]]]);
        let facet = |mut f: [usize; 3]| {
            if inward {
                f.swap(1, 2);
            }
            let lines = f.map(|k| format!("vertex {} {} {}\n", corner(k)[0], corner(k)[1], corner(k)[2]));
            format!("facet normal 0 0 0\nouter loop\n{}endloop\nendfacet\n", lines.concat())
        };
        facets.map(facet).collect()
    }

    fn inspected(cubes: &[(f64, bool)]) -> Inspection {
        let facets: String = cubes.iter().map(|(half, inward)| cube(*half, *inward)).collect();
        let bytes = format!("solid a\n{facets}endsolid a\n").into_bytes();
        inspect_files(&Shapes { files: vec![ShapeFile { path: "a.stl".to_owned(), bytes }] })
    }

    #[test]
    fn a_hollow_body_is_one_body_with_a_cavity_wall() {
        let found = inspected(&[(2.0, false), (1.0, true)]);
        assert!(found.findings.iter().all(|f| f.code != "shell_turned"), "{:?}", found.findings);
        assert!(found.findings.iter().any(|f| f.code == "cavity_wall"), "{:?}", found.findings);
        assert_eq!((found.bodies.len(), found.bodies[0].name.as_str()), (1, "a.stl"));
        assert!((found.bodies[0].volume - 56.0).abs() < 1e-9, "4^3 less 2^3: {}", found.bodies[0].volume);
        assert_eq!(found.repaired[0].1.len(), 24, "the body is written whole");
    }

    #[test]
    fn a_body_in_a_cavity_is_one_of_its_own() {
        let found = inspected(&[(1.0, false), (4.0, false), (2.0, true)]);
        let names: Vec<&str> = found.bodies.iter().map(|body| body.name.as_str()).collect();
        assert_eq!(names, ["a.stl shell 0", "a.stl shell 1"]);
        assert!((found.bodies[1].volume - 448.0).abs() < 1e-9, "8^3 less 4^3: {}", found.bodies[1].volume);
    }
}
