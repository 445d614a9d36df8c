//! Which bodies touch, overlap, enclose or nearly touch each other, and which are bonded.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Bounds;
use crate::geom::Triangle;
use crate::geom::distance;
use crate::geom::intersect;
use crate::geom::intersect::Meeting;
use crate::mesh::Body;
use crate::mesh::parts::Part;

/// Distance up to which surfaces count as touching, relative to the largest coordinate or size [1].
///
/// Corners in STL files are rounded to single precision, each coordinate by up to 2⁻²⁵ to 2⁻²⁴ of
/// itself: up to √3 · 6e-8 = 1.03e-7 a corner and 2.1e-7 for two surfaces drawn as touching.  The rest is for planes
/// through rounded corners and for turning the body into place.
pub(crate) const REL_TOL: f64 = 5e-7;

/// Gap of two bodies that is listed, relative to the size of the smaller one [1].
const NEAR: f64 = 0.1;

/// Gap that may be a slip of the drawing rather than a gap, relative to the smaller size [1].
const SUSPECT: f64 = 1e-3;

/// Pairs of facets measured for one gap; with more the gap is stated as an upper bound.
///
/// Reached by concentric spheres of 60,000 facets each at a gap of a tenth of the radius, in 1.1 s;
/// the gap was then 9.9982e-2 of the radius.
const MOST_MEASURED: usize = 4_000_000;

/// Pairs looked at to tell overlap from contact.
const MOST_COMPARED: usize = 1_000_000;

/// Sets of numbers that are joined two at a time.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Groups {
    parent: Vec<usize>,
}

impl Groups {
    /// `n` sets of one.
    pub(crate) fn new(n: usize) -> Self {
        Groups { parent: (0..n).collect() }
    }

    /// The smallest number of the set of `i`.
    pub(crate) fn first(&self, mut i: usize) -> usize {
        while self.parent[i] != i {
            i = self.parent[i];
        }
        i
    }

    /// Joins the sets of `i` and `j`.
    pub(crate) fn join(&mut self, i: usize, j: usize) {
        let (p, q) = (self.first(i), self.first(j));
        let (low, high) = (p.min(q), p.max(q));
        self.parent[high] = low;
        (self.parent[i], self.parent[j]) = (low, low);
    }

    /// Whether both are in one set.
    pub(crate) fn same(&self, i: usize, j: usize) -> bool {
        self.first(i) == self.first(j)
    }
}

/// Distance up to which things within `bounds` count as touching [m].
pub(crate) fn tolerance<'a>(bounds: impl IntoIterator<Item = &'a Bounds>) -> f64 {
    REL_TOL * bounds.into_iter().fold(0.0, |far: f64, b| far.max(b.reach()).max(b.diagonal()))
}

/// Bodies by bond, transitively; number `bodies.len()` stands for earth.
pub(crate) fn bonded(bodies: &[Body], bonds: &[Vec<String>], findings: &mut Vec<Finding>) -> Groups {
    let mut groups = Groups::new(bodies.len() + 1);
    for members in bonds {
        let mut known = Vec::new();
        for member in members {
            match bodies.iter().position(|b| b.name == *member) {
                Some(b) => known.push(b),
                None if member == "earth" => known.push(bodies.len()),
                None => findings.push(Finding {
                    severity: Severity::Refusal,
                    code: "bond_unknown",
                    text: format!(
                        "bond: no electrode is called `{member}`; name electrodes of the case or `earth`"
                    ),
                    place: None,
                }),
            }
        }
        for pair in known.windows(2) {
            groups.join(pair[0], pair[1]);
        }
    }
    groups
}

/// Bodies by metal: bonded ones that touch or overlap are in one set.
///
/// Adds a refusal for each pair that touches without a bond, and a finding for each small gap.
pub(crate) fn joined(
    bodies: &[Body],
    parts: &[Part],
    bonded: &Groups,
    findings: &mut Vec<Finding>,
) -> Groups {
    let mut groups = Groups::new(bodies.len());
    for j in 0..bodies.len() {
        for i in 0..j {
            let names = [bodies[i].name.as_str(), bodies[j].name.as_str()];
            let relation = relation(&parts[i], &parts[j]);
            match relation {
                Relation::Apart => {}
                Relation::Near(gap) => findings.push(near(names, &gap, bonded.same(i, j))),
                Relation::Meet(_) | Relation::Within(..) if bonded.same(i, j) => groups.join(i, j),
                Relation::Meet(place) => findings.push(meeting(names, [&parts[i], &parts[j]], place)),
                Relation::Within(inner, place) => {
                    findings.push(buried([names[inner], names[1 - inner]], place));
                }
            }
        }
    }
    groups
}

/// How two bodies stand to each other.
enum Relation {
    Apart,
    Near(Gap),
    /// The surfaces meet here.
    Meet(Vec3),
    /// The one with this number (0 or 1) has a shell inside the metal of the other.
    Within(usize, Vec3),
}

/// Shortest distance of two bodies.
struct Gap {
    /// Its length [m].
    length: f64,
    /// Its middle [m].
    place: Vec3,
    /// Size of the smaller body [m].
    size: f64,
    /// Whether the search was ended early, so that the gap may be smaller.
    at_most: bool,
}

fn relation(a: &Part, b: &Part) -> Relation {
    let (p, q) = (a.bounds(), b.bounds());
    let (abs_tol, size) = (tolerance([&p, &q]), p.diagonal().min(q.diagonal()));
    let limit = (NEAR * size).max(2.0 * abs_tol);
    if limit * limit <= p.distance_sq(&q) {
        return Relation::Apart;
    }
    let gap = gap(a, b, limit);
    if let Some(gap) = gap.as_ref().filter(|gap| gap.length <= abs_tol) {
        return Relation::Meet(gap.place);
    }
    for (inner, outer, number) in [(a, b, 0), (b, a, 1)] {
        let point = inner.shells.iter().map(|s| inner.point_of(s)).find(|x| outer.holds(x));
        if let Some(place) = point {
            return Relation::Within(number, place);
        }
    }
    gap.map_or(Relation::Apart, Relation::Near)
}

/// Shortest distance of two bodies, if below `limit` [m].
fn gap(a: &Part, b: &Part, limit: f64) -> Option<Gap> {
    let (mut found, mut best, mut measured) = (None, limit * limit, 0);
    a.skin.tree().closest(b.skin.tree(), limit * limit, MOST_MEASURED, |f, g, _| {
        measured += 1;
        let (first, second) = (a.triangle(f), b.triangle(g));
        if best <= distance::at_least_sq(first, second).max(distance::at_least_sq(second, first)) {
            return best;
        }
        let closest = distance::triangles(first, second);
        if closest.distance_sq < best {
            best = closest.distance_sq;
            found = Some((closest.on_first + closest.on_second) * 0.5);
        }
        closest.distance_sq
    });
    found.map(|place| Gap {
        length: best.sqrt(),
        place,
        size: a.bounds().diagonal().min(b.bounds().diagonal()),
        at_most: MOST_MEASURED <= measured,
    })
}

fn near(names: [&str; 2], gap: &Gap, bonded: bool) -> Finding {
    let [a, b] = names;
    let (at_most, length) = (if gap.at_most { "at most " } else { "" }, gap.length);
    let share = 100.0 * length / gap.size;
    let apart =
        format!("`{a}` and `{b}` stand {at_most}{length:.4e} m apart, {share:.2e} % of the smaller one");
    let suspect = length < SUSPECT * gap.size;
    let advice = match (suspect, bonded) {
        (false, _) => "",
        (true, true) => "; they are bonded but do not touch, so they keep rows of their own",
        (true, false) => "; make sure that the gap is meant and the shapes resolve it",
    };
    Finding {
        severity: if suspect { Severity::Warning } else { Severity::Note },
        code: "near_contact",
        text: format!("{apart}{advice}"),
        place: Some(gap.place),
    }
}

fn buried([inner, outer]: [&str; 2], place: Vec3) -> Finding {
    Finding {
        severity: Severity::Refusal,
        code: "overlap",
        text: format!(
            "`{inner}` lies inside the metal of `{outer}`; bond them if they are joined, or give \
             `{outer}` a cavity"
        ),
        place: Some(place),
    }
}

/// The refusal for two bodies whose surfaces meet without a bond.
fn meeting([a, b]: [&str; 2], parts: [&Part; 2], place: Vec3) -> Finding {
    let (code, how, place) = match kind(parts[0], parts[1]) {
        Some((Meeting::Crossing([p, q]), _)) => ("overlap", "overlap", (p + q) * 0.5),
        Some((Meeting::Coplanar { middle, .. }, true)) => ("coplanar_overlap", "share a face", middle),
        Some((Meeting::Coplanar { middle, .. }, false)) => ("contact", "touch with their faces", middle),
        _ => ("contact", "touch", place),
    };
    Finding {
        severity: Severity::Refusal,
        code,
        text: format!("`{a}` and `{b}` {how}; bond them if they are joined, or leave a gap between them"),
        place: Some(place),
    }
}

/// The strongest way in which facets of two bodies meet, and whether their normals agree.
fn kind(a: &Part, b: &Part) -> Option<(Meeting, bool)> {
    let abs_tol = tolerance([&a.bounds(), &b.bounds()]);
    let (mut found, mut compared): (Option<(Meeting, bool)>, usize) = (None, 0);
    for f in 0..a.corners.len() {
        let first = a.triangle(f);
        let near = Bounds::of(&first.corners).grown(abs_tol);
        b.skin.tree().meeting(&near, |g| {
            compared += 1;
            let second = b.triangle(g);
            let meeting = intersect::triangles(first, second, abs_tol);
            let agree = 0.0 < Triangle::cross(first).dot(&second.cross());
            match (&meeting, &found) {
                (Meeting::Crossing(_), _) => found = Some((meeting, agree)),
                (Meeting::Coplanar { .. }, None) => found = Some((meeting, agree)),
                (Meeting::Coplanar { .. }, Some((_, false))) if agree => found = Some((meeting, agree)),
                _ => {}
            }
            !matches!(meeting, Meeting::Crossing(_)) && compared < MOST_COMPARED
        });
        if matches!(found, Some((Meeting::Crossing(_), _))) || MOST_COMPARED <= compared {
            break;
        }
    }
    found
}
