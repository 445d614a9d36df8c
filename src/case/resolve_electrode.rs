//! Electrodes, bonds and the earth plane: names, states and places.

use crate::base::Plane;
use crate::base::Vec3;
use crate::base::units;
use crate::base::units::Dimension;
use crate::case::EarthPlane;
use crate::case::Electrode;
use crate::case::Place;
use crate::case::Role;
use crate::case::Shell;
use crate::case::SurfaceKind;
use crate::case::ValueIs;
use crate::case::fault::Fault;
use crate::case::fault::Sink;
use crate::case::resolve_value as value;
use crate::case::wire;
use crate::case::wire::Value;
use crate::case::words::nearest;
use crate::mesh::smooth;
use std::f64::consts::PI;
use std::f64::consts::SQRT_2;
use toml::Spanned;

/// Names that stand for the 0 V reference, in lower case.
const RESERVED: [&str; 3] = ["0", "gnd", "earth"];

/// The name of the 0 V reference in `members` and `follows`.
pub(super) const EARTH: &str = "earth";

/// Words for the meaning of a value in time.
pub(super) const VALUE_IS: [(&str, ValueIs); 3] =
    [("peak", ValueIs::Peak), ("rms", ValueIs::Rms), ("dc", ValueIs::Dc)];

/// Crest value of a value of that meaning over the value [1].
pub(super) fn to_crest(value_is: ValueIs) -> f64 {
    match value_is {
        ValueIs::Peak | ValueIs::Dc => 1.0,
        ValueIs::Rms => SQRT_2,
    }
}

/// All electrodes; new shape files are added to `paths`.
pub(super) fn electrodes(
    wires: &[Spanned<wire::Electrode>],
    unit: f64,
    paths: &mut Vec<String>,
    sink: &mut Sink,
) -> Vec<Electrode> {
    let electrodes: Vec<Electrode> = wires.iter().map(|wire| electrode(wire, unit, paths, sink)).collect();
    for (n, electrode) in electrodes.iter().enumerate() {
        let span = wires[n].get_ref().name.as_ref().map_or(wires[n].span(), Spanned::span);
        check_name(&electrode.name, "an electrode", &span, sink);
        if electrode.name.contains('+') {
            let wanted = "a name without `+`, which joins the names of bonded electrodes that touch";
            let found = format!("{:?}", electrode.name);
            sink.note(span.clone(), Fault::Range { word: "name".to_owned(), found, wanted });
        }
        if electrodes[..n].iter().any(|other| other.name == electrode.name) && !electrode.name.is_empty() {
            sink.note(span, Fault::Twice { what: "electrode name", name: electrode.name.clone() });
        }
    }
    check_guards(wires, &electrodes, sink);
    electrodes
}

fn electrode(
    wire: &Spanned<wire::Electrode>,
    unit: f64,
    paths: &mut Vec<String>,
    sink: &mut Sink,
) -> Electrode {
    let (span, wire) = (wire.span(), wire.get_ref());
    let name = value::needed_text(&wire.name, "name", ("an [[electrode]]", span.clone()), sink);
    let table = format!("the electrode `{name}`");
    let here = (&*table, span);
    let shape_form = "the path of an STL file, or a list of paths";
    value::needed(&wire.shape, "shape", shape_form, here.clone(), sink);
    let files = files(wire, shape_form, paths, sink);
    let key = format!("electrode.{name}");
    Electrode {
        shell: shell(&wire.shell, files.len(), unit, sink),
        files,
        role: role(wire, here, &key, sink),
        sheet: value::flag(&wire.sheet, "sheet", sink).unwrap_or_else(|| {
            sink.assume(&format!("{key}.sheet"), "false");
            false
        }),
        crease_angle: crease_angle(&wire.crease_angle, &key, sink),
        surface: surface(&wire.surface, &key, sink),
        field_limit: field_limit(&wire.field_limit, sink),
        size_check: size_check(&wire.size_check, unit, sink),
        place: wire.place.as_ref().map(|place| self::place(place, unit, sink)),
        drawing: value::text(&wire.drawing, "drawing", sink),
        name,
    }
}

/// Notes a fault if a name is reserved or cannot be typed and printed.
pub(super) fn check_name(name: &str, what: &'static str, span: &std::ops::Range<usize>, sink: &mut Sink) {
    if RESERVED.contains(&name.to_lowercase().as_str()) {
        sink.note(span.clone(), Fault::Reserved { name: name.to_owned(), what });
    } else if name.trim() != name || name.chars().any(char::is_control) {
        let wanted = "a name on one line, without blanks before or after it";
        sink.note(span.clone(), Fault::Range { word: "name".to_owned(), found: format!("{name:?}"), wanted });
    }
}

fn files(
    wire: &wire::Electrode,
    wanted: &'static str,
    paths: &mut Vec<String>,
    sink: &mut Sink,
) -> Vec<usize> {
    let mut files = Vec::new();
    for (path, span) in value::texts(&wire.shape, "shape", wanted, sink) {
        let known = paths.iter().position(|known| *known == path);
        let index = known.unwrap_or(paths.len());
        if files.contains(&index) {
            sink.note(span, Fault::Twice { what: "shape file", name: path.clone() });
        }
        if known.is_none() {
            paths.push(path);
        }
        files.push(index);
    }
    if let Some(shape) = &wire.shape
        && matches!(shape.get_ref(), Value::List(items) if items.is_empty())
    {
        sink.note(shape.span(), Fault::Form { word: "shape".to_owned(), wanted });
    }
    files
}

fn shell(field: &wire::Field, n_files: usize, unit: f64, sink: &mut Sink) -> Option<Shell> {
    let at = field.as_ref()?;
    if 1 < n_files {
        let wanted = "one shape file only: list the files, or pick a shell of one";
        sink.note(at.span(), Fault::Form { word: "shell".to_owned(), wanted });
        return None;
    }
    if let Value::List(_) = at.get_ref() {
        return value::vector_of(at, "shell", unit, sink).map(Shell::Holding);
    }
    let wanted = "the number of the shell in the file, from 0, or a point [x, y, z] it holds";
    value::count_of(at, "shell", (0, 1_000_000, wanted), sink).map(Shell::Index)
}

#[derive(Clone, Copy)]
enum RoleWord {
    Live,
    Earthed,
    Floating,
    Guard,
}

const ROLES: [(&str, RoleWord); 4] = [
    ("live", RoleWord::Live),
    ("earthed", RoleWord::Earthed),
    ("floating", RoleWord::Floating),
    ("guard", RoleWord::Guard),
];

fn role(wire: &wire::Electrode, here: (&str, std::ops::Range<usize>), key: &str, sink: &mut Sink) -> Role {
    if wire.role.is_none() {
        sink.assume(&format!("{key}.role"), "live");
    }
    let word = value::choice(&wire.role, "role", &ROLES, sink);
    if let (Some(follows), Some(RoleWord::Live | RoleWord::Earthed | RoleWord::Floating) | None) =
        (&wire.follows, word)
    {
        sink.note(follows.span(), Fault::FollowsWithoutGuard);
    }
    match word {
        Some(RoleWord::Live) | None => Role::Live,
        Some(RoleWord::Earthed) => Role::Earthed,
        Some(RoleWord::Floating) => Role::Floating,
        Some(RoleWord::Guard) => {
            let wanted = "the name of the electrode whose potential the guard takes, or `earth`";
            value::needed(&wire.follows, "follows", wanted, here, sink);
            Role::Guard { follows: value::text(&wire.follows, "follows", sink).unwrap_or_default() }
        }
    }
}

fn surface(field: &wire::Field, key: &str, sink: &mut Sink) -> SurfaceKind {
    let kinds = [("rebuilt", SurfaceKind::Rebuilt), ("as_drawn", SurfaceKind::AsDrawn)];
    if field.is_none() {
        sink.assume(&format!("{key}.surface"), "rebuilt");
    }
    value::choice(field, "surface", &kinds, sink).unwrap_or(SurfaceKind::Rebuilt)
}

fn crease_angle(field: &wire::Field, key: &str, sink: &mut Sink) -> Option<f64> {
    if field.is_none() {
        let degrees = format!("{:.1} deg", smooth::CREASE_ANGLE.to_degrees());
        sink.assume(&format!("{key}.crease_angle"), &degrees);
    }
    let angle = value::quantity(field, "crease_angle", Dimension::Angle, sink)?;
    if 0.0 < angle && angle < PI {
        return Some(angle);
    }
    let at = field.as_ref()?;
    let (found, wanted) = (value::written(at.get_ref()), "an angle between 0 deg and 180 deg");
    sink.note(at.span(), Fault::Range { word: "crease_angle".to_owned(), found, wanted });
    None
}

/// The highest field allowed as a crest or steady value [V/m], and how it was given.
fn field_limit(field: &wire::Field, sink: &mut Sink) -> Option<(f64, ValueIs)> {
    let at = field.as_ref()?;
    let Value::Text(text) = at.get_ref() else {
        let example = "2.6 kV/mm peak";
        sink.note(at.span(), Fault::BareNumber { word: "field_limit".to_owned(), example });
        return None;
    };
    let split = text.trim().rsplit_once(char::is_whitespace);
    let meaning = split.and_then(|(quantity, word)| {
        VALUE_IS.iter().find(|(name, _)| *name == word).map(|(_, value_is)| (quantity, *value_is))
    });
    let Some((quantity, value_is)) = meaning else {
        sink.note(at.span(), Fault::LimitWord);
        return None;
    };
    match units::parse_quantity(quantity, Dimension::Field) {
        Ok(limit) => value::above_zero(limit, at, "field_limit", sink)
            .map(|limit| (limit * to_crest(value_is), value_is)),
        Err(error) => {
            sink.note(at.span(), Fault::Quantity { word: "field_limit".to_owned(), error });
            None
        }
    }
}

/// Overall size on the drawing [m]; a sheet may have one size of zero.
fn size_check(field: &wire::Field, unit: f64, sink: &mut Sink) -> Option<Vec3> {
    let size = value::vector(field, "size_check", unit, sink)?;
    let zeros = size.iter().filter(|side| **side <= 0.0).count();
    if size.min() < 0.0 || 1 < zeros {
        let at = field.as_ref()?;
        let (found, wanted) = ("this".to_owned(), "the overall size along x, y and z, at most one of them 0");
        sink.note(at.span(), Fault::Range { word: "size_check".to_owned(), found, wanted });
        return None;
    }
    Some(size)
}

fn place(wire: &wire::Place, unit: f64, sink: &mut Sink) -> Place {
    let scale = wire.scale.as_ref().and_then(|at| {
        let number = value::number_of(at, "scale", "a bare number above zero", sink)?;
        value::above_zero(number, at, "scale", sink)
    });
    let rotate = wire.rotate.0.iter().filter_map(|turn| {
        let (span, turn) = (turn.span(), turn.get_ref());
        value::needed(&turn.axis, "axis", "a direction such as [0, 0, 1]", ("rotate", span.clone()), sink);
        value::needed(&turn.angle, "angle", "an angle such as \"30 deg\"", ("rotate", span), sink);
        let axis = value::direction(&turn.axis, "axis", sink);
        let angle = value::quantity(&turn.angle, "angle", Dimension::Angle, sink);
        axis.zip(angle)
    });
    Place {
        rotate: rotate.collect(),
        scale: scale.unwrap_or(1.0),
        shift: value::vector(&wire.shift, "shift", unit, sink).unwrap_or_else(Vec3::zeros),
    }
}

fn check_guards(wires: &[Spanned<wire::Electrode>], electrodes: &[Electrode], sink: &mut Sink) {
    let next = |n: usize| match &electrodes[n].role {
        Role::Guard { follows } => electrodes.iter().position(|other| other.name == *follows),
        _ => None,
    };
    let mut told = vec![false; electrodes.len()];
    for (n, electrode) in electrodes.iter().enumerate() {
        let Role::Guard { follows } = &electrode.role else { continue };
        let Some(at) = &wires[n].get_ref().follows else { continue };
        if next(n).is_none() && follows != EARTH && !follows.is_empty() {
            sink.note(at.span(), no_electrode("follows", follows, electrodes));
        }
        let mut chain = vec![n];
        while let Some(m) = chain.last().copied().and_then(next) {
            if m == n && !told[n] {
                let names = chain.iter().chain([&n]).map(|k| electrodes[*k].name.clone()).collect();
                sink.note(at.span(), Fault::Ring { chain: names });
                chain.iter().for_each(|k| told[*k] = true);
            }
            if chain.contains(&m) {
                break;
            }
            chain.push(m);
        }
    }
}

/// The fault for a name that no electrode has.
pub(super) fn no_electrode(word: &str, name: &str, electrodes: &[Electrode]) -> Fault {
    let known = electrodes.iter().map(|electrode| electrode.name.as_str());
    Fault::NoElectrode {
        word: word.to_owned(),
        name: name.to_owned(),
        nearest: nearest(name, known.clone()).map(str::to_owned),
        known: known.map(str::to_owned).collect(),
    }
}

/// The bonds: names of electrodes, possibly with `earth`.
pub(super) fn bonds(
    wires: &[Spanned<wire::Bond>],
    electrodes: &[Electrode],
    sink: &mut Sink,
) -> Vec<Vec<String>> {
    wires.iter().map(|wire| bond(wire, electrodes, sink)).collect()
}

fn bond(wire: &Spanned<wire::Bond>, electrodes: &[Electrode], sink: &mut Sink) -> Vec<String> {
    let wanted = "a list of at least two electrode names, one of which may be `earth`";
    let members = &wire.get_ref().members;
    value::needed(members, "members", wanted, ("a [[bond]]", wire.span()), sink);
    let mut names: Vec<String> = Vec::new();
    for (name, span) in value::texts(members, "members", wanted, sink) {
        if names.contains(&name) {
            sink.note(span, Fault::Twice { what: "member", name: name.clone() });
        } else if name != EARTH && electrodes.iter().all(|electrode| electrode.name != name) {
            sink.note(span, no_electrode("members", &name, electrodes));
        }
        names.push(name);
    }
    let Some(at) = members else { return names };
    if names.len() < 2 {
        sink.note(at.span(), Fault::Form { word: "members".to_owned(), wanted });
    }
    let joined: Vec<&str> = electrodes
        .iter()
        .map(|electrode| electrode.name.as_str())
        .filter(|name| names.iter().any(|n| n == name))
        .collect();
    let joined = joined.join("+");
    if 1 < names.len()
        && electrodes.iter().any(|electrode| electrode.name == joined && !names.contains(&joined))
    {
        sink.note(at.span(), Fault::BondName { name: joined });
    }
    names
}

/// The earth plane; a second one is a fault.
pub(super) fn earth_plane(
    wires: &[Spanned<wire::EarthPlane>],
    unit: f64,
    sink: &mut Sink,
) -> Option<EarthPlane> {
    for second in wires.iter().skip(1) {
        sink.note(second.span(), Fault::SecondPlane);
    }
    let wire = wires.first()?;
    let (span, wire) = (wire.span(), wire.get_ref());
    let here = ("the [[earth_plane]]", span);
    value::needed(&wire.through, "through", "a point of the plane, [x, y, z]", here.clone(), sink);
    value::needed(&wire.facing, "facing", "the direction from the plane to the electrodes", here, sink);
    if wire.name.is_none() {
        sink.assume("earth_plane.name", "plane");
    }
    let through = value::vector(&wire.through, "through", unit, sink).unwrap_or_else(Vec3::zeros);
    let facing = value::direction(&wire.facing, "facing", sink).unwrap_or_else(Vec3::z);
    let name = value::text(&wire.name, "name", sink).unwrap_or_else(|| "plane".to_owned());
    Some(EarthPlane { name, plane: Plane { through, facing } })
}
