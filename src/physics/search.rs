//! The highest place of a fitted field, and how far to trust it.

use crate::base::Vec3;
use crate::geom::Triangle;
use crate::mesh::Spot;
use crate::panel::Panels;
use crate::physics::patch;
use crate::physics::patch::Cell;
use crate::physics::patch::Fit;
use crate::physics::patch::Form;
use crate::physics::patch::Patch;
use crate::physics::patch::Recipe;
use crate::physics::regions;
use nalgebra::Matrix2;
use nalgebra::Vector2;

/// The fit that gives the value.
///
/// Error at the known place, 1,280 to 2,560 panels, regular and jittered: see the table in `tests/it/maxima.rs`.
/// Over gaps of 0.1 and 0.2 radii `1/field` as a quadratic gives the same value from 12 to 36 panels, the
/// field itself as a quadratic loses 5 % over that range.
const MAIN: Recipe = Recipe { count: 20, order: 2, form: Form::Inverse(1.0) };

/// Fits whose differences from it enter the bar: another form, fewer panels, more panels.
const CONTROLS: [Recipe; 3] =
    [Recipe { form: Form::Plain, ..MAIN }, Recipe { count: 12, ..MAIN }, Recipe { count: 32, ..MAIN }];

/// Reach of the search about the middle of a patch, in patch radii [1].
const REACH: f64 = 0.5;

/// Distance from the middle at which the search starts anew there, in patch radii [1].
const RENEW: f64 = 0.15;

/// Times that the search starts anew.
const TRIES: usize = 6;

/// A fitted maximum.
#[derive(Clone, Debug)]
pub(super) struct Top {
    /// Highest fitted value [V/m].
    pub(super) value: f64,
    /// What differences of fits and scatter leave open [V/m].
    pub(super) doubt: f64,
    /// Place and normal.
    pub(super) spot: Spot,
    /// Principal curvatures there [1/m].
    pub(super) curvature: [f64; 2],
    /// Panel under the place.
    pub(super) panel: usize,
    /// Mean area of the panels about it [m²].
    pub(super) area: f64,
    /// Where the panels were taken from.
    pub(super) patch: Patch,
    /// The fit, if the panels determine one.
    pub(super) fit: Option<Fit>,
}

impl Top {
    /// Whether a place lies in the inner part of the patch.
    pub(super) fn holds(&self, x: &Vec3) -> bool {
        let radius = self.fit.as_ref().map_or(0.0, |fit| fit.radius);
        self.patch.frame.distance(x) <= REACH * radius
    }
}

/// The highest fitted value that a search from cell `start` reaches.
pub(super) fn climb(panels: &Panels, cells: &[Cell], field: &[f64], start: usize) -> Top {
    let mut here = Here {
        cell: start,
        w: [1.0 / 3.0; 3],
        spot: Spot { point: cells[start].middle, normal: cells[start].normal },
    };
    let mut best: Option<Top> = None;
    for _ in 0..TRIES {
        let patch = Patch::new(cells, [here.spot.point, here.spot.normal], regions::PATCH);
        let Some(fit) = main_fit(cells, &patch, field) else { break };
        let (value, x) = fit.highest(REACH);
        let moved = x.norm();
        here = onto(panels, cells, &patch, &x).unwrap_or(here);
        let found = top(panels, cells, field, &here, (value, x, &patch, fit.clone()));
        let settled = moved <= RENEW * fit.radius;
        // Where the search goes in a circle the surest of its places counts.
        let better = best.as_ref().is_none_or(|best| best.value - best.doubt < found.value - found.doubt);
        if better || settled {
            best = Some(found);
        }
        if settled {
            break;
        }
    }
    best.unwrap_or_else(|| alone(panels, cells, field, &here))
}

/// The main fit, or the plain one where the field varies too much for it.
fn main_fit(cells: &[Cell], patch: &Patch, field: &[f64]) -> Option<Fit> {
    patch::fit(cells, patch, field, MAIN).or_else(|| patch::fit(cells, patch, field, CONTROLS[0]))
}

/// A place on the surface.
struct Here {
    cell: usize,
    w: [f64; 3],
    spot: Spot,
}

fn top(
    panels: &Panels,
    cells: &[Cell],
    field: &[f64],
    here: &Here,
    (value, x, patch, fit): (f64, Vector2<f64>, &Patch, Fit),
) -> Top {
    let mut doubt = 0.0_f64;
    for control in CONTROLS {
        // A wider control is wider than what the main fit had to take.
        let count =
            if MAIN.count < control.count { control.count.max(fit.count * 8 / 5) } else { control.count };
        match patch::fit(cells, patch, field, Recipe { count, ..control }) {
            Some(other) => doubt = doubt.max((other.value(&x) - value).abs()),
            None => doubt = doubt.max(2.0 * fit.misfit),
        }
    }
    // A value over all panels extrapolates: the excess counts in full.
    let excess = (value - fit.range[0]).max(0.0);
    Top {
        value,
        doubt: DIFFERENCES * doubt.max(excess) + SCATTERS * fit.scatter(&x),
        spot: here.spot,
        curvature: panels.curvatures(cells[here.cell].panel, here.w),
        panel: cells[here.cell].panel,
        area: mean_area(cells, patch),
        patch: patch.clone(),
        fit: Some(fit),
    }
}

/// Mean area of the panels nearest to the middle of a patch [m²].
fn mean_area(cells: &[Cell], patch: &Patch) -> f64 {
    let near = &patch.near[..INNER.min(patch.near.len())];
    near.iter().map(|(_, k)| cells[*k].area).sum::<f64>() / near.len().max(1) as f64
}

/// Panels about the place whose size counts as that of the patch.
const INNER: usize = 12;

/// Times that the largest difference of fits enters the doubt [1].
///
/// Between spheres 0.1 to 1 radii apart, at demands of 2 and 0.5 %, the bars with one difference were 1.1 to
/// 3.6 times the error; at a gap of 0.05 radii to a sphere of a fifth 0.9 times.
const DIFFERENCES: f64 = 1.5;

/// Standard errors of the fit that enter the doubt [1].
const SCATTERS: f64 = 1.5;

/// Where panels determine no fit: the highest of them, in doubt by their range.
fn alone(panels: &Panels, cells: &[Cell], field: &[f64], here: &Here) -> Top {
    let patch = Patch::new(cells, [here.spot.point, here.spot.normal], patch_of_few(cells));
    let values = || patch.near.iter().map(|(_, k)| field[cells[*k].panel] * cells[*k].ratio);
    let (hi, lo) = (values().fold(0.0, f64::max), values().fold(f64::INFINITY, f64::min));
    Top {
        value: hi,
        doubt: if lo <= hi { hi - lo } else { hi },
        spot: here.spot,
        curvature: panels.curvatures(cells[here.cell].panel, here.w),
        panel: cells[here.cell].panel,
        area: mean_area(cells, &patch),
        patch,
        fit: None,
    }
}

/// Panels about a place without a fit.
fn patch_of_few(cells: &[Cell]) -> usize {
    cells.len().min(8)
}

/// The place of the surface at coordinates `x` of a patch: on the panel that holds it, by steps of Newton.
fn onto(panels: &Panels, cells: &[Cell], patch: &Patch, x: &Vector2<f64>) -> Option<Here> {
    let mut best: Option<(f64, Here)> = None;
    for (_, k) in &patch.near {
        let p = cells[*k].panel;
        let at = |w: [f64; 3]| patch.frame.coordinates(&panels.spot(p, w).point);
        let [a, b, c] = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]].map(at);
        let Some(inverse) = Matrix2::from_columns(&[b - a, c - a]).try_inverse() else { continue };
        let mut w = [1.0 / 3.0; 3];
        for _ in 0..4 {
            let step = inverse * (x - at(w));
            let (v, u) = (w[1] + step.x, w[2] + step.y);
            w = inside([1.0 - v - u, v, u]);
        }
        let off = (x - at(w)).norm();
        if best.as_ref().is_none_or(|(least, _)| off < *least) {
            best = Some((off, Here { cell: *k, w, spot: panels.spot(p, w) }));
        }
    }
    best.map(|(_, here)| here)
}

/// The nearest coordinates that lie on the panel.
fn inside(w: [f64; 3]) -> [f64; 3] {
    let held = w.map(|w| w.clamp(0.0, 1.0));
    let sum: f64 = held.iter().sum();
    if 0.0 < sum { held.map(|w| w / sum) } else { [1.0 / 3.0; 3] }
}

/// How much the fitted field changes along each edge of a panel of the patch [V/m]: its difference and
/// twice what its middle lies off the mean.
pub(super) fn changes(fit: &Fit, patch: &Patch, tri: &Triangle) -> [f64; 3] {
    let at = |x: &Vec3| patch.frame.coordinates(x);
    [0, 1, 2].map(|k| {
        let (a, b) = (tri.corners[k], tri.corners[(k + 1) % 3]);
        let [u, m, v] = [a, (a + b) * 0.5, b].map(|x| fit.value(&at(&x)));
        let change = (u - v).abs() + 2.0 * (u + v - 2.0 * m).abs();
        if change.is_finite() { change } else { 0.0 }
    })
}
