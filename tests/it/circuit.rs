//! Laws and closed forms of the algebra on the Maxwell matrix.
use crate::fixtures;
use amberskin::circuit::{CircuitError, Settled, State, bonded, earth, inverse, mutual, settle};

#[track_caller]
fn assert_close(found: f64, expected: f64, rel_tol: f64) {
    assert!((found - expected).abs() <= rel_tol * expected.abs(), "{found:e}, expected {expected:e}");
}

/// A divider: `V = V0 c12 / (c12 + c20)`, the capacitive divider of any textbook.
#[test]
fn a_floating_electrode_divides_the_voltage() {
    let (c12, c10, c20) = (3e-12, 5e-12, 2e-12);
    let c = vec![vec![c12 + c10, -c12], vec![-c12, c12 + c20]];
    let rest = settle(&c, &[State::Potential(1e3), State::Charge(0.0)], &[]).unwrap();
    assert_close(rest.potentials[1], 1e3 * c12 / (c12 + c20), 1e-15);
    let series = c10 + c12 * c20 / (c12 + c20);
    assert_close(rest.charges[0], 1e3 * series, 1e-14);
    assert_close(rest.energy, 0.5 * 1e6 * series, 1e-14);
}

/// Values of the exact image series for three balls over a floor (see `fixtures`).
#[test]
fn the_tap_of_the_three_ball_stack_floats_where_the_series_says() {
    let states = |q| [State::Potential(1e5), State::Charge(q), State::Potential(0.0)];
    let c = fixtures::matrix();
    let rest = settle(&c, &states(0.0), &[]).unwrap();
    assert_close(rest.potentials[1], 31.15993895e3, 1e-9);
    assert_close(rest.energy, 30.1501e-3, 2e-6);
    let charged = settle(&c, &states(1e-9), &[]).unwrap();
    assert_close(charged.potentials[1] - rest.potentials[1], 251.87, 2e-5);
    assert_close(charged.charges[1], 1e-9, 0.0);
}

/// A guard at the potential of the inner electrode takes its mutual charge away: `Q_1 = c_10 V`.
#[test]
fn a_driven_guard_leaves_only_the_rest() {
    let c = fixtures::matrix();
    let rest = settle(&c, &[State::Potential(7.0), State::Follow(0), State::Potential(0.0)], &[]).unwrap();
    assert_close(rest.potentials[1], 7.0, 0.0);
    assert_close(rest.charges[0], 7.0 * (c[0][0] + c[0][1]), 1e-14);
    // Following a floating row, the source of the guard feeds the guard alone.
    let floating = [State::Potential(7.0), State::Charge(0.0), State::Follow(1)];
    let rest = settle(&c, &floating, &[]).unwrap();
    assert_close(rest.potentials[2], rest.potentials[1], 0.0);
    assert_close(rest.potentials[1], -7.0 * c[1][0] / (c[1][1] + c[1][2]), 1e-14);
}

#[test]
fn a_bonded_pair_is_the_sum_of_its_rows() {
    let c = fixtures::matrix();
    let b = bonded(&c, &[vec![0, 2], vec![1]]).unwrap();
    assert_close(b[0][0], c[0][0] + c[0][2] + c[2][0] + c[2][2], 1e-15);
    let states = [State::Charge(2e-9), State::Potential(5.0), State::Charge(1e-9)];
    let apart = settle(&c, &states, &[vec![2, 0]]).unwrap();
    let one = settle(&b, &[State::Charge(3e-9), State::Potential(5.0)], &[]).unwrap();
    assert_close(apart.potentials[0], one.potentials[0], 1e-14);
    assert_close(apart.potentials[2], one.potentials[0], 1e-14);
    assert_close(apart.charges[0] + apart.charges[2], 3e-9, 1e-14);
    assert_close(apart.energy, one.energy, 1e-14);
}

#[test]
fn mutual_and_earth_put_the_matrix_together_again() {
    let c = fixtures::matrix();
    let (m, e) = (mutual(&c), earth(&c));
    for i in 0..3 {
        assert_close(m[i].iter().sum::<f64>() + e[i], c[i][i], 1e-15);
    }
    let p = inverse(&c).unwrap();
    for (i, p) in p.iter().enumerate() {
        let product: Vec<f64> = (0..3).map(|j| p.iter().zip(&c).map(|(p, c)| p * c[j]).sum()).collect();
        for (j, one) in product.iter().enumerate() {
            assert!((one - f64::from(u8::from(i == j))).abs() < 1e-14, "p c at {i}, {j}: {one}");
        }
    }
}

/// Every kind of weight against the difference of two settlings, on random matrices of six rows
/// with held, floating, charged, bonded and following rows.
#[test]
fn weights_are_the_slopes_of_settle() {
    let mut random = Random(20_240_607);
    for round in 0..40 {
        let c = random.matrix(6);
        let states = [
            State::Potential(random.between(-2.0, 2.0)),
            State::Charge(random.between(-1.0, 1.0) * 1e-12),
            State::Charge(0.0),
            State::Charge(random.between(-1.0, 1.0) * 1e-12),
            if round % 2 == 0 { State::Follow(1) } else { State::Potential(0.5) },
            State::Potential(random.between(-2.0, 2.0)),
        ];
        let groups = [vec![2, 3]];
        let delta = random.symmetric(6);
        let moved = |t: f64| -> Settled {
            let c: Vec<Vec<f64>> =
                (0..6).map(|i| (0..6).map(|j| c[i][j] + t * delta[i][j]).collect()).collect();
            settle(&c, &states, &groups).unwrap()
        };
        let (rest, up, down) = (moved(0.0), moved(1e-4), moved(-1e-4));
        let change: Vec<f64> =
            delta.iter().map(|row| row.iter().zip(&rest.potentials).map(|(d, v)| d * v).sum()).collect();
        let by = |u: Vec<f64>| -> f64 { u.iter().zip(&change).map(|(u, d)| u * d).sum() };
        let slope = |of: &dyn Fn(&Settled) -> f64| (of(&up) - of(&down)) / 2e-4;
        for m in 0..6 {
            near(by(rest.weights_potential(m)), slope(&|s| s.potentials[m]), 1.0);
            near(by(rest.weights_charge(m)), slope(&|s| s.charges[m]), 1e-12);
        }
        near(by(rest.weights_energy()), slope(&|s| s.energy), 1e-12);
    }
}

/// Within 1e-6 of the larger of the value and `size`, the order of all such values.
#[track_caller]
fn near(found: f64, expected: f64, size: f64) {
    let tol = 1e-6 * expected.abs().max(size);
    assert!((found - expected).abs() <= tol, "{found:e}, difference quotient {expected:e}");
}

/// All charges given: `W = ½ Qᵀ C⁻¹ Q`, so the sign of the slope turns.
#[test]
fn energy_at_given_charges_falls_as_capacitance_grows() {
    let c = fixtures::matrix();
    let held = settle(&c, &[State::Potential(3.0); 3], &[]).unwrap();
    let floating = settle(&c, &[State::Charge(1e-11); 3], &[]).unwrap();
    for i in 0..3 {
        assert_close(held.weights_energy()[i], 0.5 * held.potentials[i], 1e-15);
        assert_close(floating.weights_energy()[i], -0.5 * floating.potentials[i], 1e-12);
        assert!(floating.weights_charge(i).iter().all(|u| u.abs() < 1e-12), "a given charge does not move");
        assert!(held.weights_potential(i).iter().all(|u| *u == 0.0), "a given potential does not move");
    }
}

#[test]
fn what_has_no_answer_is_refused() {
    let c = fixtures::matrix();
    let v = State::Potential;
    let q = State::Charge;
    let equal = vec![vec![1e-12, -1e-12], vec![-1e-12, 1e-12]];
    let refused = |found: Result<Settled, CircuitError>| found.unwrap_err();
    assert!(
        matches!(inverse(&equal), Err(CircuitError::Singular { n: 2, .. })),
        "two shorted plates in a box"
    );
    assert!(matches!(inverse(&[vec![0.0]]), Err(CircuitError::Singular { .. })), "no capacitance");
    assert!(matches!(inverse(&[vec![1.0, 2.0]]), Err(CircuitError::Size { .. })), "not square");
    assert!(matches!(inverse(&[vec![f64::NAN]]), Err(CircuitError::NotFinite { row: 0 })), "not a number");
    let two = refused(settle(&c, &[v(1.0), v(2.0), q(0.0)], &[vec![0, 1]]));
    assert_eq!(two, CircuitError::TwoPotentials { row: 1, volts: 2.0, other: 1.0 });
    let charged = refused(settle(&c, &[v(1.0), q(1e-9), q(0.0)], &[vec![0, 1]]));
    assert!(matches!(charged, CircuitError::ChargeOnHeld { .. }), "{charged}");
    let twice = refused(settle(&c, &[q(0.0); 3], &[vec![0, 1], vec![1, 2]]));
    assert_eq!(twice, CircuitError::BadGroup { row: 1 });
    let round = refused(settle(&c, &[State::Follow(1), State::Follow(0), v(0.0)], &[]));
    assert!(matches!(round, CircuitError::BadGroup { .. }), "{round}");
    assert!(settle(&[], &[], &[]).is_ok(), "nothing is at rest");
}

/// A linear congruential generator (Knuth, MMIX); seeded, so every run is the same.
struct Random(u64);

impl Random {
    fn between(&mut self, low: f64, high: f64) -> f64 {
        self.0 = self.0.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        low + (high - low) * (self.0 >> 11) as f64 / (1u64 << 53) as f64
    }

    fn symmetric(&mut self, n: usize) -> Vec<Vec<f64>> {
        let mut m = vec![vec![0.0; n]; n];
        let pairs = (0..n).flat_map(|i| (0..=i).map(move |j| (i, j)));
        for (i, j) in pairs {
            let entry = self.between(-1.0, 1.0) * 1e-12;
            (m[i][j], m[j][i]) = (entry, entry);
        }
        m
    }

    /// A Maxwell matrix from random mutual and earth capacitances of 0.1 to 3 pF.
    fn matrix(&mut self, n: usize) -> Vec<Vec<f64>> {
        let mut c = vec![vec![0.0; n]; n];
        for i in 0..n {
            c[i][i] += self.between(0.1, 3.0) * 1e-12;
            for j in 0..i {
                let mutual = self.between(0.1, 3.0) * 1e-12;
                (c[i][j], c[j][i]) = (-mutual, -mutual);
                c[i][i] += mutual;
                c[j][j] += mutual;
            }
        }
        c
    }
}
