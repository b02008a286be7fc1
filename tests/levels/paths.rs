//! The angular algebra on levels of which only J and the parity are known: its factors times the elements of random tables are what the sums over
//! all M give, exactly.

use super::random::{Random, cases};
use super::value_of;
use ketwork::angular::chain::{Bracket, ChainSum, Resolvent, State};
use ketwork::angular::paths::{Orientation, Setting, blocked, decompose};
use ketwork::angular::selection::SelectionRule;
use ketwork::angular::term::Level;
use ketwork::angular::{HalfInteger, threej};
use ketwork::num::units::ConstantSet;
use ketwork::num::{Effort, Scalar, Surd};
use ketwork::systems::levels::LevelSystem;
use ketwork::systems::{Atom, StateLabel, Symmetry, System};
use rug::Rational;
use std::collections::BTreeMap;
use std::fmt::Write as _;

/// A table as a test knows it: levels w0, w1, … with the energies 0, 1, … hartree.
struct Known {
    levels: Vec<(i32, bool)>,
    /// By operator, bra and ket, both directions.
    elements: BTreeMap<(&'static str, usize, usize), i64>,
    text: String,
}

/// Operators of the tables: name, rank, whether they change the parity.
const OPERATORS: [(&str, i32, bool); 4] = [("D", 1, true), ("Q", 2, false), ("M1", 1, false), ("W", 0, false)];

fn known(random: &mut Random) -> Known {
    let kind = random.below(2) as i32;
    let levels: Vec<(i32, bool)> = (0..6).map(|_| (2 * random.below(3) as i32 + kind, random.below(2) == 1)).collect();
    let mut text = String::from("row,name,energy,unit,J,parity\n");
    for (at, (twice_j, odd)) in levels.iter().enumerate() {
        let parity = if *odd { "odd" } else { "even" };
        writeln!(text, "level,w{at},{at},hartree,{},{parity}", HalfInteger::from_twice(*twice_j)).expect("a string");
    }
    text += "row,from,to,operator,rank,value\n";
    let mut elements = BTreeMap::new();
    for (name, rank, changes) in OPERATORS {
        for a in 0..levels.len() {
            for b in 0..=a {
                let ((ja, pa), (jb, pb)) = (levels[a], levels[b]);
                let joined = (ja - jb).abs() <= 2 * rank && 2 * rank <= ja + jb && (pa != pb) == changes;
                let value = random.between(-5, 5);
                if joined && value != 0 {
                    writeln!(text, "element,w{a},w{b},{name},{rank},{value}").expect("a string");
                    elements.insert((name, a, b), value);
                    // <J||T||J'> = (-1)^(J-J') <J'||T||J>
                    let sign = if (ja - jb) / 2 % 2 == 0 { 1 } else { -1 };
                    elements.insert((name, b, a), sign * value);
                }
            }
        }
    }
    Known { levels, elements, text }
}

/// A chain between two levels that has a way through the table, from the left, with random components; M of the ket is that of the bra less the
/// sum of spherical components.
fn chain(random: &mut Random, table: &Known, length: u64) -> Option<(End, Operators, End)> {
    let start = random.below(6) as usize;
    let (mut level, mut operators) = (start, Vec::new());
    for _ in 0..length {
        let ways: Vec<(&'static str, usize)> =
            table.elements.keys().filter(|(_, bra, _)| *bra == level).map(|(name, _, ket)| (*name, *ket)).collect();
        let (name, next) = *ways.get(random.below(ways.len().max(1) as u64) as usize)?;
        let (_, rank, _) = *OPERATORS.iter().find(|(known, ..)| *known == name)?;
        let component = match (rank, random.below(5)) {
            (0, _) => None,
            (1, 0) => Some(["x", "y", "z"][random.below(3) as usize].to_string()),
            _ => Some(random.between(-i64::from(rank), i64::from(rank)).to_string()),
        };
        operators.push((name, Atom { name: name.to_string(), component, arguments: vec![], power: 1 }));
        level = next;
    }
    let change: i32 = operators.iter().filter_map(|(_, atom)| atom.component.as_ref()?.parse::<i32>().ok()).sum();
    let twice_j = table.levels[start].0;
    let twice_m = 2 * random.between(0, i64::from(twice_j)) as i32 - twice_j;
    let end = twice_m - 2 * change;
    (end.abs() <= table.levels[level].0).then_some(((start, twice_m), operators, (level, end)))
}

/// A level and twice its M.
type End = (usize, i32);

/// Operators of a chain by name, with their components.
type Operators = Vec<(&'static str, Atom)>;

fn written(atom: &Atom) -> String {
    match &atom.component {
        Some(q) if !q.starts_with('-') && q.parse::<i32>().is_ok_and(|q| q > 0) => format!("{}_+{q}", atom.name),
        Some(q) => format!("{}_{q}", atom.name),
        None => atom.name.clone(),
    }
}

/// 1/(z - E) with z = 1/3.
fn divided(value: &Surd, energy: usize) -> Surd {
    let difference = Rational::from((1, 3)) - Rational::from(energy as u64);
    value.scaled(&difference.recip())
}

#[test]
fn paths_times_elements_are_the_sum_over_states() {
    let (mut open, mut nonzero) = (0, 0);
    for seed in 0..cases(400) {
        let mut random = Random::new(u64::from(seed));
        let table = known(&mut random);
        let system = LevelSystem::read(&table.text, ConstantSet::default())
            .unwrap_or_else(|faults| panic!("{}", faults[0].to_text()));
        let length = 1 + random.below(4);
        let Some((bra, chain, ket)) = chain(&mut random, &table, length) else { continue };
        let state = |(level, twice_m): (usize, i32)| format!("k[w{level}, M={}]", HalfInteger::from_twice(twice_m));
        let middle: Vec<String> = chain.iter().map(|(_, atom)| written(atom)).collect();
        let expression = format!("<{}| {} |{}>", state(bra), middle.join(" (1/(1/3 - H)) "), state(ket));

        let named = |(level, twice_m): (usize, i32)| -> State {
            let m = Rational::from((twice_m, 2));
            let label = StateLabel { text: format!("w{level}"), options: vec![("M".into(), m)] };
            let state = system.state(&label, &Effort::new()).expect("a state");
            system.end(&state).expect("an end")
        };
        let operators = chain.iter().map(|(_, atom)| system.tensors(atom).expect("a tensor")).collect();
        let resolvent = Resolvent::new("R");
        let bracket = Bracket::with_resolvent(named(bra), operators, &resolvent, named(ket));
        let rules = system.symmetry().expect("levels have angular momenta").rules();
        let setting = Setting { rules, orientation: Orientation::AsWritten };
        let paths = decompose(&ChainSum::from(bracket), &setting, &Effort::new()).expect("paths");
        // columns of one level count M from -J; in any other case there is one
        let column = if paths.columns.len() > 1 { ((bra.1 + table.levels[bra.0].0) / 2) as usize } else { 0 };
        let mut sum = Surd::zero();
        for path in &paths.contributions {
            // from the right: the elements between all levels of the blocks of the path
            let mut ahead: BTreeMap<usize, Surd> = BTreeMap::from([(ket.0, path.factors[column].clone())]);
            for (place, (name, _)) in chain.iter().enumerate().rev() {
                let mut next: BTreeMap<usize, Surd> = BTreeMap::new();
                for (at, amplitude) in &ahead {
                    for other in 0..table.levels.len() {
                        let Some(element) = table.elements.get(&(*name, other, *at)) else { continue };
                        let inside = place > 0;
                        let here = match inside {
                            true => in_block(&table, other, &path.levels[0][place - 1]),
                            false => other == bra.0,
                        };
                        if here {
                            let value = amplitude.scaled(&Rational::from(*element));
                            let value = if inside { divided(&value, other) } else { value };
                            *next.entry(other).or_default() += &value;
                        }
                    }
                }
                ahead = next;
            }
            sum += &ahead.remove(&bra.0).unwrap_or_default();
            open += 1;
        }
        let Scalar::Exact(value) = value_of(system, &expression).scalar else { panic!("{expression} is not exact") };
        assert_eq!(value, sum, "seed {seed}: {expression}\n{}", table.text);
        nonzero += u32::from(!value.is_zero());
    }
    assert!(open > 100 && nonzero > 40, "{open} paths, {nonzero} values");
}

fn in_block(table: &Known, level: usize, block: &Level) -> bool {
    let (twice_j, odd) = table.levels[level];
    let parity = if odd { "odd" } else { "even" };
    block.to_string() == format!("J={} {parity}", HalfInteger::from_twice(twice_j))
}

/// One operator between two levels has the plain factor of Wigner and Eckart.
#[test]
fn one_element_has_the_factor_of_wigner_and_eckart() {
    let text = "row,name,energy,unit,J,parity\nlevel,a,0,hartree,5/2,even\nlevel,b,1,hartree,3/2,odd\nrow,from,to,operator,rank,value\nelement,a,b,T,3,1\n";
    let half = HalfInteger::from_twice;
    let mut count = 0;
    for twice_m in (-5..=5).step_by(2) {
        for q in -3..=3 {
            let twice_other: i32 = twice_m - 2 * q;
            if twice_other.abs() > 3 {
                continue;
            }
            let system = LevelSystem::read(text, ConstantSet::default()).expect("a good table");
            let component =
                written(&Atom { name: "T".into(), component: Some(q.to_string()), arguments: vec![], power: 1 });
            let expression = format!("<k[a, M={}]| {component} |k[b, M={}]>", half(twice_m), half(twice_other));
            let symbol = threej(half(5), half(6), half(3), half(-twice_m), half(2 * q), half(twice_other))
                .expect("half-integers");
            let expected = if (5 - twice_m) / 2 % 2 == 0 { symbol } else { -&symbol };
            assert_eq!(value_of(system, &expression).scalar, Scalar::Exact(expected), "{expression}");
            count += 1;
        }
    }
    // seven components and four M', without the six whose M is beyond 5/2
    assert_eq!(count, 22);
}

/// Where no way is open, the rule that closes it is one of J and the parity; nothing is said of an L or S that nobody knows.
#[test]
fn a_closed_way_is_told_in_terms_of_the_total_momentum() {
    let text = "row,name,energy,unit,J,parity\nlevel,a,0,hartree,1/2,even\nlevel,b,1,hartree,5/2,even\nlevel,c,2,hartree,3/2,odd\n\
                row,from,to,operator,rank,value\nelement,a,c,D,1,1\n";
    let system = LevelSystem::read(text, ConstantSet::default()).expect("a good table");
    let end = |name: &str| {
        let label = StateLabel { text: name.into(), options: vec![] };
        system.end(&system.state(&label, &Effort::new()).expect("a state")).expect("an end")
    };
    let dipole = Atom { name: "D".into(), component: Some("z".into()), arguments: vec![], power: 1 };
    let operators = vec![system.tensors(&dipole).expect("a tensor")];
    let bracket = Bracket { bra: end("a"), operators, gaps: vec![], ket: end("b") };
    let broken = blocked(&bracket, &system.rules(), &Effort::new()).expect("not interrupted");
    assert_eq!(broken.len(), 1);
    assert_eq!(broken[0].rules, [SelectionRule::TotalTriangle, SelectionRule::Parity]);
    assert_eq!((broken[0].bra.to_string(), broken[0].ket.to_string()), ("J=1/2 even".into(), "J=5/2 even".into()));
}
