//! A case as a list of words with their values, defaults filled in.

use crate::base::Vec3;
use crate::case::Case;
use crate::case::Electrode;
use crate::case::Role;
use crate::case::Shell;
use crate::case::SurfaceKind;
use crate::case::ValueIs;
use crate::mesh::smooth;

/// Every word of the case with its value as it was understood, in SI with the unit behind it.
///
/// Keys are unique; parts are named (`electrode.ball.role`).  Paths of outputs are left out, so that
/// the list says the same wherever the case file stands.
pub fn resolved(case: &Case) -> Vec<(String, String)> {
    let mut list = Vec::new();
    let mut put = |key: String, value: String| list.push((key, value));
    for (word, text) in &case.study.fields {
        put(format!("study.{word}"), text.clone());
    }
    if !case.study.left_out.is_empty() {
        put("study.left_out".to_owned(), case.study.left_out.join("; "));
    }
    put("units.length".to_owned(), case.length_name.clone());
    put("units.capacitance".to_owned(), case.printing.capacitance_name.clone());
    put("units.field".to_owned(), case.printing.field_name.clone());
    put("surroundings.relative_permittivity".to_owned(), case.relative_permittivity.to_string());
    if let Some(earth) = &case.earth_plane {
        put(format!("earth_plane.{}.through", earth.name), metres(&earth.plane.through));
        put(format!("earth_plane.{}.facing", earth.name), numbers(&earth.plane.facing));
    }
    for electrode in &case.electrodes {
        put_electrode(case, electrode, &mut put);
    }
    for (n, bond) in case.bonds.iter().enumerate() {
        put(format!("bond.{}", n + 1), bond.join(", "));
    }
    for voltage in &case.voltage_cases {
        let key = format!("voltage_case.{}", voltage.name);
        put(format!("{key}.value_is"), value_is(voltage.value_is).to_owned());
        for (name, value) in &voltage.potentials {
            put(format!("{key}.potentials.{name}"), format!("{value} V crest"));
        }
        for (name, value) in &voltage.charges {
            put(format!("{key}.charges.{name}"), format!("{value} C crest"));
        }
    }
    for look in &case.looks {
        let ends = [look.points.first(), look.points.last()];
        let ends: Vec<String> = ends.into_iter().flatten().map(metres).collect();
        let text = format!("{} points from {}", look.points.len(), ends.join(" to "));
        put(format!("look.{}", look.name), text);
    }
    put_accuracy(case, &mut put);
    list
}

fn put_electrode(case: &Case, electrode: &Electrode, put: &mut impl FnMut(String, String)) {
    let mut say = |word: &str, text: String| put(format!("electrode.{}.{word}", electrode.name), text);
    let files: Vec<&str> =
        electrode.files.iter().filter_map(|n| case.shape_paths.get(*n)).map(String::as_str).collect();
    say("shape", files.join(", "));
    match &electrode.shell {
        Some(Shell::Index(n)) => say("shell", n.to_string()),
        Some(Shell::Holding(point)) => say("shell", format!("the one that holds {}", metres(point))),
        None => {}
    }
    let role = match &electrode.role {
        Role::Live => "live".to_owned(),
        Role::Earthed => "earthed".to_owned(),
        Role::Floating => "floating".to_owned(),
        Role::Guard { follows } => format!("guard, follows {follows}"),
    };
    say("role", role);
    say("sheet", electrode.sheet.to_string());
    let angle = electrode.crease_angle.unwrap_or(smooth::CREASE_ANGLE);
    say("crease_angle", degrees(angle));
    let surface = match electrode.surface {
        SurfaceKind::Rebuilt => "rebuilt",
        SurfaceKind::AsDrawn => "as_drawn",
    };
    say("surface", surface.to_owned());
    if let Some((limit, given)) = electrode.field_limit {
        let text = match given {
            ValueIs::Dc => format!("{limit} V/m dc"),
            ValueIs::Peak | ValueIs::Rms => format!("{limit} V/m peak, given as {}", value_is(given)),
        };
        say("field_limit", text);
    }
    if let Some(size) = &electrode.size_check {
        say("size_check", metres(size));
    }
    if let Some(place) = &electrode.place {
        say("place.scale", place.scale.to_string());
        for (n, (axis, angle)) in place.rotate.iter().enumerate() {
            say(&format!("place.rotate.{}", n + 1), format!("{} about {}", degrees(*angle), numbers(axis)));
        }
        say("place.shift", metres(&place.shift));
    }
    if let Some(drawing) = &electrode.drawing {
        say("drawing", drawing.clone());
    }
}

/// An angle [rad] in degrees, without the digits that rounding leaves behind.
fn degrees(angle: f64) -> String {
    format!("{} deg", (angle.to_degrees() * 1e9).round() / 1e9)
}

fn put_accuracy(case: &Case, put: &mut impl FnMut(String, String)) {
    let accuracy = &case.accuracy;
    let mut say = |word: &str, text: String| put(format!("accuracy.{word}"), text);
    say("capacitance", accuracy.capacitance.to_string());
    if let Some(bar) = accuracy.max_field {
        say("max_field", format!("{bar} (read, not steered)"));
    }
    if let Some(panels) = accuracy.max_panels {
        say("max_panels", panels.to_string());
    }
    if let Some(seconds) = accuracy.time_limit {
        say("time_limit", format!("{seconds} s"));
    }
    if let Some(bytes) = accuracy.memory_limit {
        say("memory_limit", format!("{bytes} B"));
    }
}

/// The word for a meaning in time.
pub(super) fn value_is(value_is: ValueIs) -> &'static str {
    match value_is {
        ValueIs::Peak => "peak",
        ValueIs::Rms => "rms",
        ValueIs::Dc => "dc",
    }
}

fn numbers(v: &Vec3) -> String {
    format!("[{}, {}, {}]", v.x, v.y, v.z)
}

fn metres(v: &Vec3) -> String {
    format!("{} m", numbers(v))
}
