//! One panel seen from many points: far ones by moments, near ones by the closed form, eight at a time.

use super::far::Moments;
use super::lanes;
use super::lanes::LANES;
use super::lanes::Lane;
use super::triangle::Prepared;
use crate::base::Vec3;
use crate::geom::Triangle;

/// Points, coordinate by coordinate, padded to whole groups of eight.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Points {
    coordinates: [Vec<f64>; 3],
    n: usize,
}

impl Points {
    /// Points in their order.
    pub fn new(points: impl Iterator<Item = Vec3>) -> Self {
        let mut found = Points::default();
        for x in points {
            found.coordinates.iter_mut().zip(x.iter()).for_each(|(list, x)| list.push(*x));
        }
        found.n = found.coordinates[0].len();
        let padded = found.n.next_multiple_of(LANES);
        for list in &mut found.coordinates {
            // Repeats the last point, so that no lane holds a number of its own kind.
            let last = list.last().copied().unwrap_or(0.0);
            list.resize(padded, last);
        }
        found
    }

    /// Count without padding.
    pub fn len(&self) -> usize {
        self.n
    }

    /// Whether there are none.
    pub fn is_empty(&self) -> bool {
        self.n == 0
    }

    /// Count with padding: the length that outputs must have.
    pub fn padded(&self) -> usize {
        self.coordinates[0].len()
    }

    fn at(&self, k: usize) -> Vec3 {
        Vec3::new(self.coordinates[0][k], self.coordinates[1][k], self.coordinates[2][k])
    }
}

/// A panel prepared for many points.
#[derive(Clone, Debug, PartialEq)]
pub struct Source {
    moments: Moments,
    exact: Prepared,
    corners: [[f64; 3]; 3],
    /// Outward normals in the plane, normal, lengths [m] and twice the area [m²].
    m: [[f64; 3]; 3],
    n: [f64; 3],
    l: [f64; 3],
    cross: f64,
    /// Too thin for the vector form.
    thin: bool,
}

/// Height over longest edge under which near points take the guarded scalar form [1].
///
/// The vector form loses `1e-16 (l/w)²` relative at the test points of a panel of length `l` and width `w`:
/// 1e-8 here.
const THIN: f64 = 1e-4;

impl Source {
    /// Prepares `tri`.
    pub fn new(tri: &Triangle) -> Self {
        let exact = Prepared::new(tri);
        Source {
            moments: Moments::of(tri),
            // In the order of the prepared edges, which starts with the longest.
            corners: exact.tri.corners.map(Into::into),
            m: exact.m.map(Into::into),
            n: exact.n.into(),
            l: exact.l,
            cross: exact.cross,
            thin: exact.height < THIN * exact.longest,
            exact,
        }
    }

    /// Writes `∫dS/r` as seen from each point [m].
    ///
    /// Relative error against the guarded scalar form (`tests/it/kernels.rs`): 2.6e-6 from the far
    /// expansion; near by 2e-12 for ratios of height to length of 0.1 and more, 2e-11 at 1e-2, 3e-9 at 1e-3
    /// and 4e-8 at 1e-4; at the test points of the panel itself 1e-9 down to 1e-3 and 8e-9 at 1e-4.
    ///
    /// # Panics
    /// If `out` is not of length [`Points::padded`].
    pub fn potentials(&self, points: &Points, out: &mut [f64]) {
        assert_eq!(out.len(), points.padded(), "output length");
        pulp::Arch::new().dispatch(Job { source: self, points, out });
    }

    /// `∫dS/r` as seen from `x` [m], guarded scalar form.
    pub fn exact(&self) -> &Prepared {
        &self.exact
    }

    /// Closed form for eight points: `Σ_edges p ln((s + l)/(s − l)) − |h| Ω`, `s` the sum of the distances to the
    /// ends of the edge.
    #[inline(always)]
    fn closed(&self, x: [&Lane; 3]) -> Lane {
        let mut d = [[[0.0; LANES]; 3]; 3];
        let mut r = [[0.0; LANES]; 3];
        for c in 0..3 {
            for k in 0..LANES {
                let (a, b, e) = (
                    self.corners[c][0] - x[0][k],
                    self.corners[c][1] - x[1][k],
                    self.corners[c][2] - x[2][k],
                );
                (d[c][0][k], d[c][1][k], d[c][2][k]) = (a, b, e);
                r[c][k] = (a * a + b * b + e * e).sqrt();
            }
        }
        let mut sum = [0.0; LANES];
        for c in 0..3 {
            let (next, l, m) = ((c + 1) % 3, self.l[c], self.m[c]);
            let mut ratio = [0.0; LANES];
            for k in 0..LANES {
                let s = r[c][k] + r[next][k];
                // On the edge itself p = 0; the floor only keeps the logarithm finite.
                ratio[k] = (s + l) / (s - l).max(f64::EPSILON * l);
            }
            let logs = lanes::ln(&ratio);
            for k in 0..LANES {
                let p = m[0] * d[c][0][k] + m[1] * d[c][1][k] + m[2] * d[c][2][k];
                sum[k] += p * logs[k];
            }
        }
        let (mut h, mut numerator, mut denominator) = ([0.0; LANES], [0.0; LANES], [0.0; LANES]);
        for k in 0..LANES {
            let dot = |a: usize, b: usize| {
                d[a][0][k] * d[b][0][k] + d[a][1][k] * d[b][1][k] + d[a][2][k] * d[b][2][k]
            };
            h[k] = (self.n[0] * d[0][0][k] + self.n[1] * d[0][1][k] + self.n[2] * d[0][2][k]).abs();
            numerator[k] = h[k] * self.cross;
            denominator[k] =
                r[0][k] * r[1][k] * r[2][k] + dot(0, 1) * r[2][k] + dot(0, 2) * r[1][k] + dot(1, 2) * r[0][k];
        }
        let half = lanes::angle(&numerator, &denominator);
        for k in 0..LANES {
            sum[k] -= 2.0 * h[k] * half[k];
        }
        sum
    }
}

struct Job<'a> {
    source: &'a Source,
    points: &'a Points,
    out: &'a mut [f64],
}

impl pulp::WithSimd for Job<'_> {
    type Output = ();

    #[inline(always)]
    fn with_simd<S: pulp::Simd>(self, _simd: S) {
        let [xs, ys, zs] = &self.points.coordinates;
        let ((xs, _), (ys, _), (zs, _)) = (xs.as_chunks(), ys.as_chunks(), zs.as_chunks());
        let (outs, _) = self.out.as_chunks_mut::<LANES>();
        for (((x, y), z), out) in xs.iter().zip(ys).zip(zs).zip(outs) {
            self.source.moments.potentials([x, y, z], out);
        }
        self.near();
    }
}

impl Job<'_> {
    /// Fills in the near points, gathered in groups of eight.
    #[inline(always)]
    fn near(self) {
        let mut held = [0_usize; LANES];
        let mut count = 0;
        for k in 0..self.out.len() {
            if self.out[k].is_nan() {
                held[count] = k;
                count += 1;
                if count == LANES {
                    near_group(self.source, self.points, self.out, &held);
                    count = 0;
                }
            }
        }
        if 0 < count {
            // Repeats the last point: every lane holds a number, and writes it where it belongs.
            let last = held[count - 1];
            held[count..].fill(last);
            near_group(self.source, self.points, self.out, &held);
        }
    }
}

#[inline(always)]
fn near_group(source: &Source, points: &Points, out: &mut [f64], held: &[usize; LANES]) {
    if source.thin {
        held.iter().for_each(|k| out[*k] = source.exact.potential(&points.at(*k)));
        return;
    }
    let gather = |c: usize| held.map(|k| points.coordinates[c][k]);
    let values = source.closed([&gather(0), &gather(1), &gather(2)]);
    held.iter().zip(values).for_each(|(k, value)| out[*k] = value);
}
