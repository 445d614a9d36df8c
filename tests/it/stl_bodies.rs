//! Bodies made in code, their STL files, and their exact measures.
use amberskin::base::Vec3;

/// The facets of a body, normals outward.
pub(crate) type Facets = Vec<[Vec3; 3]>;

/// A box of 12 facets.
pub(crate) fn cuboid(lo: [f64; 3], hi: [f64; 3]) -> Facets {
    let corner = |k: usize| {
        Vec3::new(
            if k & 1 == 0 { lo[0] } else { hi[0] },
            if k & 2 == 0 { lo[1] } else { hi[1] },
            if k & 4 == 0 { lo[2] } else { hi[2] },
        )
    };
    let faces = [[0, 2, 3, 1], [4, 5, 7, 6], [0, 1, 5, 4], [2, 6, 7, 3], [0, 4, 6, 2], [1, 3, 7, 5]];
    faces.iter().flat_map(|&[a, b, c, d]| [[a, b, c], [a, c, d]]).map(|f| f.map(corner)).collect()
}

/// The unit cube of 12 facets.
pub(crate) fn cube() -> Facets {
    cuboid([0.0; 3], [1.0; 3])
}

/// A ball from an octahedron, each facet cut in four `levels` times: 8 · 4^levels facets.
pub(crate) fn ball(centre: Vec3, radius: f64, levels: usize) -> Facets {
    let (x, y, z) = (Vec3::x(), Vec3::y(), Vec3::z());
    let mut facets: Facets = vec![
        [x, y, z],
        [y, -x, z],
        [-x, -y, z],
        [-y, x, z],
        [y, x, -z],
        [-x, y, -z],
        [-y, -x, -z],
        [x, -y, -z],
    ];
    for _ in 0..levels {
        facets = facets
            .iter()
            .flat_map(|&[a, b, c]| {
                let (ab, bc, ca) = ((a + b).normalize(), (b + c).normalize(), (c + a).normalize());
                [[a, ab, ca], [ab, b, bc], [ca, bc, c], [ab, bc, ca]]
            })
            .collect();
    }
    facets.iter().map(|f| f.map(|x| centre + x * radius)).collect()
}

/// The same facets inside out.
pub(crate) fn inside_out(facets: &[[Vec3; 3]]) -> Facets {
    facets.iter().map(|&[a, b, c]| [a, c, b]).collect()
}

/// Signed volume.
pub(crate) fn volume(facets: &[[Vec3; 3]]) -> f64 {
    facets.iter().map(|[a, b, c]| a.dot(&b.cross(c))).sum::<f64>() / 6.0
}

/// Area.
pub(crate) fn area(facets: &[[Vec3; 3]]) -> f64 {
    facets.iter().map(|[a, b, c]| (b - a).cross(&(c - a)).norm()).sum::<f64>() / 2.0
}

/// Binary STL with zero normals.
pub(crate) fn binary(facets: &[[Vec3; 3]]) -> Vec<u8> {
    let mut bytes = vec![0u8; 80];
    bytes.extend(u32::try_from(facets.len()).unwrap().to_le_bytes());
    for facet in facets {
        bytes.extend([0u8; 12]);
        facet.iter().flat_map(|x| x.iter()).for_each(|c| bytes.extend((*c as f32).to_le_bytes()));
        bytes.extend([0u8; 2]);
    }
    bytes
}

/// One ASCII solid; numbers as short as single precision allows.
pub(crate) fn ascii(name: &str, facets: &[[Vec3; 3]]) -> String {
    let mut text = format!("solid {name}\n");
    for facet in facets {
        text += "  facet normal 0 0 0\n    outer loop\n";
        for x in facet {
            text += &format!("      vertex {:e} {:e} {:e}\n", x.x as f32, x.y as f32, x.z as f32);
        }
        text += "    endloop\n  endfacet\n";
    }
    text + &format!("endsolid {name}\n")
}
