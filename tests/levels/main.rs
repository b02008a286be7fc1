//! Level tables: every defect of a file, uncertainties against derivatives, the angular algebra against sums over M, hostile files.

mod defects;
mod gradients;
mod hostile;
mod paths;
#[path = "../laws/random.rs"]
#[allow(dead_code, clippy::needless_range_loop)]
mod random;

use ketwork::lang::parser::parse_expression;
use ketwork::num::Effort;
use ketwork::session::{DataFiles, FileProblem, Session};
use ketwork::sums::{Evaluator, Systems, Value, Wanted};
use ketwork::systems::System;
use ketwork::systems::levels::LevelSystem;
use ketwork::theory::{Binding, Names, Resolver};
use std::collections::BTreeMap;
use std::sync::Arc;

/// One file with a text, under the name every case uses.
struct OneFile(String);

const NAME: &str = "k.csv";

impl DataFiles for OneFile {
    fn read(&self, name: &str) -> Result<String, FileProblem> {
        if name == NAME { Ok(self.0.clone()) } else { Err(FileProblem::Missing { name: name.to_string() }) }
    }
}

/// A session that has declared `k` from the text of a table.
fn session_of(table: &str) -> Session {
    let mut session = Session::new(Arc::new(OneFile(table.to_string())));
    session.enter("system k = levels(\"k.csv\")").expect("the entry parses");
    session
}

/// The value of an expression on the system `k`.
fn value_of(system: LevelSystem, expression: &str) -> Value {
    let mut names = Names::default();
    names.bound.insert("k".into(), Binding::System);
    names.operators.extend(system.operators());
    let tree = parse_expression(expression).unwrap_or_else(|found| panic!("{expression}: {}", found[0].message));
    let term = Resolver::new(&names, expression, 0).scalar(&tree).unwrap_or_else(|problem| panic!("{}", problem.fault));
    let systems: Systems = BTreeMap::from([("k".to_string(), Arc::new(system) as Arc<dyn System>)]);
    let mut evaluator = Evaluator::new(&systems, Effort::new());
    evaluator.value(&term, Wanted::Digits(30)).unwrap_or_else(|failure| panic!("{expression}: {}", failure.trouble))
}
