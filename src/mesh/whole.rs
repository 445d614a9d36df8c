//! From the drawn part of a body to the whole: the part with its copies across even mirrors.

use crate::base::Finding;
use crate::base::Images;
use crate::base::Plane;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Bounds;
use crate::mesh::Surface;
use crate::mesh::Welded;
use crate::mesh::contact;
use crate::mesh::edges;
use crate::mesh::plane_cut;

/// `surface` with its copies joined to it across every even mirror that it meets.
///
/// Facets in such a mirror close the part where the whole goes on: they are inside the metal and are left
/// out.  Normals, smooth patches, edges and cavities then are those of the whole.  A body that stands
/// clear of a mirror, or touches it in points or lines only, is returned as it is.  The facets of the part
/// come first, in their order.
///
/// # Errors
/// A refusal for each mirror that the body crosses, stands behind, or, as a sheet, lies in.
pub fn whole(surface: Surface, images: &Images, name: &str) -> Result<(Surface, Vec<Finding>), Vec<Finding>> {
    let bounds = Bounds::of(&surface.welded.points);
    let abs_tol = contact::tolerance([&bounds]);
    let refused: Vec<Finding> =
        images.even().filter_map(|plane| refusal(&surface, plane, abs_tol, name)).collect();
    if !refused.is_empty() {
        return Err(refused);
    }
    let findings = images.even().filter_map(|plane| {
        let flat = |facet: &&[u32; 3]| in_plane(&surface.welded.points, facet, plane, abs_tol);
        let caps = surface.welded.facets.iter().filter(flat).count();
        (0 < caps).then(|| cap_note(name, caps, plane))
    });
    let findings = findings.collect();
    let welded = images.even().fold(surface.welded, |welded, plane| doubled(welded, plane, abs_tol));
    Ok((Surface { welded, ..surface }, findings))
}

fn refusal(surface: &Surface, plane: &Plane, abs_tol: f64, name: &str) -> Option<Finding> {
    let points = &surface.welded.points;
    let height = |x: &&Vec3| plane.height(x);
    let lowest = points.iter().min_by(|a, b| height(a).total_cmp(&height(b)))?;
    let highest = points.iter().max_by(|a, b| height(a).total_cmp(&height(b)))?;
    let facing = plane_cut::written(&plane.facing);
    let finding =
        |code, text, place: &Vec3| Finding { severity: Severity::Refusal, code, text, place: Some(*place) };
    if plane.height(highest) < -abs_tol {
        let text = format!(
            "`{name}` lies wholly behind the even mirror that faces {facing}; draw the part in front of it, or turn \
             `facing`"
        );
        return Some(finding("behind_mirror", text, highest));
    }
    if plane.height(lowest) < -abs_tol {
        let text = format!(
            "`{name}` crosses the even mirror that faces {facing}: what stands behind it is the copy of what stands in \
             front; cut the body at the mirror and draw the part in front only, or remove the mirror"
        );
        return Some(finding("crosses_mirror", text, lowest));
    }
    let flat = |facet: &&[u32; 3]| in_plane(points, facet, plane, abs_tol);
    let lying = surface.welded.facets.iter().find(flat).filter(|_| surface.sheet)?;
    let text = format!(
        "the sheet `{name}` has facets that lie in the even mirror that faces {facing}, where its two sides are each \
         other's copies; solve it without this mirror, or draw it as a solid with its thickness"
    );
    Some(finding("sheet_in_mirror", text, &points[lying[0] as usize]))
}

fn in_plane(points: &[Vec3], facet: &[u32; 3], plane: &Plane, abs_tol: f64) -> bool {
    facet.iter().all(|k| plane.height(&points[*k as usize]).abs() <= abs_tol)
}

fn cap_note(name: &str, caps: usize, plane: &Plane) -> Finding {
    Finding {
        severity: Severity::Note,
        code: "cap_in_mirror",
        text: format!(
            "`{name}`: {caps} facets lie in the even mirror that faces {}, inside the metal of the whole; left out",
            plane_cut::written(&plane.facing)
        ),
        place: None,
    }
}

/// A body in front of `plane` joined to its copy behind it, without the facets in the plane.
fn doubled(welded: Welded, plane: &Plane, abs_tol: f64) -> Welded {
    let flat = |facet: &[u32; 3]| in_plane(&welded.points, facet, plane, abs_tol);
    let kept: Vec<[u32; 3]> = welded.facets.iter().copied().filter(|facet| !flat(facet)).collect();
    let low = |k: u32| plane.height(&welded.points[k as usize]).abs() <= abs_tol;
    let mut shared = vec![false; welded.points.len()];
    let open = edges::open_sides(&edges::sides(&kept));
    for side in open.iter().filter(|side| side.ends.iter().all(|k| low(*k))) {
        side.ends.iter().for_each(|k| shared[*k as usize] = true);
    }
    if !shared.contains(&true) {
        return welded;
    }
    let mut points = Vec::with_capacity(2 * welded.points.len());
    let mut place: Vec<Option<[u32; 2]>> = vec![None; welded.points.len()];
    for k in kept.iter().flatten().map(|k| *k as usize) {
        if place[k].is_none() {
            let (x, first) = (welded.points[k], points.len() as u32);
            // In the plane to the last digit, so that part and copy meet there.
            points.push(if shared[k] { x - plane.facing * plane.height(&x) } else { x });
            place[k] = Some([first, if shared[k] { first } else { first + 1 }]);
            if !shared[k] {
                points.push(plane.mirror(&x));
            }
        }
    }
    let index = |k: u32, side: usize| place[k as usize].map_or(0, |pair| pair[side]);
    let part = kept.iter().map(|facet| facet.map(|k| index(k, 0)));
    let copy = kept.iter().map(|[a, b, c]| [index(*a, 1), index(*c, 1), index(*b, 1)]);
    Welded { facets: part.chain(copy).collect(), points }
}
