//! How bodies and facets stand to the planes at 0 V.

use crate::base::Finding;
use crate::base::ImagePlane;
use crate::base::Plane;
use crate::base::PlaneKind;
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

/// Bodies that touch or cross `grounded`, a plane at 0 V; adds the refusals of those that may not.
///
/// `bonded` holds earth under the number `bodies.len()`.
pub(crate) fn earthed(
    bodies: &[Body],
    parts: &[Part],
    grounded: &ImagePlane,
    bonded: &Groups,
    findings: &mut Vec<Finding>,
) -> Vec<bool> {
    let stands: Vec<Stand> = parts.iter().map(|part| stand(part, &grounded.plane)).collect();
    let all_behind = stands.iter().all(|s| matches!(s, Stand::Behind(_)));
    let mut earthed = vec![false; bodies.len()];
    for (b, (body, stand)) in bodies.iter().zip(&stands).enumerate() {
        match *stand {
            Stand::Front => {}
            Stand::Behind(place) => findings.push(behind(&body.name, grounded, place, all_behind)),
            Stand::Meets(_) if bonded.same(b, bodies.len()) => earthed[b] = true,
            Stand::Meets(place) => findings.push(meets(&body.name, grounded.kind, place)),
        }
    }
    earthed
}

/// The refusal for a body that meets a plane at 0 V without being bonded with earth.
fn meets(name: &str, kind: PlaneKind, place: Vec3) -> Finding {
    let (code, reason) = match kind {
        PlaneKind::Earth | PlaneKind::Even => ("meets_earth", ""),
        PlaneKind::Odd => (
            "meets_mirror",
            ", where the potential is 0 V and its copy at the opposite potential would touch it",
        ),
    };
    Finding {
        severity: Severity::Refusal,
        code,
        text: format!(
            "`{name}` touches or crosses the {}{reason}; bond `{name}` with `earth` if it stands on it, or lift it off",
            kind.word()
        ),
        place: Some(place),
    }
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

fn behind(name: &str, grounded: &ImagePlane, place: Vec3, all: bool) -> Finding {
    let f = grounded.plane.facing;
    let advice = if all {
        format!("turn `facing` to {}", written(&-f))
    } else {
        "move it to the front, or turn `facing` if the assembly stands on the other side".to_owned()
    };
    Finding {
        severity: Severity::Refusal,
        code: if grounded.kind == PlaneKind::Odd { "behind_mirror" } else { "behind_earth" },
        text: format!(
            "`{name}` lies wholly behind the {}, which faces {}; {advice}",
            grounded.kind.word(),
            written(&f)
        ),
        place: Some(place),
    }
}

/// A direction as it stands in a case, without negative zeros.
pub(crate) fn written(v: &Vec3) -> String {
    let [x, y, z] = [v.x, v.y, v.z].map(|c| if c == 0.0 { 0.0 } else { c });
    format!("[{x}, {y}, {z}]")
}
