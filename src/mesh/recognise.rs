//! Which parts of a body are planes, cylinders, cones, spheres and tori.

use super::Welded;
use super::borders::Border;
use super::borders::Curve;
use super::borders::borders;
use super::faces::Faces;
use super::faces::NONE;
use super::faces::angle;
use super::faces::faces;
use super::form::Form;
use super::region::Region;
use super::region::Search;
use super::region::is_left_out;
use super::region::seek;
use super::region::still_free;
use crate::base::Vec3;
use std::collections::BTreeMap;

/// Share of the turn over a border by which the normals of two forms that are tangent there may differ [1].
///
/// Forms fitted to exact corners agree within rounding.  The circle arcs through three neighbouring rings
/// of a spheroid of ratio 2, drawn with 16 to 64 rings, differ by 0.05 to 0.2 of the turn, cones through
/// two by all of it.
const TANGENT: f64 = 0.03;

/// Error of a normal from rounding, in turns over the border, above which an agreement means nothing [1].
const BLURRED: f64 = 0.3;

/// Widths of a neighbour from which a face beside it counts as a flat, or a strip as a straight one [1].
const WIDER: f64 = 3.0;

/// Facets of a face from which it can be a flat among faces of its size: the two triangles of a quad of
/// a round body lie in one plane as well.
const FLAT_FACETS: usize = 3;

/// Passes over the weak regions at most.
const ROUNDS: usize = 4;

/// What a body is made of.
#[derive(Clone, Debug, PartialEq)]
pub struct Patches {
    /// Patch of each facet.
    pub of_facet: Vec<u32>,
    /// What each patch is.
    pub forms: Vec<Form>,
    /// Edges where patches meet, creases within a patch, and rims.
    pub borders: Vec<Border>,
    /// The curves that the borders lie on.
    pub curves: Vec<Curve>,
}

impl Patches {
    /// One patch of no known form.
    pub fn none(n_facets: usize) -> Self {
        Patches {
            of_facet: vec![0; n_facets],
            forms: vec![Form::Free],
            borders: Vec::new(),
            curves: Vec::new(),
        }
    }
}

/// Recognises the forms of a body from its facets; edges that turn by more than `crease_angle` [rad]
/// always separate.
///
/// A face belongs to a form where all its corners lie on it within the rounding of single precision and
/// its normal is what facets of its size have there.  Forms are fitted to the faces around a seed, grown
/// as far as they hold and fitted again; of several the one that holds on the largest area is taken, of
/// equals the simplest.  Few corners fit forms by chance (two circles fit a cone, three a torus): such
/// patches are kept only where they are bounded by creases or tangent to what is beside them.
pub fn recognise(welded: &Welded, crease_angle: f64) -> Patches {
    let faces = faces(welded, crease_angle);
    let (regions, owner) = seek_all(&faces);
    let (of_facet, forms) = patches(&faces, &regions, &owner);
    let (borders, curves) = borders(&faces, &of_facet);
    Patches { of_facet, forms, borders, curves }
}

/// Regions and the region of each face.
///
/// First those whose corners fix them, from seeds in order of area; then the weak ones that agree with
/// what is known beside them, as often as there are new ones; then weak ones that may support each other,
/// less those that do not; then once more those that agree.
fn seek_all(faces: &Faces<'_>) -> (Vec<Region>, Vec<u32>) {
    let mut order: Vec<u32> = (0..faces.faces.len() as u32).collect();
    order.sort_by(|a, b| {
        let area = |k: &u32| faces.faces[*k as usize].area;
        area(b).total_cmp(&area(a)).then(a.cmp(b))
    });
    let mut search = Search::new(faces);
    let mut regions = Vec::new();
    for seed in order {
        if search.owner[seed as usize] == NONE
            && let Some(region) = seek(&mut search, seed)
        {
            claim(&mut search, &mut regions, region);
        }
    }
    let mut pool = std::mem::take(&mut search.pool);
    pool.sort_by(|a, b| b.area.total_cmp(&a.area).then(a.form.rank().cmp(&b.form.rank())));
    agreeing(&mut search, &mut regions, &pool);
    let settled = regions.len();
    for region in &pool {
        if let Some(region) = still_free(&search, region) {
            claim(&mut search, &mut regions, region);
        }
    }
    settle(&mut search, &regions, settled);
    agreeing(&mut search, &mut regions, &pool);
    adopt(&mut search, &regions);
    (regions, search.owner)
}

fn claim(search: &mut Search<'_>, regions: &mut Vec<Region>, region: Region) {
    let id = regions.len() as u32;
    region.faces.iter().for_each(|f| search.owner[*f as usize] = id);
    regions.push(region);
}

/// Takes weak regions that agree with what is beside them, until there is none.
fn agreeing(search: &mut Search<'_>, regions: &mut Vec<Region>, pool: &[Region]) {
    for _ in 0..ROUNDS {
        let before = regions.len();
        for region in pool {
            let Some(region) = still_free(search, region) else { continue };
            claim(search, regions, region);
            let k = regions.len() - 1;
            if !agrees(search.faces, regions, &search.owner, k) {
                regions[k].faces.iter().for_each(|f| search.owner[*f as usize] = NONE);
                regions.pop();
            }
        }
        if regions.len() == before {
            return;
        }
    }
}

/// Gives small faces that no region took to the one beside which they lie with most of their edges.
fn adopt(search: &mut Search<'_>, regions: &[Region]) {
    for face in 0..search.owner.len() {
        let this = &search.faces.faces[face];
        if search.owner[face] != NONE {
            continue;
        }
        let owners = this.beside.iter().map(|(g, _)| search.owner[*g as usize]).filter(|k| *k != NONE);
        if let Some(k) =
            owners.into_iter().find(|k| is_left_out(search.faces, &regions[*k as usize], face as u32))
        {
            search.owner[face] = k;
        }
    }
}

/// Gives up the regions from `first` on that disagree with what is beside them, until none is left.
fn settle(search: &mut Search<'_>, regions: &[Region], first: usize) {
    let mut alive: Vec<usize> = (first..regions.len()).collect();
    loop {
        let (good, wrong): (Vec<usize>, Vec<usize>) =
            alive.iter().partition(|k| agrees(search.faces, regions, &search.owner, **k));
        if wrong.is_empty() {
            return;
        }
        for k in wrong {
            regions[k].faces.iter().for_each(|f| search.owner[*f as usize] = NONE);
        }
        alive = good;
    }
}

/// Whether a face that no form takes is a flat of the drawing.
fn is_flat(faces: &Faces<'_>, face: usize, owner: &[u32]) -> bool {
    let this = &faces.faces[face];
    if !this.sure {
        return false;
    }
    let rivals = this.beside.iter().filter(|(g, _)| owner[*g as usize] == NONE);
    let widest = rivals.map(|(g, _)| faces.faces[*g as usize].width).fold(0.0, f64::max);
    if widest <= 0.0 {
        let beside = this.beside.iter().map(|(g, _)| faces.faces[*g as usize].width).fold(0.0, f64::max);
        return FLAT_FACETS <= this.facets.len() || beside <= WIDER * this.width;
    }
    let inner = || {
        this.corners.iter().any(|k| faces.around(*k).iter().all(|f| faces.of[*f as usize] as usize == face))
    };
    let wide = WIDER * widest <= this.area.sqrt().min(2.0 * this.width);
    (FLAT_FACETS <= this.facets.len() && inner()) || wide
}

/// Whether a region is tangent to what is beside it over most of its smooth border.
fn agrees(faces: &Faces<'_>, regions: &[Region], owner: &[u32], k: usize) -> bool {
    let this = &regions[k];
    let mut flats: BTreeMap<u32, bool> = BTreeMap::new();
    let (mut good, mut bad) = (0.0, 0.0);
    for face in &this.faces {
        for f in &faces.faces[*face as usize].facets {
            for side in 0..3 {
                let g = faces.across[*f as usize][side];
                if g == NONE || !faces.smooth(*f, side) {
                    continue;
                }
                let other = faces.of[g as usize];
                let ends = faces.ends(*f, side).map(|k| faces.point(k));
                let length = (ends[0] - ends[1]).norm();
                let turn = faces.turn[*f as usize][side];
                let beside = &faces.faces[other as usize];
                let tangent = match owner[other as usize] {
                    p if p as usize == k => continue,
                    NONE => flats
                        .entry(other)
                        .or_insert_with(|| is_flat(faces, other as usize, owner))
                        .then_some(Form::Plane { through: ends[0], normal: beside.normal }),
                    p => Some(regions[p as usize].form),
                };
                let width = faces.faces[*face as usize].width.min(beside.width);
                let noise = 20.0 * faces.rounding / width.max(f64::MIN_POSITIVE);
                let fits = tangent.map(|form| {
                    ends.iter().all(|x| match (this.form.nearest(x), form.nearest(x)) {
                        (Some((_, n)), Some((_, m))) => angle(&n, &m) <= noise.max(TANGENT * turn),
                        _ => true,
                    })
                });
                match fits {
                    Some(_) if BLURRED * turn < noise => bad += length,
                    Some(true) => good += length,
                    Some(false) => bad += length,
                    None if is_long(faces, *face, other, &ends) => {}
                    None => bad += length,
                }
            }
        }
    }
    let few = this.few;
    if few { bad <= 0.1 * good && 0.0 < good } else { bad <= 0.3 * (good + bad) }
}

/// Whether a face reaches much farther from this edge than its neighbour.
fn is_long(faces: &Faces<'_>, face: u32, other: u32, ends: &[Vec3; 2]) -> bool {
    let Some(along) = (ends[1] - ends[0]).try_normalize(0.0) else { return true };
    let reach = |face: u32| {
        let across = |k: &u32| {
            let q = faces.point(*k) - ends[0];
            (q - along * q.dot(&along)).norm()
        };
        faces.faces[face as usize].corners.iter().map(across).fold(0.0, f64::max)
    };
    WIDER * reach(other) <= reach(face)
}

/// Patch of each facet and form of each patch: the regions, the flats, and what is left, connected.
fn patches(faces: &Faces<'_>, regions: &[Region], owner: &[u32]) -> (Vec<u32>, Vec<Form>) {
    let n = faces.faces.len();
    let flat: Vec<bool> = (0..n).map(|k| owner[k] == NONE && is_flat(faces, k, owner)).collect();
    let mut of_face = vec![NONE; n];
    let mut forms = Vec::new();
    let mut of_region = vec![NONE; regions.len()];
    for seed in 0..n {
        if of_face[seed] != NONE {
            continue;
        }
        let id = forms.len() as u32;
        of_face[seed] = id;
        if owner[seed] != NONE {
            let known = &mut of_region[owner[seed] as usize];
            if *known == NONE {
                *known = id;
                forms.push(regions[owner[seed] as usize].form);
            }
            of_face[seed] = *known;
        } else if flat[seed] {
            forms.push(Form::Plane { through: plane_point(faces, seed), normal: faces.faces[seed].normal });
        } else {
            forms.push(Form::Free);
            let mut stack = vec![seed as u32];
            while let Some(f) = stack.pop() {
                for (g, _) in &faces.faces[f as usize].beside {
                    let g = *g as usize;
                    if of_face[g] == NONE && owner[g] == NONE && !flat[g] {
                        of_face[g] = id;
                        stack.push(g as u32);
                    }
                }
            }
        }
    }
    (faces.of.iter().map(|f| of_face[*f as usize]).collect(), forms)
}

/// Mean corner of a face [m].
fn plane_point(faces: &Faces<'_>, face: usize) -> Vec3 {
    let corners = &faces.faces[face].corners;
    corners.iter().map(|k| faces.point(*k)).sum::<Vec3>() / corners.len().max(1) as f64
}
