//! Coefficients of time methods.

use crate::exact::Rational;

/// A 2N-storage Runge–Kutta method: k ← a k + dt·rate, u ← u + b k, at times c.
#[derive(Clone, Debug)]
pub struct LowStorage {
    pub a: Vec<Rational>,
    pub b: Vec<Rational>,
    pub c: Vec<Rational>,
}

/// Five stages, fourth order (Carpenter & Kennedy 1994, NASA TM 109112).
pub fn carpenter_kennedy() -> LowStorage {
    let list =
        |pairs: [(i64, i64); 5]| pairs.iter().map(|(above, below)| Rational::ratio(*above, *below)).collect();
    LowStorage {
        a: list([
            (0, 1),
            (-567_301_805_773, 1_357_537_059_087),
            (-2_404_267_990_393, 2_016_746_695_238),
            (-3_550_918_686_646, 2_091_501_179_385),
            (-1_275_806_237_668, 842_570_457_699),
        ]),
        b: list([
            (1_432_997_174_477, 9_575_080_441_755),
            (5_161_836_677_717, 13_612_068_292_357),
            (1_720_146_321_549, 2_090_206_949_498),
            (3_134_564_353_537, 4_481_467_310_338),
            (2_277_821_191_437, 14_882_151_754_819),
        ]),
        c: list([
            (0, 1),
            (1_432_997_174_477, 9_575_080_441_755),
            (2_526_269_341_429, 6_820_363_962_896),
            (2_006_345_519_317, 3_224_310_063_776),
            (2_802_321_613_138, 2_924_317_926_251),
        ]),
    }
}
