//! From accepted bodies to the assembly of exposed triangles.

use crate::base::Finding;
use crate::base::Plane;
use crate::base::Vec3;
use crate::mesh::Assembly;
use crate::mesh::Body;
use crate::mesh::Net;
use crate::mesh::Piece;
use crate::mesh::Row;

/// The exposed triangles of `bodies`, with one row of the matrix for each conductor.
///
/// # Errors
/// All findings, when there is a refusal among them.
pub fn expose(
    bodies: Vec<Body>,
    _bonds: &[Vec<String>],
    _plane: Option<&Plane>,
) -> Result<Assembly, Vec<Finding>> {
    let mut pieces = Vec::new();
    for (b, body) in bodies.iter().enumerate() {
        let welded = &body.surface.welded;
        for (f, corners) in welded.facets.iter().enumerate() {
            let corners: [Vec3; 3] = corners.map(|c| welded.points[c as usize]);
            let bary = [[1.0, 0.0, 0.0], [0.0, 1.0, 0.0], [0.0, 0.0, 1.0]];
            pieces.push(Piece { body: b as u32, facet: f as u32, corners, bary, net: Net::Row(b as u32) });
        }
    }
    let rows = bodies
        .iter()
        .enumerate()
        .map(|(b, body)| Row { name: body.name.clone(), bodies: vec![b as u32] })
        .collect();
    Ok(Assembly { bodies, rows, pieces, findings: Vec::new() })
}
