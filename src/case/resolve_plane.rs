//! Earth planes and mirrors: where they are, what they do, and that they stand at right angles.

use crate::base::ImagePlane;
use crate::base::Images;
use crate::base::ImagesError;
use crate::base::Plane;
use crate::base::PlaneKind;
use crate::base::Vec3;
use crate::case::EarthPlane;
use crate::case::Mirror;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::resolve_electrode as electrode;
use crate::case::resolve_value as value;
use crate::case::wire;
use crate::case::wire::Field;
use std::ops::Range;
use toml::Spanned;

/// Earth planes, mirrors, and all of them as images.
pub(super) fn planes(
    file: &wire::File,
    unit: f64,
    sink: &mut Sink,
) -> (Vec<EarthPlane>, Vec<Mirror>, Images) {
    let many = 1 < file.earth_plane.len();
    let numbered = file.earth_plane.iter().enumerate();
    let earth_planes: Vec<EarthPlane> =
        numbered.map(|(n, wire)| earth_plane(wire, many.then_some(n), unit, sink)).collect();
    let mirrors: Vec<Mirror> = file.mirror.iter().map(|wire| mirror(wire, unit, sink)).collect();
    let spans: Vec<Range<usize>> =
        file.earth_plane.iter().map(Spanned::span).chain(file.mirror.iter().map(Spanned::span)).collect();
    let names: Vec<&str> = earth_planes
        .iter()
        .map(|earth| earth.name.as_str())
        .chain(mirrors.iter().map(|mirror| mirror.name.as_str()))
        .collect();
    for (n, name) in names.iter().enumerate() {
        if !name.is_empty() && names[..n].contains(name) {
            let what = "name of an earth plane or mirror";
            sink.note(spans[n].clone(), Fault::Twice { what, name: (*name).to_owned() });
        }
    }
    let images = images(&earth_planes, &mirrors, &spans, sink);
    (earth_planes, mirrors, images)
}

/// The planes as images; faults for planes that make endless ones.
fn images(earth: &[EarthPlane], mirrors: &[Mirror], spans: &[Range<usize>], sink: &mut Sink) -> Images {
    let of_mirror = |mirror: &Mirror| ImagePlane {
        plane: mirror.plane,
        kind: if mirror.even { PlaneKind::Even } else { PlaneKind::Odd },
    };
    let of_earth = |earth: &EarthPlane| ImagePlane { plane: earth.plane, kind: PlaneKind::Earth };
    let all: Vec<ImagePlane> = earth.iter().map(of_earth).chain(mirrors.iter().map(of_mirror)).collect();
    let told = |n: usize| match earth.get(n) {
        Some(earth) => format!("the earth plane `{}`", earth.name),
        None => format!("the mirror `{}`", mirrors[n - earth.len()].name),
    };
    // A plane without a readable direction is told of already.
    if all.iter().any(|plane| plane.plane.facing.norm() < 0.5) {
        return Images::none();
    }
    match Images::new(all) {
        Ok(images) => images,
        Err(error) => {
            let (n, fault) = match error {
                ImagesError::TooMany { count } => (count - 1, Fault::ManyPlanes { this: told(count - 1) }),
                ImagesError::Parallel { first, second } => {
                    (second, Fault::ParallelPlanes { this: told(second), other: told(first) })
                }
                ImagesError::Oblique { first, second, degrees } => {
                    (second, Fault::ObliquePlanes { this: told(second), other: told(first), degrees })
                }
            };
            sink.note(spans[n].clone(), fault);
            Images::none()
        }
    }
}

/// An earth plane; without a name it is called `plane`, or one of several `plane 1`, `plane 2`, ….
fn earth_plane(
    wire: &Spanned<wire::EarthPlane>,
    number: Option<usize>,
    unit: f64,
    sink: &mut Sink,
) -> EarthPlane {
    let (span, wire) = (wire.span(), wire.get_ref());
    let otherwise = number.map_or("plane".to_owned(), |n| format!("plane {}", n + 1));
    if wire.name.is_none() {
        sink.assume("earth_plane.name", &otherwise);
    }
    let name = value::text(&wire.name, "name", sink).unwrap_or(otherwise);
    let plane = place(&wire.through, &wire.facing, ("the [[earth_plane]]", span), unit, sink);
    EarthPlane { name, plane }
}

fn mirror(wire: &Spanned<wire::Mirror>, unit: f64, sink: &mut Sink) -> Mirror {
    let (span, wire) = (wire.span(), wire.get_ref());
    let name = value::needed_text(&wire.name, "name", ("a [[mirror]]", span.clone()), sink);
    let at = wire.name.as_ref().map_or(span.clone(), Spanned::span);
    electrode::check_name(&name, "a mirror", &at, sink);
    let table = format!("the mirror `{name}`");
    let wanted = "`even` (beyond it the same shapes at the same potentials) or `odd` (at the opposite ones)";
    value::needed(&wire.parity, "parity", wanted, (&table, span.clone()), sink);
    let even = value::choice(&wire.parity, "parity", &[("even", true), ("odd", false)], sink).unwrap_or(true);
    let plane = place(&wire.through, &wire.facing, (&table, span), unit, sink);
    Mirror { name, plane, even }
}

/// A plane from a point of it and its direction [m]; a direction that cannot be read is zero.
fn place(through: &Field, facing: &Field, here: (&str, Range<usize>), unit: f64, sink: &mut Sink) -> Plane {
    value::needed(through, "through", "a point of the plane, [x, y, z]", here.clone(), sink);
    value::needed(facing, "facing", "the direction from the plane to the electrodes", here, sink);
    Plane {
        through: value::vector(through, "through", unit, sink).unwrap_or_else(Vec3::zeros),
        facing: value::direction(facing, "facing", sink).unwrap_or_else(Vec3::zeros),
    }
}
