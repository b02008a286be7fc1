//! The headline tables of triplet and doublet S states, exactly.
//!
//! The values were computed independently for this project as explicit sums over ML, MS in exact arithmetic.

use crate::words::{doublet_s, orbit_dot_spin, paths, rational, response, spin_spin, triplet_s};
use ketwork::angular::Electrons;
use ketwork::angular::chain::{Operator, State};
use ketwork::num::Surd;
use rug::Rational;
use std::collections::BTreeMap;

/// Factors by doubled J of the first intermediate level, for one M; all intermediate J must agree.
fn by_j(g: &State, q: i32, middle: Vec<Operator>, electrons: Electrons, column: usize) -> BTreeMap<i32, Surd> {
    let mut out: BTreeMap<i32, Surd> = BTreeMap::new();
    for path in paths(&response(g, q, middle), electrons).contributions {
        let levels = &path.levels[0];
        assert!(levels.iter().all(|level| level.j == levels[0].j), "scalars keep J");
        *out.entry(levels[0].j.twice()).or_default() += &path.factors[column];
    }
    out
}

fn average(g: &State, q: i32, middle: Vec<Operator>, electrons: Electrons) -> BTreeMap<i32, Surd> {
    let decomposition = paths(&response(g, q, middle), electrons);
    let mut out: BTreeMap<i32, Surd> = BTreeMap::new();
    for path in &decomposition.contributions {
        let average = decomposition.columns.average(&path.factors).expect("every M");
        *out.entry(path.levels[0][0].j.twice()).or_default() += &average;
    }
    out
}

/// Compares a row of a table: factors in ascending J, divided by a unit.
fn row(found: &BTreeMap<i32, Surd>, unit: i64, expected: &[&str], what: &str) {
    let expected: Vec<Surd> = expected.iter().map(|text| rational(text).scaled(&Rational::from(unit))).collect();
    let found: Vec<Surd> = found.values().cloned().collect();
    assert_eq!(found, expected, "{what}");
}

/// A row of the table: q, doubled M (none for the average), and factors by J.
type Row<'a> = (i32, Option<i32>, &'a [&'a str]);

fn check(g: &State, middle: &dyn Fn() -> Vec<Operator>, electrons: Electrons, unit: i64, top: i32, rows: &[Row]) {
    for (q, m, expected) in rows {
        let what = format!("q = {q}, 2M = {m:?}");
        let found = match m {
            Some(m) => by_j(g, *q, middle(), electrons, usize::try_from((m + top) / 2).expect("a column")),
            None => average(g, *q, middle(), electrons),
        };
        row(&found, unit, expected, &what);
    }
}

#[test]
fn triplet_without_perturbation() {
    let rows: &[Row] = &[
        (0, Some(0), &["1/9", "0", "2/9"]),
        (0, Some(2), &["0", "1/6", "1/6"]),
        (0, Some(-2), &["0", "1/6", "1/6"]),
        (1, Some(0), &["0", "1/6", "1/6"]),
        (1, Some(2), &["0", "0", "1/3"]),
        (1, Some(-2), &["1/9", "1/6", "1/18"]),
        (-1, Some(2), &["1/9", "1/6", "1/18"]),
        (0, None, &["1/27", "1/9", "5/27"]),
        (1, None, &["1/27", "1/9", "5/27"]),
    ];
    check(&triplet_s(), &Vec::new, Electrons::TWO, 1, 2, rows);
}

#[test]
fn triplet_with_spin_orbit() {
    let rows: &[Row] = &[
        (0, Some(0), &["-2/9", "0", "2/9"]),
        (0, Some(2), &["0", "-1/6", "1/6"]),
        (1, Some(0), &["0", "-1/6", "1/6"]),
        (1, Some(2), &["0", "0", "1/3"]),
        (1, Some(-2), &["-2/9", "-1/6", "1/18"]),
        (-1, Some(2), &["-2/9", "-1/6", "1/18"]),
        (0, None, &["-2/27", "-1/9", "5/27"]),
        (-1, None, &["-2/27", "-1/9", "5/27"]),
    ];
    check(&triplet_s(), &|| vec![orbit_dot_spin()], Electrons::TWO, 1, 2, rows);
}

#[test]
fn triplet_with_spin_spin() {
    let rows: &[Row] = &[
        (0, Some(0), &["1/27", "0", "1/135"]),
        (0, Some(-2), &["0", "-1/36", "1/180"]),
        (1, Some(0), &["0", "-1/36", "1/180"]),
        (1, Some(2), &["0", "0", "1/90"]),
        (1, Some(-2), &["1/27", "-1/36", "1/540"]),
        (0, None, &["1/81", "-1/54", "1/162"]),
        (1, None, &["1/81", "-1/54", "1/162"]),
    ];
    check(&triplet_s(), &|| vec![spin_spin()], Electrons::TWO, 1, 2, rows);
}

#[test]
fn triplet_with_two_spin_orbits() {
    let rows: &[Row] =
        &[(0, Some(0), &["4/9", "0", "2/9"]), (0, Some(2), &["0", "1/6", "1/6"]), (0, None, &["4/27", "3/27", "5/27"])];
    check(&triplet_s(), &|| vec![orbit_dot_spin(), orbit_dot_spin()], Electrons::TWO, 1, 2, rows);
}

#[test]
fn doublet() {
    let free: &[Row] = &[
        (0, Some(1), &["1/9", "2/9"]),
        (0, Some(-1), &["1/9", "2/9"]),
        (1, Some(1), &["0", "1/3"]),
        (1, Some(-1), &["2/9", "1/9"]),
        (1, None, &["1/9", "2/9"]),
    ];
    check(&doublet_s(), &Vec::new, Electrons::ONE, 1, 1, free);
    let once: &[Row] = &[
        (0, Some(1), &["-1/9", "1/9"]),
        (1, Some(1), &["0", "1/6"]),
        (1, Some(-1), &["-2/9", "1/18"]),
        (1, None, &["-1/9", "1/9"]),
    ];
    check(&doublet_s(), &|| vec![orbit_dot_spin()], Electrons::ONE, 1, 1, once);
    let twice: &[Row] = &[
        (0, Some(-1), &["1/9", "1/18"]),
        (1, Some(1), &["0", "1/12"]),
        (1, Some(-1), &["2/9", "1/36"]),
        (0, None, &["1/9", "1/18"]),
    ];
    check(&doublet_s(), &|| vec![orbit_dot_spin(), orbit_dot_spin()], Electrons::ONE, 1, 1, twice);
}
