//! How bodies and facets stand to the earth plane.

use crate::base::Finding;
use crate::base::Plane;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Triangle;
use crate::mesh::Body;
use crate::mesh::contact;
use crate::mesh::contact::Groups;
use crate::mesh::parts::Part;

/// How a facet stands to the plane.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum Side {
    /// In front; it may touch the plane.
    Front,
    /// On both sides.
    Across,
    /// Behind the plane or lying in it.
    Gone,
}

/// How `facet` stands to `plane`; heights up to `abs_tol` [m] count as none.
pub(crate) fn side(facet: &Triangle, plane: &Plane, abs_tol: f64) -> Side {
    let heights = facet.corners.map(|p| plane.height(&p));
    let behind = heights.iter().any(|h| *h < -abs_tol);
    let front = heights.iter().any(|h| abs_tol < *h);
    match (front, behind) {
        (true, false) => Side::Front,
        (true, true) => Side::Across,
        (false, _) => Side::Gone,
    }
}

/// Bodies that touch or cross `plane`; adds the refusals of those that may not.
///
/// `bonded` holds earth under the number `bodies.len()`.
pub(crate) fn earthed(
    bodies: &[Body],
    parts: &[Part],
    plane: &Plane,
    bonded: &Groups,
    findings: &mut Vec<Finding>,
) -> Vec<bool> {
    let stands: Vec<Stand> = parts.iter().map(|part| stand(part, plane)).collect();
    let all_behind = stands.iter().all(|s| matches!(s, Stand::Behind(_)));
    let mut earthed = vec![false; bodies.len()];
    for (b, (body, stand)) in bodies.iter().zip(&stands).enumerate() {
        match *stand {
            Stand::Front => {}
            Stand::Behind(place) => findings.push(behind(&body.name, plane, place, all_behind)),
            Stand::Meets(_) if bonded.same(b, bodies.len()) => earthed[b] = true,
            Stand::Meets(place) => findings.push(Finding {
                severity: Severity::Refusal,
                code: "meets_earth",
                text: format!(
                    "`{0}` touches or crosses the earth plane; bond `{0}` with `earth` if it stands on it, \
                     or lift it off",
                    body.name
                ),
                place: Some(place),
            }),
        }
    }
    earthed
}

/// How a body stands to the plane, with its lowest (or, behind, its highest) place.
#[derive(Clone, Copy)]
enum Stand {
    Front,
    Meets(Vec3),
    Behind(Vec3),
}

fn stand(part: &Part, plane: &Plane) -> Stand {
    let abs_tol = contact::tolerance([&part.bounds()]);
    let corners = || part.skin.triangles().iter().flat_map(|t| t.corners.iter());
    let lowest = corners().min_by(|p, q| plane.height(p).total_cmp(&plane.height(q)));
    let highest = corners().max_by(|p, q| plane.height(p).total_cmp(&plane.height(q)));
    match (lowest, highest) {
        (_, Some(high)) if plane.height(high) < -abs_tol => Stand::Behind(*high),
        (Some(low), _) if plane.height(low) <= abs_tol => Stand::Meets(*low),
        _ => Stand::Front,
    }
}

fn behind(name: &str, plane: &Plane, place: Vec3, all: bool) -> Finding {
    let f = plane.facing;
    let advice = if all {
        format!("turn `facing` to [{}, {}, {}]", turned(f.x), turned(f.y), turned(f.z))
    } else {
        "move it to the front, or turn `facing` if the assembly stands on the other side".to_owned()
    };
    Finding {
        severity: Severity::Refusal,
        code: "behind_earth",
        text: format!(
            "`{name}` lies wholly behind the earth plane, which faces [{}, {}, {}]; {advice}",
            f.x, f.y, f.z
        ),
        place: Some(place),
    }
}

/// The opposite number, without a negative zero.
fn turned(x: f64) -> f64 {
    if x == 0.0 { 0.0 } else { -x }
}
