//! Builds the systems that entries declare from their arguments.

use super::evaluate::Wrong;
use super::files::DataFiles;
use super::scope::{Effect, Scope};
use crate::lang::tree::{Argument, Expr, ExprKind, Name};
use crate::num::{Effort, Surd};
use crate::sums::Environment;
use crate::systems::System;
use crate::systems::hydrogenic::Hydrogenic;
use crate::systems::levels::{LevelSystem, MOST_FAULTS};
use crate::systems::matrix::{ExactMatrix, MatrixSystem};
use crate::theory::{Fault, Problem, Resolver, terms::Place};
use rug::Rational;
use std::sync::Arc;

/// Everything a declaration may look at.
pub(super) struct Declaration<'d> {
    pub scope: &'d Scope,
    pub source: &'d str,
    pub entry: u64,
    pub effort: &'d Effort,
    pub files: &'d dyn DataFiles,
}

impl Declaration<'_> {
    fn place(&self, span: crate::lang::tree::Span) -> Place {
        Place { entry: self.entry, span }
    }

    fn refuse<T>(
        &self,
        span: crate::lang::tree::Span,
        message: impl Into<String>,
        help: impl Into<String>,
    ) -> Result<T, Wrong> {
        let fault = Fault::Other { message: message.into(), help: help.into() };
        Err(Problem::new(self.place(span), fault).into())
    }

    /// `system name = kind(arguments)`
    pub fn system(&self, name: &Name, kind: &Name, arguments: &[Argument]) -> Result<Effect, Wrong> {
        let (mut operators, mut tensors) = (Vec::new(), Vec::new());
        let system: Arc<dyn System> = match kind.text.as_str() {
            "hydrogenic" => Arc::new(self.hydrogenic(kind, arguments)?),
            "matrix" => {
                let (system, matrices) = self.matrix(kind, arguments)?;
                operators = matrices;
                Arc::new(system)
            }
            "levels" => {
                let system = self.levels(kind, arguments)?;
                tensors = system.operators();
                Arc::new(system)
            }
            other => {
                let fault = match self.scope.names.later.get(other) {
                    Some(what) => Fault::NotYet { what: what.clone() },
                    None => Fault::Other {
                        message: format!("`{other}` is not a kind of system"),
                        help: "systems are declared as in `system h = hydrogenic(Z=1)` or `system m = matrix(H = \"h.mtx\")`"
                            .into(),
                    },
                };
                return Err(Problem::new(self.place(kind.span), fault).into());
            }
        };
        Ok(Effect::System { name: name.text.clone(), system, operators, tensors })
    }

    fn hydrogenic(&self, kind: &Name, arguments: &[Argument]) -> Result<Hydrogenic, Wrong> {
        let (mut charge, mut mass) = (Rational::from(1), None);
        let mut seen: Vec<&str> = Vec::new();
        for argument in arguments {
            let Argument::Named { name, value } = argument else {
                return self.refuse(
                    kind.span,
                    "`hydrogenic` takes its arguments by name",
                    "write `hydrogenic(Z=1)` or `hydrogenic(Z=2, mass=7294.3)`",
                );
            };
            if seen.contains(&name.text.as_str()) {
                return self.refuse(name.span, format!("`{}` is given twice", name.text), "give it once");
            }
            seen.push(&name.text);
            match name.text.as_str() {
                "Z" => charge = self.positive(name, value)?,
                "mass" if matches!(&value.kind, ExprKind::Name(inf) if inf == "inf") => mass = None,
                "mass" => mass = Some(self.positive(name, value)?),
                other => {
                    return self.refuse(
                        name.span,
                        format!("`{other}` is not an argument of `hydrogenic`"),
                        "it has Z (nuclear charge) and mass (nuclear mass in electron masses, `inf` if not given)",
                    );
                }
            }
        }
        Hydrogenic::new(charge, mass).or_else(|error| self.refuse(kind.span, error.to_string(), error.help()))
    }

    fn positive(&self, name: &Name, value: &Expr) -> Result<Rational, Wrong> {
        let number = self.exact(value)?;
        match number.as_rational() {
            Some(q) if *q > 0 => Ok(q.into_owned()),
            _ => self.refuse(
                value.span,
                format!("{} = {number} is not a positive rational number", name.text),
                "write a positive whole number, fraction or decimal",
            ),
        }
    }

    /// An argument as an exact number.
    fn exact(&self, expr: &Expr) -> Result<Surd, Wrong> {
        let term = Resolver::new(&self.scope.names, self.source, self.entry).scalar(expr)?;
        if !crate::sums::measured_sources(&term).is_empty() {
            return self.refuse(
                expr.span,
                "a number with an uncertainty stands in the declaration of a system",
                "declare the system with the value alone",
            );
        }
        match self.scope.evaluator(self.effort).scalar(&term, &Environment::default(), 128)? {
            crate::num::Scalar::Exact(value) => Ok(value),
            crate::num::Scalar::Approx(_) => self.refuse(
                expr.span,
                "an approximate number stands in the declaration of a system",
                "write it as a fraction, decimal or square root",
            ),
        }
    }

    /// The text of a data file that an argument names.
    fn data_file(&self, value: &Expr, file: &str) -> Result<String, Wrong> {
        self.files.read(file).or_else(|problem| {
            self.refuse(
                value.span,
                problem.to_string(),
                "data files stand in the folder of the session file, or below it",
            )
        })
    }

    /// `levels("file.csv")`
    fn levels(&self, kind: &Name, arguments: &[Argument]) -> Result<LevelSystem, Wrong> {
        let [Argument::Positional(value @ Expr { kind: ExprKind::Text(file), .. })] = arguments else {
            return self.refuse(
                kind.span,
                "`levels` takes the name of one file in quotes",
                "write `levels(\"file.csv\")`; `help level-table` says what stands in the file",
            );
        };
        let faults = match LevelSystem::read(&self.data_file(value, file)?) {
            Ok(system) => return Ok(system),
            Err(faults) => faults,
        };
        let fault = match faults.as_slice() {
            [only] => Fault::Other { message: format!("\"{file}\", {}", only.to_text()), help: only.defect.help() },
            several => Fault::DataFile {
                name: file.clone(),
                faults: several.iter().map(|one| format!("{}; {}", one.to_text(), one.defect.help())).collect(),
                more: several.len() >= MOST_FAULTS,
            },
        };
        Err(Problem::new(self.place(value.span), fault).into())
    }

    /// `matrix(H = …, V = …)`
    fn matrix(&self, kind: &Name, arguments: &[Argument]) -> Result<(MatrixSystem, Vec<String>), Wrong> {
        let mut matrices: Vec<(String, ExactMatrix)> = Vec::new();
        for argument in arguments {
            let Argument::Named { name, value } = argument else {
                return self.refuse(
                    kind.span,
                    "`matrix` takes its arguments by name",
                    "write `matrix(H = \"h.mtx\", V = [[0, 1], [1, 0]])`",
                );
            };
            if matrices.iter().any(|(earlier, _)| *earlier == name.text) {
                return self.refuse(name.span, format!("`{}` is given twice", name.text), "give it once");
            }
            matrices.push((name.text.clone(), self.entries(value)?));
        }
        let operators = matrices.iter().map(|(name, _)| name.clone()).filter(|name| name != "H").collect();
        let system =
            MatrixSystem::new(matrices).or_else(|error| self.refuse(kind.span, error.to_string(), error.help()))?;
        Ok((system, operators))
    }

    /// One matrix: a file, rows, `diag(…)` or `diagonals([…], …)`.
    fn entries(&self, value: &Expr) -> Result<ExactMatrix, Wrong> {
        let built = match &value.kind {
            ExprKind::Text(file) => ExactMatrix::from_matrix_market(&self.data_file(value, file)?),
            ExprKind::List(rows) => {
                let rows = rows.iter().map(|row| self.row(row)).collect::<Result<Vec<_>, _>>()?;
                ExactMatrix::from_rows(rows)
            }
            ExprKind::Call { name, arguments, subscript: None } if name.text == "diag" => {
                let list = arguments.iter().map(|a| self.plain(a, value)).collect::<Result<Vec<_>, _>>()?;
                let main = list.into_iter().map(|expr| self.exact(expr)).collect::<Result<Vec<_>, _>>()?;
                ExactMatrix::from_diagonals(vec![main])
            }
            ExprKind::Call { name, arguments, subscript: None } if name.text == "diagonals" => {
                let lists = arguments.iter().map(|a| self.row(self.plain(a, value)?)).collect::<Result<Vec<_>, _>>()?;
                ExactMatrix::from_diagonals(lists)
            }
            _ => {
                return self.refuse(
                    value.span,
                    "a matrix is a file or rows of numbers",
                    "write a file name in quotes, rows `[[1, 2], [2, 3]]`, `diag(1, 2, 3)`, or `diagonals([main], [first], …)`",
                );
            }
        };
        built.or_else(|error| self.refuse(value.span, error.to_string(), error.help()))
    }

    fn plain<'a>(&self, argument: &'a Argument, around: &Expr) -> Result<&'a Expr, Wrong> {
        match argument {
            Argument::Positional(expr) => Ok(expr),
            _ => {
                self.refuse(around.span, "numbers between commas are needed here", "write for instance `diag(1, 2, 3)`")
            }
        }
    }

    fn row(&self, row: &Expr) -> Result<Vec<Surd>, Wrong> {
        match &row.kind {
            ExprKind::List(entries) => entries.iter().map(|entry| self.exact(entry)).collect(),
            _ => self.refuse(row.span, "a row of a matrix stands in square brackets", "write `[[1, 2], [2, 3]]`"),
        }
    }
}
