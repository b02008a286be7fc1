//! Builds the systems that entries declare from their arguments.

use super::evaluate::Wrong;
use super::files::DataFiles;
use super::scope::{Effect, Scope};
use crate::lang::tree::{Argument, Expr, ExprKind, LabelPart, Name};
use crate::num::units::Dimension;
use crate::num::{Effort, Scalar, Surd};
use crate::sums::{Environment, Wanted};
use crate::systems::hydrogenic::Hydrogenic;
use crate::systems::levels::{LevelSystem, MOST_FAULTS};
use crate::systems::matrix::{ExactMatrix, MatrixSystem};
use crate::systems::shifted::Shifted;
use crate::systems::symbolic::Symbolic;
use crate::systems::{StateLabel, System};
use crate::theory::dimensions::{Known, known};
use crate::theory::terms::{Place, ScalarTerm, Source};
use crate::theory::{Fault, Problem, Resolver};
use rug::{Float, Rational};
use std::borrow::Cow;
use std::sync::Arc;

/// Digits to which shifts that are not exact are taken.
const SHIFT_DIGITS: u32 = 40;

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

    /// `system name = kind(arguments)`, with what is to be told about it.
    pub fn system(&self, name: &Name, kind: &Name, arguments: &[Argument]) -> Result<(Effect, Vec<String>), Wrong> {
        let mut told = Vec::new();
        let (mut operators, mut tensors) = (Vec::new(), Vec::new());
        let system: Arc<dyn System> = match kind.text.as_str() {
            "hydrogenic" => Arc::new(self.hydrogenic(kind, arguments, &mut told)?),
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
            "symbolic" => Arc::new(self.symbolic(kind, arguments)?),
            "shifted" => Arc::new(self.shifted(kind, arguments)?),
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
        Ok((Effect::System { name: name.text.clone(), system, operators, tensors }, told))
    }

    fn hydrogenic(&self, kind: &Name, arguments: &[Argument], told: &mut Vec<String>) -> Result<Hydrogenic, Wrong> {
        let (mut charge, mut mass, mut spin) = (Rational::from(1), None, false);
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
                "mass" => {
                    let (number, note) = self.nuclear_mass(value)?;
                    told.extend(note);
                    mass = Some(number);
                }
                "spin" => spin = self.spin(value)?,
                other => {
                    return self.refuse(
                        name.span,
                        format!("`{other}` is not an argument of `hydrogenic`"),
                        "it has Z (nuclear charge), mass (nuclear mass in electron masses, `inf` if not given) and spin \
                         (0 if not given, or 1/2)",
                    );
                }
            }
        }
        let atom =
            Hydrogenic::new(charge, mass).or_else(|error| self.refuse(kind.span, error.to_string(), error.help()))?;
        Ok(if spin { atom.with_spin() } else { atom })
    }

    /// Whether the electron has its spin.
    fn spin(&self, value: &Expr) -> Result<bool, Wrong> {
        let number = self.exact(value)?;
        match number.as_rational() {
            Some(q) if *q == 0 => Ok(false),
            Some(q) if *q == Rational::from((1, 2)) => Ok(true),
            _ => self.refuse(
                value.span,
                format!("spin = {number} is not the spin of an electron"),
                "write spin=1/2, or spin=0 to leave the spin out",
            ),
        }
    }

    /// `symbolic(electrons=2)`
    fn symbolic(&self, kind: &Name, arguments: &[Argument]) -> Result<Symbolic, Wrong> {
        let form = "write `symbolic(electrons=1)`, `symbolic(electrons=2)`, or `symbolic(electrons=n)` for any number";
        let [Argument::Named { name, value }] = arguments else {
            return self.refuse(kind.span, "`symbolic` takes the number of electrons", form);
        };
        if name.text != "electrons" {
            return self.refuse(name.span, format!("`{}` is not an argument of `symbolic`", name.text), form);
        }
        if matches!(&value.kind, ExprKind::Name(any) if any == "n") {
            return Symbolic::new(None).or_else(|error| self.refuse(kind.span, error.to_string(), error.help()));
        }
        let number = self.exact(value)?;
        let count = number.as_rational().filter(|q| q.is_integer()).and_then(|q| q.numer().to_u32());
        let Some(count) = count else {
            return self.refuse(value.span, format!("{number} is not a number of electrons"), form);
        };
        Symbolic::new(Some(count)).or_else(|error| self.refuse(value.span, error.to_string(), error.help()))
    }

    /// `shifted(he, 2^3P_0: 31.9 GHz, …)`
    fn shifted(&self, kind: &Name, arguments: &[Argument]) -> Result<Shifted, Wrong> {
        let form = "write the system, then levels with their shifts: `shifted(he, 2^3P_0: 31.9 GHz, 2^3P_1: 2.3 GHz)`";
        let Some((Argument::Positional(Expr { kind: ExprKind::Name(name), span }), levels)) = arguments.split_first()
        else {
            return self.refuse(kind.span, "`shifted` takes a system and levels with their shifts", form);
        };
        let Some(base) = self.scope.systems.get(name) else {
            return self.refuse(*span, format!("`{name}` is not a system declared above"), form);
        };
        if levels.is_empty() {
            return self.refuse(kind.span, "no level is moved", form);
        }
        let mut moved = Vec::with_capacity(levels.len());
        for argument in levels {
            let Argument::Level { label, value } = argument else {
                return self.refuse(kind.span, "every level stands with its shift", form);
            };
            let text: String = label
                .parts
                .iter()
                .map(|part| match part {
                    LabelPart::Text(text) => text.clone(),
                    LabelPart::Computed(_) => "{…}".into(),
                })
                .collect();
            let (by, sigma) = self.real(value)?;
            let label = StateLabel { text, options: Vec::new() };
            // each label is looked at alone first, so that an error stands at its place
            base.manifold(&label, self.effort)
                .or_else(|error| self.refuse(value.span, error.to_string(), error.help()))?;
            moved.push((label, by, sigma));
        }
        Shifted::new(base.clone(), moved, self.effort)
            .or_else(|error| self.refuse(kind.span, error.to_string(), error.help()))
    }

    /// A real number with the standard uncertainty that is written in it.
    fn real(&self, expr: &Expr) -> Result<(Rational, Rational), Wrong> {
        let term = Resolver::new(&self.scope.names, self.source, self.entry).scalar(expr)?;
        if let Known::Definite(dimension) = known(&term)
            && dimension != Dimension::energy()
        {
            let message = format!("a level is moved by an energy, and this is {}", dimension.words());
            return self.refuse(expr.span, message, "write an energy, as 31.9 GHz or 1e-6");
        }
        let value = self.scope.evaluator(self.effort).value(&term, Wanted::Digits(SHIFT_DIGITS))?;
        let number = match &value.scalar {
            Scalar::Exact(exact) if exact.as_rational().is_some() => exact.as_rational().map(Cow::into_owned),
            other if other.is_real() => other.to_ball(256).ok().and_then(|ball| ball.re.mid().to_rational()),
            _ => None,
        };
        let Some(number) = number else {
            return self.refuse(expr.span, "a shift is a real number", "write an energy, as 31.9 GHz or 1e-6");
        };
        // constants behind the unit count with what is written
        let squares =
            value.sources.iter().fold(Float::new(64), |sum, (_, part)| sum + Float::with_val(64, part.square_ref()));
        Ok((number, squares.sqrt().to_rational().unwrap_or_default()))
    }

    fn positive(&self, name: &Name, value: &Expr) -> Result<Rational, Wrong> {
        let term = Resolver::new(&self.scope.names, self.source, self.entry).scalar(value)?;
        if let Known::Definite(dimension) = known(&term) {
            let message = format!("{} = {} is no plain number", name.text, dimension.words());
            return self.refuse(value.span, message, "write a positive whole number, fraction or decimal");
        }
        let number = self.exact_value(value, &term)?;
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
        match known(&term) {
            Known::Definite(dimension) if dimension != Dimension::energy() => self.refuse(
                expr.span,
                format!("{} stands here, where a plain number or an energy is wanted", dimension.words()),
                "numbers of a declaration are in atomic units",
            ),
            _ => self.exact_value(expr, &term),
        }
    }

    /// The mass of a nucleus in electron masses, a number or a mass with its unit, and what is to be told: a system has an exact mass, so that
    /// the uncertainty of constants is left out.
    fn nuclear_mass(&self, value: &Expr) -> Result<(Rational, Option<String>), Wrong> {
        const FORM: &str = "give it in electron masses, as mass=1836.15, or as a mass: mass=4.0026 u, mass=codata.m_p";
        let term = Resolver::new(&self.scope.names, self.source, self.entry).scalar(value)?;
        match known(&term) {
            Known::Definite(dimension) | Known::Atomic(dimension) if dimension != Dimension::mass() => {
                return self.refuse(value.span, format!("{} is no mass of a nucleus", dimension.words()), FORM);
            }
            _ => {}
        }
        let sources = crate::sums::measured_sources(&term);
        if sources.iter().any(|(source, _)| !matches!(source, Source::Constant(_))) {
            self.exact_value(value, &term)?;
        }
        let scalar = self.scope.evaluator(self.effort).scalar(&term, &Environment::default(), 128)?;
        let Some(mass) = scalar.as_rational().filter(|mass| *mass > 0) else {
            return self.refuse(value.span, "the mass of a nucleus is a positive rational number", FORM);
        };
        if sources.is_empty() {
            return Ok((mass, None));
        }
        let full = self.scope.evaluator(self.effort).value(&term, Wanted::Digits(SHIFT_DIGITS))?;
        let told = full.sigma().map(|sigma| {
            let shown = super::evaluate::concise(&full.scalar, &sigma);
            format!("mass {shown} electron masses; the uncertainty of the constants is left out")
        });
        Ok((mass, told))
    }

    fn exact_value(&self, expr: &Expr, term: &ScalarTerm) -> Result<Surd, Wrong> {
        let sources = crate::sums::measured_sources(term);
        if !sources.is_empty() {
            let constants = sources.iter().all(|(source, _)| matches!(source, Source::Constant(_)));
            let (message, help) = if constants {
                (
                    "a number that rests on constants with an uncertainty stands in the declaration of a system",
                    "write it in atomic units",
                )
            } else {
                (
                    "a number with an uncertainty stands in the declaration of a system",
                    "declare the system with the value alone",
                )
            };
            return self.refuse(expr.span, message, help);
        }
        match self.scope.evaluator(self.effort).scalar(term, &Environment::default(), 128)? {
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
        let faults = match LevelSystem::read(&self.data_file(value, file)?, self.scope.names.constants) {
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
