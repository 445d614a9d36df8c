//! Which facets meet at which edge.

/// One side of one facet.
#[derive(Clone, Copy, Debug, PartialEq, Eq, PartialOrd, Ord)]
pub struct Side {
    /// Its ends as indices of points, the smaller first.
    pub ends: [u32; 2],
    /// Index of the facet.
    pub facet: u32,
    /// Number of the side in the facet: from corner `side` to the next.
    pub side: u8,
    /// Whether the facet runs along it from the smaller to the larger index.
    pub forward: bool,
}

impl Side {
    /// Its ends in the direction in which the facet runs.
    pub fn run(&self) -> [u32; 2] {
        let [a, b] = self.ends;
        if self.forward { [a, b] } else { [b, a] }
    }
}

/// All sides of all facets, sorted so that those of one edge stand together, in facet order.
pub fn sides(facets: &[[u32; 3]]) -> Vec<Side> {
    let mut sides: Vec<Side> = facets
        .iter()
        .zip(0u32..)
        .flat_map(|(corners, facet)| {
            [0u8, 1, 2].map(|side| {
                let (a, b) = (corners[side as usize], corners[(side as usize + 1) % 3]);
                Side { ends: [a.min(b), a.max(b)], facet, side, forward: a < b }
            })
        })
        .collect();
    sides.sort_unstable();
    sides
}

/// The sides edge by edge.
pub fn by_edge(sides: &[Side]) -> impl Iterator<Item = &[Side]> {
    sides.chunk_by(|a, b| a.ends == b.ends)
}

/// The sides that no other facet shares.
pub fn open_sides(sides: &[Side]) -> Vec<Side> {
    by_edge(sides).filter(|edge| edge.len() == 1).map(|edge| edge[0]).collect()
}
