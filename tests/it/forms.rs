//! Planes, cylinders, cones, spheres and tori recognised on facets whose true forms are known.
use crate::shapes;
use crate::shapes::Facet;
use amberskin::geom::Triangle;
use amberskin::mesh::Welded;
use amberskin::mesh::accept;
use amberskin::mesh::borders::Curve;
use amberskin::mesh::form::Form;
use amberskin::mesh::recognise::Patches;
use amberskin::mesh::recognise::recognise;
use amberskin::mesh::smooth::CREASE_ANGLE;
use std::f64::consts::FRAC_PI_2;
use std::f64::consts::PI;

/// A drawn body turned at random, rounded to single precision, and what was recognised on it.
struct Known {
    welded: Welded,
    patches: Patches,
}

/// Turns and rounds the facets, welds them as a case does, and recognises.
fn known(facets: &[Facet], sheet: bool) -> Known {
    let turned = shapes::rounded(&shapes::turned(facets, [0.3, -0.7, 0.5], 1.1));
    let (surface, _) = accept::body(&turned, sheet, "part").unwrap();
    let patches = recognise(&surface.welded, CREASE_ANGLE);
    Known { welded: surface.welded, patches }
}

impl Known {
    fn area(&self, is: impl Fn(&Form) -> bool) -> f64 {
        let facets = self.welded.facets.iter().zip(&self.patches.of_facet);
        facets
            .filter(|(_, k)| is(&self.patches.forms[**k as usize]))
            .map(|(f, _)| Triangle::new(f.map(|k| self.welded.points[k as usize])).area())
            .sum()
    }

    /// Share of the area on forms that `is` describes [1].
    fn share(&self, is: impl Fn(&Form) -> bool) -> f64 {
        self.area(is) / self.area(|_| true)
    }

    fn count(&self, is: impl Fn(&Form) -> bool) -> usize {
        self.patches.forms.iter().filter(|f| is(f)).count()
    }
}

fn is_plane(form: &Form) -> bool {
    matches!(form, Form::Plane { .. })
}

fn is_free(form: &Form) -> bool {
    matches!(form, Form::Free)
}

fn is_sphere(of: f64, inside: f64) -> impl Fn(&Form) -> bool {
    move |form| matches!(form, Form::Sphere { radius, sign, .. } if near(*radius, of) && near(*sign, inside))
}

fn is_cylinder(of: f64, inside: f64) -> impl Fn(&Form) -> bool {
    move |form| matches!(form, Form::Cylinder { radius, sign, .. } if near(*radius, of) && near(*sign, inside))
}

fn is_torus(ring: f64, tube: f64) -> impl Fn(&Form) -> bool {
    move |form| matches!(form, Form::Torus { major, minor, .. } if near(*major, ring) && near(*minor, tube))
}

/// Within 1e-4: single precision of corners on a fillet of a twentieth of the part.
fn near(a: f64, b: f64) -> bool {
    (a - b).abs() <= 1e-4 * b.abs()
}

/// Points of an arc of the meridian about `c`, without the first.
fn arc(c: [f64; 2], radius: f64, from: f64, to: f64, steps: usize) -> Vec<[f64; 2]> {
    let at = |k: usize| from + (to - from) * k as f64 / steps as f64;
    (1..=steps).map(|k| [c[0] + radius * at(k).cos(), c[1] + radius * at(k).sin()]).collect()
}

/// A round bar of radius `r` and height `h` with both rims rounded by `f` in `steps` strips.
fn rounded_bar(r: f64, h: f64, f: f64, steps: usize, columns: usize) -> Vec<Facet> {
    let mut profile = vec![[0.0, 0.0], [r - f, 0.0]];
    profile.extend(arc([r - f, f], f, -FRAC_PI_2, 0.0, steps));
    profile.push([r, h - f]);
    profile.extend(arc([r - f, h - f], f, 0.0, FRAC_PI_2, steps));
    profile.push([0.0, h]);
    shapes::revolved(&profile, columns)
}

#[test]
fn balls_are_spheres() {
    let balls = [
        shapes::icosphere(2),
        shapes::icosphere(8),
        shapes::jittered_icosphere(4, 7),
        shapes::jittered_icosphere(12, 3),
        shapes::meridian_sphere(12, 24),
        shapes::meridian_sphere(40, 64),
    ];
    for facets in &balls {
        let ball = known(&shapes::moved(facets, [0.4, 0.1, -0.3]), false);
        assert!(
            near(ball.share(is_sphere(1.0, 1.0)), 1.0),
            "{} facets: {:?}",
            facets.len(),
            ball.patches.forms
        );
        assert_eq!(ball.patches.forms.len(), 1, "one patch of {} facets", facets.len());
        assert!(ball.patches.borders.is_empty(), "a ball has no borders");
    }
}

#[test]
fn flat_sided_bodies_are_planes() {
    for n in [1, 10, 31] {
        let cube = known(&shapes::cuboid([1.0, 2.0, 3.0], n), false);
        assert_eq!(cube.count(is_plane), 6, "faces of a block of {n}² cells a face");
        assert_eq!(cube.patches.forms.len(), 6, "patches");
        assert_eq!(cube.patches.curves.len(), 12, "edges");
        assert!(cube.patches.curves.iter().all(|c| *c == Curve::Line), "straight edges");
    }
    let octagon = known(&shapes::cylinder(1.0, 3.0, 1, 1, 8), false);
    assert_eq!(octagon.count(is_plane), 10, "an octagonal bar stays: {:?}", octagon.patches.forms);
    assert_eq!(octagon.patches.forms.len(), 10, "patches of an octagonal bar");
}

#[test]
fn bars_and_cones_with_sharp_rims() {
    for columns in [12, 36, 100] {
        let bar = known(&shapes::cylinder(1.0, 3.0, 1, 1, columns), false);
        assert_eq!(bar.count(is_cylinder(1.0, 1.0)), 1, "{columns} columns: {:?}", bar.patches.forms);
        assert_eq!((bar.count(is_plane), bar.patches.forms.len()), (2, 3), "{columns} columns");
        let arcs = bar
            .patches
            .curves
            .iter()
            .filter(|c| matches!(c, Curve::Arc { radius, .. } if near(*radius, 1.0)));
        assert_eq!((arcs.count(), bar.patches.curves.len()), (2, 2), "rims of {columns} sides");
        let cone = known(&shapes::cone(1.0, 2.0, 1, 1, columns), false);
        let is_cone = |f: &Form| matches!(f, Form::Cone { half_angle, .. } if near(half_angle.tan(), 0.5));
        assert_eq!((cone.count(is_cone), cone.count(is_plane)), (1, 1), "{:?}", cone.patches.forms);
        let stump =
            known(&shapes::revolved(&[[0.0, 0.0], [1.0, 0.0], [0.5, 1.0], [0.0, 1.0]], columns), false);
        assert_eq!((stump.count(is_cone), stump.count(is_plane)), (1, 2), "{:?}", stump.patches.forms);
    }
}

#[test]
fn rounded_rims_are_tori() {
    for (steps, columns) in [(3, 24), (4, 48), (8, 64)] {
        let bar = known(&rounded_bar(1.0, 2.0, 0.2, steps, columns), false);
        let found = [bar.count(is_plane), bar.count(is_cylinder(1.0, 1.0)), bar.count(is_torus(0.8, 0.2))];
        assert_eq!(found, [2, 1, 2], "{steps} strips, {columns} columns: {:?}", bar.patches.forms);
        assert_eq!(bar.patches.forms.len(), 5, "{steps} strips, {columns} columns: patches");
        let arcs = bar.patches.curves.iter().filter(|c| matches!(c, Curve::Arc { .. })).count();
        assert_eq!((arcs, bar.patches.curves.len()), (4, 4), "{steps} strips: circles between the forms");
    }
    let ring = known(&shapes::torus(2.0, 0.5, 48, 24), false);
    assert_eq!(
        (ring.count(is_torus(2.0, 0.5)), ring.patches.forms.len()),
        (1, 1),
        "{:?}",
        ring.patches.forms
    );
}

#[test]
fn a_capsule_is_two_spheres_and_a_cylinder() {
    let capsule = known(&shapes::capsule(2.0, 6, 1, 36), false);
    let found = [capsule.count(is_sphere(1.0, 1.0)), capsule.count(is_cylinder(1.0, 1.0))];
    assert_eq!(found, [2, 1], "{:?}", capsule.patches.forms);
    assert!(
        near(capsule.area(is_cylinder(1.0, 1.0)), 36.0 * 2.0 * (PI / 36.0).sin() * 2.0),
        "the straight part"
    );
}

#[test]
fn bodies_of_no_form_stay_free() {
    // The same push for the same corner, whichever facet asks.
    let noisy = shapes::mapped(&shapes::icosphere(8), |p| {
        let mixed = |h: u64, c: &f64| (h ^ (c + 2.0).to_bits()).wrapping_mul(0x9E37_79B9_7F4A_7C15);
        let mut random = shapes::Random(p.iter().fold(17, mixed));
        p * (1.0 + 0.003 * random.signed())
    });
    let bodies = [
        ("spheroid 2", shapes::spheroid(1.0, 2.0, 24, 36)),
        ("spheroid 1.1", shapes::spheroid(1.0, 1.1, 24, 36)),
        ("spheroid 1/3", shapes::spheroid(1.0, 1.0 / 3.0, 40, 64)),
        ("spheroid of an icosphere", shapes::ellipsoid([1.0, 1.0, 1.4], 12)),
        ("ellipsoid", shapes::ellipsoid([1.0, 1.3, 1.7], 8)),
        ("noisy ball", noisy),
    ];
    for (name, facets) in &bodies {
        let body = known(facets, false);
        let share = body.share(is_free);
        assert!(0.99 < share, "{name}: {share} free of {:?}", body.patches.forms);
    }
}
