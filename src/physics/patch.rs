//! Fits of the field over a patch of panels, on the rebuilt surface.

use crate::base::Vec3;
use crate::base::threads;
use crate::geom::Triangle;
use crate::kernel::rules;
use crate::panel::Panels;
use nalgebra::DMatrix;
use nalgebra::DVector;
use nalgebra::Matrix2;
use nalgebra::Vector2;

/// Cosine of the largest angle between normals of a patch and its middle [1]: 50°.
const SAME_SIDE: f64 = 0.64;

/// Panels whose shapes make the measure of a patch.
const SHAPES: usize = 8;

/// Squared distance over that of the last of them up to which more are taken [1].
const ABOUT: f64 = 1.5;

/// A panel of a body as a fit sees it.
#[derive(Clone, Debug)]
pub struct Cell {
    /// Index of the panel.
    pub panel: usize,
    /// Middle of the rebuilt surface over it [m].
    pub middle: Vec3,
    /// Unit normal there [1].
    pub normal: Vec3,
    /// Places of [`rules::SIX`] on the rebuilt surface [m].
    pub places: [Vec3; 6],
    /// Area of the rebuilt surface over it [m²].
    pub area: f64,
    /// Mean of `d dᵀ` over its corners about its middle, as (xx, yy, zz, xy, yz, zx) [m²].
    spread: [f64; 6],
    /// Area of the flat panel over that of the surface: the charge stays, the density does not [1].
    pub ratio: f64,
}

/// Cells of the panels `held`.
pub fn cells(panels: &Panels, held: &[usize]) -> Vec<Cell> {
    threads::map(held.len(), |k| cell(panels, held[k]))
}

fn cell(panels: &Panels, p: usize) -> Cell {
    let at = |w: [f64; 3]| panels.spot(p, w).point;
    let middle = panels.spot(p, [1.0 / 3.0; 3]);
    let corners = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]].map(at);
    let sides = [[0.5, 0.5, 0.0], [0.0, 0.5, 0.5], [0.5, 0.0, 0.5]].map(at);
    let ([a, b, c], [d, e, f]) = (corners, sides);
    let quarters = [[a, d, f], [d, b, e], [f, e, c], [d, e, f]];
    let four: f64 = quarters.iter().map(|q| Triangle::new(*q).area()).sum();
    // Chords of a quarter of the size miss a quarter of the rise: one step of Richardson.
    let area = four + (four - Triangle::new(corners).area()) / 3.0;
    let flat = panels.triangles[p].area();
    let ratio = flat / area;
    let sane = ratio.is_finite() && (0.5..2.0).contains(&ratio);
    let mut spread = [0.0; 6];
    for corner in &panels.triangles[p].corners {
        let d = corner - panels.triangles[p].centroid();
        let products = [d.x * d.x, d.y * d.y, d.z * d.z, d.x * d.y, d.y * d.z, d.z * d.x];
        spread.iter_mut().zip(products).for_each(|(s, d)| *s += d / 3.0);
    }
    Cell {
        panel: p,
        middle: middle.point,
        normal: middle.normal,
        places: rules::SIX.map(|(w, _)| at(w)),
        area: if sane { area } else { flat },
        spread,
        ratio: if sane { ratio } else { 1.0 },
    }
}

/// Tangent plane at a place of the surface, with the mean shape of its panels as the measure of length.
#[derive(Clone, Debug)]
pub struct Frame {
    x0: Vec3,
    e: Vec3,
    f: Vec3,
    n: Vec3,
    /// Inverse root of the mean second moment [1/m], and its inverse [m].
    scale: Matrix2<f64>,
    unscale: Matrix2<f64>,
}

impl Frame {
    /// At `x0` with normal `n`, measured by the nearest of `cells`.
    fn new(cells: &[Cell], [x0, n]: [Vec3; 2]) -> Self {
        let (e, f) = across(&n);
        let beside = cells.iter().enumerate().filter(|(_, cell)| SAME_SIDE < cell.normal.dot(&n));
        let all: Vec<(f64, usize)> = beside.map(|(k, cell)| ((cell.middle - x0).norm_squared(), k)).collect();
        // With all that are about as near: half a fan of panels round a pole has no mean shape.
        let last = nearest(all.clone(), SHAPES).last().map_or(0.0, |(d, _)| *d);
        let close: Vec<(f64, usize)> = all.into_iter().filter(|(d, _)| *d <= ABOUT * last).collect();
        let mut second = Matrix2::zeros();
        for (_, k) in &close {
            let [xx, yy, zz, xy, yz, zx] = cells[*k].spread;
            let along = |a: &Vec3, b: &Vec3| {
                xx * a.x * b.x
                    + yy * a.y * b.y
                    + zz * a.z * b.z
                    + xy * (a.x * b.y + a.y * b.x)
                    + yz * (a.y * b.z + a.z * b.y)
                    + zx * (a.z * b.x + a.x * b.z)
            };
            second += Matrix2::new(along(&e, &e), along(&e, &f), along(&e, &f), along(&f, &f));
        }
        // Over its trace, so that lengths times a power of two change no bit of the rest.
        let size = (second.trace() / (4.0 * close.len().max(1) as f64)).sqrt().max(f64::MIN_POSITIVE);
        let eigen = (second / second.trace().max(f64::MIN_POSITIVE)).symmetric_eigen();
        let root = |power: f64| {
            let values = eigen.eigenvalues.map(|value| value.max(f64::EPSILON).powf(power));
            eigen.eigenvectors * Matrix2::from_diagonal(&values) * eigen.eigenvectors.transpose()
        };
        Frame { x0, e, f, n, scale: root(-0.5) / size, unscale: root(0.5) * size }
    }

    /// Coordinates of a place near the surface [1]: its distance, in the direction of its projection.
    pub fn coordinates(&self, x: &Vec3) -> Vector2<f64> {
        let d = x - self.x0;
        let flat = Vector2::new(d.dot(&self.e), d.dot(&self.f));
        let length = flat.norm();
        let stretch = if 0.0 < length { d.norm() / length } else { 1.0 };
        self.scale * flat * stretch
    }

    /// Height over the plane in mean panel sizes [1].
    fn height(&self, x: &Vec3) -> f64 {
        (x - self.x0).dot(&self.n) * self.scale.determinant().abs().sqrt()
    }

    /// Distance of a place from the middle; its height counts as well, since the other side of a wall is near
    /// only in the plane [1].
    pub fn distance(&self, x: &Vec3) -> f64 {
        self.coordinates(x).norm().hypot(self.height(x))
    }

    /// A length of one in the coordinates, in its longer direction [m].
    pub fn unit(&self) -> f64 {
        self.unscale.norm()
    }
}

/// Two unit vectors across `n`.
fn across(n: &Vec3) -> (Vec3, Vec3) {
    let axis = [Vec3::x(), Vec3::y(), Vec3::z()];
    let least = (1..3).fold(0, |best, k| if n[k].abs() < n[best].abs() { k } else { best });
    let e = n.cross(&axis[least]).normalize();
    (e, n.cross(&e))
}

/// The `count` entries of least distance, in order.
pub(super) fn nearest(mut all: Vec<(f64, usize)>, count: usize) -> Vec<(f64, usize)> {
    let order = |a: &(f64, usize), b: &(f64, usize)| a.0.total_cmp(&b.0).then(a.1.cmp(&b.1));
    if count < all.len() {
        all.select_nth_unstable_by(count, order);
        all.truncate(count);
    }
    all.sort_by(order);
    all
}

/// Panels nearest to a place, in the measure of their own mean shape.
#[derive(Clone, Debug)]
pub struct Patch {
    /// The measure.
    pub frame: Frame,
    /// Indices of cells with their distances, nearest first [1].
    pub near: Vec<(f64, usize)>,
}

impl Patch {
    /// The `count` nearest of `cells` to the place `x0` with normal `n`.
    pub fn new(cells: &[Cell], place: [Vec3; 2], count: usize) -> Self {
        let frame = Frame::new(cells, place);
        let beside = cells.iter().enumerate().filter(|(_, cell)| SAME_SIDE < cell.normal.dot(&frame.n));
        let key =
            |cell: &Cell| frame.coordinates(&cell.middle).norm_squared() + frame.height(&cell.middle).powi(2);
        let near = nearest(beside.map(|(k, cell)| (key(cell), k)).collect(), count);
        Patch { frame, near: near.into_iter().map(|(d, k)| (d.sqrt(), k)).collect() }
    }

    /// Distance of the farthest of the first `count` [1].
    pub fn radius(&self, count: usize) -> f64 {
        self.near[..count.min(self.near.len())].last().map_or(0.0, |(d, _)| *d)
    }
}

/// Which function of the place is a polynomial.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Form {
    /// The field itself.
    Plain,
    /// `field^(−α)`: α = 1 in the gap between round bodies, 2 on an ellipsoid.
    Inverse(f64),
}

impl Form {
    /// Field over the scale, and its derivative, where the polynomial is `t` [1].
    fn value(self, t: f64) -> (f64, f64) {
        match self {
            Form::Plain => (t, 1.0),
            Form::Inverse(alpha) => {
                let value = t.powf(-1.0 / alpha);
                (value, -value / (alpha * t))
            }
        }
    }

    fn polynomial(self, value: f64) -> f64 {
        match self {
            Form::Plain => value,
            Form::Inverse(alpha) => value.powf(-alpha),
        }
    }
}

/// How a fit is made.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Recipe {
    /// Panels.
    pub count: usize,
    /// Order of the polynomial.
    pub order: usize,
    /// What is a polynomial.
    pub form: Form,
}

/// A fitted field over a patch.
#[derive(Clone, Debug)]
pub struct Fit {
    form: Form,
    order: usize,
    coefficients: DVector<f64>,
    /// Inverse of the weighted normal matrix times the variance [1].
    covariance: DMatrix<f64>,
    /// Field that counts as one [V/m].
    unit: f64,
    /// Panels that were taken.
    pub count: usize,
    /// Radius of the patch in the coordinates of its frame [1].
    pub radius: f64,
    /// Root mean square misfit of the panels [V/m].
    pub misfit: f64,
    /// Highest and lowest panel value of the patch [V/m].
    pub range: [f64; 2],
}

/// Least value over the greatest in a patch where powers are fitted [1].
const LEAST: f64 = 0.15;

/// Steps of Gauss and Newton.
const STEPS: usize = 4;

/// Weight at the rim of the patch over that in its middle: `exp(−TAPER)` [1].
const TAPER: f64 = 2.0;

/// Terms of a polynomial in two variables.
fn terms(order: usize) -> usize {
    (order + 1) * (order + 2) / 2
}

fn basis(order: usize, x: &Vector2<f64>) -> Vec<f64> {
    let mut all = Vec::with_capacity(terms(order));
    for degree in 0..=order {
        for k in 0..=degree {
            all.push(x.x.powi((degree - k) as i32) * x.y.powi(k as i32));
        }
    }
    all
}

/// The polynomial whose means over the panels agree best with their densities, `field[panel]`.
///
/// Least squares, weighted by area and distance; each panel counts by the mean over six places of the
/// rebuilt surface, so that wide panels are no points.  More panels are taken where they do not determine
/// the value in the middle; none where all of the patch do not.
pub fn fit(cells: &[Cell], patch: &Patch, field: &[f64], recipe: Recipe) -> Option<Fit> {
    let mut count = recipe.count.min(patch.near.len());
    loop {
        let found = fit_of(cells, patch, field, Recipe { count, ..recipe });
        if found.is_some() || patch.near.len() <= count {
            return found;
        }
        count = (count + count.div_ceil(2)).min(patch.near.len());
    }
}

fn fit_of(cells: &[Cell], patch: &Patch, field: &[f64], recipe: Recipe) -> Option<Fit> {
    let near = &patch.near[..recipe.count];
    let values: Vec<f64> = near.iter().map(|(_, k)| field[cells[*k].panel] * cells[*k].ratio).collect();
    let top = values.iter().fold(0.0_f64, |top, v| top.max(*v));
    let low = values.iter().fold(f64::INFINITY, |low, v| low.min(*v));
    if !(0.0 < top && top.is_finite()) || (recipe.form != Form::Plain && low < LEAST * top) {
        return None;
    }
    let values = values.iter().map(|v| v / top).collect();
    let problem = Problem { values, ..Problem::new(cells, patch, recipe)? };
    let (coefficients, inverse) = problem.solve(recipe.form)?;
    let (variance, misfit) = problem.variance(recipe.form, &coefficients);
    Some(Fit {
        form: recipe.form,
        order: recipe.order,
        coefficients,
        covariance: inverse * variance,
        unit: top,
        count: recipe.count,
        radius: patch.radius(recipe.count),
        misfit: misfit * top,
        range: [top, low],
    })
}

/// Weights with which the first panels of the patch enter the quadratic's values at the six places of
/// cell `k`, [`SMOOTHED`] panels or more [1].
pub fn weights_at(cells: &[Cell], patch: &Patch, k: usize) -> Option<[Vec<f64>; 6]> {
    let mut count = SMOOTHED.min(patch.near.len());
    loop {
        let recipe = Recipe { count, order: 2, form: Form::Plain };
        if let Some(problem) = Problem::new(cells, patch, recipe) {
            let means = problem.linear();
            let radius = patch.radius(count);
            let (_, inverse) = problem.normal(&means, &problem.values, &problem.values)?;
            return Some(cells[k].places.map(|x| {
                let row = &inverse * DVector::from_vec(basis(2, &(patch.frame.coordinates(&x) / radius)));
                let of_panel = |(mean, w): (&Vec<f64>, &f64)| {
                    w * mean.iter().zip(row.iter()).map(|(m, r)| m * r).sum::<f64>()
                };
                means.iter().zip(&problem.weights).map(of_panel).collect()
            }));
        }
        if patch.near.len() <= count {
            return None;
        }
        count = (count + count.div_ceil(2)).min(patch.near.len());
    }
}

/// Panels of the fits that rank places.
const SMOOTHED: usize = 16;

/// Largest variance of the fitted value in the middle over that of a panel [1].
///
/// A ring of narrow panels round a pole alone tells no curvature: there it is in the hundreds; it is 0.2
/// to 0.6 on irregular meshes.
const LEVERAGE: f64 = 1.0;

/// A least squares problem, values over the unit.
struct Problem {
    m: usize,
    rows: Vec<[Vec<f64>; 6]>,
    weights: Vec<f64>,
    values: Vec<f64>,
}

impl Problem {
    /// With all values one; none where the panels do not determine the value in the middle.
    fn new(cells: &[Cell], patch: &Patch, recipe: Recipe) -> Option<Self> {
        let (count, m) = (recipe.count, terms(recipe.order));
        let (near, radius) = (&patch.near[..count], patch.radius(count));
        if count < m + 2 || !(0.0 < radius && radius.is_finite()) {
            return None;
        }
        let mean_area = near.iter().map(|(_, k)| cells[*k].area).sum::<f64>() / count as f64;
        let weight =
            |(d, k): &(f64, usize)| cells[*k].area / mean_area * (-TAPER * (d / radius).powi(2)).exp();
        let row = |(_, k): &(f64, usize)| {
            cells[*k].places.map(|x| basis(recipe.order, &(patch.frame.coordinates(&x) / radius)))
        };
        let problem = Problem {
            m,
            rows: near.iter().map(row).collect(),
            weights: near.iter().map(weight).collect(),
            values: vec![1.0; count],
        };
        let (_, inverse) = problem.normal(&problem.linear(), &problem.values, &problem.values)?;
        (inverse[(0, 0)] * problem.mean_weight() <= LEVERAGE).then_some(problem)
    }

    /// Means of the terms over the panels.
    fn linear(&self) -> Vec<Vec<f64>> {
        let zero = DVector::zeros(self.m);
        self.rows.iter().map(|row| self.mean(Form::Plain, &zero, row).1).collect()
    }

    /// Mean of the weights, weighted by themselves [1].
    fn mean_weight(&self) -> f64 {
        self.weights.iter().map(|w| w * w).sum::<f64>() / self.weights.iter().sum::<f64>()
    }

    /// Mean over a panel of the field, and its gradient over the coefficients.
    fn mean(&self, form: Form, c: &DVector<f64>, row: &[Vec<f64>; 6]) -> (f64, Vec<f64>) {
        let (mut mean, mut slope) = (0.0, vec![0.0; self.m]);
        for (basis, (_, w)) in row.iter().zip(rules::SIX) {
            let t: f64 = basis.iter().zip(c.iter()).map(|(b, c)| b * c).sum();
            let (value, derivative) = form.value(t);
            mean += w * value;
            slope.iter_mut().zip(basis).for_each(|(s, b)| *s += w * derivative * b);
        }
        (mean, slope)
    }

    fn normal(
        &self,
        slopes: &[Vec<f64>],
        wanted: &[f64],
        extra: &[f64],
    ) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let (mut a, mut b) = (DMatrix::zeros(self.m, self.m), DVector::zeros(self.m));
        for ((slope, wanted), (w, extra)) in slopes.iter().zip(wanted).zip(self.weights.iter().zip(extra)) {
            for i in 0..self.m {
                b[i] += w * extra * slope[i] * wanted;
                for j in 0..self.m {
                    a[(i, j)] += w * extra * slope[i] * slope[j];
                }
            }
        }
        let ridge = RIDGE * a.trace() / self.m as f64;
        (0..self.m).for_each(|i| a[(i, i)] += ridge);
        let inverse = a.cholesky()?.inverse();
        Some((&inverse * b, inverse))
    }

    fn solve(&self, form: Form) -> Option<(DVector<f64>, DMatrix<f64>)> {
        let ones = vec![1.0; self.values.len()];
        let linear = self.linear();
        if form == Form::Plain {
            return self.normal(&linear, &self.values, &ones);
        }
        // Start: the transformed values, weighted by how much the field changes with them.
        let start: Vec<f64> = self.values.iter().map(|v| form.polynomial(*v)).collect();
        let pull: Vec<f64> = start.iter().map(|t| form.value(*t).1.powi(2)).collect();
        let (mut c, mut inverse) = self.normal(&linear, &start, &pull)?;
        for _ in 0..STEPS {
            if !self.positive(&c) {
                return None;
            }
            let seen: Vec<(f64, Vec<f64>)> = self.rows.iter().map(|row| self.mean(form, &c, row)).collect();
            let missing: Vec<f64> = self.values.iter().zip(&seen).map(|(v, (mean, _))| v - mean).collect();
            let slopes: Vec<Vec<f64>> = seen.into_iter().map(|(_, slope)| slope).collect();
            let (step, fresh) = self.normal(&slopes, &missing, &ones)?;
            (c, inverse) = (c + step, fresh);
        }
        self.positive(&c).then_some((c, inverse))
    }

    /// Whether the polynomial is well above zero on every panel.
    fn positive(&self, c: &DVector<f64>) -> bool {
        let value = |b: &Vec<f64>| b.iter().zip(c.iter()).map(|(b, c)| b * c).sum::<f64>();
        self.rows.iter().flatten().all(|b| POSITIVE < value(b))
    }

    /// Variance of a value of mean weight, and the root mean square misfit.
    fn variance(&self, form: Form, c: &DVector<f64>) -> (f64, f64) {
        let weight: f64 = self.weights.iter().sum();
        let off = |(row, v): (&[Vec<f64>; 6], &f64)| (self.mean(form, c, row).0 - v).powi(2);
        let sum: f64 =
            self.rows.iter().zip(&self.values).map(off).zip(&self.weights).map(|(off, w)| off * w).sum();
        let (n, m) = (self.values.len() as f64, self.m as f64);
        (sum / weight * n / (n - m) * self.mean_weight(), (sum / weight).sqrt())
    }
}

/// Added to the diagonal of the normal matrix, over its mean [1].
const RIDGE: f64 = 1e-13;

/// Least value of the polynomial under a power, where the field of the highest panel makes 1 [1].
const POSITIVE: f64 = 0.3;

impl Fit {
    /// The field at coordinates of the frame [V/m].
    pub fn value(&self, x: &Vector2<f64>) -> f64 {
        let basis = basis(self.order, &(x / self.radius));
        let t: f64 = basis.iter().zip(self.coefficients.iter()).map(|(b, c)| b * c).sum();
        self.unit * self.form.value(t).0
    }

    /// Standard error of that from the scatter of the panels [V/m].
    pub fn scatter(&self, x: &Vector2<f64>) -> f64 {
        let basis = DVector::from_vec(basis(self.order, &(x / self.radius)));
        let t = basis.dot(&self.coefficients);
        let variance = basis.dot(&(&self.covariance * &basis));
        self.unit * self.form.value(t).1.abs() * variance.max(0.0).sqrt()
    }

    /// The highest value within `reach` of the middle, and where [V/m], [1].
    pub fn highest(&self, reach: f64) -> (f64, Vector2<f64>) {
        let mut best = (self.value(&Vector2::zeros()), Vector2::zeros());
        let take = |x: Vector2<f64>, best: &mut (f64, Vector2<f64>)| {
            let value = self.value(&x);
            if best.0 < value && x.norm() <= reach * (1.0 + 1e-12) {
                *best = (value, x);
            }
        };
        for ring in 1..=4 {
            for k in 0..16 {
                let (s, c) = (f64::from(k) * std::f64::consts::PI / 8.0).sin_cos();
                take(Vector2::new(c, s) * (reach * f64::from(ring) / 4.0), &mut best);
            }
        }
        let mut step = reach / 8.0;
        while 1e-4 * reach < step {
            let middle = best.1;
            for (x, y) in [(1.0, 0.0), (-1.0, 0.0), (0.0, 1.0), (0.0, -1.0)] {
                take(middle + Vector2::new(x, y) * step, &mut best);
            }
            if (middle - best.1).norm() <= 0.0 {
                step *= 0.5;
            }
        }
        best
    }
}
