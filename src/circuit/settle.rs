//! Potentials and charges of an assembly in which some rows are held and others float.

use crate::circuit::CircuitError;
use crate::circuit::Matrix;
use crate::circuit::matrix::Solver;
use crate::circuit::matrix::check;
use nalgebra::DMatrix;

/// What is known of a row.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum State {
    /// Held at a potential [V].
    Potential(f64),
    /// Floating with a net charge [C]; members of one group share the sum of their charges.
    Charge(f64),
    /// Driven to the potential of another row by a source of its own: a driven guard.  Its charge
    /// comes from that source and does not enter the balance of the row it follows.
    Follow(usize),
}

/// An assembly at rest, and how it answers to a small change `δC` of the matrix.
///
/// With `V` the potentials, every weight vector `u` below means `δ(…) = uᵀ δC V = Σ_ij u_i V_j δC_ij`
/// to first order, at the same given potentials and charges.  Derivation: let row k of `B` pick
/// the rows whose charges sum to the given charge `q_k` of floating group k, and column k of `P` the
/// rows at its potential `v_k` (the group and what follows it).  `Bᵀ C (P v + V_given) = q` gives
/// `M v = q − Bᵀ C V_given` with `M = Bᵀ C P`, and varied at fixed `q`: `M δv = −Bᵀ δC V`.
#[derive(Clone, Debug, PartialEq)]
pub struct Settled {
    /// Potential of each row [V].
    pub potentials: Vec<f64>,
    /// Charge of each row [C].
    pub charges: Vec<f64>,
    /// Field energy ½ Σ V_i Q_i [J].
    pub energy: f64,
    /// `reaction[k][i]`: row k of `M⁻¹ Bᵀ` [1/F].
    reaction: Matrix,
    /// Floating group whose potential each row has.
    group: Vec<Option<usize>>,
    /// `coupling[i][k]` = (C P)_ik: charge of row i per volt on group k [F].
    coupling: Matrix,
}

impl Settled {
    /// Weights `u` [1/F] of the potential of row `m`: `δV_m = uᵀ δC V`; zero if it is given.
    pub fn weights_potential(&self, m: usize) -> Vec<f64> {
        match self.group[m] {
            Some(k) => self.reaction[k].iter().map(|b| -b).collect(),
            None => vec![0.0; self.potentials.len()],
        }
    }

    /// Weights `u` [1] of the charge of row `i`: `δQ_i = uᵀ δC V`.
    ///
    /// `u = e_i − B M⁻ᵀ (C P)ᵀ e_i`: zero up to rounding for a row that floats alone.
    pub fn weights_charge(&self, i: usize) -> Vec<f64> {
        let mut u = vec![0.0; self.potentials.len()];
        u[i] = 1.0;
        for (reaction, coupling) in self.reaction.iter().zip(&self.coupling[i]) {
            for (u, b) in u.iter_mut().zip(reaction) {
                *u -= coupling * b;
            }
        }
        u
    }

    /// Weights `w` [V] of the energy: `δW = wᵀ δC V`, with `w = ½ V − B M⁻ᵀ Pᵀ Q`.
    ///
    /// Given potentials only, or floating rows without charge: `w = ½ V`, so `δW = ½ Vᵀ δC V`.  All
    /// rows with given charge: `w = −½ V`, so `δW = −½ Vᵀ δC V` (the sign turns, since then
    /// `W = ½ Qᵀ C⁻¹ Q`).
    pub fn weights_energy(&self) -> Vec<f64> {
        let mut w: Vec<f64> = self.potentials.iter().map(|v| 0.5 * v).collect();
        for (k, reaction) in self.reaction.iter().enumerate() {
            let of_group = self.group.iter().zip(&self.charges).filter(|(group, _)| **group == Some(k));
            let charge: f64 = of_group.map(|(_, q)| q).sum();
            for (w, b) in w.iter_mut().zip(reaction) {
                *w -= charge * b;
            }
        }
        w
    }
}

/// Potentials, charges and energy of the assembly.
///
/// `groups` lists rows that are bonded and so at one potential; a row in none stands alone.  A group
/// with a given potential among its members is held at it; otherwise the members' charges are
/// summed and spread over the group.
///
/// # Errors
/// [`CircuitError`]; singular where a floating row has no capacitance.
pub fn settle(c: &[Vec<f64>], states: &[State], groups: &[Vec<usize>]) -> Result<Settled, CircuitError> {
    check(c)?;
    let n = c.len();
    if states.len() != n {
        return Err(CircuitError::Size { line: states.len().min(n), found: 0, expected: n });
    }
    let plan = plan(states, groups)?;
    let n_free = plan.charge.len();
    let given: Vec<f64> =
        plan.hold.iter().map(|hold| if let Hold::At(v) = hold { *v } else { 0.0 }).collect();
    let coupling = DMatrix::from_fn(n, n_free, |i, k| {
        (0..n).filter(|j| plan.hold[*j] == Hold::With(k)).map(|j| c[i][j]).sum::<f64>()
    });
    let balance = DMatrix::from_fn(n_free, n, |k, i| if plan.balance[i] == Some(k) { 1.0 } else { 0.0 });
    let solver = Solver::build(&(&balance * &coupling))?;
    let reaction = solver.solve(&balance);
    let from_given = DMatrix::from_fn(n, 1, |i, _| c[i].iter().zip(&given).map(|(c, v)| c * v).sum());
    let charge = DMatrix::from_column_slice(n_free, 1, &plan.charge);
    let free = solver.solve(&(charge - &balance * from_given));
    let potentials: Vec<f64> = plan
        .hold
        .iter()
        .map(|hold| match hold {
            Hold::At(v) => *v,
            Hold::With(k) => free[*k],
        })
        .collect();
    let charges: Vec<f64> = (0..n)
        .map(|i| match plan.alone(i) {
            Some(k) => plan.charge[k],
            None => c[i].iter().zip(&potentials).map(|(c, v)| c * v).sum(),
        })
        .collect();
    let energy = 0.5 * potentials.iter().zip(&charges).map(|(v, q)| v * q).sum::<f64>();
    let nested = |m: &DMatrix<f64>| m.row_iter().map(|row| row.iter().copied().collect()).collect();
    let group = plan.hold.iter().map(|hold| if let Hold::With(k) = hold { Some(*k) } else { None }).collect();
    Ok(Settled {
        potentials,
        charges,
        energy,
        reaction: nested(&reaction),
        group,
        coupling: nested(&coupling),
    })
}

/// Where the potential of a row comes from.
#[derive(Clone, Copy, Debug, PartialEq)]
enum Hold {
    /// Given [V].
    At(f64),
    /// That of a floating group.
    With(usize),
}

/// States and groups resolved.
struct Plan {
    /// By row.
    hold: Vec<Hold>,
    /// Floating group whose charge each row is part of.
    balance: Vec<Option<usize>>,
    /// Charge of each floating group [C].
    charge: Vec<f64>,
}

impl Plan {
    /// The floating group of a row that is all of its group: its charge is known exactly.
    fn alone(&self, row: usize) -> Option<usize> {
        let k = self.balance[row]?;
        let members = self.balance.iter().filter(|group| **group == Some(k)).count();
        if members == 1 { Some(k) } else { None }
    }
}

fn plan(states: &[State], groups: &[Vec<usize>]) -> Result<Plan, CircuitError> {
    let n = states.len();
    let mut grouped = vec![false; n];
    for row in groups.iter().flatten() {
        if n <= *row || grouped[*row] {
            return Err(CircuitError::BadGroup { row: *row });
        }
        grouped[*row] = true;
    }
    let alone = (0..n).filter(|row| !grouped[*row]).map(|row| vec![row]);
    let all: Vec<Vec<usize>> =
        groups.iter().filter(|group| !group.is_empty()).cloned().chain(alone).collect();
    let mut hold: Vec<Option<Hold>> = vec![None; n];
    let (mut balance, mut charge, mut leader) = (vec![None; n], Vec::new(), vec![None; n]);
    for group in &all {
        match group_state(states, group)? {
            State::Potential(v) => group.iter().for_each(|row| hold[*row] = Some(Hold::At(v))),
            State::Charge(q) => {
                for row in group {
                    (hold[*row], balance[*row]) = (Some(Hold::With(charge.len())), Some(charge.len()));
                }
                charge.push(q);
            }
            State::Follow(row) => group.iter().for_each(|member| leader[*member] = Some(row)),
        }
    }
    let found = (0..n).map(|row| resolved(row, &hold, &leader)).collect::<Result<_, _>>()?;
    Ok(Plan { hold: found, balance, charge })
}

/// The one state of bonded rows.
fn group_state(states: &[State], group: &[usize]) -> Result<State, CircuitError> {
    let mut held: Option<State> = None;
    let mut charge = 0.0;
    for row in group {
        let (row, state) = (*row, states[*row]);
        let finite = matches!(state, State::Potential(x) | State::Charge(x) if x.is_finite());
        match (state, held) {
            (State::Follow(to), _) if states.len() <= to || group.contains(&to) => {
                return Err(CircuitError::BadGroup { row });
            }
            (State::Potential(_) | State::Charge(_), _) if !finite => {
                return Err(CircuitError::NotFinite { row });
            }
            (State::Charge(q), _) => charge += q,
            (State::Potential(volts), Some(State::Potential(other))) => {
                if 0.0 < (volts - other).abs() {
                    return Err(CircuitError::TwoPotentials { row, volts, other });
                }
            }
            (state, None) => held = Some(state),
            (state, Some(other)) => {
                if state != other {
                    return Err(CircuitError::BadGroup { row });
                }
            }
        }
    }
    match held {
        None => Ok(State::Charge(charge)),
        Some(_) if charge != 0.0 => Err(CircuitError::ChargeOnHeld { row: group[0], coulombs: charge }),
        Some(state) => Ok(state),
    }
}

/// Goes from follower to leader until a row is held; longer than there are rows, it goes round.
fn resolved(row: usize, hold: &[Option<Hold>], leader: &[Option<usize>]) -> Result<Hold, CircuitError> {
    let mut at = row;
    for _ in 0..hold.len() {
        match (hold[at], leader[at]) {
            (Some(hold), _) => return Ok(hold),
            (None, Some(next)) => at = next,
            (None, None) => break,
        }
    }
    Err(CircuitError::BadGroup { row })
}
