//! From the shape files of a case to accepted bodies in place.

use crate::base::Finding;
use crate::base::Severity;
use crate::base::Vec3;
use crate::base::counted;
use crate::case::Case;
use crate::case::Electrode;
use crate::case::Shapes;
use crate::case::Shell;
use crate::case::SurfaceKind;
use crate::mesh::Body;
use crate::mesh::Surface;
use crate::mesh::accept;
use crate::mesh::place;
use crate::mesh::place::Placing;
use crate::mesh::repair;
use crate::mesh::shells;
use crate::mesh::size;
use crate::mesh::smooth;
use crate::mesh::smooth::Smooth;
use crate::mesh::stl;
use crate::mesh::weld;

/// Facets of one file, solid by solid, in the unit of the file.
pub(super) struct Read {
    pub(super) solids: Vec<Vec<[Vec3; 3]>>,
    pub(super) findings: Vec<Finding>,
}

/// Facets read per shape file, in the unit of the file.
///
/// # Errors
/// A refusal for every file that is no STL.
pub(super) fn read_all(shapes: &Shapes) -> Result<Vec<Read>, Vec<Finding>> {
    let mut refused = Vec::new();
    let mut read = Vec::new();
    for file in &shapes.files {
        match stl::parse(&file.bytes, &file.path) {
            Ok(soup) => {
                let solids = soup.solids.into_iter().map(|solid| solid.facets).collect();
                read.push(Read { solids, findings: soup.findings });
            }
            Err(error) => refused.push(refusal("stl", error.to_string())),
        }
    }
    if refused.is_empty() { Ok(read) } else { Err(refused) }
}

/// A refusal without a place.
pub(super) fn refusal(code: &'static str, text: String) -> Finding {
    Finding { severity: Severity::Refusal, code, text, place: None }
}

/// Bodies of all electrodes, with every finding.
///
/// # Errors
/// All findings, when one of them is a refusal.
pub(super) fn bodies(case: &Case, shapes: &Shapes) -> Result<(Vec<Body>, Vec<Finding>), Vec<Finding>> {
    let read = read_all(shapes)?;
    let mut findings: Vec<Finding> = read.iter().flat_map(|read| read.findings.clone()).collect();
    let mut bodies = Vec::new();
    for electrode in &case.electrodes {
        match body(case, electrode, &read) {
            Ok((body, more)) => {
                findings.extend(more);
                bodies.push(body);
            }
            Err(more) => findings.extend(more),
        }
    }
    if findings.iter().any(|f| f.severity == Severity::Refusal) {
        Err(findings)
    } else {
        Ok((bodies, findings))
    }
}

fn body(case: &Case, electrode: &Electrode, read: &[Read]) -> Result<(Body, Vec<Finding>), Vec<Finding>> {
    let solids = electrode.files.iter().flat_map(|k| &read[*k].solids);
    let chosen: Vec<Vec<[Vec3; 3]>> = match &electrode.shell {
        None => solids.cloned().collect(),
        Some(shell) => {
            let raw: Vec<[Vec3; 3]> = solids.flatten().copied().collect();
            vec![select(&raw, shell, case.length_unit, electrode).map_err(|f| vec![f])?]
        }
    };
    let placing = placing(case, electrode);
    let placed: Vec<Vec<[Vec3; 3]>> = chosen.iter().map(|facets| place(facets, &placing)).collect();
    let slices: Vec<&[[Vec3; 3]]> = placed.iter().map(Vec::as_slice).collect();
    let (surface, mut findings) = accept::body_of(&slices, electrode.sheet, &electrode.name)?;
    if let Some(drawn) = &electrode.size_check {
        let (lo, hi) = weld::bounds(&surface.welded.points);
        if let Some(finding) = size::size_check(&(hi - lo), drawn, &electrode.name) {
            findings.push(finding);
            return Err(findings);
        }
    }
    let surface = smoothed(surface, electrode, &mut findings);
    Ok((Body { name: electrode.name.clone(), surface }, findings))
}

fn placing<'a>(case: &Case, electrode: &'a Electrode) -> Placing<'a> {
    let unit = case.length_unit;
    match &electrode.place {
        None => Placing { unit, scale: 1.0, rotations: &[], shift: Vec3::zeros() },
        Some(place) => Placing { unit, scale: place.scale, rotations: &place.rotate, shift: place.shift },
    }
}

/// The facets of one shell of a file, in file units; the point it holds is given in metres.
///
/// Shells are told after the repairs, so that T-joints do not part them.
fn select(
    raw: &[[Vec3; 3]],
    shell: &Shell,
    unit: f64,
    electrode: &Electrode,
) -> Result<Vec<[Vec3; 3]>, Finding> {
    let name = &electrode.name;
    let (mended, _) = repair::repair(weld::weld(raw, weld::WELD_REL_TOL), electrode.sheet, name);
    let found = shells::split(&mended);
    let index = match shell {
        Shell::Index(k) if *k < found.len() => Ok(*k),
        Shell::Index(k) => Err(format!(
            "`{name}`: shell {k} is asked for, but the file has {}; an index from 0 to {} is wanted",
            counted(found.len(), "shell"),
            found.len().saturating_sub(1)
        )),
        Shell::Holding(x) => shells::holding(&found, &(x / unit)).ok_or_else(|| {
            format!("`{name}`: none of the {} shells of the file holds the point given", found.len())
        }),
    };
    let welded = &found[index.map_err(|text| refusal("shell", text))?];
    Ok(welded.facets.iter().map(|f| f.map(|k| welded.points[k as usize])).collect())
}

/// Fills normals and creases and tells the sharpest ridge that is taken for faceting.
fn smoothed(surface: Surface, electrode: &Electrode, findings: &mut Vec<Finding>) -> Surface {
    let angle = electrode.crease_angle.unwrap_or(smooth::CREASE_ANGLE);
    let Smooth { normals, creases, sharpest_smoothed } = match electrode.surface {
        SurfaceKind::Rebuilt => smooth::recover(&surface.welded, angle),
        SurfaceKind::AsDrawn => smooth::as_drawn(&surface.welded),
    };
    if let Some((turn, at)) = sharpest_smoothed {
        findings.push(Finding {
            severity: Severity::Note,
            code: "smoothed_ridge",
            text: format!(
                "`{}`: edges that turn by less than {:.1}° are taken for facets of a smooth shape; the sharpest of \
                 them turns by {:.1}°; give `crease_angle` or `surface = \"as_drawn\"` if it is a real ridge",
                electrode.name,
                angle.to_degrees(),
                turn.to_degrees()
            ),
            place: Some(at),
        });
    }
    let rims_as_drawn = electrode.surface == SurfaceKind::AsDrawn;
    Surface { normals, creases, rims_as_drawn, ..surface }
}
