//! Holes: loops of open sides, and the filling of tiny ones.

use crate::base::Vec3;
use crate::mesh::Welded;
use crate::mesh::edges::Side;
use crate::mesh::listing::Listing;
use crate::mesh::listing::at;
use std::collections::HashMap;

/// Perimeter up to which a hole is tiny and filled, in diagonals of the part [1].
///
/// A plane filling of that perimeter covers at most 0.02²/4π = 3e-5 of the squared diagonal; a
/// hole as deep as it is wide shifts the capacitance by less than that share, an order below
/// the tightest demand.  A missing facet of a ball of 60,000 is filled, one of 20,000 is not.
pub const TINY_PERIMETER_REL: f64 = 0.02;

/// Most sides of a hole that is filled; a tiny hole has few.
const MAX_SIDES: usize = 64;

/// A chain of open sides, in the direction in which a filling facet would run along them.
#[derive(Clone, Debug, PartialEq)]
pub struct Loop {
    /// Its corners as indices of points.
    pub corners: Vec<u32>,
    /// Whether it returns to its first corner; a chain that does not ends where the facets
    /// beside it change their orientation.
    pub closed: bool,
}

impl Loop {
    /// Length of the sides [m].
    pub fn perimeter(&self, points: &[Vec3]) -> f64 {
        let x = |k: usize| points[self.corners[k % self.corners.len()] as usize];
        let sides = if self.closed { self.corners.len() } else { self.corners.len().saturating_sub(1) };
        (0..sides).map(|k| (x(k + 1) - x(k)).norm()).sum()
    }

    /// Mean of the corners [m].
    pub fn middle(&self, points: &[Vec3]) -> Vec3 {
        let sum: Vec3 = self.corners.iter().map(|&p| points[p as usize]).sum();
        sum / self.corners.len().max(1) as f64
    }
}

/// The loops of open sides; loops that touch at a corner are parted there.
pub fn loops(open: &[Side]) -> Vec<Loop> {
    let mut steps: Vec<(u32, u32)> = open.iter().map(|s| s.run()).map(|[a, b]| (b, a)).collect();
    steps.sort_unstable();
    let mut walk = Walk { used: vec![false; steps.len()], next: (0..steps.len()).collect(), steps };
    let mut found = Vec::new();
    for start in 0..walk.steps.len() {
        if !walk.used[start] {
            follow(&mut walk, start, &mut found);
        }
    }
    found
}

/// The steps along open sides, sorted by their first corner, and how far they are used up.
struct Walk {
    steps: Vec<(u32, u32)>,
    used: Vec<bool>,
    /// At the first step of each corner: the first one that may be unused.
    next: Vec<usize>,
}

impl Walk {
    /// An unused step that begins at `from`.
    fn step_from(&mut self, from: u32) -> Option<usize> {
        let first = self.steps.partition_point(|s| s.0 < from);
        let begins = |s: usize| self.steps.get(s).is_some_and(|step| step.0 == from);
        let mut s = *self.next.get(first)?;
        while begins(s) && self.used[s] {
            s += 1;
        }
        self.next[first] = s;
        begins(s).then_some(s)
    }
}

fn follow(walk: &mut Walk, start: usize, found: &mut Vec<Loop>) {
    let mut chain = vec![walk.steps[start].0];
    let mut position: HashMap<u32, usize> = HashMap::from([(walk.steps[start].0, 0)]);
    let mut step = Some(start);
    while let Some(now) = step {
        walk.used[now] = true;
        let to = walk.steps[now].1;
        if let Some(&from) = position.get(&to) {
            let corners = chain.split_off(from);
            for p in &corners[1..] {
                position.remove(p);
            }
            chain.push(to);
            found.push(Loop { corners, closed: true });
        } else {
            position.insert(to, chain.len());
            chain.push(to);
        }
        step = walk.step_from(to);
    }
    if 1 < chain.len() {
        found.push(Loop { corners: chain, closed: false });
    }
}

/// Fills the closed loops of a perimeter up to `max_perimeter`, each with a line in `list`.
pub(in crate::mesh) fn fill(welded: &mut Welded, open: &[Side], max_perimeter: f64, list: &mut Listing<'_>) {
    for hole in loops(open) {
        let perimeter = hole.perimeter(&welded.points);
        if !hole.closed || MAX_SIDES < hole.corners.len() || max_perimeter < perimeter {
            continue;
        }
        if let Some(filling) = ears(&welded.points, &hole.corners) {
            welded.facets.extend(filling);
            let place = hole.middle(&welded.points);
            list.add(place, || {
                format!(
                    "tiny hole of {} sides and perimeter {perimeter:.3e} m filled at {}",
                    hole.corners.len(),
                    at(&place)
                )
            });
        }
    }
}

/// The triangles of a polygon, cut off ear by ear; nothing if it has no proper ears.
fn ears(points: &[Vec3], corners: &[u32]) -> Option<Vec<[u32; 3]>> {
    let x = |p: u32| points[p as usize];
    let n = corners.len();
    let normal: Vec3 = (0..n).map(|k| x(corners[k]).cross(&x(corners[(k + 1) % n]))).sum();
    let mut rest = corners.to_vec();
    let mut filling = Vec::new();
    while 3 < rest.len() {
        let n = rest.len();
        let ear = |k: usize| [rest[(k + n - 1) % n], rest[k], rest[(k + 1) % n]];
        let best = (0..n)
            .filter(|&k| is_ear(points, ear(k), &rest, &normal))
            .min_by(|&s, &t| reach(points, ear(s)).total_cmp(&reach(points, ear(t))))?;
        filling.push(ear(best));
        rest.remove(best);
    }
    let last = [*rest.first()?, *rest.get(1)?, *rest.get(2)?];
    filling.push(last);
    Some(filling)
}

/// Length of the cut behind an ear [m].
fn reach(points: &[Vec3], [a, _, c]: [u32; 3]) -> f64 {
    (points[c as usize] - points[a as usize]).norm()
}

/// Whether an ear turns with the polygon and holds none of its corners.
fn is_ear(points: &[Vec3], ear: [u32; 3], rest: &[u32], normal: &Vec3) -> bool {
    let x = ear.map(|p| points[p as usize]);
    let turn = |a: &Vec3, b: &Vec3, c: &Vec3| (b - a).cross(&(c - a)).dot(normal);
    if turn(&x[0], &x[1], &x[2]) <= 0.0 {
        return false;
    }
    rest.iter().filter(|p| !ear.contains(p)).all(|&p| {
        let y = points[p as usize];
        (0..3).any(|k| turn(&x[k], &x[(k + 1) % 3], &y) < 0.0)
    })
}
