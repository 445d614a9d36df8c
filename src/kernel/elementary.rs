//! Logarithm of a ratio and angle of a point, in line and without a table.
//!
//! The coefficients of the angle are those of the public fdlibm (Sun Microsystems 1993, `atan`).

use std::f64::consts::FRAC_PI_4;
use std::f64::consts::LN_2;
use std::f64::consts::PI;

/// `ln(a/b)` for `a ≥ b > 0` [1]; infinite for `b = 0`.
///
/// Relative error at most 7e-16 for `a ≥ 2b`; where the ratio tends to 1 take [`log_sides`].
#[inline(always)]
pub(super) fn log_ratio(a: f64, b: f64) -> f64 {
    if b < f64::MIN_POSITIVE {
        return (a / b).ln();
    }
    let (k, power) = nearest_power(a, b);
    k * LN_2 + twice_atanh((a - power * b) / (a + power * b))
}

/// `ln((u + v)/(u − v))` for `u > v ≥ 0`, `u − v` not cancelling [1].
///
/// `k ln 2 + 2 atanh((a − 2ᵏb)/(a + 2ᵏb))` with `a = u + v`, `b = u − v` and `2ᵏ` the power of two next
/// to `a/b`.  Difference and sum are formed from `u` and `v`, exact for `k = 0`: one division, and no
/// digit lost where the ratio tends to 1.  Relative error at most 7e-16 over 1e6 random ratios.
#[inline(always)]
pub(super) fn log_sides(u: f64, v: f64) -> f64 {
    let (k, power) = nearest_power(u + v, u - v);
    let (less, more) = (1.0 - power, 1.0 + power);
    k * LN_2 + twice_atanh((u * less + v * more) / (u * more + v * less))
}

/// The power of two next to `a/b` and its exponent, so that `a/b` over it is at most 2^0.59.
#[inline(always)]
fn nearest_power(a: f64, b: f64) -> (f64, f64) {
    // The bits of a double, read as an integer, are its logarithm to base two but for 0.09.
    let k = (a.to_bits() as i64).wrapping_sub(b.to_bits() as i64).wrapping_add(1 << 51) >> 52;
    (k as f64, f64::from_bits(((1023 + k) << 52) as u64))
}

/// `2 atanh q` for `|q| ≤ 0.201`, where eleven terms of the series leave 2e-17 of it.
#[inline(always)]
fn twice_atanh(q: f64) -> f64 {
    let s = q * q;
    let (s2, s4) = (s * s, s * s * (s * s));
    let low = (1.0 / 3.0 + s * (1.0 / 5.0)) + s2 * (1.0 / 7.0 + s * (1.0 / 9.0));
    let mid = (1.0 / 11.0 + s * (1.0 / 13.0)) + s2 * (1.0 / 15.0 + s * (1.0 / 17.0));
    let high = 1.0 / 19.0 + s * (1.0 / 21.0);
    2.0 * (q + q * (s * (low + s4 * (mid + s4 * high))))
}

/// Angle of the point `(x, y)` with `y ≥ 0`, from the positive `x` axis [rad]; zero at the origin.
///
/// Relative error at most 7e-16 over 1e6 random points with ratios from 1e-12 to 1e12.
#[inline(always)]
pub(super) fn upper_angle(y: f64, x: f64) -> f64 {
    const EVEN: [f64; 6] = [
        3.333_333_333_333_293e-1,
        1.428_571_427_250_346_6e-1,
        9.090_887_133_436_507e-2,
        6.661_073_137_387_531e-2,
        4.976_877_994_615_932e-2,
        1.628_582_011_536_578_2e-2,
    ];
    const ODD: [f64; 5] = [
        -1.999_999_999_987_648_3e-1,
        -1.111_111_040_546_235_6e-1,
        -7.691_876_205_044_83e-2,
        -5.833_570_133_790_573_5e-2,
        -3.653_157_274_421_691_6e-2,
    ];
    // Tangent of π/8: nearer to the diagonal the angle is counted from there.
    const SPLIT: f64 = 0.414_213_562_373_095_03;
    let width = x.abs();
    let (lo, hi) = if y < width { (y, width) } else { (width, y) };
    if hi <= 0.0 {
        return 0.0;
    }
    let diagonal = SPLIT * hi < lo;
    let (top, bottom) = if diagonal { (lo - hi, lo + hi) } else { (lo, hi) };
    let q = top / bottom;
    let s = q * q;
    let (w, w2) = (s * s, s * s * (s * s));
    let even = (EVEN[0] + w * EVEN[1]) + w2 * ((EVEN[2] + w * EVEN[3]) + w2 * (EVEN[4] + w * EVEN[5]));
    let odd = (ODD[0] + w * ODD[1]) + w2 * ((ODD[2] + w * ODD[3]) + w2 * ODD[4]);
    let angle = q - q * (s * even + w * odd);
    let angle = if diagonal { FRAC_PI_4 + angle } else { angle };
    let angle = if y < width { angle } else { 2.0 * FRAC_PI_4 - angle };
    if x < 0.0 { PI - angle } else { angle }
}

#[cfg(test)]
mod tests {
    use super::log_ratio;
    use super::log_sides;
    use super::upper_angle;

    /// Numbers over many powers of ten: a golden-section sequence, the same every run.
    fn spread(i: u32, lo: f64, hi: f64) -> f64 {
        10.0_f64.powf(lo + (hi - lo) * (f64::from(i) * 0.618_033_988_749_894_9).fract())
    }

    #[test]
    fn the_logarithm_of_a_ratio_is_that_of_the_standard_library() {
        for i in 0..1_000_000 {
            let (b, over) = (spread(i, -9.0, 9.0), spread(i.wrapping_mul(7), -9.0, 30.0));
            let a = b * (2.0 + over);
            let error = (log_ratio(a, b) / (a / b).ln() - 1.0).abs();
            assert!(error <= 7e-16, "ln({a:e}/{b:e}): {error:e}");
            let v = b * spread(i.wrapping_mul(3), -12.0, -0.05);
            let want = (2.0 * v / (b - v)).ln_1p();
            let error = (log_sides(b, v) / want - 1.0).abs();
            assert!(error <= 7e-16, "sides {b:e}, {v:e}: {error:e}");
        }
        assert!(log_ratio(1.0, 0.0).is_infinite(), "a point on the line");
        assert!(log_sides(2.5, 0.0).abs() <= 0.0, "ratio one");
    }

    #[test]
    fn the_angle_is_that_of_the_standard_library() {
        for i in 0..1_000_000 {
            let (y, x) = (spread(i, -6.0, 6.0), spread(i.wrapping_mul(7), -6.0, 6.0));
            for x in [x, -x, 0.0] {
                let error = (upper_angle(y, x) / y.atan2(x) - 1.0).abs();
                assert!(error <= 7e-16, "angle of ({x:e}, {y:e}): {error:e}");
            }
        }
        assert!(upper_angle(0.0, 0.0).abs() <= 0.0, "the origin");
    }
}
