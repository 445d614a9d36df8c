//! The way of a study from facets to the last round, for tests that need more than its record.
use crate::reference::TestBody;
use crate::shapes::Facet;
use amberskin::adapt;
use amberskin::adapt::Demand;
use amberskin::adapt::Finished;
use amberskin::adapt::Limits;
use amberskin::base::Plane;
use amberskin::mesh::Assembly;
use amberskin::mesh::Body;
use amberskin::mesh::Surface;
use amberskin::mesh::accept;
use amberskin::mesh::assembly;
use amberskin::mesh::smooth;
use amberskin::panel;
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
pub(crate) fn assembled(bodies: &[TestBody], bonds: &[Vec<String>], plane: Option<&Plane>) -> Assembly {
    let accepted = |body: &TestBody| {
        let (surface, _) = accept::body(&body.facets, body.sheet, &body.name).unwrap();
        let smooth = smooth::recover(&surface.welded, smooth::CREASE_ANGLE);
        let surface =
            Surface { normals: smooth.normals, creases: smooth.creases, rims_as_drawn: false, ..surface };
        Body { name: body.name.clone(), surface }
    };
    assembly::expose(bodies.iter().map(accepted).collect(), bonds, plane).unwrap()
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
pub(crate) fn refined(assembly: Assembly, plane: Option<Plane>, asked: Asked) -> Finished {
    let start = adapt::at_least(FIRST_PANELS, panel::build(Arc::new(assembly), plane));
    let limits = Limits { max_panels: Some(asked.max_panels), time: None, memory: 4e9 };
    adapt::run(start, 1.0, Demand { capacitance: asked.demand }, &limits, &|_| {}).unwrap()
}

/// Bodies without bonds, refined until what is asked is reached.
pub(crate) fn solve(bodies: &[TestBody], plane: Option<Plane>, asked: Asked) -> Solved {
    refined(assembled(bodies, &[], plane.as_ref()), plane, asked).solved
}

/// `uᵀ C v` and its bar [F × units of u and v].
pub(crate) fn combination(solved: &Solved, u: &[f64], v: &[f64]) -> (f64, f64) {
    let c = &solved.matrix;
    let value = u.iter().zip(c).map(|(u, row)| u * row.iter().zip(v).map(|(c, v)| c * v).sum::<f64>()).sum();
    (value, Bar::total(&solved.bar(u, v)))
}

/// Relative bars of the diagonal, for the bars of maxima [1].
pub(crate) fn charge_bars(solved: &Solved) -> Vec<f64> {
    let (bars, _) = solved.bars();
    (0..solved.n_rows()).map(|i| bars[i][i].total() / solved.matrix[i][i]).collect()
}
