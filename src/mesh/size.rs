//! Sizes against the drawing, and sizes that smell of a wrong unit.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::mesh::listing::short;

/// Deviation of a size from the drawing that is refused [1]; tessellation takes up to 0.4 %.
pub const SIZE_REL_TOL: f64 = 0.02;

/// Largest dimension below which a body smells of a wrong unit [m].
pub const SUSPICIOUSLY_SMALL: f64 = 1e-4;

/// Largest dimension above which a body smells of a wrong unit [m].
pub const SUSPICIOUSLY_LARGE: f64 = 1e3;

/// Ratios of units that get mixed up, and how that happens.
const FACTORS: &[(f64, &str)] = &[
    (25.4, "inches taken for millimetres"),
    (1.0 / 25.4, "millimetres taken for inches"),
    (1000.0, "metres taken for millimetres"),
    (0.001, "millimetres taken for metres"),
    (10.0, "centimetres taken for millimetres"),
    (0.1, "millimetres taken for centimetres"),
    (100.0, "metres taken for centimetres"),
    (0.01, "centimetres taken for metres"),
    (12.0, "feet taken for inches"),
    (1.0 / 12.0, "inches taken for feet"),
    (304.8, "feet taken for millimetres"),
    (1.0 / 304.8, "millimetres taken for feet"),
    (2.54, "inches taken for centimetres"),
    (1.0 / 2.54, "centimetres taken for inches"),
    (0.0254, "metres taken for inches"),
    (1.0 / 0.0254, "inches taken for metres"),
    (2.0, "a radius drawn for a diameter"),
    (0.5, "a diameter drawn for a radius"),
    (1e6, "metres taken for micrometres"),
    (1e-6, "micrometres taken for metres"),
];

/// A refusal where the overall `size` is over 2 % off the `drawn` one in any direction, naming
/// both and the likely factor.
///
/// Both [m], along the axes.  A drawn size of zero (across a sheet) allows 2 % of the largest.
pub fn size_check(size: &Vec3, drawn: &Vec3, name: &str) -> Option<Finding> {
    if close(size, drawn) {
        return None;
    }
    let factor = FACTORS.iter().find(|(factor, _)| close(&(size * *factor), drawn));
    let sorted = |v: &Vec3| {
        let mut v = [v.x, v.y, v.z];
        v.sort_by(f64::total_cmp);
        Vec3::from(v)
    };
    let advice = match factor {
        Some((factor, why)) => format!("multiplied by {} it fits: {why}?", short(*factor)),
        None if close(&sorted(size), &sorted(drawn)) => {
            "the axes look exchanged: turn the part with `place`".to_owned()
        }
        None => "no common factor fits; check the file, `[units] length` and the drawing".to_owned(),
    };
    Some(Finding {
        severity: Severity::Refusal,
        code: "size_check",
        text: format!("`{name}`: size {} but {} on the drawing; {advice}", shown(size), shown(drawn)),
        place: None,
    })
}

fn close(size: &Vec3, drawn: &Vec3) -> bool {
    (0..3).all(|k| {
        let allowed = if 0.0 < drawn[k] { drawn[k] } else { drawn.max() };
        (size[k] - drawn[k]).abs() <= SIZE_REL_TOL * allowed
    })
}

fn shown(size: &Vec3) -> String {
    format!("{} × {} × {} m", short(size.x), short(size.y), short(size.z))
}

/// A warning where the largest dimension of `size` [m] is under 0.1 mm or over 1 km.
pub fn unit_suspicion(size: &Vec3, name: &str) -> Option<Finding> {
    let largest = size.max();
    let usual = (SUSPICIOUSLY_SMALL..=SUSPICIOUSLY_LARGE).contains(&largest);
    (!usual).then(|| Finding {
        severity: Severity::Warning,
        code: "unit_suspicion",
        text: format!(
            "`{name}`: size {}; a body between 0.1 mm and 1 km is usual: check `[units] length`",
            shown(size)
        ),
        place: None,
    })
}
