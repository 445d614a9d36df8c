//! Reading good STL files: every solid, every facet, as a second reading has it.
use crate::stl_bodies;
use crate::stl_bodies::Facets;
use amberskin::base::Vec3;
use amberskin::mesh::stl;

/// A second reading of binary STL, without the gate and the crate.
fn second_binary(bytes: &[u8]) -> Facets {
    let count = u32::from_le_bytes(bytes[80..84].try_into().unwrap()) as usize;
    let number = |at: usize| f64::from(f32::from_le_bytes(bytes[at..at + 4].try_into().unwrap()));
    let corner = |at: usize| Vec3::new(number(at), number(at + 4), number(at + 8));
    (0..count).map(|n| [12, 24, 36].map(|k| corner(84 + 50 * n + k))).collect()
}

/// A second reading of ASCII STL: every word `vertex` and the three numbers behind it.
fn second_ascii(text: &str) -> Facets {
    let words: Vec<&str> = text.split_whitespace().collect();
    let number = |k: usize| f64::from(words[k].parse::<f32>().unwrap());
    let corners: Vec<Vec3> = (0..words.len())
        .filter(|&k| words[k].eq_ignore_ascii_case("vertex"))
        .map(|k| Vec3::new(number(k + 1), number(k + 2), number(k + 3)))
        .collect();
    corners.chunks_exact(3).map(|c| [c[0], c[1], c[2]]).collect()
}

/// All facets of a file in order.
#[track_caller]
fn all(bytes: &[u8]) -> Facets {
    stl::parse(bytes, "part.stl").unwrap().solids.into_iter().flat_map(|s| s.facets).collect()
}

#[test]
fn both_readings_agree_facet_by_facet() {
    let bodies = [
        stl_bodies::cube(),
        stl_bodies::ball(Vec3::new(0.1, -7.3, 1e3), 12.7, 3),
        stl_bodies::cuboid([-1e-9, 0.0, 1e9], [1e-9, 1.0, 2e9]),
    ];
    for body in bodies {
        let bytes = stl_bodies::binary(&body);
        assert_eq!(all(&bytes), second_binary(&bytes));
        let text = stl_bodies::ascii("some name", &body);
        assert_eq!(all(text.as_bytes()), second_ascii(&text));
        assert_eq!(all(text.as_bytes()), all(&bytes), "both formats hold the same numbers");
    }
}
