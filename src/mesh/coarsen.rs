//! From the many facets of recognised forms to few charts: the answer must not depend on how finely a
//! flat or a cylinder was drawn.

use crate::base::Vec3;
use crate::geom::Triangle;
use crate::mesh::Chart;
use crate::mesh::Surface;
use crate::mesh::borders::Curve;
use crate::mesh::form::Form;
use std::collections::BTreeMap;
use std::f64::consts::PI;

/// Most that the surface may turn between two corners of a chart [rad]: 50°.
const MOST_TURN: f64 = 0.87;

/// Most that a chart may depart from its form, in least radii of curvature there [1]: beyond, places of
/// the chart and of the form no longer belong together one to one.
const MOST_DEPARTURE: f64 = 0.25;

/// Least cosine between the normal of a chart and that of the form at its corners [1].
const FACING: f64 = 0.6;

/// Least height over longest edge that a chart is given on a curved form, unless those before were worse [1].
const LEAST_QUALITY: f64 = 0.1;

/// The same on a plane [1]: what is thin there is turned over afterwards.
const LEAST_QUALITY_FLAT: f64 = 0.01;

/// Share of its flat area that either half of a chart must keep when its side becomes an arc [1].
const LEAST_HALF: f64 = 0.3;

/// Most passes over all corners.
const MOST_PASSES: usize = 60;

/// Charts that stand for the facets of which `whole` is true: those on recognised forms are merged as
/// far as the form allows, the others stand for themselves.
///
/// Corners are taken out one after another by drawing an edge together (Hoppe et al., Mesh optimization,
/// SIGGRAPH 1993), those on a line or arc between two patches only along it, and edges are
/// turned over where that is Delaunay's choice (Lawson 1977), which leaves the constrained Delaunay
/// triangulation of each flat.  Corners stay where they were drawn.
pub fn charts(surface: &Surface, whole: &[bool]) -> Vec<Chart> {
    let mut net = Net::new(surface, whole);
    for _ in 0..MOST_PASSES {
        if !net.thin_out() {
            break;
        }
    }
    for _ in 0..MOST_PASSES {
        if !net.turn_over() {
            break;
        }
    }
    net.charts(whole)
}

/// What may become of a corner.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
enum Freedom {
    /// Stays.
    Fixed,
    /// May go to any neighbour.
    Inside,
    /// May go along its curve.
    Along(u32),
}

struct Net<'a> {
    surface: &'a Surface,
    facets: Vec<[u32; 3]>,
    alive: Vec<bool>,
    /// Living facets at each corner.
    at: Vec<Vec<u32>>,
    freedom: Vec<Freedom>,
    /// Curve of each border edge, ends in rising order.
    border: BTreeMap<[u32; 2], u32>,
}

fn key(a: u32, b: u32) -> [u32; 2] {
    [a.min(b), a.max(b)]
}

impl<'a> Net<'a> {
    fn new(surface: &'a Surface, whole: &[bool]) -> Self {
        let patches = &surface.patches;
        let facets = surface.welded.facets.clone();
        let formed = |f: usize| patches.forms[patches.of_facet[f] as usize] != Form::Free;
        let alive: Vec<bool> = (0..facets.len()).map(|f| whole[f] && formed(f)).collect();
        let mut at = vec![Vec::new(); surface.welded.points.len()];
        let mut fixed = vec![false; at.len()];
        for (f, corners) in facets.iter().enumerate() {
            for c in corners {
                if alive[f] {
                    at[*c as usize].push(f as u32);
                } else {
                    fixed[*c as usize] = true;
                }
            }
        }
        let mut border = BTreeMap::new();
        let mut curves: Vec<Vec<u32>> = vec![Vec::new(); at.len()];
        for edge in &patches.borders {
            if border.insert(key(edge.ends[0], edge.ends[1]), edge.curve).is_none() {
                edge.ends.iter().for_each(|k| curves[*k as usize].push(edge.curve));
            }
        }
        let freedom = (0..at.len())
            .map(|k| match curves[k][..] {
                _ if fixed[k] => Freedom::Fixed,
                [] => Freedom::Inside,
                [a, b] if a == b && patches.curves[a as usize] != Curve::Free => Freedom::Along(a),
                _ => Freedom::Fixed,
            })
            .collect();
        Net { surface, facets, alive, at, freedom, border }
    }

    fn form(&self, f: u32) -> &Form {
        let patches = &self.surface.patches;
        &patches.forms[patches.of_facet[f as usize] as usize]
    }

    fn point(&self, k: u32) -> Vec3 {
        self.surface.welded.points[k as usize]
    }

    /// Neighbours of corner `v` in rising order.
    fn neighbours(&self, v: u32) -> Vec<u32> {
        let mut found: Vec<u32> =
            self.at[v as usize].iter().flat_map(|f| self.facets[*f as usize]).filter(|k| *k != v).collect();
        found.sort_unstable();
        found.dedup();
        found
    }

    /// One pass over all corners; says whether any was taken out.
    fn thin_out(&mut self) -> bool {
        let mut locked = vec![false; self.at.len()];
        let mut done = false;
        for v in 0..self.at.len() as u32 {
            if locked[v as usize]
                || self.freedom[v as usize] == Freedom::Fixed
                || self.at[v as usize].is_empty()
            {
                continue;
            }
            let neighbours = self.neighbours(v);
            let Some(to) = self.best_target(v, &neighbours) else { continue };
            self.draw_together(v, to);
            neighbours.iter().for_each(|k| locked[*k as usize] = true);
            done = true;
        }
        done
    }

    /// The neighbour to which `v` can go with the best charts left.
    fn best_target(&self, v: u32, neighbours: &[u32]) -> Option<u32> {
        let before = self.at[v as usize].iter().map(|f| self.quality(&self.facets[*f as usize]));
        let before = before.fold(f64::INFINITY, f64::min);
        let mut best: Option<(f64, u32)> = None;
        for u in neighbours {
            if let Some(quality) = self.quality_after(v, *u, before)
                && best.is_none_or(|(most, _)| most < quality)
            {
                best = Some((quality, *u));
            }
        }
        best.map(|(_, u)| u)
    }

    /// Least quality of the charts at `v` once it is drawn to `u`; none where that is not allowed.
    fn quality_after(&self, v: u32, u: u32, before: f64) -> Option<f64> {
        let along = match self.freedom[v as usize] {
            Freedom::Fixed => return None,
            Freedom::Inside => None,
            Freedom::Along(curve) => {
                if self.border.get(&key(v, u)) != Some(&curve) {
                    return None;
                }
                Some(self.next_on_curve(v, u)?)
            }
        };
        let beside: Vec<u32> =
            self.at[v as usize].iter().copied().filter(|f| self.facets[*f as usize].contains(&u)).collect();
        let common = {
            let of_u = self.neighbours(u);
            self.neighbours(v).into_iter().filter(|k| of_u.binary_search(k).is_ok()).count()
        };
        // The link condition: else the surface would be pinched.
        if beside.is_empty() || common != beside.len() {
            return None;
        }
        // No two borders may fall on each other.
        let mut closing = beside.iter().flat_map(|f| self.facets[*f as usize]).filter(|k| *k != u && *k != v);
        if closing.any(|k| {
            self.border.contains_key(&key(v, k)) && (Some(k) != along || self.border.contains_key(&key(u, k)))
        }) {
            return None;
        }
        // Where the corner of an ear goes, the side behind it comes to lie on the curve.
        let behind =
            |f: &u32| along.is_some_and(|w| self.facets[*f as usize].contains(&w)) && !beside.contains(f);
        for f in self.at[u as usize].iter().filter(|f| behind(f)) {
            let corners = self.facets[*f as usize];
            if !self.is_sound(*f, &corners, self.arcs_moved(&corners, v, u, along)) {
                return None;
            }
        }
        let mut least = f64::INFINITY;
        for f in self.at[v as usize].iter().filter(|f| !beside.contains(f)) {
            let corners = self.facets[*f as usize].map(|k| if k == v { u } else { k });
            let arcs = self.arcs_moved(&corners, v, u, along);
            if !self.is_sound(*f, &corners, arcs) {
                return None;
            }
            let quality = self.quality(&corners);
            let floor =
                if matches!(self.form(*f), Form::Plane { .. }) { LEAST_QUALITY_FLAT } else { LEAST_QUALITY };
            if quality < floor.min(before) {
                return None;
            }
            least = least.min(quality);
        }
        Some(least)
    }

    /// The other neighbour of `v` on its curve.
    fn next_on_curve(&self, v: u32, u: u32) -> Option<u32> {
        self.neighbours(v).into_iter().find(|k| *k != u && self.border.contains_key(&key(v, *k)))
    }

    /// Curves of the sides of a chart after `v` went to `u`, where `along` is the next on the curve of `v`.
    fn arcs_moved(&self, corners: &[u32; 3], v: u32, u: u32, along: Option<u32>) -> [Option<u32>; 3] {
        [0, 1, 2].map(|k| {
            let (a, b) = (corners[k], corners[(k + 1) % 3]);
            let moved = along.filter(|w| key(a, b) == key(u, *w)).and_then(|w| self.border.get(&key(v, w)));
            moved.or_else(|| self.border.get(&key(a, b))).copied()
        })
    }

    fn curves_of(&self, corners: &[u32; 3]) -> [Option<u32>; 3] {
        [0, 1, 2].map(|k| self.border.get(&key(corners[k], corners[(k + 1) % 3])).copied())
    }

    fn quality(&self, corners: &[u32; 3]) -> f64 {
        let tri = Triangle::new(corners.map(|k| self.point(k)));
        let longest = tri.longest_edge();
        if 0.0 < longest { tri.cross().norm() / (longest * longest) } else { 0.0 }
    }

    fn chart(&self, f: u32, corners: &[u32; 3], curves: [Option<u32>; 3]) -> Chart {
        Chart::of_form(self.surface, f, corners.map(|k| self.point(k)), curves)
    }

    /// Whether the form over a chart with these corners is told one to one.
    fn is_sound(&self, f: u32, corners: &[u32; 3], curves: [Option<u32>; 3]) -> bool {
        let form = self.form(f);
        let chart = self.chart(f, corners, curves);
        let flat = chart.flat();
        let (n, area) = (flat.normal(), flat.area());
        let mut normals = [Vec3::zeros(); 3];
        let mut bend = 0.0_f64;
        for (normal, x) in normals.iter_mut().zip(&chart.corners) {
            let Some((_, found)) = form.nearest(x) else { return false };
            *normal = found;
            bend = form.curvatures(x).iter().fold(bend, |most, k| most.max(k.abs()));
            if normal.dot(&n) < FACING {
                return false;
            }
        }
        for k in 0..3 {
            // A hollow arc may leave no more than a cusp of the corner at its end.
            let angle = if chart.is_beside_arc(k) { chart.angle_at(self.surface, k, &n) } else { PI };
            if -MOST_OPEN < angle && angle < LEAST_ANGLE {
                return false;
            }
            let (a, b) = (k, (k + 1) % 3);
            if normals[a].dot(&normals[b]) < MOST_TURN.cos() {
                return false;
            }
            let mut w = [0.5; 3];
            w[(k + 2) % 3] = 0.0;
            let middle = chart.bowed(self.surface, w);
            if MOST_DEPARTURE < form.distance(&middle).abs() * bend {
                return false;
            }
            if curves[k].is_some() {
                if chart.turn_of_side(self.surface, k) > MOST_TURN {
                    return false;
                }
                let c = &chart.corners;
                let half = |p: Vec3, q: Vec3| 0.5 * (p - c[(k + 2) % 3]).cross(&(q - c[(k + 2) % 3])).dot(&n);
                if half(c[a], middle).min(half(middle, c[b])) < LEAST_HALF * 0.5 * area {
                    return false;
                }
            }
        }
        true
    }

    fn draw_together(&mut self, v: u32, u: u32) {
        if let Freedom::Along(curve) = self.freedom[v as usize]
            && let Some(w) = self.next_on_curve(v, u)
        {
            self.border.remove(&key(v, u));
            self.border.remove(&key(v, w));
            self.border.insert(key(u, w), curve);
        }
        for f in std::mem::take(&mut self.at[v as usize]) {
            let corners = self.facets[f as usize];
            if corners.contains(&u) {
                self.alive[f as usize] = false;
                for k in corners.iter().filter(|k| **k != v) {
                    self.at[*k as usize].retain(|g| *g != f);
                }
            } else {
                self.facets[f as usize] = corners.map(|k| if k == v { u } else { k });
                self.at[u as usize].push(f);
            }
        }
    }

    /// One pass of edges turned over; says whether any was.
    fn turn_over(&mut self) -> bool {
        let mut done = false;
        for f in 0..self.facets.len() as u32 {
            for k in 0..3 {
                if self.alive[f as usize] && self.turn_over_side(f, k) {
                    done = true;
                }
            }
        }
        done
    }

    fn turn_over_side(&mut self, f: u32, k: usize) -> bool {
        let corners = self.facets[f as usize];
        let (a, b, c) = (corners[k], corners[(k + 1) % 3], corners[(k + 2) % 3]);
        if self.border.contains_key(&key(a, b)) {
            return false;
        }
        let patch = self.surface.patches.of_facet[f as usize];
        let across =
            self.at[a as usize].iter().copied().filter(|g| *g != f && self.facets[*g as usize].contains(&b));
        let across: Vec<u32> = across.collect();
        let [g] = across[..] else { return false };
        if self.surface.patches.of_facet[g as usize] != patch {
            return false;
        }
        let Some(d) = self.facets[g as usize].into_iter().find(|k| *k != a && *k != b) else { return false };
        let angle = |tip: u32| {
            let (p, q) = (self.point(a) - self.point(tip), self.point(b) - self.point(tip));
            p.cross(&q).norm().atan2(p.dot(&q))
        };
        let joined = self.at[c as usize].iter().any(|h| self.facets[*h as usize].contains(&d));
        if angle(c) + angle(d) <= PI * (1.0 + 1e-9) || joined {
            return false;
        }
        let [first, second] = [[a, d, c], [d, b, c]];
        if !self.is_sound(f, &first, self.curves_of(&first))
            || !self.is_sound(g, &second, self.curves_of(&second))
        {
            return false;
        }
        self.facets[f as usize] = first;
        self.facets[g as usize] = second;
        self.at[b as usize].retain(|h| *h != f);
        self.at[a as usize].retain(|h| *h != g);
        self.at[d as usize].push(f);
        self.at[c as usize].push(g);
        true
    }

    fn charts(&self, whole: &[bool]) -> Vec<Chart> {
        let heights = heights(self.surface);
        let patches = &self.surface.patches;
        let mut found = Vec::new();
        for (f, corners) in self.facets.iter().enumerate() {
            let patch = patches.of_facet[f] as usize;
            if self.alive[f] {
                let chart = self.chart(f as u32, corners, self.curves_of(corners));
                opened(self.surface, Chart { drawn: heights[patch], ..chart }, &mut found);
            } else if whole[f] && !matches!(patches.forms[patch], Form::Plane { .. }) {
                let sides = self.curves_of(corners);
                found.push(Chart::of_facet(self.surface, f as u32).on(self.surface, sides));
            }
        }
        found
    }
}

/// Largest angle between the sides of a chart at a corner beside an arc [rad]: 140°.
///
/// Where a rim runs on smoothly through the corner of an ear, its two sides, bowed, make no corner at all,
/// and panels there come to nothing.
const MOST_OPEN: f64 = 2.44;

/// Least angle between the sides of a chart at a corner beside an arc [rad]: 14°.
const LEAST_ANGLE: f64 = 0.25;

/// Adds a chart, cut from its widest corner to the middle of the side across where arcs open that corner too far.
fn opened(surface: &Surface, chart: Chart, found: &mut Vec<Chart>) {
    let n = chart.flat().normal();
    let angle = |k: usize| if chart.is_beside_arc(k) { chart.angle_at(surface, k, &n).abs() } else { 0.0 };
    let angles = [0, 1, 2].map(angle);
    let widest = (1..3).fold(0, |best, k| if angles[best] < angles[k] { k } else { best });
    if angles[widest] <= MOST_OPEN {
        found.push(chart);
        return;
    }
    let (k, next, last) = (widest, (widest + 1) % 3, (widest + 2) % 3);
    let mut w = [0.5; 3];
    w[k] = 0.0;
    let middle = chart.spot(surface, w).point;
    let (curves, borders) = (&chart.curves, &chart.borders);
    let half = |corners: [Vec3; 3], curves: [Option<u32>; 3], borders: [bool; 3]| Chart {
        corners,
        curves,
        borders,
        ..chart
    };
    let c = &chart.corners;
    let first =
        half([c[k], c[next], middle], [curves[k], curves[next], None], [borders[k], borders[next], false]);
    let second = half(
        [c[k], middle, c[last]],
        [None, curves[next], curves[last]],
        [false, borders[next], borders[last]],
    );
    // Each cut halves an open corner or an arc, so this ends after a few.
    opened(surface, first, found);
    opened(surface, second, found);
}

/// Mean height of each recognised form over its facets [m].
fn heights(surface: &Surface) -> Vec<f64> {
    let patches = &surface.patches;
    let mut sums = vec![(0.0, 0.0); patches.forms.len()];
    for (f, patch) in patches.of_facet.iter().enumerate() {
        let form = &patches.forms[*patch as usize];
        if matches!(form, Form::Plane { .. } | Form::Free) {
            continue;
        }
        let tri = Triangle::new(surface.welded.facets[f].map(|k| surface.welded.points[k as usize]));
        let (n, area) = (tri.normal(), tri.area());
        // The rule of edge midpoints is exact for a quadratic.
        let height = |k: usize| {
            let x = (tri.corners[k] + tri.corners[(k + 1) % 3]) * 0.5;
            form.nearest(&x).map_or(0.0, |(y, _)| (y - x).dot(&n))
        };
        let (sum, total) = &mut sums[*patch as usize];
        *sum += area * (height(0) + height(1) + height(2)) / 3.0;
        *total += area;
    }
    sums.into_iter().map(|(sum, area)| if 0.0 < area { sum / area } else { 0.0 }).collect()
}
