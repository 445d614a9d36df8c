//! From accepted bodies to the assembly of exposed triangles.

use crate::base::Finding;
use crate::base::Plane;
use crate::base::Severity;
use crate::mesh::Assembly;
use crate::mesh::Body;
use crate::mesh::Net;
use crate::mesh::Row;
use crate::mesh::contact;
use crate::mesh::contact::Groups;
use crate::mesh::expose;
use crate::mesh::expose::Conductor;
use crate::mesh::expose::Exposed;
use crate::mesh::expose::LeftOut;
use crate::mesh::expose::Why;
use crate::mesh::expose_split::MOST_CELLS;
use crate::mesh::parts;
use crate::mesh::parts::Part;
use crate::mesh::plane_cut;
use crate::mesh::selfcross;

pub use crate::mesh::selfcross::crossings_within;

/// Findings of one kind that are listed; the rest is counted.
const MOST_LISTED: usize = 20;

/// The exposed triangles of `bodies`, with one row of the matrix for each conductor.
///
/// `bonds` lists names of bodies held at one potential, possibly with `earth`; they hold
/// transitively.  Bonded bodies that touch are one conductor: faces that lie on each other, facets
/// inside its metal and second copies are left out, cut where they must be.  A conductor that
/// meets `plane` and is bonded with earth is cut there and belongs to the 0 V reference.  Walls of
/// empty cavities are left out.  Takes seconds for some hundred thousand facets.
///
/// # Errors
/// All findings, when there is a refusal among them.
pub fn expose(
    bodies: Vec<Body>,
    bonds: &[Vec<String>],
    plane: Option<&Plane>,
) -> Result<Assembly, Vec<Finding>> {
    let parts: Vec<Part> = bodies.iter().map(|b| parts::prepare(&b.surface)).collect();
    let mut findings: Vec<Finding> =
        bodies.iter().zip(&parts).flat_map(|(b, part)| selfcross::within(part, &b.name)).collect();
    let bonded = contact::bonded(&bodies, bonds, &mut findings);
    let metal = contact::joined(&bodies, &parts, &bonded, &mut findings);
    let earthed = match plane {
        Some(plane) => plane_cut::earthed(&bodies, &parts, plane, &bonded, &mut findings),
        None => vec![false; bodies.len()],
    };
    if refused(&findings) {
        return Err(capped(findings));
    }
    findings.extend(nested(&bodies, &parts));

    let (mut rows, mut pieces) = (Vec::new(), Vec::new());
    for members in conductors(&metal, bodies.len()) {
        let name = members.iter().map(|&m| bodies[m].name.as_str()).collect::<Vec<_>>().join("+");
        let earth = members.iter().any(|&m| earthed[m]);
        let net = if earth { Net::Earth } else { Net::Row(rows.len() as u32) };
        let bounds: Vec<_> = members.iter().map(|&m| parts[m].bounds()).collect();
        let exposed = expose::exposed(&Conductor {
            parts: &parts,
            members: &members,
            plane: plane.filter(|_| earth),
            net,
            abs_tol: contact::tolerance(&bounds),
        });
        findings.extend(left_out(&name, &exposed, &bodies));
        if exposed.pieces.is_empty() && !earth {
            findings.push(nothing_exposed(&name));
        }
        if !earth {
            rows.push(Row { name, bodies: members.iter().map(|&m| m as u32).collect() });
        }
        pieces.extend(exposed.pieces);
    }
    pieces.sort_by_key(|p| (p.body, p.facet));
    let findings = capped(findings);
    if refused(&findings) { Err(findings) } else { Ok(Assembly { bodies, rows, pieces, findings }) }
}

fn refused(findings: &[Finding]) -> bool {
    findings.iter().any(|f| f.severity == Severity::Refusal)
}

/// Bodies of each conductor, in order of the first.
fn conductors(metal: &Groups, n: usize) -> Vec<Vec<usize>> {
    let mut members = vec![Vec::new(); n];
    (0..n).for_each(|b| members[metal.first(b)].push(b));
    members.retain(|m: &Vec<usize>| !m.is_empty());
    members
}

/// A note for each body that stands in a cavity of another.
fn nested(bodies: &[Body], parts: &[Part]) -> Vec<Finding> {
    let mut findings = Vec::new();
    for (outer, part) in parts.iter().enumerate() {
        let abs_tol = contact::tolerance([&part.bounds()]);
        for shell in part.shells.iter().filter(|s| part.is_cavity(s, 4.0 * abs_tol)) {
            for (inner, other) in parts.iter().enumerate().filter(|&(inner, _)| inner != outer) {
                let point = other.shells.first().map(|s| other.point_of(s));
                if let Some(place) = point.filter(|x| part.encloses(shell, x)) {
                    let (a, b) = (&bodies[inner].name, &bodies[outer].name);
                    let text = format!("`{a}` stands in a cavity of `{b}`");
                    findings.push(Finding {
                        severity: Severity::Note,
                        code: "nested",
                        text,
                        place: Some(place),
                    });
                }
            }
        }
    }
    findings
}

/// What was left out of one conductor, and the facets that could not be cut.
fn left_out(name: &str, exposed: &Exposed, bodies: &[Body]) -> Vec<Finding> {
    let mut findings: Vec<Finding> =
        exposed.left_out.iter().map(|(why, what)| listed(name, *why, what)).collect();
    findings.extend(exposed.too_fine.iter().map(|&(body, facet)| Finding {
        severity: Severity::Refusal,
        code: "contact_too_fine",
        text: format!(
            "facet {facet} of `{}` meets other metal along so fine a line that it falls into more than \
             {MOST_CELLS} parts; draw that face with smaller facets",
            bodies[body].name
        ),
        place: None,
    }));
    findings
}

fn listed(name: &str, why: Why, what: &LeftOut) -> Finding {
    let (code, reason) = match why {
        Why::Inside => ("hidden_inside", "face only the inside of its metal"),
        Why::Contact => ("hidden_contact", "are faces that lie on each other"),
        Why::Double => ("hidden_double", "coincide with other facets of it"),
        Why::Earth => ("behind_earth_plane", "lie in the earth plane or behind it"),
        Why::Cavity => ("empty_cavity", "are walls of a cavity with nothing in it"),
        Why::Flat => ("no_area", "have no area"),
    };
    let LeftOut { whole, parts, area, place } = *what;
    let text =
        format!("`{name}`: {whole} facets and {parts} parts of facets ({area:.4e} m²) {reason}; left out");
    Finding { severity: Severity::Note, code, text, place }
}

fn nothing_exposed(name: &str) -> Finding {
    Finding {
        severity: Severity::Refusal,
        code: "nothing_exposed",
        text: format!("nothing of `{name}` is exposed; a conductor needs some surface outside other metal"),
        place: None,
    }
}

/// At most [`MOST_LISTED`] findings of each kind, then one that counts the rest.
fn capped(findings: Vec<Finding>) -> Vec<Finding> {
    let mut kinds: Vec<(Severity, &'static str, usize)> = Vec::new();
    let mut kept = Vec::with_capacity(findings.len());
    for finding in findings {
        let kind = (finding.severity, finding.code);
        let at = kinds.iter().position(|k| (k.0, k.1) == kind).unwrap_or_else(|| {
            kinds.push((kind.0, kind.1, 0));
            kinds.len() - 1
        });
        kinds[at].2 += 1;
        if kinds[at].2 <= MOST_LISTED {
            kept.push(finding);
        }
    }
    for (severity, code, count) in kinds.into_iter().filter(|k| MOST_LISTED < k.2) {
        let text = format!("and {} more of this kind", count - MOST_LISTED);
        kept.push(Finding { severity, code, text, place: None });
    }
    kept
}
