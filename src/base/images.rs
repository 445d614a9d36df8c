//! Planes at which charge is mirrored: earth planes, odd and even mirrors.

use super::Plane;
use super::Vec3;

/// What a plane does to the charge in front of it.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum PlaneKind {
    /// Infinite conductor at 0 V: the image has the opposite charge.
    Earth,
    /// Symmetry plane, beyond it the same shapes at the opposite potential.
    Odd,
    /// Symmetry plane, beyond it the same shapes at the same potential.
    Even,
}

impl PlaneKind {
    /// Charge of the image over charge [1].
    pub fn sign(self) -> f64 {
        match self {
            PlaneKind::Earth | PlaneKind::Odd => -1.0,
            PlaneKind::Even => 1.0,
        }
    }

    /// How messages call such a plane.
    pub fn word(self) -> &'static str {
        match self {
            PlaneKind::Earth => "earth plane",
            PlaneKind::Odd => "odd mirror",
            PlaneKind::Even => "even mirror",
        }
    }
}

/// A plane and what it does.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct ImagePlane {
    /// Where it is.
    pub plane: Plane,
    /// What it does.
    pub kind: PlaneKind,
}

/// Up to three planes at right angles; their reflections and the products of these form a group of up to
/// eight, so that the potential of a charge is a sum over its members (method of images: Kelvin 1848;
/// Jackson, Classical Electrodynamics, section 2.1).
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Images {
    planes: Vec<ImagePlane>,
}

/// Why planes give no finite set of images; the numbers are those of the planes.
#[derive(Clone, Copy, Debug, PartialEq, thiserror::Error)]
pub enum ImagesError {
    /// More than three.
    #[error(
        "there are {count} planes; at most three, at right angles to each other, have a finite set of images"
    )]
    TooMany {
        /// How many.
        count: usize,
    },
    /// Two parallel planes.
    #[error(
        "planes {first} and {second} are parallel, which makes endless rows of images; at most one plane per direction"
    )]
    Parallel {
        /// Number of one plane.
        first: usize,
        /// Number of the other.
        second: usize,
    },
    /// Two planes that are neither parallel nor at right angles.
    #[error("planes {first} and {second} meet at {degrees} degrees; only right angles are available")]
    Oblique {
        /// Number of one plane.
        first: usize,
        /// Number of the other.
        second: usize,
        /// Angle between them [degrees].
        degrees: f64,
    },
}

/// Cosine up to which two planes count as at right angles, and sine up to which as parallel [1].
///
/// Directions written with ten digits keep right angles to 1e-10; reflections then commute to 1e-9 of a length.
const SQUARE: f64 = 1e-9;

/// A product of reflections at some of the planes, with the sign of the image.
#[derive(Clone, Debug, PartialEq)]
pub struct Reflection {
    planes: Vec<Plane>,
    /// Charge of the image over charge [1].
    pub sign: f64,
}

impl Images {
    /// No plane at all.
    pub fn none() -> Self {
        Images::default()
    }

    /// The planes as a set of images.
    ///
    /// # Errors
    /// [`ImagesError`]: the first fault met, in order of planes.
    pub fn new(planes: Vec<ImagePlane>) -> Result<Self, ImagesError> {
        for second in 1..planes.len() {
            for first in 0..second {
                let (a, b) = (&planes[first].plane.facing, &planes[second].plane.facing);
                let (cosine, sine) = (a.dot(b).abs(), a.cross(b).norm());
                if sine <= SQUARE {
                    return Err(ImagesError::Parallel { first, second });
                }
                if SQUARE < cosine {
                    let degrees = (sine.atan2(cosine).to_degrees() * 1e6).round() / 1e6;
                    return Err(ImagesError::Oblique { first, second, degrees });
                }
            }
        }
        if 3 < planes.len() {
            return Err(ImagesError::TooMany { count: planes.len() });
        }
        Ok(Images { planes })
    }

    /// The planes.
    pub fn planes(&self) -> &[ImagePlane] {
        &self.planes
    }

    /// The planes at which the potential is zero: earth planes and odd mirrors.
    pub fn grounded(&self) -> impl Iterator<Item = &ImagePlane> {
        self.planes.iter().filter(|plane| plane.kind != PlaneKind::Even)
    }

    /// The even mirrors.
    pub fn even(&self) -> impl Iterator<Item = &Plane> {
        self.planes.iter().filter(|plane| plane.kind == PlaneKind::Even).map(|plane| &plane.plane)
    }

    /// Charge of an electrode with its copies at the same potential, over the charge of the part that is
    /// drawn [1]: 2 for each even mirror.
    pub fn whole_over_part(&self) -> f64 {
        self.even().fold(1.0, |factor, _| 2.0 * factor)
    }

    /// All members of the group but the identity, single planes first.
    pub fn reflections(&self) -> Vec<Reflection> {
        let mut masks: Vec<u32> = (1..1 << self.planes.len()).collect();
        masks.sort_by_key(|mask| mask.count_ones());
        masks.into_iter().map(|mask| self.product(mask)).collect()
    }

    /// The products of even mirrors but the identity: they lead from the part to its copies.
    pub fn copies(&self) -> Vec<Reflection> {
        let even = self.even().map(|plane| ImagePlane { plane: *plane, kind: PlaneKind::Even }).collect();
        Images { planes: even }.reflections()
    }

    /// The product of reflections at the mirrors behind which `x` lies; earth planes do not count.
    pub fn to_front(&self, x: &Vec3) -> Reflection {
        let behind = |plane: &ImagePlane| plane.kind != PlaneKind::Earth && plane.plane.height(x) < 0.0;
        let mask =
            (0..self.planes.len()).filter(|k| behind(&self.planes[*k])).fold(0, |mask, k| mask | 1 << k);
        self.product(mask)
    }

    fn product(&self, mask: u32) -> Reflection {
        let chosen = || (0..self.planes.len()).filter(|k| mask >> k & 1 == 1).map(|k| &self.planes[k]);
        Reflection {
            planes: chosen().map(|plane| plane.plane).collect(),
            sign: chosen().map(|plane| plane.kind.sign()).product(),
        }
    }
}

impl From<Option<Plane>> for Images {
    /// One earth plane, or none.
    fn from(plane: Option<Plane>) -> Self {
        Images {
            planes: plane.map(|plane| ImagePlane { plane, kind: PlaneKind::Earth }).into_iter().collect(),
        }
    }
}

impl From<&Images> for Images {
    fn from(images: &Images) -> Self {
        images.clone()
    }
}

impl Reflection {
    /// `x` reflected [m].
    pub fn point(&self, x: &Vec3) -> Vec3 {
        self.planes.iter().fold(*x, |x, plane| plane.mirror(&x))
    }

    /// A direction reflected [unit of `v`].
    pub fn direction(&self, v: &Vec3) -> Vec3 {
        self.planes.iter().fold(*v, |v, plane| v - plane.facing * (2.0 * v.dot(&plane.facing)))
    }

    /// Whether right-handed shapes become left-handed.
    pub fn turns_over(&self) -> bool {
        self.planes.len() % 2 == 1
    }

    /// Whether nothing is reflected.
    pub fn is_identity(&self) -> bool {
        self.planes.is_empty()
    }
}
