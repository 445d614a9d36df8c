//! Facets of one body that pass through each other.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::geom::Bounds;
use crate::geom::Triangle;
use crate::geom::distance;
use crate::geom::intersect;
use crate::geom::intersect::Meeting;
use crate::mesh::Surface;
use crate::mesh::contact;
use crate::mesh::parts;
use crate::mesh::parts::Part;
use std::collections::BTreeSet;

/// Places listed one by one; the rest is counted.
const MOST_LISTED: usize = 5;

/// Crossings after which the search ends: enough to refuse, and a bound on the time.
const MOST_FOUND: usize = 1_000;

/// Pairs of facets with overlapping boxes that are looked at; a round body has some twenty a facet,
/// a disc drawn as a fan of 5,000 facets some millions in all.
const MOST_PAIRS: usize = 60_000_000;

/// Where facets of `surface` without a common corner pass through each other or overlap in one plane.
/// Crossings shorter or shallower than the contact tolerance are passed over.
///
/// A refusal for a shell of a solid that crosses itself; a note for a sheet, and for shells of
/// one solid that touch or overlap (they are the same metal).  `name` is what the body is called.
pub fn crossings_within(surface: &Surface, name: &str) -> Vec<Finding> {
    within(&parts::prepare(surface), name)
}

/// The same for a prepared body.
pub(crate) fn within(part: &Part, name: &str) -> Vec<Finding> {
    let found = search(part);
    let (own, across): (Vec<_>, Vec<_>) = found.pairs.into_iter().partition(|p| p.same_shell);
    let mut findings = Vec::new();
    let (severity, what) = if part.sheet {
        (Severity::Note, "the sheet crosses itself, which is allowed")
    } else {
        (Severity::Refusal, "the surface passes through itself; draw it so that no facet crosses another")
    };
    findings.extend(listed(&own, severity, "self_intersection", |p| {
        format!("`{name}`: facets {} and {} cross: {what}", p.facets[0], p.facets[1])
    }));
    findings.extend(listed(&across, Severity::Note, "shells_overlap", |p| {
        format!(
            "`{name}`: shells {} and {} touch or overlap and count as the same metal",
            part.shell_of[p.facets[0]], part.shell_of[p.facets[1]]
        )
    }));
    if found.cut_short {
        findings.push(Finding {
            severity: Severity::Warning,
            code: "self_intersection_unchecked",
            text: format!("`{name}`: too many facets lie across each other to check all for crossings"),
            place: None,
        });
    }
    findings
}

/// A pair of facets that cross.
struct Pair {
    facets: [usize; 2],
    same_shell: bool,
    place: Vec3,
}

struct Found {
    pairs: Vec<Pair>,
    cut_short: bool,
}

fn search(part: &Part) -> Found {
    let abs_tol = contact::tolerance([&part.bounds()]);
    let n = part.corners.len();
    let (mut pairs, mut seen, mut seen_shells) = (Vec::new(), 0, BTreeSet::new());
    for f in 0..n {
        let first = part.triangle(f);
        part.skin.tree().meeting(&Bounds::of(&first.corners).grown(abs_tol), |g| {
            seen += 1;
            let shells = [part.shell_of[f], part.shell_of[g]];
            let same_shell = shells[0] == shells[1];
            if g <= f || (same_shell && part.joined(f, g)) || seen_shells.contains(&shells) {
                return seen < MOST_PAIRS;
            }
            let second = part.triangle(g);
            let place =
                if same_shell { crossing(first, second, abs_tol) } else { touch(first, second, abs_tol) };
            if let Some(place) = place {
                pairs.push(Pair { facets: [f, g], same_shell, place });
                if !same_shell {
                    seen_shells.extend([shells, [shells[1], shells[0]]]);
                }
            }
            pairs.len() < MOST_FOUND && seen < MOST_PAIRS
        });
        if MOST_FOUND <= pairs.len() || MOST_PAIRS <= seen {
            break;
        }
    }
    Found { cut_short: MOST_PAIRS <= seen, pairs }
}

/// Where two facets pass through each other or share an area.
fn crossing(first: &Triangle, second: &Triangle, abs_tol: f64) -> Option<Vec3> {
    match intersect::triangles(first, second, abs_tol) {
        Meeting::Apart => None,
        Meeting::Crossing([p, q]) => Some((p + q) * 0.5),
        Meeting::Coplanar { middle, .. } => Some(middle),
    }
}

/// Where two facets touch.
fn touch(first: &Triangle, second: &Triangle, abs_tol: f64) -> Option<Vec3> {
    let closest = distance::triangles(first, second);
    (closest.distance_sq <= abs_tol * abs_tol).then_some(closest.on_first)
}

/// The first few as findings, and one that counts the rest.
fn listed(
    pairs: &[Pair],
    severity: Severity,
    code: &'static str,
    text: impl Fn(&Pair) -> String,
) -> Vec<Finding> {
    let finding = |text: String, place: Option<Vec3>| Finding { severity, code, text, place };
    let mut findings: Vec<Finding> =
        pairs.iter().take(MOST_LISTED).map(|p| finding(text(p), Some(p.place))).collect();
    if let Some(rest) = pairs.len().checked_sub(MOST_LISTED).filter(|rest| 0 < *rest) {
        let more = if MOST_FOUND <= pairs.len() { " or more" } else { "" };
        findings.push(finding(format!("and {rest}{more} more places of this kind"), None));
    }
    findings
}
