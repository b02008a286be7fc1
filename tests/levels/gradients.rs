//! What one standard uncertainty of each number of a table does to a result, against derivatives worked out by hand.

use super::value_of;
use ketwork::num::Scalar;
use ketwork::num::units::ConstantSet;
use ketwork::sums::Value;
use ketwork::systems::levels::LevelSystem;
use ketwork::theory::terms::Source;

/// One ground level, an element of each quantity; in hartree, so that nothing is converted.
const TABLE: &str = "row,name,energy,unit,from,to,operator,quantity,value
level,4s_1/2,0.25(1),hartree
level,4p_1/2,0.75(2),hartree
level,4p_3/2,0.875(3),hartree
level,5p_3/2,1.5(4),hartree
element,,,,4s_1/2,4p_1/2,D,reduced,4.25(5)
element,,,,4s_1/2,4p_3/2,D,line_strength,30(6)
element,,,,4s_1/2,5p_3/2,D,oscillator_strength,0.5(7)
";

const SIGMA: [f64; 7] = [0.01, 0.02, 0.003, 0.4, 0.05, 6.0, 0.7];

/// Gaps and line strengths; an oscillator strength f is 3 f/gap as a line strength for J = 1/2.
const GAPS: [f64; 3] = [0.5, 0.625, 1.25];

fn strengths() -> [f64; 3] {
    [4.25 * 4.25, 30.0, 3.0 * 0.5 / 1.25]
}

/// The derivatives of (1/3) sum S gap/(gap^2 - w^2) with respect to each number of the table, and to w.
fn derivatives(w: f64) -> ([f64; 7], f64) {
    let s = strengths();
    let denominator: Vec<f64> = GAPS.iter().map(|gap| gap * gap - w * w).collect();
    let by_strength = |k: usize| GAPS[k] / (3.0 * denominator[k]);
    // d/dgap of gap/(gap^2 - w^2)
    let by_gap = |k: usize| -(GAPS[k] * GAPS[k] + w * w) / (denominator[k] * denominator[k]) * s[k] / 3.0;
    // the strength of the third line falls with the gap where f is held
    let third = by_gap(2) - by_strength(2) * s[2] / GAPS[2];
    let by_w: f64 = (0..3).map(|k| 2.0 * w * GAPS[k] * s[k] / (3.0 * denominator[k] * denominator[k])).sum();
    let ground = -(by_gap(0) + by_gap(1) + third);
    let by_data = [
        ground,
        by_gap(0),
        by_gap(1),
        third,
        by_strength(0) * 2.0 * 4.25,
        by_strength(1),
        by_strength(2) * 3.0 / GAPS[2],
    ];
    (by_data, by_w)
}

/// The changes of a value by source, in the order of the file.
fn changes(value: &Value) -> Vec<f64> {
    let indices: Vec<usize> = value
        .sources
        .iter()
        .map(|(source, _)| match source {
            Source::Datum { system, index } if system == "k" => *index,
            other => panic!("{other:?}"),
        })
        .collect();
    assert_eq!(indices, (0..7).collect::<Vec<_>>());
    value.sources.iter().map(|(_, change)| change.to_f64()).collect()
}

fn check(value: &Value, expected: impl Fn(usize) -> f64) {
    for (at, change) in changes(value).into_iter().enumerate() {
        let expected = expected(at) * SIGMA[at];
        assert!((change / expected - 1.0).abs() < 1e-9, "number {at}: {change} and {expected}");
    }
}

const ALPHA: &str =
    "-<k[4s_1/2, M=1/2]| D_z (1/(E(k[4s_1/2]) + w - H) + 1/(E(k[4s_1/2]) - w - H)) D_z |k[4s_1/2, M=1/2]>";

fn alpha(w: &str) -> String {
    ALPHA.replace('w', w)
}

#[test]
fn of_a_polarizability() {
    for (text, w) in [("0", 0.0), ("1/4", 0.25), ("0.55", 0.55)] {
        let system = LevelSystem::read(TABLE, ConstantSet::default()).expect("a good table");
        let value = value_of(system, &alpha(text));
        let (by_data, _) = derivatives(w);
        check(&value, |at| by_data[at]);
    }
}

#[test]
fn of_the_frequency_of_a_zero() {
    let system = LevelSystem::read(TABLE, ConstantSet::default()).expect("a good table");
    let value = value_of(system, &format!("zero(w in 0.505 .. 0.62, {ALPHA})"));
    let Scalar::Approx(root) = &value.scalar else { panic!("an exact zero") };
    let w = root.midpoint(64).real().to_f64();
    let (by_data, by_w) = derivatives(w);
    // alpha(w(x), x) = 0
    check(&value, |at| -by_data[at] / by_w);
}

/// A number that comes in twice counts once: the same table, subtracted from itself.
#[test]
fn one_source_counts_once() {
    let system = LevelSystem::read(TABLE, ConstantSet::default()).expect("a good table");
    let value = value_of(system, &format!("{0} - {0}", alpha("1/4")));
    assert!(value.sources.is_empty());
}
