//! Exact cases on this machine: drawn in code, solved like any other, held against closed forms.
//!
//! The exact values rest on constants of their own, so that a wrong one in the program shows.

use super::StudyError;
use super::prove_shapes;
use crate::adapt;
use crate::adapt::Demand;
use crate::adapt::Finished;
use crate::adapt::Limits;
use crate::base::Plane;
use crate::base::Vec3;
use crate::mesh::Body;
use crate::mesh::Surface;
use crate::mesh::accept;
use crate::mesh::assembly;
use crate::mesh::smooth;
use crate::operator::Sources;
use crate::panel;
use crate::physics::field;
use crate::physics::solved::Solved;
use std::sync::Arc;

/// One exact case.
#[derive(Clone, Debug, PartialEq)]
pub struct ProveLine {
    /// What was computed.
    pub name: String,
    /// Where the exact value comes from.
    pub source: &'static str,
    /// Exact value, in the unit of the name [stated in the name].
    pub exact: f64,
    /// Computed value [stated in the name].
    pub found: f64,
    /// Bar of the computed value [stated in the name].
    pub bar: f64,
    /// Whether the deviation is within the bar, and the bar within what can prove anything.
    pub pass: bool,
}

/// 4πε₀ [F/m], 10⁷/c² (exact before 2019, and 2e-10 from the value of CODATA 2022); not the program's own.
const UNIT_BALL: f64 = 1.112_650_056e-10;

/// Capacitance of a cube over 4πε₀ times its edge [1] (Helsing and Perfekt 2013).
const CUBE: f64 = 0.660_678_154_099_57;

/// Highest field between two balls of equal radius, one radius apart, at ±V/2, over V/gap [1]: sum of the
/// image charges of Kelvin, 200 terms.
const TWO_BALLS_FIELD: f64 = 1.358_996_328_021_533_4;

/// Demand on capacitances [1].
const DEMAND: f64 = 1e-3;

/// Most panels of a case; the whole run takes some seconds with them.
const MOST_PANELS: usize = 3000;

/// Largest relative bar that proves something [1]: a wrong constant is off by more.
const WIDEST: f64 = 0.01;

/// The same for a field, whose bar holds the difference of two fits [1].
const WIDEST_FIELD: f64 = 0.03;

/// Frequency of a ball alone, 1,280 facets, and of two balls, 2 × 980.
const ALONE: usize = 8;
const PAIR: usize = 7;

/// Panels that every body has at least at the start, as in a study.
const FIRST_PANELS: usize = 60;

/// Runs the exact cases.
///
/// # Errors
/// [`StudyError`] where a case gives no result at all.
pub fn prove() -> Result<Vec<ProveLine>, StudyError> {
    let mut lines = vec![sphere()?];
    lines.extend(two_spheres()?);
    lines.extend([sphere_over_plane()?, cube()?, disc()?]);
    Ok(lines)
}

fn sphere() -> Result<ProveLine, StudyError> {
    let solved = solved(vec![prove_shapes::ball(Vec3::zeros(), 1.0, ALONE)], false, None)?;
    let source = "Gauss's law: 4πε₀R";
    Ok(entry("sphere, R = 1 m: C [F]", source, &solved, (0, 0), UNIT_BALL))
}

/// Two balls of 1 m radius, 1 m apart: both kinds of entry, and the field between the facing poles.
fn two_spheres() -> Result<Vec<ProveLine>, StudyError> {
    let balls = [0.0, -3.0].map(|z| prove_shapes::ball(Vec3::new(0.0, 0.0, z), 1.0, PAIR));
    let solved = solved(balls.to_vec(), false, None)?;
    let source = "image series: Smythe, Static and Dynamic Electricity, ch. 5; Lekner 2011";
    let [own, mutual] = equal_balls(3.0).map(|c| UNIT_BALL * c);
    let sources = Sources::build(&solved.panels);
    let (bars, _) = solved.bars();
    let charge_bar = [0, 1].map(|row| bars[row][row].total() / solved.matrix[row][row]);
    let peaks = field::peaks(&solved, &sources, &[0.5, -0.5], &charge_bar);
    let (found, bar) = peaks.first().map_or((f64::NAN, 0.0), |peak| (peak.field, peak.bar));
    Ok(vec![
        entry("two spheres, R = 1 m, gap 1 m: C11 [F]", source, &solved, (0, 0), own),
        entry("two spheres, R = 1 m, gap 1 m: C12 [F]", source, &solved, (0, 1), mutual),
        line(
            "two spheres at ±0.5 V: highest field [V/m]",
            source,
            [TWO_BALLS_FIELD, found, bar],
            WIDEST_FIELD,
        ),
    ])
}

/// `sinh α Σ 1/sinh((2n − 1) α)` and `−sinh α Σ 1/sinh(2n α)`, `cosh α = d/2R`, times R: C11 and C12 over
/// 4πε₀ of two equal balls of radius 1 m with centres `distance` [m] apart.
fn equal_balls(distance: f64) -> [f64; 2] {
    let alpha = (0.5 * distance).acosh();
    let sum = |first: u32| (0..200).map(|n| 1.0 / (f64::from(first + 2 * n) * alpha).sinh()).sum::<f64>();
    [alpha.sinh() * sum(1), -alpha.sinh() * sum(2)]
}

/// A ball of 1 m radius, 1 m over an earthed plane: `C11 − C12` of the ball and its image.
fn sphere_over_plane() -> Result<ProveLine, StudyError> {
    let plane = Plane { through: Vec3::zeros(), facing: Vec3::z() };
    let ball = prove_shapes::ball(Vec3::new(0.0, 0.0, 2.0), 1.0, ALONE);
    let solved = solved(vec![ball], false, Some(plane))?;
    let [own, mutual] = equal_balls(4.0);
    let source = "image series: Smythe, Static and Dynamic Electricity, ch. 5";
    let name = "sphere over plane, R = 1 m, gap 1 m: C [F]";
    Ok(entry(name, source, &solved, (0, 0), UNIT_BALL * (own - mutual)))
}

fn cube() -> Result<ProveLine, StudyError> {
    let solved = solved(vec![prove_shapes::cube()], false, None)?;
    let source = "Helsing and Perfekt 2013: 0.66067815409957 · 4πε₀a";
    Ok(entry("cube, a = 1 m: C [F]", source, &solved, (0, 0), UNIT_BALL * CUBE))
}

fn disc() -> Result<ProveLine, StudyError> {
    let solved = solved(vec![prove_shapes::disc()], true, None)?;
    let source = "Landau and Lifshitz, Electrodynamics of Continuous Media, section 4: 8ε₀R";
    let exact = UNIT_BALL * 2.0 / std::f64::consts::PI;
    Ok(entry("disc, R = 1 m: C [F]", source, &solved, (0, 0), exact))
}

fn entry(name: &str, source: &'static str, solved: &Solved, at: (usize, usize), exact: f64) -> ProveLine {
    let (bars, _) = solved.bars();
    line(name, source, [exact, solved.matrix[at.0][at.1], bars[at.0][at.1].total()], WIDEST)
}

fn line(name: &str, source: &'static str, [exact, found, bar]: [f64; 3], widest: f64) -> ProveLine {
    let pass = (found - exact).abs() <= bar && bar <= widest * exact.abs();
    ProveLine { name: name.to_owned(), source, exact, found, bar, pass }
}

/// The way of a study from facets to the last round; every ball, block or sheet is a row.
fn solved(bodies: Vec<Vec<[Vec3; 3]>>, sheet: bool, plane: Option<Plane>) -> Result<Solved, StudyError> {
    let accepted: Result<Vec<Body>, StudyError> =
        bodies.iter().enumerate().map(|(n, facets)| body(facets, sheet, &format!("body {n}"))).collect();
    let assembly = assembly::expose(accepted?, &[], plane.as_ref()).map_err(StudyError::Refused)?;
    let start = adapt::at_least(FIRST_PANELS, panel::build(Arc::new(assembly), plane));
    let limits = Limits { max_panels: Some(MOST_PANELS), time: None, memory: f64::INFINITY };
    let demand = Demand { capacitance: DEMAND };
    let finished = adapt::run(start, 1.0, demand, &limits, &|_| {});
    finished.map(|Finished { solved, .. }| solved).map_err(|error| StudyError::Singular(error.to_string()))
}

fn body(facets: &[[Vec3; 3]], sheet: bool, name: &str) -> Result<Body, StudyError> {
    let (surface, _) = accept::body(facets, sheet, name).map_err(StudyError::Refused)?;
    let smooth = smooth::recover(&surface.welded, smooth::CREASE_ANGLE);
    let surface =
        Surface { normals: smooth.normals, creases: smooth.creases, rims_as_drawn: false, ..surface };
    Ok(Body { name: name.to_owned(), surface })
}
