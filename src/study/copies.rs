//! Whether the copies of a case are a ring whose blocks can be used again.

use crate::base::Finding;
use crate::base::Motion;
use crate::base::Severity;
use crate::base::Vec3;
use crate::case::Case;
use crate::case::Copy;
use crate::mesh::Assembly;
use crate::panel::Panels;
use crate::panel::Ring;
use crate::panel::ring;
use crate::panel::ring::WhyNot;

/// Distance of two axes, in distances of them from the origin or unit lengths, and sine between their
/// directions, up to which they are one [1].
const ONE_AXIS: f64 = 1e-9;

/// The panels arranged as a ring where all electrodes belong to full rings of one turn; else as they are, with
/// the reason as a note where there are copies.
pub(super) fn arranged(case: &Case, panels: Panels) -> (Panels, Option<Finding>) {
    if case.electrodes.iter().all(|electrode| electrode.copy.is_none()) {
        return (panels, None);
    }
    match ring_of(case, &panels.assembly).and_then(|ring| ring::arranged(&panels, ring)) {
        Ok(arranged) => (arranged, None),
        Err(why) => {
            let text =
                format!("copies are solved as electrodes of their own, without use of their likeness: {why}");
            let finding = Finding { severity: Severity::Note, code: "copies_expanded", text, place: None };
            (panels, Some(finding))
        }
    }
}

/// Sectors in which the panels repeat around an axis, 1 if they do not.
pub(super) fn sectors(case: &Case, assembly: &Assembly) -> usize {
    ring_of(case, assembly).map_or(1, |ring| ring.sectors())
}

/// The ring that all electrodes make together.
fn ring_of(case: &Case, assembly: &Assembly) -> Result<Ring, WhyNot> {
    let copies: Option<Vec<&Copy>> =
        case.electrodes.iter().map(|electrode| electrode.copy.as_ref()).collect();
    let copies = copies.ok_or("some electrodes are not copied")?;
    let first = *copies.first().ok_or("there are none")?;
    if copies.iter().any(|copy| copy.count != first.count) {
        return Err("electrodes are copied different numbers of times");
    }
    if copies.iter().any(|copy| !copy.motion.closes_after(copy.count)) {
        return Err("they do not close a full turn");
    }
    let mut bodies: Vec<Vec<u32>> = vec![Vec::new(); first.count];
    for (body, copy) in copies.iter().enumerate() {
        let turns = turns(&first.motion, &copy.motion).ok_or("they turn about different axes")?;
        let sector = if turns { copy.number } else { (copy.count - copy.number) % copy.count };
        bodies[sector].push(body as u32);
    }
    let rows: Vec<Vec<u32>> = assembly.rows.iter().map(|row| row.bodies.clone()).collect();
    Ring::new(first.motion, bodies, &rows, &case.images)
}

/// Whether a turn is the same as another one, `Some(false)` for the opposite one; none for another axis.
fn turns(first: &Motion, other: &Motion) -> Option<bool> {
    let (Motion::Turn { through: p, axis: a, angle }, Motion::Turn { through: q, axis: b, angle: turned }) =
        (first, other)
    else {
        return None;
    };
    let apart = (q - p).cross(a).norm();
    let size = p.norm().max(q.norm()).max(f64::MIN_POSITIVE);
    let one_axis = a.cross(b).norm() <= ONE_AXIS && (apart <= ONE_AXIS * size || Vec3::norm(&(q - p)) <= 0.0);
    one_axis.then(|| 0.0 < angle * turned * a.dot(b))
}
