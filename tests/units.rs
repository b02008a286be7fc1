//! Units and constants as a user meets them: what is refused and how it is explained, what is converted, what a record claims.

use ketwork::lang::vocabulary::{WordKind, vocabulary};
use ketwork::num::parse_decimal;
use ketwork::num::units::{Dimension, Lookup, Unit, look_up, names};
use ketwork::session::{NoFiles, Outcome, ReplayVerdict, Session};
use std::sync::Arc;

/// What the entries that are refused and converted below rest on.
const PREAMBLE: &str = "\
system h = hydrogenic(Z=1)
state g = h[1s]
resolvent R(w) = 1/(E(g) + w - H)
define pol(w) = -<g| D_z (R(w) + R(-w)) D_z |g>
define twice(w) = 2 pol(w)
ket u(w) = R(w) D_z |g>
define F = 2 kV/cm
";

fn session(entries: &str) -> Session {
    let text = format!("ketwork session 1\n{PREAMBLE}{entries}\n");
    let mut session = Session::open(&text, Arc::new(NoFiles)).expect(entries);
    session.evaluate(&mut |_, _| {});
    session
}

/// The record of the last of some entries.
fn record(entries: &str) -> String {
    let session = session(entries);
    match session.entry(session.len()).and_then(|entry| entry.outcome) {
        Some(Outcome::Result(answer)) => answer.lines.join(" | "),
        other => panic!("{entries}: {other:?}"),
    }
}

#[test]
fn refusals_say_what_was_got_and_what_to_write() {
    for (entry, message, help) in [
        ("E(g) + 413 nm", "a length is added to an energy", "`photon(413.09 nm)`"),
        ("1/(3 GHz) + 2 nm", "a length is added to", ""),
        ("0.1 + 3 GHz", "an energy is added to a plain number", "`0.1 hartree`"),
        ("3 GHz - 2 pi", "a plain number is added to an energy", "`0.1 hartree`"),
        ("2 cm^-1 + 1/(2 cm)", "an inverse length is added to an energy", "`1/cm` is an inverse length"),
        ("3 GHz + 2/(1 s)", "an inverse time is added to an energy", "rad/s"),
        ("F + 3 V", "a voltage is added to an electric field", ""),
        ("<g| D_z R(413 nm) D_z |g>", "inside `R`, with these arguments, a length is added to an energy", "photon"),
        ("twice(413 nm)", "inside `twice`, with these arguments, a length is added to an energy", "photon"),
        ("<u(3 nm)|g>", "inside `u`", "photon"),
        ("<g| D_z 1/(413 nm - H) D_z |g>", "a length is added to an energy", "photon"),
        ("compare 3 GHz with 1 nm", "a length is compared with an energy", "photon"),
        ("expect 3 GHz = 1", "a plain number is compared with an energy", "`0.1 hartree`"),
        ("E(g) in nm", "this is an energy, and `nm` is a unit of a length", "`wavelength(E(g)) in nm`"),
        ("3 nm in GHz", "this is a length, and `GHz` is a unit of an energy", "`photon(3 nm) in GHz`"),
        ("<g|r|g> in angstrom", "whether this is a length or an energy", "`(<g|r|g>) bohr in angstrom`"),
        ("2 in MHz", "this is a plain number", "`(2) hartree in MHz`"),
        ("F in T", "this is an electric field, and `T` is a unit of a magnetic field", "hartree/(e bohr)"),
        ("E(g) in Mhz", "`Mhz` is not a unit", "did you mean `MHz`?"),
        ("3 Ghz", "`Ghz` is not known here", "did you mean `GHz`?"),
        ("E(g) in 5 MHz", "this is not a unit", "help units"),
        ("E(g) in sqrt(2)", "this is not a unit", "help units"),
        ("nm", "`nm` is a unit, and no number stands before it", "`1 nm`"),
        ("MHz in GHz", "`MHz` is a unit, and no number stands before it", "`1 MHz`"),
        ("3 nm nm", "the unit `nm` stands twice side by side", "`nm^2`"),
        ("3 kbohr", "`bohr` takes no prefix", "`1e3 bohr`"),
        ("3 nm^1000", "a unit is raised to a power beyond 100", ""),
        ("3 nm^pi", "the power of a unit is a whole number", ""),
        ("ln(3 nm)", "a length stands in `ln`, where a plain number is needed", "`(…)/(1 bohr)`"),
        ("exp(1 eV)", "an energy stands in `exp`", "`(…)/(1 hartree)`"),
        ("2^(3 eV)", "an energy stands in an exponent", ""),
        ("(3 nm)^pi", "a length is raised to a power that is not written as a number", ""),
        ("photon(3 eV)", "`photon` takes a length, and this is an energy", "vacuum wavelength"),
        ("photon(413)", "`photon` takes a length, and this is a plain number", "vacuum wavelength"),
        ("wavelength(3 nm)", "`wavelength` takes an energy, and this is a length", "takes an energy"),
        ("zero(w in 1 GHz .. 2 nm, w)", "a length is the end of a range that begins at an energy", "photon"),
        ("zero(w in 1 GHz .. 2 GHz, w - 1 nm)", "a length is added to an energy", "photon"),
        ("sum(n in 1 nm .. 2 nm, n)", "a length stands in the range of a sum", ""),
        ("threej(1 nm, 1, 0, 0, 0, 0)", "a length stands in the symbol", ""),
        ("E(h[{2 nm}p, m=0])", "a length stands in a label", ""),
        ("codata.alph", "`codata.alph` is not one of the constants", "`codata.alpha`"),
        ("codata", "`codata` is the set of constants", "`codata.alpha`"),
        ("constants CODATA-2014", "`CODATA-2014` is not a set of constants", "CODATA-2022"),
        ("h.mass", "`mass` is not a parameter of the system h", "infinite"),
        ("h.size", "`size` is not a parameter of the system h", "`h.reduced_mass`"),
        ("system e = hydrogenic(Z=3 nm)", "Z = a length is no plain number", ""),
        ("system e = hydrogenic(mass=3 nm)", "a length is no mass of a nucleus", "mass=codata.m_p"),
        ("system e = shifted(h, 2p: 3 nm)", "a level is moved by an energy, and this is a length", ""),
        ("<g| D_z R(0.1 + 0.1 i) D_z |g> in C m^2/V", "a complex value depends on a number with an uncertainty", "re("),
    ] {
        let session = session(entry);
        let Some(Outcome::Failed(reports)) = session.entry(session.len()).and_then(|e| e.outcome) else {
            panic!("{entry} is not refused: {:?}", session.entry(session.len()).and_then(|e| e.outcome))
        };
        let diagnostic = &reports[0].diagnostic;
        assert!(diagnostic.message.contains(message), "{entry}: {}", diagnostic.message);
        let told = diagnostic.help.as_deref().unwrap_or_default();
        assert!(told.contains(help), "{entry}: {told}");
    }
}

#[test]
fn names_of_entries_and_operators_come_before_units() {
    for (entries, wanted) in [
        ("define m = 3\n2 m", "= 6"),
        ("define GHz = 5\n2 GHz", "= 10"),
        ("2 C m^2/V in coulomb meter^2/volt", "= 2 coulomb meter^2/volt"),
        ("<g| C(1)_0 C(1)_0 |g>", "= 1/3"),
        // a state is no factor, so that a unit of the same name may stand behind a number
        ("state s = h[2s]\n2 s in fs", "= 2000000000000000 fs"),
        ("sum(m in 1 .. 2, 2 m)", "= 6"),
    ] {
        assert_eq!(record(entries), wanted, "{entries}");
    }
}

#[test]
fn results_bear_the_unit_they_are_written_in() {
    for (entries, wanted) in [
        ("3 GHz + 2 GHz", "= 5 GHz"),
        ("2 F", "= 4 kV/cm"),
        ("3 GHz + 0", "= 3 GHz"),
        ("1 hartree + 1 rydberg", "= 3/2 hartree"),
        ("sqrt(2) hartree", "= sqrt(2) hartree"),
        ("(3 GHz)/(1 MHz)", "= 3000"),
        ("1 GHz/(2 MHz)", "= 500"),
        ("E(g) + 1 hartree", "= 1/2 hartree"),
        ("1.5(2) MHz + 2 MHz", "~ 3.5(2) MHz"),
        ("codata.R_inf in m^-1", "~ 10973731.568157(12) m^-1"),
        ("<g| D_z |g> in debye", "= 0 exactly: D_z changes l by one and keeps m"),
    ] {
        assert_eq!(record(entries), wanted, "{entries}");
    }
}

/// Round a circle of units the factors are 1 exactly, whatever constants they hold; a converted value is met by the one it came from.
#[test]
fn conversions_undo_each_other() {
    for group in [
        ["Hz", "eV", "J", "K", "cm^-1", "rad/s", "hartree", "rydberg"].as_slice(),
        &["m", "nm", "angstrom", "bohr"],
        &["s", "fs", "hbar/hartree"],
        &["kg", "dalton", "m_e"],
        &["V/m", "V/cm", "kV/cm", "hartree/(e a0)", "V cm^-1"],
        &["C m^2/V", "Hz/(V/m)^2", "e^2 a0^2/hartree", "farad m^2"],
        &["a0^3", "cm^3", "angstrom^3"],
        &["W/cm^2", "W/m^2", "hartree^2/(hbar a0^2)"],
        &["T", "G", "hbar/(e a0^2)"],
        &["debye", "e a0", "C m"],
    ] {
        for (position, a) in group.iter().enumerate() {
            let b = group[(position + 1) % group.len()];
            let c = group[(position + 2) % group.len()];
            let round = record(&format!("digits exact\n((2 {a})/(3 {b})) ((3 {b})/(5 {c})) ((5 {c})/(2 {a}))"));
            assert_eq!(round, "= 1", "{a}, {b} and {c}");
            // The value in one unit, written in that unit, is the value in the other.
            let there = record(&format!("digits 40\n2 {a} in {b}"));
            let number = there.trim_start_matches(['=', '~', ' ']).strip_suffix(b).expect("a unit").trim().to_string();
            let Ok(back) = parse_decimal(&number) else { continue };
            assert!(there.starts_with('~') || back > 0, "{there}");
            record(&format!("expect {number} {b} = 2.000000000 {a}"));
        }
    }
}

#[test]
fn the_vocabulary_has_the_units_and_no_others() {
    for word in vocabulary().of_kind(WordKind::Unit) {
        for name in std::iter::once(&word.name).chain(&word.also) {
            assert!(matches!(look_up(name), Lookup::Word(_)), "{name}");
        }
    }
    for name in names() {
        assert!(vocabulary().find(name).is_some(), "help says nothing of {name}");
    }
    assert_eq!(*Unit::atomic(&Dimension::energy()).dimension(), Dimension::energy());
}

#[test]
fn replay_compares_values_in_their_unit() {
    for (record, agrees, digits) in [
        ("~ -13.605693122991(15) eV", true, Some(14)),
        ("~ -13.605693122992(15) eV", true, Some(14)),
        ("~ -13.605693122994(26) eV", false, Some(12)),
        ("~ -13.60569(1) eV", false, Some(6)),
        ("~ -13.605693122991(15) hartree", false, Some(0)),
        ("= -1/2 hartree", false, Some(12)),
    ] {
        let text = format!("ketwork session 1\n{PREAMBLE}E(g) in eV\n  {record}\n");
        let mut session = Session::open(&text, Arc::new(NoFiles)).expect(record);
        let report = session.replay(&mut |_| {});
        let verdict = report.entries.last().expect("an entry").verdict;
        match verdict {
            ReplayVerdict::Agrees { digits: held } => assert!(agrees && held == digits, "{record}: {verdict:?}"),
            ReplayVerdict::Differs { digits_in_common } => {
                assert!(!agrees, "{record}: {verdict:?}");
                assert!(digits_in_common >= digits, "{record}: {verdict:?}");
            }
            _ => panic!("{record}: {verdict:?}"),
        }
    }
}

/// A zero does not rest on the constants in which its interval is given, and a factor in front of it costs no second search.
#[test]
fn a_zero_rests_on_its_function_alone() {
    let zero = record("zero(w in photon(120 nm) .. photon(104 nm), pol(w))");
    let plain = record("zero(w in 0.40 .. 0.44, pol(w))");
    assert_eq!(zero, format!("{plain} hartree"));
    let session = session("wavelength(zero(w in 0.40 .. 0.44, pol(w))) in nm");
    let Some(Outcome::Result(answer)) = session.entry(session.len()).and_then(|e| e.outcome) else { panic!("a value") };
    assert_eq!(answer.unit.as_deref(), Some("nm"));
    assert_eq!(answer.remarks, ["the uncertainty is that of the constants: R_inf of CODATA-2022"]);
}
