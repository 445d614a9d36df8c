//! What of one conductor, of one body or several that touch, is exposed.
//!
//! A place of a facet is hidden when metal of the conductor lies on both its sides.  Facets that
//! meet another shell of the conductor are cut along it, each cell is asked about in its middle,
//! and equal cells are put together again.  Of coincident cells at most one stays.  A doubtful place
//! stays: inside metal of one potential it carries no charge, while a lost one would falsify the
//! answer, and a doubled one makes the equations singular.

use crate::base::Plane;
use crate::base::Vec3;
use crate::geom::Bounds;
use crate::geom::Triangle;
use crate::geom::distance;
use crate::geom::intersect;
use crate::geom::intersect::Meeting;
use crate::geom::intersect::Section;
use crate::mesh::Net;
use crate::mesh::Piece;
use crate::mesh::expose_split::Cutter;
use crate::mesh::expose_split::TooFine;
use crate::mesh::parts::NOBODY;
use crate::mesh::parts::Part;
use crate::mesh::parts::Shell;
use crate::mesh::plane_cut;
use crate::mesh::plane_cut::Side;
use std::collections::BTreeMap;
use std::mem;
use std::ptr;

/// Distance of the probes from the facet, in tolerances [1]: beyond a coincident face, and still
/// closer than anything that was drawn apart.
const PROBE: f64 = 4.0;

/// Facets asked about in a region that nothing cuts; they must agree before it is left out.
const WITNESSES: usize = 3;

/// Barycentric corners of an uncut facet [1].
const WHOLE: [[f64; 3]; 3] = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]];

/// Why a place carries no panel.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub(crate) enum Why {
    /// Metal of the conductor on both sides.
    Inside,
    /// Two faces of the conductor lie on each other.
    Contact,
    /// Another facet of the conductor stands for it.
    Double,
    /// Behind the earth plane or in it.
    Earth,
    /// Wall of a cavity with nothing in it.
    Cavity,
    /// No area.
    Flat,
}

/// What was left out for one reason.
#[derive(Clone, Copy, Debug, PartialEq, Default)]
pub(crate) struct LeftOut {
    /// Whole facets.
    pub(crate) whole: usize,
    /// Parts of facets of which another part stays or is left out for another reason.
    pub(crate) parts: usize,
    /// Area [m²].
    pub(crate) area: f64,
    /// The first place [m].
    pub(crate) place: Option<Vec3>,
}

/// A conductor to be looked at.
pub(crate) struct Conductor<'a> {
    /// All bodies of the assembly.
    pub(crate) parts: &'a [Part],
    /// Numbers of its own bodies, ascending.
    pub(crate) members: &'a [usize],
    /// The plane it is cut at, if it belongs to the 0 V reference.
    pub(crate) plane: Option<&'a Plane>,
    /// Its row, or earth.
    pub(crate) net: Net,
    /// Distance up to which surfaces count as touching [m].
    pub(crate) abs_tol: f64,
}

/// What a conductor shows to the outside.
#[derive(Clone, Debug, PartialEq, Default)]
pub(crate) struct Exposed {
    /// Triangles, by body and facet.
    pub(crate) pieces: Vec<Piece>,
    /// What was left out, by reason.
    pub(crate) left_out: BTreeMap<Why, LeftOut>,
    /// Facets (body, facet) that would fall into too many cells.
    pub(crate) too_fine: Vec<(usize, usize)>,
}

/// What of `conductor` is exposed.
pub(crate) fn exposed(conductor: &Conductor) -> Exposed {
    let mut out = Exposed::default();
    for &body in conductor.members {
        let meets = conductor.meets(body);
        let open = conductor.regions(body, &meets);
        for (facet, meets) in meets.iter().enumerate() {
            conductor.facet(body, facet, meets.as_ref(), open[facet], &mut out);
        }
    }
    out
}

/// What a facet meets of other shells.
#[derive(Clone, Debug, PartialEq, Default)]
struct Meets {
    /// Segments along which it is cut.
    cuts: Vec<[Vec3; 2]>,
    /// Facets that lie in its plane.
    covers: Vec<Cover>,
}

/// A facet in the plane of another one.
#[derive(Clone, Copy, Debug, PartialEq)]
struct Cover {
    triangle: Triangle,
    bounds: Bounds,
    /// Its normal points the other way.
    opposed: bool,
    /// Of two exposed copies it is the one that stays.
    stays: bool,
}

impl Conductor<'_> {
    /// For each facet of a body what it meets, `None` where it meets nothing.
    fn meets(&self, body: usize) -> Vec<Option<Meets>> {
        let part = &self.parts[body];
        let bounds = part.bounds().grown(self.abs_tol);
        let alone = |c: usize| c == body && part.shells.len() == 1 && !part.sheet;
        let others: Vec<usize> = self
            .members
            .iter()
            .copied()
            .filter(|&c| !alone(c) && self.parts[c].bounds().meets(&bounds))
            .collect();
        let mut meets = vec![None; part.corners.len()];
        if others.is_empty() {
            return meets;
        }
        for (f, meets) in meets.iter_mut().enumerate() {
            let near = Bounds::of(&part.triangle(f).corners).grown(self.abs_tol);
            for &other in &others {
                self.parts[other].skin.tree().meeting(&near, |g| {
                    self.meet((body, f), (other, g), meets);
                    true
                });
            }
        }
        meets
    }

    /// Adds to `meets` how facet `f` meets facet `g`, if it does.
    fn meet(&self, f: (usize, usize), g: (usize, usize), meets: &mut Option<Meets>) {
        let (own, other) = (&self.parts[f.0], &self.parts[g.0]);
        let (a, b) = (own.triangle(f.1), other.triangle(g.1));
        if f.0 == g.0 && own.shell_of[f.1] == own.shell_of[g.1] {
            let folded = own.sheet
                && !own.joined(f.1, g.1)
                && matches!(intersect::triangles(a, b, self.abs_tol), Meeting::Coplanar { .. });
            if folded {
                self.cover(f, g, meets.get_or_insert_default());
            }
            return;
        }
        if self.abs_tol * self.abs_tol < distance::triangles(a, b).distance_sq {
            return;
        }
        let meets = meets.get_or_insert_default();
        match intersect::section(b, &a.corners[0], &a.normal(), self.abs_tol) {
            Section::InPlane => self.cover(f, g, meets),
            Section::Segment(ends) if !other.sheet => meets.cuts.push(ends),
            Section::Segment(_) | Section::Apart => {}
        }
    }

    /// Adds facet `g`, which lies in the plane of facet `f`, with those of its edges that end the
    /// face it belongs to.
    fn cover(&self, f: (usize, usize), g: (usize, usize), meets: &mut Meets) {
        let (own, other) = (&self.parts[f.0], &self.parts[g.0]);
        let (a, b) = (own.triangle(f.1), other.triangle(g.1));
        let normal = a.normal();
        let key = |p: &Part, (body, facet): (usize, usize)| (p.sheet, body, p.shell_of[facet], facet);
        let stays = key(other, g) < key(own, f);
        if other.sheet && !own.sheet {
            return;
        }
        let folded = f.0 == g.0 && own.shell_of[f.1] == own.shell_of[g.1];
        let opposed = b.cross().dot(&normal) < 0.0;
        meets.covers.push(Cover {
            triangle: *b,
            bounds: Bounds::of(&b.corners).grown(self.abs_tol),
            opposed,
            stays,
        });
        for k in 0..3 {
            let beyond = other.beyond[g.1][k];
            let goes_on = beyond != NOBODY && !folded && {
                let next = other.triangle(beyond as usize);
                let flat = intersect::section(next, &a.corners[0], &normal, self.abs_tol);
                flat == Section::InPlane && (next.cross().dot(&normal) < 0.0) == opposed
            };
            if !goes_on {
                meets.cuts.push([b.corners[k], b.corners[(k + 1) % 3]]);
            }
        }
    }

    /// For each facet that meets nothing why it is left out, if it is; one answer for each region
    /// bounded by facets that meet something.
    fn regions(&self, body: usize, meets: &[Option<Meets>]) -> Vec<Option<Why>> {
        let part = &self.parts[body];
        let mut answer = vec![None; meets.len()];
        let mut seen: Vec<bool> = meets.iter().map(Option::is_some).collect();
        for shell in &part.shells {
            let meets_something = shell.facets.iter().any(|&f| seen[f as usize]);
            if !meets_something && self.is_empty_cavity(body, shell) {
                shell.facets.iter().for_each(|&f| answer[f as usize] = Some(Why::Cavity));
                continue;
            }
            if !self.may_be_inside(shell) {
                continue;
            }
            for &start in &shell.facets {
                if mem::replace(&mut seen[start as usize], true) {
                    continue;
                }
                let (mut region, mut at) = (vec![start], 0);
                while at < region.len() {
                    for &g in &part.beyond[region[at] as usize] {
                        if g != NOBODY && !mem::replace(&mut seen[g as usize], true) {
                            region.push(g);
                        }
                    }
                    at += 1;
                }
                let step = region.len().div_ceil(WITNESSES);
                let inside = |&f: &u32| {
                    let t = part.triangle(f as usize);
                    self.hidden(&t.centroid(), &t.normal())
                };
                if region.iter().step_by(step).all(inside) {
                    region.iter().for_each(|&f| answer[f as usize] = Some(Why::Inside));
                }
            }
        }
        answer
    }

    /// Whether another shell of the conductor comes near enough to hide some of `shell`.
    fn may_be_inside(&self, shell: &Shell) -> bool {
        self.members.iter().any(|&c| {
            let part = &self.parts[c];
            let hides = |s: &Shell| !ptr::eq(s, shell) && s.bounds.meets(&shell.bounds);
            !part.sheet && part.bounds().meets(&shell.bounds) && part.shells.iter().any(hides)
        })
    }

    /// Whether `shell` is the wall of a cavity with nothing at all in it.
    fn is_empty_cavity(&self, body: usize, shell: &Shell) -> bool {
        let part = &self.parts[body];
        if !part.is_cavity(shell, PROBE * self.abs_tol) {
            return false;
        }
        let cut = self.plane.is_some_and(|plane| {
            let facets = || shell.facets.iter().map(|&f| part.triangle(f as usize));
            facets().any(|t| plane_cut::side(t, plane, self.abs_tol) != Side::Front)
        });
        !cut && !self.parts.iter().any(|other| {
            let within = |s: &Shell| !ptr::eq(s, shell) && part.encloses(shell, &other.point_of(s));
            other.bounds().meets(&shell.bounds) && other.shells.iter().any(within)
        })
    }

    /// Whether metal of the conductor lies on both sides of a place on a facet.
    fn hidden(&self, x: &Vec3, normal: &Vec3) -> bool {
        let metal = |x: Vec3| self.members.iter().any(|&m| self.parts[m].holds(&x));
        let step = normal * (PROBE * self.abs_tol);
        metal(x + step) && metal(x - step)
    }

    /// Adds what of one facet is exposed.
    fn facet(
        &self,
        body: usize,
        facet: usize,
        meets: Option<&Meets>,
        region: Option<Why>,
        out: &mut Exposed,
    ) {
        let triangle = self.parts[body].triangle(facet);
        let side = self.plane.map_or(Side::Front, |plane| plane_cut::side(triangle, plane, self.abs_tol));
        let whole = if side == Side::Gone { Some(Why::Earth) } else { region };
        let piece = |bary: [[f64; 3]; 3], corners: [Vec3; 3]| Piece {
            body: body as u32,
            facet: facet as u32,
            corners,
            bary,
            net: self.net,
        };
        if let Some(why) = whole {
            out.leave(why, triangle.area(), triangle.centroid(), true);
            return;
        }
        let Some(mut cutter) = Cutter::new(*triangle, self.abs_tol) else {
            out.leave(Why::Flat, 0.0, triangle.corners[0], true);
            return;
        };
        if meets.is_none() && side == Side::Front {
            out.pieces.push(piece(WHOLE, triangle.corners));
            return;
        }
        if self.cut(&mut cutter, triangle, meets, side).is_err() {
            out.too_fine.push((body, facet));
            return;
        }
        let parts = cutter.parts(|x| self.class(x, triangle, meets, side));
        let one = parts.len() == 1;
        for (class, polygon) in parts {
            let bary = cutter.triangles(polygon);
            let corners = |w: &[[f64; 3]; 3]| w.map(|w| triangle.at(w));
            match class {
                None if one => out.pieces.push(piece(WHOLE, triangle.corners)),
                None => out.pieces.extend(bary.iter().map(|w| piece(*w, corners(w)))),
                Some(why) => {
                    let area = bary.iter().map(|w| Triangle::new(corners(w)).area()).sum();
                    let place =
                        bary.first().map_or(triangle.corners[0], |w| Triangle::new(corners(w)).centroid());
                    out.leave(why, area, place, one);
                }
            }
        }
    }

    /// Cuts a facet along all that it meets, long segments first.
    fn cut(
        &self,
        cutter: &mut Cutter,
        facet: &Triangle,
        meets: Option<&Meets>,
        side: Side,
    ) -> Result<(), TooFine> {
        let mut cuts = meets.map_or_else(Vec::new, |m| m.cuts.clone());
        if let (Side::Across, Some(plane)) = (side, self.plane) {
            let level = intersect::section(facet, &plane.through, &plane.facing, self.abs_tol);
            cuts.extend(if let Section::Segment(ends) = level { Some(ends) } else { None });
        }
        let length = |s: &[Vec3; 2]| (s[1] - s[0]).norm_squared();
        cuts.sort_by(|s, t| length(t).total_cmp(&length(s)));
        cutter.cut(&cuts)
    }

    /// Why the cell of a facet around `x` is left out, if it is.
    fn class(&self, x: &Vec3, facet: &Triangle, meets: Option<&Meets>, side: Side) -> Option<Why> {
        if side == Side::Across && self.plane.is_some_and(|plane| plane.height(x) < 0.0) {
            return Some(Why::Earth);
        }
        let covers = meets.map_or(&[][..], |m| &m.covers);
        let over: Vec<&Cover> = covers.iter().filter(|c| c.lies_at(x, self.abs_tol)).collect();
        let contact = over.iter().any(|c| c.opposed);
        if over.iter().any(|c| c.stays) {
            return Some(if contact { Why::Contact } else { Why::Double });
        }
        let hidden = self.hidden(x, &facet.normal());
        hidden.then_some(if contact { Why::Contact } else { Why::Inside })
    }
}

impl Cover {
    /// Whether `x`, a place in its plane, lies in the facet or within `abs_tol` [m] of it.
    fn lies_at(&self, x: &Vec3, abs_tol: f64) -> bool {
        let normal = self.triangle.normal();
        self.bounds.holds(x)
            && (0..3).all(|k| {
                let (a, b) = (self.triangle.corners[k], self.triangle.corners[(k + 1) % 3]);
                -abs_tol * (b - a).norm() <= normal.dot(&(b - a).cross(&(x - a)))
            })
    }
}

impl Exposed {
    /// Books a facet, or a part of one, as left out.
    fn leave(&mut self, why: Why, area: f64, place: Vec3, whole: bool) {
        let entry = self.left_out.entry(why).or_default();
        entry.whole += usize::from(whole);
        entry.parts += usize::from(!whole);
        entry.area += area;
        entry.place = entry.place.or(Some(place));
    }
}
