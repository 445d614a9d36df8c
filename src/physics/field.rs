//! Field on the surface: panel values, and the maxima of each body.

use crate::base::Vec3;
use crate::base::threads;
use crate::geom::Triangle;
use crate::kernel::triangle;
use crate::operator::Sources;
use crate::panel::Panels;
use crate::physics::edges;
use crate::physics::gap;
use crate::physics::regions;
use crate::physics::regions::Ground;
use crate::physics::regions::Smoothed;
use crate::physics::search;
use crate::physics::search::Top;
use crate::physics::solved::Solved;
use crate::physics::solved::unit_weight;
use std::f64::consts::PI;

/// What kind of place a maximum is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// Smooth surface.
    Smooth,
    /// Unbounded at an edge or rim.
    Edge,
}

/// The highest field of one body at given row potentials.
#[derive(Clone, Debug)]
pub struct Peak {
    /// Index of the body.
    pub body: usize,
    /// Kind of place.
    pub kind: Kind,
    /// Highest fitted value [V/m].
    pub field: f64,
    /// Its bar [V/m].
    pub bar: f64,
    /// Highest value of a panel, slivers together with their neighbours [V/m].
    pub raw: f64,
    /// Place of the fitted value; of the highest panel for [`Kind::Edge`] [m].
    pub at: Vec3,
    /// Principal curvatures of the surface there, positive where it bulges out [1/m].
    pub curvature: Option<[f64; 2]>,
    /// Area with more than 90 % and more than 80 % of the field; none for [`Kind::Edge`] [m²].
    pub area_above: Option<[f64; 2]>,
    /// The next separate maxima, highest first; none for [`Kind::Edge`].
    pub further: Vec<Further>,
    /// Part of the bar that the fit leaves open [V/m].
    pub local: f64,
    /// Part of the bar from the charges, which more panels mend [V/m].
    pub charges: f64,
    /// Part of the bar from the facets, which they do not [V/m].
    pub facets: f64,
    top: Top,
}

/// A maximum that is not the highest of its body.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Further {
    /// Fitted value [V/m].
    pub field: f64,
    /// Its bar [V/m].
    pub bar: f64,
    /// Its place [m].
    pub at: Vec3,
}

/// Normal field of each panel at row potentials `v`, outward positive; on a sheet the sum of both
/// sides [V/m].
pub fn normal_field(solved: &Solved, v: &[f64]) -> Vec<f64> {
    let n = solved.panels.len();
    let mut field = vec![0.0; n];
    for (volt, density) in v.iter().zip(&solved.charges.density) {
        field.iter_mut().zip(density).for_each(|(field, s)| *field += volt * s);
    }
    field
}

/// Magnitude of the field on the stronger side of each panel at row potentials `v` [V/m].
///
/// A solid has one side.  On a sheet the sum `s` of both sides is shared as `s/2 ± E_n`, with `E_n` the
/// normal field of all other charge, which costs one evaluation a panel.
fn magnitude(solved: &Solved, sources: &Sources, v: &[f64]) -> Vec<f64> {
    let field = normal_field(solved, v);
    let bodies = &solved.panels.assembly.bodies;
    threads::map(field.len(), |p| {
        if !bodies[solved.panels.body[p] as usize].surface.sheet {
            return field[p].abs();
        }
        let tri = &solved.panels.triangles[p];
        // The panel's own normal field is ±s/2, in the first term; the height of its centroid over its
        // own plane is only rounding.
        let own = triangle::gradient(tri, &tri.centroid()) * field[p];
        let gradient = sources.gradient(&tri.centroid(), &field) - own;
        0.5 * field[p].abs() + (gradient.dot(&tri.normal()) / (4.0 * PI)).abs()
    })
}

/// The bodies of a round, ready for the maxima of any voltage case.
#[derive(Clone, Debug)]
pub struct Survey {
    grounds: Vec<(usize, Ground)>,
}

/// The survey of every body that has panels.
pub fn survey(panels: &Panels) -> Survey {
    survey_of(panels, |_| true)
}

/// The survey of the solids without unbounded edges.
pub fn survey_smooth(panels: &Panels) -> Survey {
    survey_of(panels, |body| !panels.assembly.bodies[body].surface.sheet && !has_unbounded_edge(panels, body))
}

fn survey_of(panels: &Panels, wanted: impl Fn(usize) -> bool) -> Survey {
    let mut by_body: Vec<Vec<usize>> = vec![Vec::new(); panels.assembly.bodies.len()];
    (0..panels.len()).for_each(|p| by_body[panels.body[p] as usize].push(p));
    let bodies = by_body.iter().enumerate().filter(|(body, held)| !held.is_empty() && wanted(*body));
    Survey { grounds: bodies.map(|(body, held)| (body, regions::ground(panels, held))).collect() }
}

/// The highest field of every body that has panels, at row potentials `v`.
///
/// On smooth bodies the value is the highest of a fit over the nearest panels, on the rebuilt surface; its
/// bar holds the differences of several fits, the scatter about them, the bar of the charges in this state and
/// what the facets leave open.  A body with a convex crease or a rim has no highest value: kind [`Kind::Edge`];
/// the fitted value then speaks of places off the edges and is a lower bound.
pub fn peaks(solved: &Solved, sources: &Sources, v: &[f64]) -> Vec<Peak> {
    surveyed_peaks(&survey(&solved.panels), solved, sources, v)
}

/// The same, with the survey at hand.
pub fn surveyed_peaks(survey: &Survey, solved: &Solved, sources: &Sources, v: &[f64]) -> Vec<Peak> {
    peaks_at(survey, solved, &magnitude(solved, sources, v), v)
}

/// The same for solids only, which need no sources.
pub fn solid_peaks(survey: &Survey, solved: &Solved, v: &[f64]) -> Vec<Peak> {
    let strength: Vec<f64> = normal_field(solved, v).iter().map(|e| e.abs()).collect();
    peaks_at(survey, solved, &strength, v)
}

fn peaks_at(survey: &Survey, solved: &Solved, strength: &[f64], v: &[f64]) -> Vec<Peak> {
    let peak = |(body, ground): &(usize, Ground)| peak(solved, *body, ground, strength, v);
    survey.grounds.iter().map(peak).collect()
}

/// Further maxima of a body that are told: the highest, and only over [`WORTH`] of the first [1].
const FURTHER: usize = 5;
const WORTH: f64 = 0.3;

/// Panels of a maximum from which the search starts, and their least smoothed value over the highest [1].
const STARTS: usize = 4;
const NEAR_TOP: f64 = 0.95;

/// Fitted value over the highest panel value from which the fit is not believed [1].
const BEYOND: f64 = 1.1;

fn peak(solved: &Solved, body: usize, ground: &Ground, strength: &[f64], v: &[f64]) -> Peak {
    let panels = &solved.panels;
    let smoothed = ground.smoothed(strength);
    let sharp = has_unbounded_edge(panels, body);
    let groups = ground.maxima(&smoothed);
    let told = if sharp { 1 } else { 1 + FURTHER };
    let worth = WORTH * groups.first().map_or(0.0, |held| smoothed.means[held[0]]);
    let groups: Vec<&Vec<usize>> =
        groups.iter().filter(|held| worth <= smoothed.means[held[0]]).take(told).collect();
    let mut tops = threads::map(groups.len(), |g| highest(panels, ground, (&smoothed, strength), groups[g]));
    tops.sort_by(|(a, _), (b, _)| b.value.total_cmp(&a.value));
    let mut tops = tops.into_iter();
    let (mut top, mut higher) =
        tops.next().unwrap_or_else(|| (search::climb(panels, &ground.cells, strength, 0), 0.0));
    let raw = ground.raw(strength);
    // A fit far above every panel is beyond what they tell: the panel value stands, the excess is doubt.
    if BEYOND * raw < top.value {
        top.doubt = top.doubt.max(top.value - raw);
        higher = higher.min(top.value);
        top.value = raw;
    }
    let [charges, drawn] = charge_shares(solved, panels.row(ground.cells[0].panel), v);
    let facets = |top: &Top| top.value * (drawn + facets_share(solved, top));
    let bar = |top: &Top, higher: f64| top.doubt.max(higher - top.value) + top.value * charges + facets(top);
    let further =
        |(top, higher): (Top, f64)| Further { field: top.value, bar: bar(&top, higher), at: top.spot.point };
    let highest_panel = || {
        let all = ground.cells.iter().map(|cell| cell.panel);
        let best = all.reduce(|best, p| if strength[best] < strength[p] { p } else { best });
        panels.triangles[best.unwrap_or(top.panel)].centroid()
    };
    Peak {
        body,
        kind: if sharp { Kind::Edge } else { Kind::Smooth },
        field: top.value,
        bar: bar(&top, higher),
        raw,
        at: if sharp { highest_panel() } else { top.spot.point },
        curvature: (!sharp).then_some(top.curvature),
        area_above: (!sharp).then(|| [0.9, 0.8].map(|share| ground.area_above(&smoothed, share * top.value))),
        further: tops.map(further).collect(),
        local: top.doubt.max(higher - top.value),
        charges: top.value * charges,
        facets: facets(&top),
        top,
    }
}

/// The surest high place of a group of cells, and the highest value that any search found [V/m].
fn highest(
    panels: &Panels,
    ground: &Ground,
    (smoothed, strength): (&Smoothed, &[f64]),
    group: &[usize],
) -> (Top, f64) {
    let least = NEAR_TOP * smoothed.means[group[0]];
    let mut found: Vec<Top> = Vec::new();
    for k in group.iter().take_while(|k| least <= smoothed.means[**k]) {
        let cell = &ground.cells[*k];
        // Near a place that was found the search would end there again.
        let known = found.iter().any(|top| top.holds(&cell.middle));
        if !known {
            found.push(search::climb(panels, &ground.cells, strength, *k));
        }
        if STARTS <= found.len() {
            break;
        }
    }
    let top = found.iter().fold(0.0, |high: f64, top| high.max(top.value));
    let surest = |a: Top, b: Top| if a.value - a.doubt < b.value - b.doubt { b } else { a };
    let best = found.into_iter().reduce(surest);
    let best = best.unwrap_or_else(|| search::climb(panels, &ground.cells, strength, group[0]));
    (best, top)
}

/// Bar of the charge of `row` at potentials `v`, of the energy where a body has no row, over the sum of the
/// magnitudes that make it up: what more panels mend, and the rest [1].
fn charge_shares(solved: &Solved, row: Option<usize>, v: &[f64]) -> [f64; 2] {
    let n = solved.n_rows();
    let u = row.map_or_else(|| v.to_vec(), |row| unit_weight(row, n));
    let term = |i: usize, j: usize| (u[i] * solved.matrix[i][j] * v[j]).abs();
    let size: f64 = (0..n).flat_map(|i| (0..n).map(move |j| (i, j))).map(|(i, j)| term(i, j)).sum();
    if size <= 0.0 {
        return [0.0; 2];
    }
    let bar = solved.bar(&u, v);
    [bar.discretisation / size, (bar.faceting + bar.solver) / size]
}

/// Share of the rise of the surface over its facets that is in doubt [1], as for capacitances
/// (`faceting::SHARE`).
const OFFSET_SHARE: f64 = 0.1;

/// What the facets leave open: the rise in doubt against radii of curvature and against the gap [1].
fn facets_share(solved: &Solved, top: &Top) -> f64 {
    let panels = &solved.panels;
    let offset = panels.offset[top.panel].abs();
    if offset <= 0.0 {
        return 0.0;
    }
    let gap = gap::gap_of(panels, top.panel).max(f64::MIN_POSITIVE);
    let [k1, k2] = top.curvature.map(f64::abs);
    (OFFSET_SHARE * offset * (k1 + k2 + 1.0 / gap)).min(1.0)
}

/// Whether the body has an exposed convex crease or a rim.
fn has_unbounded_edge(panels: &Panels, body: usize) -> bool {
    let assembly = &panels.assembly;
    let exposed = edges::exposed_facets(assembly, body);
    assembly.bodies[body].surface.creases.iter().any(|crease| {
        edges::sharp_angle(&assembly.bodies[body].surface, crease) < edges::SEAM
            && crease.facets.iter().any(|f| exposed[*f as usize])
    })
}

impl Peak {
    /// Area of the panels from which the value comes, in the mean [m²].
    pub fn panel_area(&self) -> f64 {
        self.top.area
    }

    /// Distance of panel `p` of the same body from the place, over the radius of the patch [1]; none on another body
    /// or another side.
    pub fn distance(&self, panels: &Panels, p: usize) -> Option<f64> {
        let same = panels.body[p] as usize == self.body
            && 0.0 < panels.triangles[p].normal().dot(&self.top.spot.normal);
        let patch = &self.top.patch;
        let radius = self.top.fit.as_ref().map_or_else(|| patch.radius(patch.near.len()), |fit| fit.radius);
        same.then(|| patch.frame.distance(&panels.triangles[p].centroid()) / radius)
    }

    /// How much the fitted field changes along each edge of a panel near the place [V/m].
    pub fn changes(&self, tri: &Triangle) -> [f64; 3] {
        let fit = self.top.fit.as_ref();
        fit.map_or([0.0; 3], |fit| search::changes(fit, &self.top.patch, tri))
    }
}
