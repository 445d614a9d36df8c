//! The way of a study from facets to the last round, for tests that need more than its record.
use crate::reference::TestBody;
use crate::shapes::Facet;
use amberskin::adapt;
use amberskin::adapt::Aim;
use amberskin::adapt::Demand;
use amberskin::adapt::Finished;
use amberskin::adapt::Limits;
use amberskin::base::Images;
use amberskin::mesh::Assembly;
use amberskin::mesh::Body;
use amberskin::mesh::Patches;
use amberskin::mesh::accept;
use amberskin::mesh::assembly;
use amberskin::mesh::smooth;
use amberskin::mesh::whole;
use amberskin::panel;
use amberskin::physics::capacitance::Matrix;
use amberskin::physics::solved::Bar;
use amberskin::physics::solved::Solved;
use std::sync::Arc;

/// Panels that every body has at least in the first round, as in a study.
pub(crate) const FIRST_PANELS: usize = 60;

/// A body to be drawn.
pub(crate) fn body(name: &str, facets: Vec<Facet>, sheet: bool) -> TestBody {
    TestBody { name: name.to_owned(), facets, sheet }
}

/// Closed bodies named `a`, `b`, ….
pub(crate) fn solids(facets: impl IntoIterator<Item = Vec<Facet>>) -> Vec<TestBody> {
    named(facets, false)
}

/// Open sheets named `a`, `b`, ….
pub(crate) fn sheets(facets: impl IntoIterator<Item = Vec<Facet>>) -> Vec<TestBody> {
    named(facets, true)
}

fn named(facets: impl IntoIterator<Item = Vec<Facet>>, sheet: bool) -> Vec<TestBody> {
    ('a'..).zip(facets).map(|(name, facets)| body(&name.to_string(), facets, sheet)).collect()
}

/// Accepted, smoothed and exposed.
pub(crate) fn assembled(bodies: &[TestBody], bonds: &[Vec<String>], images: impl Into<Images>) -> Assembly {
    let images = images.into();
    let accepted = |body: &TestBody| {
        let (surface, _) = accept::body(&body.facets, body.sheet, &body.name).unwrap();
        let (surface, _) = whole::whole(surface, &images, &body.name).unwrap();
        let (surface, _) = smooth::rebuild(surface, smooth::CREASE_ANGLE);
        Body { name: body.name.clone(), surface }
    };
    assembly::expose(bodies.iter().map(accepted).collect(), bonds, images).unwrap()
}

/// What is asked of a solution.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Asked {
    /// Demand on capacitances [1].
    pub(crate) demand: f64,
    /// Most panels.
    pub(crate) max_panels: usize,
}

/// Refined until what is asked is reached.
pub(crate) fn refined(assembly: Assembly, images: impl Into<Images>, asked: Asked) -> Finished {
    let start = adapt::start(FIRST_PANELS, None, panel::build(Arc::new(assembly), images));
    let limits = Limits { max_panels: Some(asked.max_panels), time: None, memory: 4e9 };
    adapt::run(start, 1.0, Demand { capacitance: asked.demand, field: None }, &limits, &|_| {}).unwrap()
}

/// Refined for capacitances as asked and for the maxima in every case of `volts`, row potentials [V].
pub(crate) fn aimed(
    assembly: Assembly,
    images: impl Into<Images>,
    asked: Asked,
    volts: &[Vec<f64>],
    max_field: f64,
) -> Finished {
    let start = adapt::start(FIRST_PANELS, None, panel::build(Arc::new(assembly), images));
    let limits = Limits { max_panels: Some(asked.max_panels), time: None, memory: 4e9 };
    let potentials = |_: &Matrix| volts.to_vec();
    let aim = Aim { max_field, potentials: &potentials };
    adapt::run(start, 1.0, Demand { capacitance: asked.demand, field: Some(aim) }, &limits, &|_| {}).unwrap()
}

/// The assembly with every facet its own chart, for laws of the operator: they belong to panels that are given,
/// and how a form is merged into few charts depends on the order of its corners.
pub(crate) fn as_drawn(mut assembly: Assembly) -> Assembly {
    for body in &mut assembly.bodies {
        body.surface.patches = Patches::none(body.surface.welded.facets.len());
    }
    assembly
}

/// As [`solve`], on the facets as drawn.
pub(crate) fn solve_as_drawn(bodies: &[TestBody], images: impl Into<Images>, asked: Asked) -> Solved {
    let images = images.into();
    refined(as_drawn(assembled(bodies, &[], &images)), images, asked).solved
}

/// Bodies without bonds, refined until what is asked is reached.
pub(crate) fn solve(bodies: &[TestBody], images: impl Into<Images>, asked: Asked) -> Solved {
    let images = images.into();
    refined(assembled(bodies, &[], &images), images, asked).solved
}

/// `uᵀ C v` and its bar [F × units of u and v].
pub(crate) fn combination(solved: &Solved, u: &[f64], v: &[f64]) -> (f64, f64) {
    let c = &solved.matrix;
    let value = u.iter().zip(c).map(|(u, row)| u * row.iter().zip(v).map(|(c, v)| c * v).sum::<f64>()).sum();
    (value, Bar::total(&solved.bar(u, v)))
}
