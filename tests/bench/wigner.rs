//! Exact 3j, 6j and 9j symbols: seconds a symbol.
//!
//! `cargo bench --bench wigner -- REPEATS` reads lines `3j n1 … n6`, `6j n1 … n6` or `9j n1 … n9` of doubled arguments from standard input,
//! computes all of them REPEATS times after one round to warm up, and prints the least seconds a symbol and the values of one round.
//! tests/bench/reference_wigner.py runs it beside two Python libraries.

use ketwork::angular::{HalfInteger, ninej, sixj, threej};
use ketwork::num::Surd;
use std::hint::black_box;
use std::io::Read;
use std::time::Instant;

enum Symbol {
    Three([HalfInteger; 6]),
    Six([HalfInteger; 6]),
    Nine([[HalfInteger; 3]; 3]),
}

impl Symbol {
    fn read(line: &str) -> Self {
        let mut words = line.split(' ');
        let kind = words.next().expect("a kind");
        let j: Vec<HalfInteger> =
            words.map(|word| HalfInteger::from_twice(word.parse().expect("a doubled argument"))).collect();
        match kind {
            "3j" => Symbol::Three(std::array::from_fn(|i| j[i])),
            "6j" => Symbol::Six(std::array::from_fn(|i| j[i])),
            "9j" => Symbol::Nine(std::array::from_fn(|row| std::array::from_fn(|column| j[3 * row + column]))),
            other => panic!("no symbol is called {other}"),
        }
    }

    fn value(&self) -> Surd {
        let value = match self {
            Symbol::Three([a, b, c, d, e, f]) => threej(*a, *b, *c, *d, *e, *f),
            Symbol::Six(j) => sixj(*j),
            Symbol::Nine(j) => ninej(*j),
        };
        value.expect("momenta that couple")
    }
}

fn main() {
    let repeats: u32 = std::env::args().find_map(|arg| arg.parse().ok()).unwrap_or(5);
    let mut text = String::new();
    std::io::stdin().read_to_string(&mut text).expect("the symbols");
    let symbols: Vec<Symbol> = text.lines().map(Symbol::read).collect();
    let values: Vec<Surd> = symbols.iter().map(Symbol::value).collect();
    let mut best = f64::INFINITY;
    for _ in 0..repeats {
        let begin = Instant::now();
        for symbol in &symbols {
            black_box(symbol.value());
        }
        best = best.min(begin.elapsed().as_secs_f64());
    }
    let count = u32::try_from(symbols.len()).expect("few symbols");
    println!("{:e}", best / f64::from(count.max(1)));
    for value in values {
        println!("{value}");
    }
}
