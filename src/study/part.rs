//! What is drawn and what is counted: the part in front of the mirrors and the whole.

use crate::base::Images;
use crate::base::Vec3;
use crate::case::Case;
use crate::case::Mirror;
use crate::mesh::Welded;
use crate::mesh::weld;
use crate::physics::solved::Solved;
use crate::record::Matrix;
use crate::record::PartOfWhole;

/// The factor from part to whole, and the rule in words.
pub(super) fn part_of_whole(case: &Case) -> PartOfWhole {
    let named = |even: bool| -> Vec<String> {
        let of_parity = |mirror: &&Mirror| mirror.even == even;
        case.mirrors.iter().filter(of_parity).map(|mirror| format!("`{}`", mirror.name)).collect()
    };
    let (even, odd) = (named(true), named(false));
    let factor = case.images.whole_over_part();
    let mut sentences = Vec::new();
    if !even.is_empty() {
        sentences.push(format!(
            "an electrode is the part drawn and its copies across the even mirror{} {}, all at its potential: \
             capacitances, charges and energies are those of the whole, {factor} times those of the part; potential \
             coefficients are those of the whole",
            if even.len() == 1 { "" } else { "s" },
            even.join(" and ")
        ));
    }
    if !odd.is_empty() {
        sentences.push(format!(
            "beyond the odd mirror{} {} stand copies at the opposite potential, which are conductors of their own and \
             are not counted: such a mirror is at 0 V and counts as earth",
            if odd.len() == 1 { "" } else { "s" },
            odd.join(" and ")
        ));
    }
    if !sentences.is_empty() {
        sentences.push("panels, areas, sizes, places and the surface file are those of the part".to_owned());
    }
    PartOfWhole { factor, text: sentences.join("; ") }
}

/// The matrix of the drawn part in the field of the whole [F].
pub(super) fn capacitance(solved: &Solved) -> Matrix {
    let factor = solved.panels.images.whole_over_part();
    solved.matrix.iter().map(|row| row.iter().map(|c| c / factor).collect()).collect()
}

/// Facets, and overall size [m], of what stands in front of the even mirrors.
pub(super) fn drawn(welded: &Welded, images: &Images) -> (usize, Vec3) {
    let (lo, hi) = weld::bounds(&welded.points);
    let rounding = FRONT * (hi - lo).norm();
    let in_front = |x: &Vec3| images.even().all(|plane| -rounding <= plane.height(x));
    let point = |k: &u32| welded.points[*k as usize];
    let facets = welded.facets.iter().filter(|f| f.iter().all(|k| in_front(&point(k)))).count();
    let (lo, hi) = weld::bounds(welded.points.iter().filter(|x| in_front(x)));
    (facets, hi - lo)
}

/// Height under a mirror that is only rounding, in sizes of the body [1].
const FRONT: f64 = 1e-9;
