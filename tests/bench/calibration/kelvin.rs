//! Balls by image charges (Kelvin 1848; Smythe, Static and Dynamic Electricity, chapter 5): the charge at
//! the centre that puts a ball to its potential, and the images of every charge in every other ball, until
//! what is left is below [`LEAST`].
use amberskin::base::Vec3;
use amberskin::base::si::EPS0;
use nalgebra::DMatrix;
use nalgebra::DVector;
use std::f64::consts::PI;

/// A conducting ball: centre and radius [m].
pub(crate) type Ball = (Vec3, f64);

/// Charge over 4πε₀ at a place [V·m].
type Charge = (f64, Vec3);

/// Charges that are left out, over the radius at 1 V [1].
const LEAST: f64 = 1e-12;

/// Charges inside each ball when ball `live` is at 1 V and the rest at 0 V.
fn inside(balls: &[Ball], live: usize) -> Vec<Vec<Charge>> {
    if balls.len() <= 2 { images(balls, live) } else { fitted(balls, live) }
}

/// Charges of each ball on a sphere of [`DEPTH`] radii, and the same count of places where they give the
/// potential (method of fundamental solutions; Fairweather and Karageorghis, Advances in Computational
/// Mathematics 9, 1998).
///
/// Three balls have 2^n images in the nth generation, which fall no faster than 0.6^n.  On two balls a radius
/// apart both ways agree to 1e-6: see [`agreement`].
const CHARGES: usize = 250;
const DEPTH: f64 = 0.6;

/// The places of a net on the unit sphere, by the golden angle.
fn net(count: usize) -> impl Iterator<Item = Vec3> {
    (0..count).map(move |k| {
        let (z, angle) = (1.0 - (2 * k + 1) as f64 / count as f64, 2.399963229728653 * k as f64);
        Vec3::new((1.0 - z * z).sqrt() * angle.cos(), (1.0 - z * z).sqrt() * angle.sin(), z)
    })
}

fn fitted(balls: &[Ball], live: usize) -> Vec<Vec<Charge>> {
    let on = |depth: f64| -> Vec<Vec3> {
        balls.iter().flat_map(|(c, r)| net(CHARGES).map(move |d| c + d * (depth * r))).collect()
    };
    let (inner, outer) = (on(DEPTH), on(1.0));
    let n = inner.len();
    let matrix = DMatrix::from_fn(n, n, |i, j| 1.0 / (outer[i] - inner[j]).norm());
    let volts = DVector::from_fn(n, |i, _| if i / CHARGES == live { 1.0 } else { 0.0 });
    let charges = matrix.lu().solve(&volts).expect("apart from each other");
    let of_ball = |k: usize| (k * CHARGES..(k + 1) * CHARGES).map(|j| (charges[j], inner[j])).collect();
    (0..balls.len()).map(of_ball).collect()
}

/// Largest difference of the two ways on two balls a radius apart, over the capacitance of one [1].
pub(crate) fn agreement() -> f64 {
    let balls = [(Vec3::zeros(), 1.0), (Vec3::z() * 3.0, 0.8)];
    let sums = |held: Vec<Vec<Charge>>| held.into_iter().map(|h| h.iter().map(|(q, _)| q).sum::<f64>());
    let pairs = sums(images(&balls, 0)).zip(sums(fitted(&balls, 0)));
    pairs.map(|(a, b)| (a - b).abs()).fold(0.0, f64::max)
}

fn images(balls: &[Ball], live: usize) -> Vec<Vec<Charge>> {
    let mut held: Vec<Vec<Charge>> = vec![Vec::new(); balls.len()];
    let mut open = vec![(live, (balls[live].1, balls[live].0))];
    while let Some((home, (q, at))) = open.pop() {
        held[home].push((q, at));
        for (other, (centre, radius)) in balls.iter().enumerate().filter(|(k, _)| *k != home) {
            let away = at - centre;
            let image = -q * radius / away.norm();
            if LEAST * balls[live].1 < image.abs() {
                open.push((other, (image, centre + away * (radius * radius / away.norm_squared()))));
            }
        }
    }
    held
}

/// Maxwell matrix of balls in free space [F].
pub(crate) fn matrix(balls: &[Ball]) -> Vec<Vec<f64>> {
    let sum = |held: &Vec<Charge>| 4.0 * PI * EPS0 * held.iter().map(|(q, _)| q).sum::<f64>();
    // The matrix is symmetric: columns serve as rows.
    (0..balls.len()).map(|j| inside(balls, j).iter().map(sum).collect()).collect()
}

/// Highest field on each ball at potentials `v` [V/m]: the best of a net of places, then of ever smaller
/// steps about it.
pub(crate) fn highest(balls: &[Ball], v: &[f64]) -> Vec<f64> {
    let mut charges: Vec<Charge> = Vec::new();
    for (live, volt) in v.iter().enumerate().filter(|(_, volt)| volt.abs() > 0.0) {
        charges.extend(inside(balls, live).into_iter().flatten().map(|(q, at)| (q * volt, at)));
    }
    let field = |x: Vec3| -> f64 {
        let of = |(q, at): &Charge| (x - at) * (q / (x - at).norm().powi(3));
        charges.iter().map(of).sum::<Vec3>().norm()
    };
    let axes = [Vec3::x(), -Vec3::x(), Vec3::y(), -Vec3::y(), Vec3::z(), -Vec3::z()];
    let starts: Vec<Vec3> = net(300).chain(axes).collect();
    let of_ball = |(centre, radius): &Ball| {
        let at = |d: &Vec3| field(centre + d * *radius);
        let mut best =
            starts.iter().map(|d| (at(d), *d)).fold((0.0, Vec3::x()), |a, b| if a.0 < b.0 { b } else { a });
        let mut step = 0.1;
        while 1e-5 < step {
            let near = axes.map(|a| (best.1 + a * step).normalize());
            let next = near.iter().map(|d| (at(d), *d)).fold(best, |a, b| if a.0 < b.0 { b } else { a });
            if next.0 <= best.0 { step *= 0.5 } else { best = next }
        }
        best.0
    };
    balls.iter().map(of_ball).collect()
}
