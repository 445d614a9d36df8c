//! Panels that repeat around an axis: sector after sector of exact copies.

use super::Origin;
use super::Panels;
use crate::base::Images;
use crate::base::Motion;
use crate::geom::Triangle;
use crate::mesh::Chart;
use crate::mesh::Net;
use crate::mesh::Piece;
use std::collections::HashMap;
use std::sync::Arc;

/// How the panels of an assembly repeat: `sectors()` of them, each the one before turned by one step.
///
/// Panels stand sector after sector, those of each in the same order, so that with `m` of them in a sector
/// panel `s·m + q` is panel `q` turned `s` times.
#[derive(Clone, Debug, PartialEq)]
pub struct Ring {
    /// One step.
    turn: Motion,
    /// `bodies[s][b]`: bodies of each sector.
    bodies: Vec<Vec<u32>>,
    /// `rows[s][row]`: the row that `row` becomes when the assembly is turned `s` times.
    rows: Vec<Vec<usize>>,
}

/// Why panels do not repeat around an axis; each text ends a sentence.
pub type WhyNot = &'static str;

/// Sine of the angle between an axis and the facing of a plane up to which the plane turns into itself [1].
const ALONG: f64 = 1e-9;

impl Ring {
    /// The ring of an assembly whose body `bodies[s][b]` is body `bodies[0][b]` turned `s` times.
    ///
    /// `rows[k]` lists the bodies of row `k`.
    ///
    /// # Errors
    /// Why a plane or a bond is not the same after a turn.
    pub fn new(
        turn: Motion,
        bodies: Vec<Vec<u32>>,
        rows: &[Vec<u32>],
        images: &Images,
    ) -> Result<Ring, WhyNot> {
        let Motion::Turn { axis, .. } = turn else { return Err("they are shifted, not turned") };
        let across = |plane: &crate::base::ImagePlane| ALONG < plane.plane.facing.cross(&axis).norm();
        if images.planes().iter().any(across) {
            return Err("a plane that does not stand across the axis is not the same after a turn");
        }
        let n_bodies = bodies.iter().map(Vec::len).sum();
        let mut place = vec![(0, 0); n_bodies];
        for (s, sector) in bodies.iter().enumerate() {
            for (b, body) in sector.iter().enumerate() {
                *place.get_mut(*body as usize).ok_or("some electrodes are not copied")? = (s, b);
            }
        }
        if rows.iter().flatten().any(|body| n_bodies <= *body as usize) {
            return Err("some electrodes are not copied");
        }
        let turned = |body: &u32, s: usize| {
            let (own, b) = place[*body as usize];
            bodies[(own + s) % bodies.len()][b]
        };
        let of_row = |row: &Vec<u32>, s: usize| {
            let mut members: Vec<u32> = row.iter().map(|body| turned(body, s)).collect();
            members.sort_unstable();
            rows.iter().position(|other| *other == members)
        };
        let map = |s: usize| rows.iter().map(|row| of_row(row, s)).collect::<Option<Vec<usize>>>();
        let turned_rows: Option<Vec<Vec<usize>>> = (0..bodies.len()).map(map).collect();
        let turned_rows = turned_rows.ok_or("bonds or contacts are not the same after a turn")?;
        let fixed = |s: usize| turned_rows[s].iter().enumerate().any(|(row, turned)| row == *turned);
        if (1..bodies.len()).any(fixed) {
            return Err("bonds join copies to one conductor");
        }
        Ok(Ring { turn, bodies, rows: turned_rows })
    }

    /// Count of sectors.
    pub fn sectors(&self) -> usize {
        self.bodies.len()
    }

    /// The row that `row` becomes when the assembly is turned `s` times; negative turns by the way round.
    pub fn turned_row(&self, row: usize, s: usize) -> usize {
        self.rows[s % self.sectors()][row]
    }

    /// One row of each set of rows that turn into each other, the first of it, ascending.
    pub fn first_rows(&self) -> Vec<usize> {
        let n = self.rows.first().map_or(0, Vec::len);
        (0..n).filter(|row| self.rows.iter().all(|turned| *row <= turned[*row])).collect()
    }
}

/// The panels in the order of the ring, each sector the exact turn of the first.
///
/// # Errors
/// Why not, if the sectors are not made of the same facets.
pub fn arranged(panels: &Panels, ring: Ring) -> Result<Panels, WhyNot> {
    let first: Vec<usize> = ring.bodies[0]
        .iter()
        .flat_map(|body| (0..panels.len()).filter(|p| panels.body[*p] == *body))
        .collect();
    let place = |body: u32| ring.bodies[0].iter().position(|other| *other == body);
    let mut charts: Vec<Chart> = panels.charts.to_vec();
    let mut origins: Vec<Origin> = Vec::with_capacity(panels.len());
    for (s, own) in ring.bodies.iter().enumerate() {
        for (body, copy) in ring.bodies[0].iter().zip(own) {
            if !is_cut_alike(panels, [*body, *copy], |row| ring.turned_row(row, s)) {
                return Err("copies are cut differently where they touch something");
            }
        }
        let turn = ring.turn.times(s);
        let mut of_chart: HashMap<u32, u32> = HashMap::new();
        for p in &first {
            let origin = panels.origin(*p);
            let net = match origin.net {
                Net::Row(row) => Net::Row(ring.turned_row(row as usize, s) as u32),
                Net::Earth => Net::Earth,
            };
            let body = place(origin.body).map_or(origin.body, |b| own[b]);
            // Copies take the charts of the first sector, turned, whatever rounding made of their own.
            let chart = *of_chart.entry(origin.chart).or_insert_with(|| {
                if s == 0 {
                    return origin.chart;
                }
                charts.push(charts[origin.chart as usize].moved(|x| turn.point(x)));
                charts.len() as u32 - 1
            });
            origins.push(Origin { net, body, chart, ..origin });
        }
    }
    let charts = Arc::new(charts);
    let next = super::from_origins(panels.assembly.clone(), charts, panels.images.clone(), &origins);
    Ok(turned(next, ring))
}

/// Whether the pieces of two bodies are the same, rows turned by `turned`.
fn is_cut_alike(panels: &Panels, [body, copy]: [u32; 2], turned: impl Fn(usize) -> usize) -> bool {
    let of = |body: u32| panels.assembly.pieces.iter().filter(move |piece| piece.body == body);
    let net = |net: Net| match net {
        Net::Row(row) => Net::Row(turned(row as usize) as u32),
        Net::Earth => Net::Earth,
    };
    let same = |(a, b): (&Piece, &Piece)| (a.facet, net(a.net)) == (b.facet, b.net);
    of(body).count() == of(copy).count() && of(body).zip(of(copy)).all(same)
}

/// Panels in the order of the ring with the first sector turned into all others, so that they are copies to
/// the last digits whatever rounding did to the surfaces they were placed on.
pub(crate) fn turned(mut panels: Panels, ring: Ring) -> Panels {
    let m = panels.len() / ring.sectors();
    for s in 1..ring.sectors() {
        let turn = ring.turn.times(s);
        for q in 0..m {
            let corners = panels.triangles[q].corners.map(|x| turn.point(&x));
            panels.triangles[s * m + q] = Triangle::new(corners);
            panels.offset[s * m + q] = panels.offset[q];
            panels.drawn[s * m + q] = panels.drawn[q];
            panels.left[s * m + q] = panels.left[q];
        }
    }
    panels.ring = Some(ring);
    panels
}

impl Panels {
    /// Panels that have no earlier copy: all, or those of the first sector of a ring.
    pub fn distinct(&self) -> usize {
        self.len() / self.copies()
    }

    /// Sectors of the ring, 1 without.
    pub fn copies(&self) -> usize {
        self.ring.as_ref().map_or(1, Ring::sectors)
    }

    /// Cuts (panel, edge) with their copies in all sectors, in rising order; of two edges of copies of one
    /// panel the first counts.
    pub fn in_all_sectors(&self, cuts: &[(usize, usize)]) -> Vec<(usize, usize)> {
        if self.ring.is_none() {
            return cuts.to_vec();
        }
        let m = self.distinct();
        let mut edges: Vec<Option<usize>> = vec![None; m];
        cuts.iter().for_each(|(p, edge)| {
            edges[p % m].get_or_insert(*edge);
        });
        let of_sector = |s: usize| (0..m).map(move |q| (s * m + q, q));
        let all = (0..self.copies()).flat_map(of_sector);
        all.filter_map(|(p, q)| edges[q].map(|edge| (p, edge))).collect()
    }
}

impl Panels {
    /// Rows that no earlier row turns into: all without a ring.
    pub fn first_rows(&self) -> Vec<usize> {
        self.ring.as_ref().map_or_else(|| (0..self.n_rows).collect(), Ring::first_rows)
    }

    /// A matrix over the rows of which the lines of [`Panels::first_rows`] are filled, with all lines filled.
    pub fn turned_entries<T: Copy>(&self, mut matrix: Vec<Vec<T>>) -> Vec<Vec<T>> {
        let Some(ring) = &self.ring else { return matrix };
        for i in ring.first_rows() {
            for s in 1..ring.sectors() {
                for j in 0..self.n_rows {
                    matrix[ring.turned_row(i, s)][ring.turned_row(j, s)] = matrix[i][j];
                }
            }
        }
        matrix
    }

    /// A list over the rows of which those of [`Panels::first_rows`] are filled, with all filled.
    pub fn turned_rows<T: Copy>(&self, mut list: Vec<T>) -> Vec<T> {
        let Some(ring) = &self.ring else { return list };
        for i in ring.first_rows() {
            (1..ring.sectors()).for_each(|s| list[ring.turned_row(i, s)] = list[i]);
        }
        list
    }
}
