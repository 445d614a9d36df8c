//! Repaired bodies as binary STL.

use crate::base::Vec3;
use crate::report::ReportError;
use crate::report::file;
use std::io;
use std::path::Path;
use stl_io::Normal;
use stl_io::Triangle;
use stl_io::Vertex;

/// Writes facets (corners in the unit of the drawing) as a binary STL file, whole or not at all.
///
/// The format holds single precision: coordinates are rounded to 6e-8 of themselves.
///
/// # Errors
/// [`ReportError`]; also for coordinates beyond single precision.
pub fn write(path: &Path, facets: &[[Vec3; 3]]) -> Result<(), ReportError> {
    let fail = |source| ReportError::Write { path: path.to_owned(), source };
    if facets.iter().flatten().any(|x| x.iter().any(|c| !(*c as f32).is_finite())) {
        let text = "a coordinate is beyond single precision";
        return Err(fail(io::Error::new(io::ErrorKind::InvalidData, text)));
    }
    let triangles: Vec<Triangle> = facets.iter().map(triangle).collect();
    let mut bytes = Vec::new();
    stl_io::write_stl(&mut bytes, triangles.iter()).map_err(fail)?;
    file::write_whole(path, &bytes)
}

fn triangle(corners: &[Vec3; 3]) -> Triangle {
    let single = |x: &Vec3| [x.x as f32, x.y as f32, x.z as f32];
    let cross = (corners[1] - corners[0]).cross(&(corners[2] - corners[0]));
    let normal = cross.try_normalize(0.0).unwrap_or_else(Vec3::zeros);
    Triangle {
        normal: Normal::new(single(&normal)),
        vertices: [0, 1, 2].map(|k| Vertex::new(single(&corners[k]))),
    }
}
