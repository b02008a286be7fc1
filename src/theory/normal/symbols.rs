//! Monomials of symbols: numbers that have no exact value, as `w`, `E(g)` or `1.5(2)`.

use std::collections::BTreeMap;
use std::fmt;

/// A product of symbols to whole powers, none of them zero. Symbols are real and commute.
#[derive(Clone, PartialEq, Eq, PartialOrd, Ord, Hash, Debug, Default)]
pub struct Symbols(BTreeMap<String, i64>);

impl Symbols {
    pub fn one() -> Self {
        Symbols::default()
    }

    pub fn of(symbol: impl Into<String>) -> Self {
        Symbols(BTreeMap::from([(symbol.into(), 1)]))
    }

    pub fn is_one(&self) -> bool {
        self.0.is_empty()
    }

    /// The symbols with their powers, in order.
    pub fn factors(&self) -> impl Iterator<Item = (&str, i64)> {
        self.0.iter().map(|(symbol, power)| (symbol.as_str(), *power))
    }

    #[must_use]
    pub fn times(&self, other: &Symbols) -> Self {
        let mut powers = self.0.clone();
        for (symbol, power) in &other.0 {
            let sum = powers.entry(symbol.clone()).or_default();
            *sum = sum.saturating_add(*power);
        }
        powers.retain(|_, power| *power != 0);
        Symbols(powers)
    }

    #[must_use]
    pub fn inverse(&self) -> Self {
        Symbols(self.0.iter().map(|(symbol, power)| (symbol.clone(), -power)).collect())
    }
}

/// Writes `E(g) w^2`; a symbol that is a sum stands in parentheses.
impl fmt::Display for Symbols {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let factor = |(symbol, power): (&String, &i64)| {
            let simple = symbol.chars().all(|c| c.is_alphanumeric() || "_.()[]^".contains(c));
            let base = if simple { symbol.clone() } else { format!("({symbol})") };
            if *power == 1 { base } else { format!("{base}^{power}") }
        };
        write!(f, "{}", self.0.iter().map(factor).collect::<Vec<_>>().join(" "))
    }
}
