//! Refinement that aims at the maxima of smooth bodies.
//!
//! A maximum is uncertain by the fit on its patch, which smaller panels there mend, and by the charges, which
//! the cuts for the capacitance mend.  The other way, an adjoint solution of the same matrix for the mean of
//! the field over a Gaussian of 0.1, 0.2, 0.4 widths `√(2 gap R)` and residual gradient times residual gradient as
//! the indicator, was measured on two balls 1, 0.2 and 0.1 radii apart: 70 to 99 % of it lies on the panels of the
//! patch, so it marks the same ones; it moves the mean by 0.002 to 0.15 %, while the fitted maximum was off by
//! 0.3 to 2.1 %, which is variation over the patch.  So panels are cut until fits over different patches agree.

use super::split;
use crate::geom::distance;
use crate::panel::Panels;
use crate::physics::capacitance::Matrix;
use crate::physics::field;
use crate::physics::field::Kind;
use crate::physics::field::Peak;
use crate::physics::solved::Solved;

/// What is asked of maxima.
#[derive(Clone, Copy)]
pub struct Aim<'a> {
    /// Relative bar of the maximum of every smooth body in every voltage case [1]; on a body whose maximum is under
    /// [`FLOOR`] of the highest of the case absolute at that floor.
    pub max_field: f64,
    /// Row potentials of every voltage case that follow from a matrix [V].
    pub potentials: &'a (dyn Fn(&Matrix) -> Vec<Vec<f64>> + Sync),
}

/// The maximum with the largest bar.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct WidestPeak {
    /// Index of the body.
    pub body: usize,
    /// Index of the voltage case.
    pub case: usize,
    /// Bar over what it relates to [1].
    pub bar: f64,
}

/// Share of the highest field of a case under which a body is held to an absolute bar [1].
const FLOOR: f64 = 0.05;

/// Share of the demand over which a part of a bar is worked on [1].
const PART: f64 = 0.5;

/// Least and largest factor on the area of panels at a maximum in a round [1].
const FACTORS: [f64; 2] = [0.12, 0.7];

/// Order with which the doubt of a fit falls with the area of panels [1].
///
/// A quadratic misses the third order in their size, 1.5 in their area; scatter falls more slowly.
const AREA_ORDER: f64 = 1.2;

/// Halvings of a panel in a round, at most.
const HALVINGS: usize = 3;

/// Panels added for maxima in a round, over all panels [1], and as a count that is always allowed.
const GROWTH: f64 = 0.3;
const FREE_GROWTH: usize = 250;

/// Area over the wanted one above which a panel is cut [1]: half of it is then nearer.
const OVER: f64 = 1.4;

/// Largest height of the surface over a panel near a maximum, in roots of the area wanted there [1].
///
/// Panels of different height stand as steps beside each other, and small panels see the edge of a step as
/// one of the body: on fillets between flats the field rose without end as they were cut alone.
const STEP: f64 = 0.03;

/// The same in the ring from one to [`RING`] patch radii.
const OVER_RING: f64 = 6.0;
const RING: f64 = 2.2;

/// The maxima of a round, and the widest bar among them.
pub(super) struct Sight {
    pub(super) widest: Option<WidestPeak>,
    /// Maxima over the demand, with their bars over what they relate to [1] and that scale [V/m].
    unmet: Vec<(Peak, f64)>,
}

/// The maxima of all smooth bodies in all voltage cases.
pub(super) fn sight(solved: &Solved, aim: &Aim) -> Sight {
    let survey = field::survey_smooth(&solved.panels);
    let mut sight = Sight { widest: None, unmet: Vec::new() };
    for (case, v) in (aim.potentials)(&solved.matrix).iter().enumerate() {
        let peaks = field::solid_peaks(&survey, solved, v);
        let high = peaks.iter().fold(0.0, |high: f64, peak| high.max(peak.field));
        for peak in peaks.into_iter().filter(|peak| peak.kind == Kind::Smooth) {
            let scale = peak.field.max(FLOOR * high);
            let bar = if 0.0 < scale { peak.bar / scale } else { 0.0 };
            let bar = if bar.is_nan() { f64::INFINITY } else { bar };
            if sight.widest.is_none_or(|widest| widest.bar < bar) {
                sight.widest = Some(WidestPeak { body: peak.body, case, bar });
            }
            if aim.max_field < bar {
                sight.unmet.push((peak, scale));
            }
        }
    }
    sight
}

impl Sight {
    /// Whether charges are to be mended before the maxima can meet their demand.
    pub(super) fn wants_charges(&self, aim: &Aim) -> bool {
        self.unmet.iter().any(|(peak, scale)| {
            PART * aim.max_field * scale < peak.charges && 0.5 * local(peak) < peak.charges
        })
    }

    /// `panels`, cut about the maxima that miss their demand, at most `room` more.
    pub(super) fn refined(&self, mut panels: Panels, aim: &Aim, room: usize) -> Panels {
        let wanted: Vec<(&Peak, f64)> = self
            .unmet
            .iter()
            .filter(|(peak, scale)| PART * aim.max_field * scale < local(peak) || peak.charges < local(peak))
            .map(|(peak, scale)| {
                let ratio = PART * aim.max_field * scale / local(peak);
                let factor = ratio.powf(1.0 / AREA_ORDER).clamp(FACTORS[0], FACTORS[1]);
                (peak, peak.panel_area() * factor)
            })
            .collect();
        let mut left = room.min(FREE_GROWTH.max((GROWTH * panels.len() as f64) as usize));
        for _ in 0..HALVINGS {
            let mut cuts = cuts(&panels, &wanted);
            cuts.truncate(left);
            if cuts.is_empty() {
                break;
            }
            left -= cuts.len();
            let mut cuts: Vec<(usize, usize)> = cuts.into_iter().map(|(p, edge, _)| (p, edge)).collect();
            cuts.sort_unstable();
            panels = split::bisect(&panels, &cuts);
        }
        panels
    }
}

/// What smaller panels at a maximum mend: the doubt of the fit, and what they do not follow of the surface [V/m].
fn local(peak: &Peak) -> f64 {
    peak.local + peak.facets
}

/// Panels that are too large for the maxima, with the edge to cut and the excess [1], most excessive first.
fn cuts(panels: &Panels, wanted: &[(&Peak, f64)]) -> Vec<(usize, usize, f64)> {
    let of_panel = |p: usize| {
        let one = |(peak, area): &(&Peak, f64)| excess(panels, peak, *area, p);
        wanted.iter().filter_map(one).reduce(|a, b| if a.1 < b.1 { b } else { a }).map(|(e, x)| (p, e, x))
    };
    let mut cuts: Vec<(usize, usize, f64)> = (0..panels.len()).filter_map(of_panel).collect();
    cuts.sort_by(|a, b| b.2.total_cmp(&a.2).then(a.0.cmp(&b.0)));
    cuts
}

/// The edge to cut and by how much the panel is too large, if it is.
fn excess(panels: &Panels, peak: &Peak, area: f64, p: usize) -> Option<(usize, f64)> {
    let tri = &panels.triangles[p];
    // No panel longer than its distance from the maximum, or than some sizes of those there: a needle that ends
    // beside it, or the other side of a gap.
    let away = (distance::point_of_triangle(tri, &peak.at) - peak.at).norm();
    let long = tri.longest_edge() / away.max(OPPOSITE * area.sqrt());
    if 1.0 < long {
        return Some((longest(panels, p), long));
    }
    let d = peak.distance(panels, p).filter(|d| *d <= RING)?;
    let step = panels.offset[p].abs() / (STEP * area.sqrt());
    let over = tri.area() / (area * if d <= 1.0 { OVER } else { OVER_RING });
    if over < step {
        return (1.0 < step).then(|| (split::most_bent(panels, p).0, step));
    }
    (1.0 < over).then(|| (steepest(peak, panels, p), over))
}

/// Length of panels across a gap in roots of the area wanted at the maximum [1].
const OPPOSITE: f64 = 4.0;

/// Share of the length of an edge in the choice of the one to cut, beside the change of the field along it [1].
const LENGTH_SHARE: f64 = 0.3;

/// The edge along which the field changes most.
fn steepest(peak: &Peak, panels: &Panels, p: usize) -> usize {
    let tri = &panels.triangles[p];
    let changes = peak.changes(tri);
    let most = changes.iter().fold(f64::MIN_POSITIVE, |most, c| most.max(*c));
    let longest = tri.longest_edge();
    let key = |k: usize| {
        let length = (tri.corners[(k + 1) % 3] - tri.corners[k]).norm();
        changes[k] / most + LENGTH_SHARE * length / longest
    };
    (1..3).fold(0, |best, k| if key(best) < key(k) { k } else { best })
}

fn longest(panels: &Panels, p: usize) -> usize {
    let corners = &panels.triangles[p].corners;
    let length = |k: usize| (corners[(k + 1) % 3] - corners[k]).norm_squared();
    (1..3).fold(0, |best, k| if length(best) < length(k) { k } else { best })
}
