//! Quadrature rules.
//!
//! Triangle rules are in barycentric coordinates, weights sum to 1 (mean over the triangle).

/// Degree 4, six points: Dunavant (1985), table II.
pub const SIX: [([f64; 3], f64); 6] = {
    const A: f64 = 0.445_948_490_915_965;
    const B: f64 = 0.091_576_213_509_771;
    const WA: f64 = 0.223_381_589_678_011;
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

/// Gauss–Legendre on (0, 1), eight points: abscissa and weight (Abramowitz and Stegun, 25.4.30).
pub const GAUSS_EIGHT: [(f64, f64); 8] = [
    (0.019_855_071_751_231_88, 0.050_614_268_145_188_13),
    (0.101_666_761_293_186_63, 0.111_190_517_226_687_24),
    (0.237_233_795_041_835_5, 0.156_853_322_938_943_64),
    (0.408_282_678_752_175_1, 0.181_341_891_689_181),
    (0.591_717_321_247_825, 0.181_341_891_689_181),
    (0.762_766_204_958_164_5, 0.156_853_322_938_943_64),
    (0.898_333_238_706_813_4, 0.111_190_517_226_687_24),
    (0.980_144_928_248_768_1, 0.050_614_268_145_188_13),
];
