//! Edges with an unbounded field for the record.

use crate::base::Vec3;
use crate::operator::Sources;
use crate::physics::edges;
use crate::physics::edges::Edge;
use crate::physics::solved::Solved;
use crate::physics::strength;
use crate::physics::strength::Place;
use crate::record;
use crate::record::EdgePlace;
use crate::record::FieldAt;

/// Edges of all bodies with their strengths per volt.
pub(super) struct Edges {
    edges: Vec<Edge>,
    places: Vec<Vec<Place>>,
}

/// Places along each edge, most first; fewer where there are many edges.
const PLACES: [usize; 4] = [9, 5, 3, 1];

/// Edges for which strengths are found at most.
const MOST_EDGES: usize = 2000;

/// Places at which strengths are found at most, beyond one for every eight panels.
const MOST_PLACES: usize = 400;

/// Edges stored for each part and voltage case: the strongest.
const MOST_STORED: usize = 24;

/// Distances at which the field law is stated, in sizes of the part [1].
const STATED: [f64; 3] = [1e-3, 3e-3, 1e-2];

impl Edges {
    pub(super) fn find(solved: &Solved, sources: &Sources) -> Self {
        let mut edges = edges::edges(&solved.panels);
        // The longest tell most; beyond the limit they are left out.
        edges.sort_by(|a, b| a.body.cmp(&b.body).then(b.length().total_cmp(&a.length())));
        edges.truncate(MOST_EDGES);
        let room = MOST_PLACES + solved.panels.len() / 8;
        let most = PLACES.into_iter().find(|most| most * edges.len() <= room).unwrap_or(1);
        let places = strength::strengths(solved, sources, &edges, most);
        Edges { edges, places }
    }

    /// The edges in one voltage case, strongest first within each part.
    pub(super) fn records(
        &self,
        case: &str,
        solved: &Solved,
        v: &[f64],
        charge_bar: &[f64],
    ) -> Vec<record::Edge> {
        let mut found: Vec<(usize, record::Edge)> = Vec::new();
        for (edge, places) in self.edges.iter().zip(&self.places) {
            let along: Vec<EdgePlace> = places.iter().map(|place| at_place(place, v, charge_bar)).collect();
            let Some(middle) = middle(edge, places) else { continue };
            let place = &places[middle];
            let size = size(solved, edge.body);
            let field_at = STATED.map(|share| FieldAt {
                distance_metre: share * size,
                field_v_per_m: along[middle].strength * (share * size).powf(place.exponent()),
            });
            let half = edge.length() * if edge.closed { 0.5 } else { 1.0 };
            let record = record::Edge {
                part: solved.panels.assembly.bodies[edge.body].name.clone(),
                angle_deg: place.angle.to_degrees(),
                exponent: place.exponent(),
                case: case.to_owned(),
                strength: along[middle].strength,
                strength_bar: along[middle].bar,
                from_metre: edge.at(0.0).1.into(),
                to_metre: edge.at(half).1.into(),
                closed: edge.closed,
                length_metre: edge.length(),
                along,
                field_at: field_at.to_vec(),
                edge_radius_metre: None,
                field_v_per_m: None,
                bar_v_per_m: None,
            };
            found.push((edge.body, record));
        }
        let near = |edge: &record::Edge| edge.field_at[0].field_v_per_m;
        found.sort_by(|a, b| a.0.cmp(&b.0).then(near(&b.1).total_cmp(&near(&a.1))));
        let mut kept = vec![0; solved.panels.assembly.bodies.len()];
        found.retain(|(body, _)| {
            kept[*body] += 1;
            kept[*body] <= MOST_STORED
        });
        found.into_iter().map(|(_, edge)| edge).collect()
    }
}

/// Index of the place nearest to the middle of an edge.
fn middle(edge: &Edge, places: &[Place]) -> Option<usize> {
    let off = |k: &usize| (places[*k].along - 0.5 * edge.length()).abs();
    (0..places.len()).min_by(|a, b| off(a).total_cmp(&off(b)))
}

fn at_place(place: &Place, v: &[f64], charge_bar: &[f64]) -> EdgePlace {
    let (strength, doubt) = place.strength(v);
    let relative = charge_bar.iter().fold(0.0, |most: f64, bar| most.max(*bar));
    let bar = doubt + relative * strength.abs();
    EdgePlace { at_metre: place.at.into(), strength: strength.abs(), bar }
}

/// Longest side of the box around a body [m].
fn size(solved: &Solved, body: usize) -> f64 {
    let points = &solved.panels.assembly.bodies[body].surface.welded.points;
    let (lo, hi) = crate::mesh::weld::bounds(points);
    let size: Vec3 = hi - lo;
    size.max()
}
