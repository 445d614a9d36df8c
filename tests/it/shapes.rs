//! Bodies of known size for the tests, made in code: every corner lies on the true surface, and
//! normals point out of the metal.
//!
//! Unit shapes stand at the origin with their axis along z; `moved`, `scaled`, `turned` place them.
use amberskin::base::Vec3;
use std::collections::HashMap;
use std::f64::consts::PI;

/// A facet of a drawn surface.
pub(crate) type Facet = [Vec3; 3];

/// A ball of radius 1 from the icosahedron, each face cut into n²: 20 n² facets.
pub(crate) fn icosphere(n: usize) -> Vec<Facet> {
    resolve(&ico_net(n))
}

/// [`icosphere`] with corners shifted along the sphere by up to a quarter of an edge: an irregular
/// mesh, the same for the same seed.
pub(crate) fn jittered_icosphere(n: usize, seed: u64) -> Vec<Facet> {
    let mut net = ico_net(n);
    let mut random = Random(seed);
    let reach = 0.25 * 1.1 / n as f64;
    for corner in &mut net.0 {
        let push = Vec3::new(random.signed(), random.signed(), random.signed()) * reach;
        *corner = (*corner + push).normalize();
    }
    resolve(&net)
}

/// A ball of radius 1 with meridians and parallels, apexes at ±z: 2 · columns · (rings − 1) facets.
pub(crate) fn meridian_sphere(rings: usize, columns: usize) -> Vec<Facet> {
    spheroid(1.0, 1.0, rings, columns)
}

/// A spheroid with half axes `equatorial` (twice) and `polar` (along z), its parallels crowded where
/// the surface is strongly curved: 2 · columns · (rings − 1) facets.
///
/// The parallels are equidistant in the mean of the parametric angle t and of the angle of the normal
/// to the axis.
pub(crate) fn spheroid(equatorial: f64, polar: f64, rings: usize, columns: usize) -> Vec<Facet> {
    let at_step = |k: usize| {
        let wanted = PI * k as f64 / rings as f64;
        let (mut lo, mut hi) = (0.0, PI);
        for _ in 0..60 {
            let t: f64 = 0.5 * (lo + hi);
            let normal = (polar * t.sin()).atan2(equatorial * t.cos());
            if 0.5 * (t + normal) < wanted { lo = t } else { hi = t }
        }
        0.5 * (lo + hi)
    };
    let profile: Vec<[f64; 2]> = (0..=rings)
        .rev()
        .map(|k| match k {
            0 => [0.0, polar],
            _ if k == rings => [0.0, -polar],
            _ => [equatorial * at_step(k).sin(), polar * at_step(k).cos()],
        })
        .collect();
    revolved(&profile, columns)
}

/// An ellipsoid with half axes `axes` along x, y, z: a scaled [`icosphere`].
pub(crate) fn ellipsoid(axes: [f64; 3], n: usize) -> Vec<Facet> {
    mapped(&icosphere(n), |p| p.component_mul(&Vec3::from(axes)))
}

/// A block with sides `sides`, centred, each face cut into n × n squares: 12 n² facets.
pub(crate) fn cuboid(sides: [f64; 3], n: usize) -> Vec<Facet> {
    let half = Vec3::from(sides) * 0.5;
    let face = rect_sheet(2.0, 2.0, n, n);
    let mut facets = Vec::new();
    for axis in 0..3 {
        for sign in [1.0, -1.0] {
            let place = |p: &Vec3| {
                let mut q = Vec3::zeros();
                q[axis] = sign;
                q[(axis + 1) % 3] = p.x;
                q[(axis + 2) % 3] = sign * p.y;
                q.component_mul(&half)
            };
            facets.extend(mapped(&face, place));
        }
    }
    facets
}

/// A rectangular sheet in z = 0, centred, normals up: 2 · nx · ny facets.
pub(crate) fn rect_sheet(lx: f64, ly: f64, nx: usize, ny: usize) -> Vec<Facet> {
    let at = |i: usize, j: usize| {
        Vec3::new(lx * (i as f64 / nx as f64 - 0.5), ly * (j as f64 / ny as f64 - 0.5), 0.0)
    };
    let mut facets = Vec::new();
    for i in 0..nx {
        for j in 0..ny {
            push_quad(&mut facets, [at(i, j), at(i + 1, j), at(i + 1, j + 1), at(i, j + 1)]);
        }
    }
    facets
}

/// A round sheet of radius 1 in z = 0, normals up, ring k with 6 k corners: 6 · rings² facets.
pub(crate) fn disc_sheet(rings: usize) -> Vec<Facet> {
    let at = |ring: usize, k: usize| {
        if ring == 0 {
            return Vec3::zeros();
        }
        let angle = 2.0 * PI * (k % (6 * ring)) as f64 / (6 * ring) as f64;
        Vec3::new(angle.cos(), angle.sin(), 0.0) * (ring as f64 / rings as f64)
    };
    let mut facets = Vec::new();
    for ring in 1..=rings {
        for sector in 0..6 {
            let (outer, inner) = (sector * ring, sector * (ring - 1));
            for k in 0..ring {
                facets.push([at(ring, outer + k), at(ring, outer + k + 1), at(ring - 1, inner + k)]);
                if k + 1 < ring {
                    facets.push([
                        at(ring - 1, inner + k),
                        at(ring, outer + k + 1),
                        at(ring - 1, inner + k + 1),
                    ]);
                }
            }
        }
    }
    facets
}

/// A round sheet of radius 1 in z = 0, normals up, as drawing programs leave flat faces: a polygon of
/// 3 · 2^halvings sides whose ears are cut off until a triangle is left, sides − 2 facets.
pub(crate) fn polygon_sheet(halvings: u32) -> Vec<Facet> {
    let sides = 3 * 2_usize.pow(halvings);
    let at = |k: usize| {
        let angle = 2.0 * PI * (k % sides) as f64 / sides as f64;
        Vec3::new(angle.cos(), angle.sin(), 0.0)
    };
    let mut facets = vec![[0, sides / 3, 2 * sides / 3].map(at)];
    let mut step = sides / 3;
    while 1 < step {
        facets.extend((0..sides).step_by(step).map(|k| [k, k + step / 2, k + step].map(at)));
        step /= 2;
    }
    facets
}

/// A flat ring in z = 0 between two radii, normals up: 2 · rings · columns facets.
pub(crate) fn annulus_sheet(inner: f64, outer: f64, rings: usize, columns: usize) -> Vec<Facet> {
    let profile: Vec<[f64; 2]> =
        (0..=rings).map(|k| [outer + (inner - outer) * k as f64 / rings as f64, 0.0]).collect();
    revolved(&profile, columns)
}

/// A round tube without wall thickness and without ends, centred, normals outward: 2 · rings · columns.
pub(crate) fn tube_sheet(radius: f64, length: f64, rings: usize, columns: usize) -> Vec<Facet> {
    let profile: Vec<[f64; 2]> =
        (0..=rings).map(|k| [radius, length * (k as f64 / rings as f64 - 0.5)]).collect();
    revolved(&profile, columns)
}

/// An anchor ring about z: `major` from the axis to the centre of the tube, `minor` its radius:
/// 2 · columns · sides facets.
pub(crate) fn torus(major: f64, minor: f64, columns: usize, sides: usize) -> Vec<Facet> {
    let mut profile: Vec<[f64; 2]> = (0..sides)
        .map(|k| {
            let angle = 2.0 * PI * k as f64 / sides as f64;
            [major + minor * angle.cos(), minor * angle.sin()]
        })
        .collect();
    profile.push(profile[0]);
    revolved(&profile, columns)
}

/// A cylinder of radius 1 and `straight` length with a half ball on each end, centred.
///
/// `rings` steps over each half ball, `belts` along the straight part.
pub(crate) fn capsule(straight: f64, rings: usize, belts: usize, columns: usize) -> Vec<Facet> {
    let arc = |k: usize| 0.5 * PI * k as f64 / rings as f64;
    let mut profile: Vec<[f64; 2]> =
        (0..=rings).map(|k| [arc(k).sin(), -0.5 * straight - arc(k).cos()]).collect();
    profile.extend((1..belts).map(|k| [1.0, straight * (k as f64 / belts as f64 - 0.5)]));
    profile.extend((0..=rings).map(|k| [arc(k).cos(), 0.5 * straight + arc(k).sin()]));
    on_axis_ends(&mut profile);
    revolved(&profile, columns)
}

/// A solid cylinder, centred; `rings` steps over each end, `belts` along the side.
pub(crate) fn cylinder(radius: f64, length: f64, rings: usize, belts: usize, columns: usize) -> Vec<Facet> {
    let part = |k: usize, n: usize| k as f64 / n as f64;
    let mut profile: Vec<[f64; 2]> = (0..=rings).map(|k| [radius * part(k, rings), -0.5 * length]).collect();
    profile.extend((1..=belts).map(|k| [radius, length * (part(k, belts) - 0.5)]));
    profile.extend((1..=rings).map(|k| [radius * (1.0 - part(k, rings)), 0.5 * length]));
    on_axis_ends(&mut profile);
    revolved(&profile, columns)
}

/// A cone standing on its base in z = 0, tip up; `rings` steps over the base, `belts` up the side.
pub(crate) fn cone(base_radius: f64, height: f64, rings: usize, belts: usize, columns: usize) -> Vec<Facet> {
    let part = |k: usize, n: usize| k as f64 / n as f64;
    let mut profile: Vec<[f64; 2]> = (0..=rings).map(|k| [base_radius * part(k, rings), 0.0]).collect();
    profile.extend((1..=belts).map(|k| [base_radius * (1.0 - part(k, belts)), height * part(k, belts)]));
    on_axis_ends(&mut profile);
    revolved(&profile, columns)
}

/// A closed ball of metal with a concentric cavity: the outer wall, then the wall of the cavity with
/// its normals into the cavity; 40 n² facets.
pub(crate) fn vessel(cavity_radius: f64, outer_radius: f64, n: usize) -> Vec<Facet> {
    let mut facets = scaled(&icosphere(n), outer_radius);
    facets.extend(flipped(&scaled(&icosphere(n), cavity_radius)));
    facets
}

/// The surface swept by a profile of (distance from the axis, z) turned about z.
///
/// Walk the profile with the metal on the left (upward along an outer wall), and the normals point
/// outward.  Points on the axis become apexes.
pub(crate) fn revolved(profile: &[[f64; 2]], columns: usize) -> Vec<Facet> {
    let at = |[r, z]: [f64; 2], column: usize| {
        let angle = 2.0 * PI * (column % columns) as f64 / columns as f64;
        Vec3::new(r * angle.cos(), r * angle.sin(), z)
    };
    let on_axis = |p: [f64; 2]| p[0] <= 0.0;
    let mut facets = Vec::new();
    for pair in profile.windows(2) {
        for column in 0..columns {
            let quad =
                [at(pair[0], column), at(pair[0], column + 1), at(pair[1], column + 1), at(pair[1], column)];
            match (on_axis(pair[0]), on_axis(pair[1])) {
                (false, false) => push_quad(&mut facets, quad),
                (true, false) => facets.push([quad[0], quad[2], quad[3]]),
                (false, true) => facets.push([quad[0], quad[1], quad[3]]),
                (true, true) => {}
            }
        }
    }
    facets
}

/// Every corner sent through `map`.
pub(crate) fn mapped(facets: &[Facet], map: impl Fn(&Vec3) -> Vec3) -> Vec<Facet> {
    facets.iter().map(|corners| [map(&corners[0]), map(&corners[1]), map(&corners[2])]).collect()
}

/// Shifted by `by`.
pub(crate) fn moved(facets: &[Facet], by: [f64; 3]) -> Vec<Facet> {
    mapped(facets, |p| p + Vec3::from(by))
}

/// Scaled about the origin.
pub(crate) fn scaled(facets: &[Facet], by: f64) -> Vec<Facet> {
    mapped(facets, |p| p * by)
}

/// Turned about an axis through the origin by the angle [rad].
pub(crate) fn turned(facets: &[Facet], axis: [f64; 3], angle: f64) -> Vec<Facet> {
    let axis = Vec3::from(axis).normalize();
    // Rodrigues' rotation formula.
    mapped(facets, |p| {
        p * angle.cos() + axis.cross(p) * angle.sin() + axis * (axis.dot(p) * (1.0 - angle.cos()))
    })
}

/// Mirrored at the plane z = 0, normals outward again.
pub(crate) fn mirrored(facets: &[Facet]) -> Vec<Facet> {
    flipped(&mapped(facets, |p| Vec3::new(p.x, p.y, -p.z)))
}

/// The other side out.
pub(crate) fn flipped(facets: &[Facet]) -> Vec<Facet> {
    facets.iter().map(|&[a, b, c]| [a, c, b]).collect()
}

/// Corners rounded to single precision, as an STL file holds them.
pub(crate) fn rounded(facets: &[Facet]) -> Vec<Facet> {
    mapped(facets, |p| p.map(|x| f64::from(x as f32)))
}

/// The facets as a binary STL file, corners in single precision, normals zero.
pub(crate) fn binary_stl(facets: &[Facet]) -> Vec<u8> {
    let mut bytes = vec![b' '; 80];
    bytes.extend((facets.len() as u32).to_le_bytes());
    for corners in facets {
        bytes.extend([0; 12]);
        for x in corners.iter().flat_map(|corner| corner.iter()) {
            bytes.extend((*x as f32).to_le_bytes());
        }
        bytes.extend([0; 2]);
    }
    bytes
}

/// The facets as one ASCII STL solid, corners in single precision, normals zero.
pub(crate) fn ascii_stl(name: &str, facets: &[Facet]) -> String {
    let mut text = format!("solid {name}\n");
    for corners in facets {
        text += "  facet normal 0 0 0\n    outer loop\n";
        for p in corners {
            text += &format!("      vertex {:e} {:e} {:e}\n", p.x as f32, p.y as f32, p.z as f32);
        }
        text += "    endloop\n  endfacet\n";
    }
    text + &format!("endsolid {name}\n")
}

/// Sum of the areas.
pub(crate) fn area(facets: &[Facet]) -> f64 {
    facets.iter().map(|[a, b, c]| 0.5 * (b - a).cross(&(c - a)).norm()).sum()
}

/// Enclosed volume, by the divergence theorem; negative if the normals point inward.
pub(crate) fn volume(facets: &[Facet]) -> f64 {
    facets.iter().map(|[a, b, c]| a.dot(&b.cross(c)) / 6.0).sum()
}

/// Edges that do not meet exactly one edge of the opposite direction, corners compared to 1e-9.
pub(crate) fn open_edges(facets: &[Facet]) -> usize {
    let key = |p: &Vec3| p.map(|x| (x * 1e9).round() as i64);
    let mut counts = HashMap::new();
    for corners in facets {
        for k in 0..3 {
            let (from, to) = (key(&corners[k]), key(&corners[(k + 1) % 3]));
            *counts.entry((from, to)).or_insert(0) += 1;
        }
    }
    counts.iter().filter(|&(&(from, to), &n)| n != 1 || counts.get(&(to, from)) != Some(&1)).count()
}

/// Corners, and facets as triples of their indices.
type Net = (Vec<Vec3>, Vec<[usize; 3]>);

fn resolve((corners, facets): &Net) -> Vec<Facet> {
    facets.iter().map(|ids| ids.map(|id| corners[id])).collect()
}

/// The icosahedron with each face cut into n², corners pushed out to the sphere.
fn ico_net(n: usize) -> Net {
    let (mut corners, mut facets, mut known) = (Vec::new(), Vec::new(), HashMap::new());
    for [a, b, c] in icosahedron() {
        let mut id = |i: usize, j: usize| {
            let k = n - i - j;
            let p = ((a * k as f64 + b * i as f64 + c * j as f64) / n as f64).normalize();
            *known.entry(p.map(|x| (x * 1e9).round() as i64)).or_insert_with(|| {
                corners.push(p);
                corners.len() - 1
            })
        };
        for i in 0..n {
            for j in 0..n - i {
                facets.push([id(i, j), id(i + 1, j), id(i, j + 1)]);
                if i + j + 1 < n {
                    facets.push([id(i + 1, j), id(i + 1, j + 1), id(i, j + 1)]);
                }
            }
        }
    }
    (corners, facets)
}

/// The 20 faces of the icosahedron with corners on the unit sphere.
fn icosahedron() -> Vec<Facet> {
    let g = (1.0 + 5.0_f64.sqrt()) / 2.0;
    let mut corners = Vec::new();
    for s in [1.0, -1.0] {
        for t in [1.0, -1.0] {
            corners.extend([Vec3::new(0.0, s, t * g), Vec3::new(s, t * g, 0.0), Vec3::new(t * g, 0.0, s)]);
        }
    }
    let near = |p: Vec3, q: Vec3| (p - q).norm() < 2.1;
    let mut faces = Vec::new();
    for i in 0..12 {
        for j in i + 1..12 {
            for k in j + 1..12 {
                let [a, b, c] = [corners[i], corners[j], corners[k]];
                if near(a, b) && near(b, c) && near(c, a) {
                    let outward = 0.0 < a.dot(&b.cross(&c));
                    faces.push(if outward { [a, b, c] } else { [a, c, b] }.map(|p| p.normalize()));
                }
            }
        }
    }
    faces
}

fn push_quad(facets: &mut Vec<Facet>, [a, b, c, d]: [Vec3; 4]) {
    facets.push([a, b, c]);
    facets.push([a, c, d]);
}

/// Sets the first and last point exactly on the axis, which the sine of π misses.
fn on_axis_ends(profile: &mut [[f64; 2]]) {
    let last = profile.len() - 1;
    profile[0][0] = 0.0;
    profile[last][0] = 0.0;
}

/// Splitmix64 (Steele, Lea, Flood, OOPSLA 2014): a few lines, the same digits everywhere.
pub(crate) struct Random(pub(crate) u64);

impl Random {
    /// Next 64 bits.
    pub(crate) fn bits(&mut self) -> u64 {
        self.0 = self.0.wrapping_add(0x9e37_79b9_7f4a_7c15);
        let mut z = self.0;
        z = (z ^ (z >> 30)).wrapping_mul(0xbf58_476d_1ce4_e5b9);
        z = (z ^ (z >> 27)).wrapping_mul(0x94d0_49bb_1331_11eb);
        z ^ (z >> 31)
    }

    /// Uniform in [0, 1).
    pub(crate) fn unit(&mut self) -> f64 {
        (self.bits() >> 11) as f64 / (1_u64 << 53) as f64
    }

    /// Uniform in [−1, 1).
    pub(crate) fn signed(&mut self) -> f64 {
        2.0 * self.unit() - 1.0
    }
}

#[track_caller]
fn assert_near(found: f64, exact: f64, rel_tol: f64) {
    assert!((found - exact).abs() <= rel_tol * exact.abs(), "found {found}, exact {exact}");
}

/// Name, facets, their number, exact area and volume, and the relative deviation that inscribed
/// facets of this number may have.
type Known = (&'static str, Vec<Facet>, usize, f64, f64, f64);

fn closed_bodies() -> Vec<Known> {
    let ball = (4.0 * PI, 4.0 / 3.0 * PI);
    // Surface of a prolate spheroid: 2πb² + 2πab·asin(e)/e, of an oblate one with polar half axis c:
    // 2πb² + πc²/e·ln((1+e)/(1−e)).
    let (e, o) = (0.99_f64.sqrt(), 0.75_f64.sqrt());
    let prolate = (2.0 * PI + 20.0 * PI * e.asin() / e, 40.0 / 3.0 * PI);
    let oblate = (2.0 * PI + PI * 0.25 / o * ((1.0 + o) / (1.0 - o)).ln(), 4.0 / 3.0 * PI * 0.5);
    vec![
        ("icosphere", icosphere(11), 2420, ball.0, ball.1, 5e-3),
        ("jittered icosphere", jittered_icosphere(11, 7), 2420, ball.0, ball.1, 6e-3),
        ("sphere of meridians", meridian_sphere(25, 50), 2400, ball.0, ball.1, 7e-3),
        ("prolate spheroid", spheroid(1.0, 10.0, 30, 42), 2436, prolate.0, prolate.1, 1.2e-2),
        ("oblate spheroid", spheroid(1.0, 0.5, 30, 42), 2436, oblate.0, oblate.1, 7e-3),
        ("block", cuboid([1.0, 2.0, 3.0], 1), 12, 22.0, 6.0, 1e-14),
        ("block, finer", cuboid([1.0, 2.0, 3.0], 4), 192, 22.0, 6.0, 1e-14),
        ("torus", torus(3.0, 1.0, 72, 24), 3456, 12.0 * PI * PI, 6.0 * PI * PI, 1.3e-2),
        ("capsule", capsule(2.0, 12, 8, 48), 2976, 8.0 * PI, 10.0 / 3.0 * PI, 5e-3),
        ("cylinder", cylinder(1.0, 2.0, 4, 8, 64), 1920, 6.0 * PI, 2.0 * PI, 1.7e-3),
        ("cone", cone(1.0, 1.0, 4, 8, 64), 1408, PI * (1.0 + 2.0_f64.sqrt()), PI / 3.0, 1.7e-3),
        ("vessel", vessel(2.0, 3.0, 8), 2560, 52.0 * PI, 76.0 / 3.0 * PI, 9e-3),
    ]
}

#[test]
fn closed_bodies_have_the_area_and_volume_of_their_closed_forms() {
    for (name, facets, n, exact_area, exact_volume, rel_tol) in closed_bodies() {
        assert_eq!(facets.len(), n, "{name}: facets");
        assert_eq!(open_edges(&facets), 0, "{name}: open edges");
        assert_near(area(&facets), exact_area, rel_tol);
        assert_near(volume(&facets), exact_volume, rel_tol);
    }
}

#[test]
fn sheets_have_their_area_and_face_up() {
    let sheets = [
        ("rectangle", rect_sheet(2.0, 3.0, 1, 1), 2, 6.0, 1e-14),
        ("disc", disc_sheet(20), 2400, PI, 5e-4),
        ("polygon", polygon_sheet(6), 190, PI, 2e-4),
        ("ring", annulus_sheet(1.0, 2.0, 6, 90), 1080, 3.0 * PI, 1e-3),
    ];
    for (name, facets, n, exact_area, rel_tol) in sheets {
        assert_eq!(facets.len(), n, "{name}: facets");
        assert!(0 < open_edges(&facets), "{name} must have a rim");
        assert_near(area(&facets), exact_area, rel_tol);
        for [a, b, c] in &facets {
            assert!(0.0 < (b - a).cross(&(c - a)).z, "{name}: a facet faces down");
        }
    }
    assert_near(area(&tube_sheet(1.0, 2.0, 8, 90)), 4.0 * PI, 1e-3);
}

#[test]
fn corners_of_balls_and_spheroids_lie_on_the_surface() {
    for (facets, [x, y, z]) in [
        (jittered_icosphere(6, 3), [1.0, 1.0, 1.0]),
        (spheroid(1.0, 10.0, 20, 24), [1.0, 1.0, 10.0]),
        (ellipsoid([3.0, 2.0, 1.0], 5), [3.0, 2.0, 1.0]),
    ] {
        for p in facets.iter().flatten() {
            let level = (p.x / x).powi(2) + (p.y / y).powi(2) + (p.z / z).powi(2);
            assert_near(level, 1.0, 1e-14);
        }
    }
}

#[test]
fn placing_keeps_size_and_side() {
    let body = cone(1.0, 2.0, 2, 3, 12);
    let exact = volume(&body);
    assert_near(volume(&moved(&turned(&body, [1.0, 2.0, 3.0], 0.7), [5.0, -4.0, 3.0])), exact, 1e-13);
    assert_near(volume(&mirrored(&body)), exact, 1e-14);
    assert_near(volume(&flipped(&body)), -exact, 1e-14);
    assert_near(volume(&scaled(&body, 2.0)), 8.0 * exact, 1e-14);
    assert_eq!(open_edges(&rounded(&icosphere(4))), 0);
}

#[test]
fn files_hold_the_corners_in_single_precision() {
    let facets = icosphere(2);
    let bytes = binary_stl(&facets);
    assert_eq!(bytes.len(), 84 + 50 * 80);
    let x = f32::from_le_bytes(bytes[96..100].try_into().unwrap());
    assert_eq!(f64::from(x).to_bits(), rounded(&facets)[0][0].x.to_bits());
    let text = ascii_stl("ball", &facets);
    assert_eq!(text.matches("vertex").count(), 240);
    let first = text.lines().find(|line| line.contains("vertex")).unwrap();
    let y: f64 = first.split_whitespace().nth(2).unwrap().parse().unwrap();
    assert_eq!((y as f32).to_bits(), (facets[0][0].y as f32).to_bits());
}
