//! Rigid moves from a shape to its copies.

use super::Vec3;
use nalgebra::Rotation3;
use nalgebra::Unit;
use std::f64::consts::TAU;

/// A rigid move without mirroring.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Motion {
    /// A right-handed turn.
    Turn {
        /// A point of the axis [m].
        through: Vec3,
        /// Direction of the axis, a unit vector [1].
        axis: Vec3,
        /// Angle [rad].
        angle: f64,
    },
    /// A shift [m].
    Step(Vec3),
}

/// Difference from a whole turn that is only rounding [rad].
const WHOLE: f64 = 1e-9;

impl Motion {
    /// The move made `k` times over.
    pub fn times(&self, k: usize) -> Motion {
        match *self {
            Motion::Turn { through, axis, angle } => Motion::Turn { through, axis, angle: angle * k as f64 },
            Motion::Step(step) => Motion::Step(step * k as f64),
        }
    }

    /// Whether `count` such moves are one turn all the way round.
    pub fn closes_after(&self, count: usize) -> bool {
        matches!(self, Motion::Turn { angle, .. } if (angle.abs() * count as f64 - TAU).abs() <= WHOLE)
    }

    /// A point moved [m].
    pub fn point(&self, x: &Vec3) -> Vec3 {
        match self {
            Motion::Turn { through, .. } => self.direction(&(x - through)) + through,
            Motion::Step(step) => x + step,
        }
    }

    /// A direction moved [unit of `v`].
    pub fn direction(&self, v: &Vec3) -> Vec3 {
        match self {
            Motion::Turn { axis, angle, .. } => {
                Rotation3::from_axis_angle(&Unit::new_unchecked(*axis), *angle) * v
            }
            Motion::Step(_) => *v,
        }
    }
}
