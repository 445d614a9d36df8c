//! Distances, intersections, the tree of boxes and the winding number.

use crate::bodies;
use crate::bodies::vec3;
use amberskin::base::Vec3;
use amberskin::geom::Bounds;
use amberskin::geom::Triangle;
use amberskin::geom::distance;
use amberskin::geom::intersect;
use amberskin::geom::intersect::Meeting;
use amberskin::geom::tree;
use amberskin::geom::winding;

/// A reproducible sequence of numbers in [0, 1): Knuth's linear congruence (The Art of Computer
/// Programming 2, section 3.3.4), upper bits.
struct Dice(u64);

impl Dice {
    fn next(&mut self) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        (self.0 >> 11) as f64 / (1_u64 << 53) as f64
    }

    fn point(&mut self) -> Vec3 {
        vec3(self.next(), self.next(), self.next())
    }

    fn triangle(&mut self) -> Triangle {
        Triangle::new([self.point(), self.point(), self.point()])
    }
}

/// Inside and outside of a sphere and a torus are known in closed form; points closer to the
/// surface than the facets are off it are passed over.
#[test]
fn the_winding_number_tells_inside_from_outside() {
    let mut dice = Dice(1);
    let torus = bodies::triangles(&bodies::torus(1.0, 0.4, 64, 32));
    let sphere = bodies::triangles(&bodies::sphere(Vec3::zeros(), 1.0, 48, 24));
    let (fast_torus, fast_sphere) = (winding::prepare(torus.clone()), winding::prepare(sphere.clone()));
    let (mut inside, mut worst) = (0, 0.0_f64);
    for _ in 0..2_000 {
        let x = (dice.point() - Vec3::repeat(0.5)) * 3.2;
        let to_torus = 0.4 - ((x.x.hypot(x.y) - 1.0).hypot(x.z));
        let to_sphere = 1.0 - x.norm();
        for (depth, facets, fast) in [(to_torus, &torus, &fast_torus), (to_sphere, &sphere, &fast_sphere)] {
            if 0.01 < depth.abs() {
                assert_eq!(winding::holds(facets, &x), 0.0 < depth, "{x:?}");
                assert_eq!(fast.holds(&x), 0.0 < depth, "{x:?}");
                worst = worst.max((fast.at(&x) - winding::winding_number(facets, &x)).abs());
                inside += usize::from(0.0 < depth);
            }
        }
    }
    assert!(200 < inside, "only {inside} points inside");
    assert!(worst < 0.03, "clusters off by {worst}");
}

/// The wall of a cavity winds the other way round: −1 alone, 0 with the vessel around it.
#[test]
fn a_cavity_is_outside() {
    let outer = bodies::cuboid(Vec3::zeros(), Vec3::repeat(3.0), 1);
    let inner = bodies::flipped(&bodies::cuboid(Vec3::repeat(1.0), Vec3::repeat(2.0), 1));
    let middle = Vec3::repeat(1.5);
    assert!((winding::winding_number(&bodies::triangles(&inner), &middle) + 1.0).abs() < 1e-14, "wall alone");
    let both = bodies::triangles(&[outer, inner].concat());
    assert!(winding::winding_number(&both, &middle).abs() < 1e-14, "in the cavity");
    assert!((winding::winding_number(&both, &Vec3::repeat(0.5)) - 1.0).abs() < 1e-14, "in the metal");
}

/// A triangle as a cloud of points a given spacing apart.
fn cloud(t: &Triangle, n: usize) -> Vec<Vec3> {
    let mut points = Vec::new();
    for i in 0..=n {
        for j in 0..=n - i {
            let (a, b) = (i as f64 / n as f64, j as f64 / n as f64);
            points.push(t.at([a, b, 1.0 - a - b]));
        }
    }
    points
}

/// No sampled point comes closer, and some come as close as the spacing allows.
#[test]
fn distances_agree_with_sampling() {
    let (mut dice, n) = (Dice(2), 24);
    for _ in 0..40 {
        let (s, mut t) = (dice.triangle(), dice.triangle());
        let shift = (dice.point() - Vec3::repeat(0.5)) * 3.0;
        t.corners.iter_mut().for_each(|c| *c += shift);
        let found = distance::triangles(&s, &t);
        let (p, q) = (cloud(&s, n), cloud(&t, n));
        let sampled = p.iter().flat_map(|p| q.iter().map(move |q| (p - q).norm())).fold(f64::MAX, f64::min);
        let spacing = (s.longest_edge() + t.longest_edge()) / n as f64;
        let exact = found.distance_sq.sqrt();
        assert!(exact <= sampled + 1e-12, "{exact} above {sampled}");
        assert!(sampled <= exact + spacing, "{sampled} far above {exact}");
        let apart = (found.on_first - found.on_second).norm();
        assert!((apart - exact).abs() < 1e-12, "the two places are {apart} apart, not {exact}");
        let off = (distance::point_of_triangle(&s, &found.on_first) - found.on_first).norm();
        assert!(off < 1e-9, "the place is {off} off its triangle");
    }
}

/// Point above a corner, an edge and the face of a right triangle: Pythagoras.
#[test]
fn distance_of_a_point_from_corner_edge_and_face() {
    let t = Triangle::new([vec3(0.0, 0.0, 0.0), vec3(4.0, 0.0, 0.0), vec3(0.0, 3.0, 0.0)]);
    let distance = |x: Vec3| (distance::point_of_triangle(&t, &x) - x).norm();
    assert!((distance(vec3(-3.0, -4.0, 12.0)) - 13.0).abs() < 1e-14, "corner");
    assert!((distance(vec3(2.0, -3.0, 4.0)) - 5.0).abs() < 1e-14, "edge");
    assert!((distance(vec3(1.0, 1.0, -2.0)) - 2.0).abs() < 1e-14, "face");
    let flat = Triangle::new([vec3(0.0, 0.0, 0.0), vec3(1.0, 0.0, 0.0), vec3(4.0, 0.0, 0.0)]);
    let x = distance::point_of_triangle(&flat, &vec3(7.0, 4.0, 0.0));
    assert!((x - vec3(4.0, 0.0, 0.0)).norm() < 1e-14, "a triangle without area is its longest edge");
}

/// Two unit right triangles in one plane that share a square of side 1/4, and shifted ones.
#[test]
fn coplanar_triangles_share_the_area_computed_by_hand() {
    let first = Triangle::new([vec3(0.0, 0.0, 0.0), vec3(1.0, 0.0, 0.0), vec3(0.0, 1.0, 0.0)]);
    let second = Triangle::new([vec3(0.25, 0.25, 0.0), vec3(-0.75, 0.25, 0.0), vec3(0.25, -0.75, 0.0)]);
    let Meeting::Coplanar { area, middle } = intersect::triangles(&first, &second, 1e-9) else {
        panic!("they lie in each other")
    };
    assert!((area - 0.0625).abs() < 1e-15, "area {area}");
    assert!((middle - vec3(0.125, 0.125, 0.0)).norm() < 1e-15, "middle {middle:?}");
    let lifted = Triangle::new(second.corners.map(|c| c + vec3(0.0, 0.0, 1e-6)));
    assert_eq!(intersect::triangles(&first, &lifted, 1e-9), Meeting::Apart);
}

#[test]
fn crossing_triangles_share_a_segment_and_touching_ones_none() {
    let first = Triangle::new([vec3(-1.0, -1.0, 0.0), vec3(3.0, -1.0, 0.0), vec3(-1.0, 3.0, 0.0)]);
    let upright = Triangle::new([vec3(0.0, 0.0, -1.0), vec3(0.0, 0.0, 1.0), vec3(1.0, 0.0, 0.0)]);
    let Meeting::Crossing([p, q]) = intersect::triangles(&first, &upright, 1e-9) else {
        panic!("they cross")
    };
    assert!(((p - q).norm() - 1.0).abs() < 1e-15, "from {p:?} to {q:?}");
    let standing = Triangle::new(upright.corners.map(|c| c + vec3(0.0, 0.0, 1.0)));
    assert_eq!(intersect::triangles(&first, &standing, 1e-9), Meeting::Apart);
}

#[test]
fn the_tree_finds_what_looking_at_everything_finds() {
    let mut dice = Dice(3);
    let boxes: Vec<Bounds> = (0..1_000)
        .map(|_| {
            let (p, s) = (dice.point(), dice.point() * 0.05);
            Bounds { lo: p, hi: p + s }
        })
        .collect();
    let tree = tree::build(&boxes);
    for probe in boxes.iter().step_by(37) {
        let mut found = Vec::new();
        tree.meeting(probe, |i| {
            found.push(i);
            true
        });
        found.sort_unstable();
        let all: Vec<usize> = (0..boxes.len()).filter(|&i| boxes[i].meets(probe)).collect();
        assert_eq!(found, all);
    }
    let others: Vec<Bounds> = boxes
        .iter()
        .map(|b| Bounds { lo: b.lo + vec3(1.2, 0.3, 0.0), hi: b.hi + vec3(1.2, 0.3, 0.0) })
        .collect();
    let mut best = f64::MAX;
    tree.closest(&tree::build(&others), f64::MAX, usize::MAX, |i, j, _| {
        best = best.min(boxes[i].distance_sq(&others[j]));
        boxes[i].distance_sq(&others[j])
    });
    let all = boxes.iter().flat_map(|a| others.iter().map(|b| a.distance_sq(b))).fold(f64::MAX, f64::min);
    assert!(best <= all && all <= best, "{best} against {all}");
}
