//! Quadrature rules.
//!
//! Triangle rules are in barycentric coordinates, weights sum to 1 (mean over the triangle).

/// Degree 4, six points: Dunavant (1985), table II.
pub const SIX: [([f64; 3], f64); 6] = {
    const A: f64 = 0.445_948_490_915_964_9;
    const B: f64 = 0.091_576_213_509_770_74;
    const WA: f64 = 0.223_381_589_678_011_47;
    const WB: f64 = 1.0 / 3.0 - WA;
    [
        ([1.0 - 2.0 * A, A, A], WA),
        ([A, 1.0 - 2.0 * A, A], WA),
        ([A, A, 1.0 - 2.0 * A], WA),
        ([1.0 - 2.0 * B, B, B], WB),
        ([B, 1.0 - 2.0 * B, B], WB),
        ([B, B, 1.0 - 2.0 * B], WB),
    ]
};

/// Degree 5, seven points: Radon (1948), (155 ± √15)/1200 and (6 ± √15)/21.
pub const SEVEN: [([f64; 3], f64); 7] = {
    const A: f64 = 0.470_142_064_105_115_1;
    const B: f64 = 0.101_286_507_323_456_34;
    const WA: f64 = 0.132_394_152_788_506_2;
    const WB: f64 = 0.125_939_180_544_827_14;
    const T: f64 = 1.0 / 3.0;
    [
        ([T, T, T], 0.225),
        ([1.0 - 2.0 * A, A, A], WA),
        ([A, 1.0 - 2.0 * A, A], WA),
        ([A, A, 1.0 - 2.0 * A], WA),
        ([1.0 - 2.0 * B, B, B], WB),
        ([B, 1.0 - 2.0 * B, B], WB),
        ([B, B, 1.0 - 2.0 * B], WB),
    ]
};

/// The three points over which collocation is averaged (DESIGN 3.2): (2/3, 1/6, 1/6) and turns;
/// with equal weights a rule of degree 2.
pub const TEST_POINTS: [[f64; 3]; 3] = {
    const A: f64 = 2.0 / 3.0;
    const B: f64 = 1.0 / 6.0;
    [[A, B, B], [B, A, B], [B, B, A]]
};

/// Gauss–Legendre on (0, 1), three points: abscissa and weight (Abramowitz and Stegun, 25.4.30).
pub const GAUSS_THREE: [(f64, f64); 3] =
    [(0.112_701_665_379_258_31, 5.0 / 18.0), (0.5, 4.0 / 9.0), (0.887_298_334_620_741_7, 5.0 / 18.0)];

/// Gauss–Legendre on (0, 1), five points.
pub const GAUSS_FIVE: [(f64, f64); 5] = [
    (0.046_910_077_030_668_004, 0.118_463_442_528_094_54),
    (0.230_765_344_947_158_45, 0.239_314_335_249_683_24),
    (0.5, 64.0 / 225.0),
    (0.769_234_655_052_841_5, 0.239_314_335_249_683_24),
    (0.953_089_922_969_332, 0.118_463_442_528_094_54),
];
