//! The sentence for every kind of fault: what is wrong, and what to write instead.

use super::diagnostic::Diagnostic;
use super::fault::{Fault, Found};
use super::tree::Span;
use super::trouble::{Wanted, WantedSet};

impl Found {
    fn phrase(&self) -> String {
        match self {
            Found::EndOfEntry => "the entry ends".to_owned(),
            Found::Token(token) => format!("`{token}` stands"),
        }
    }
}

struct Prose {
    message: String,
    label: String,
    help: Option<String>,
    related: Vec<(Span, String)>,
}

fn prose(message: impl Into<String>, label: impl Into<String>) -> Prose {
    Prose { message: message.into(), label: label.into(), help: None, related: Vec::new() }
}

impl Prose {
    fn help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    fn related(mut self, span: Span, label: impl Into<String>) -> Self {
        self.related.push((span, label.into()));
        self
    }
}

/// Joins phrases as a sentence does: `a, b or c`.
fn either(wanted: WantedSet) -> String {
    let phrases: Vec<&str> = wanted.members().map(Wanted::phrase).collect();
    match phrases.split_last() {
        None => "something else".to_owned(),
        Some((only, [])) => (*only).to_owned(),
        Some((last, others)) => format!("{} or {last}", others.join(", ")),
    }
}

/// Cuts a quoted piece of the user's text to what fits into a sentence, on one line.
fn brief(text: &str) -> String {
    const LONGEST: usize = 32;
    let text = text.split_whitespace().collect::<Vec<_>>().join(" ");
    if text.chars().count() <= LONGEST {
        return text;
    }
    text.chars().take(LONGEST).chain("...".chars()).collect()
}

impl Fault {
    /// The diagnostic for this fault at a place.
    pub fn diagnostic(&self, span: Span) -> Diagnostic {
        let prose = self.prose();
        let mut diagnostic = Diagnostic::new(span, prose.message).with_label(prose.label);
        diagnostic.help = prose.help;
        diagnostic.related = prose.related;
        diagnostic
    }

    fn prose(&self) -> Prose {
        match self {
            Fault::Wanted { .. }
            | Fault::NoOperand { .. }
            | Fault::CannotFollow(_)
            | Fault::Unclosed { .. }
            | Fault::NothingToClose(_)
            | Fault::TrailingComma
            | Fault::DoubleStar
            | Fault::SquareBrackets
            | Fault::CurlyBrackets
            | Fault::Prime { .. }
            | Fault::PrimeAfterPower
            | Fault::Factorial
            | Fault::Relation(_)
            | Fault::Sign(_)
            | Fault::LeadingPlus
            | Fault::NoComma
            | Fault::StrayEquals => self.operator_prose(),
            Fault::NotABra(_)
            | Fault::BareLabel { .. }
            | Fault::BraWithoutBar { .. }
            | Fault::MissingKet { .. }
            | Fault::EmptyKet
            | Fault::KetUnclosed { .. }
            | Fault::NotAState
            | Fault::LoneKet(_)
            | Fault::LoneBra(_)
            | Fault::StrayBar
            | Fault::StrayAngle => self.dirac_prose(),
            Fault::UnknownCharacter(_)
            | Fault::ControlCharacter(_)
            | Fault::EntryTooLong { .. }
            | Fault::TooDeep { .. }
            | Fault::TooManyTerms { .. }
            | Fault::LiteralTooLong { .. }
            | Fault::ExponentTooLarge { .. }
            | Fault::DecimalPoint
            | Fault::ConciseWithPoint { .. }
            | Fault::ConciseAfterExponent { .. }
            | Fault::PlusMinus
            | Fault::NumbersSideBySide
            | Fault::TextOutside
            | Fault::UnclosedText
            | Fault::Backslash
            | Fault::Semicolon => self.character_prose(),
            _ => self.entry_prose(),
        }
    }

    fn operator_prose(&self) -> Prose {
        match self {
            Fault::NoOperand { after, found } => {
                let place = after.as_ref().map_or(String::new(), |after| format!(" after `{after}`"));
                prose(
                    format!("{} where a number, a name, a bra or a bracket is wanted{place}", found.phrase()),
                    match found {
                        Found::EndOfEntry => "something is missing here",
                        Found::Token(_) => "a term cannot begin with this",
                    },
                )
            }
            Fault::CannotFollow(token) => prose(
                format!("`{}` cannot follow here: what stands before it is complete", brief(token)),
                "not expected",
            ),
            Fault::Unclosed { bracket, opened, found } => {
                let close = closer(*bracket);
                let message = match found {
                    Found::EndOfEntry => format!("the `{bracket}` is never closed"),
                    Found::Token(token) => {
                        format!("`{}` stands where the `{bracket}` should be closed by `{close}`", brief(token))
                    }
                };
                prose(message, format!("`{close}` is missing here"))
                    .related(*opened, "opened here")
                    .help(format!("put `{close}` where the bracket ends"))
            }
            Fault::NothingToClose(bracket) => {
                prose(format!("nothing is open that this `{bracket}` could close"), "one bracket too many")
                    .help("leave it out, or open its bracket further left")
            }
            Fault::TrailingComma => prose("nothing follows the last `,`", "one more item is wanted here, or no `,`"),
            Fault::DoubleStar => prose("`**` is not an operator", "here").help("a power is written with `^`: `r^2`"),
            Fault::SquareBrackets => prose("square brackets do not group terms", "here")
                .help("group with round brackets `( … )`; square brackets hold the label of a state: `h[1s]`"),
            Fault::CurlyBrackets => prose("curly brackets do not group terms", "here")
                .help("group with round brackets `( … )`; curly brackets hold a computed part of a label: `h[{n}p]`"),
            Fault::Prime { blank: true } => prose("the prime stands apart from its bracket", "here")
                .help("write it directly behind: `1/(E(g) - H)'`"),
            Fault::Prime { blank: false } => prose("a prime needs something before it", "here")
                .help("the reduced resolvent is written `1/(E(g) - H)'`"),
            Fault::PrimeAfterPower => prose("the prime of a reduced resolvent cannot stand on the exponent", "here")
                .help("the prime comes first, then the power: `1/(E(g) - H)'^2`"),
            Fault::Factorial => prose("`!` is not an operator of this language", "here")
                .help("there is no factorial; write the number it stands for"),
            Fault::Sign(sign) => prose(format!("`{sign}` has no meaning here"), "here"),
            Fault::LeadingPlus => prose("a term cannot begin with `+`", "here").help("leave the `+` out"),
            Fault::NoComma => prose("`=` begins an argument of its own, and no `,` stands before it", "here")
                .help("separate arguments by `,`: `hydrogenic(Z=1, mass=inf)`"),
            Fault::Relation(relation) => prose(format!("`{relation}` is not an operator of this language"), "here")
                .help("to assert an equality write `expect A = B`; to see two values side by side, `compare A with B`"),
            Fault::StrayEquals => prose("`=` stands where nothing is being defined", "here")
                .help("bind a name with `define x = …`, or assert an equality with `expect A = B`"),
            Fault::Wanted { wanted, found } => {
                let answer = prose(
                    format!("{} where {} is wanted", found.phrase(), either(*wanted)),
                    format!("{} here", either(*wanted)),
                );
                if wanted.contains(Wanted::Dots) { answer.help("a range is written `w in a .. b`") } else { answer }
            }
            _ => prose("this cannot be read", "here"),
        }
    }

    fn dirac_prose(&self) -> Prose {
        match self {
            Fault::NotABra(found) => prose(
                match found {
                    Found::EndOfEntry => "`<` opens a bra, and no state follows it".to_owned(),
                    Found::Token(token) => format!("`<` opens a bra, and `{}` is not a state", brief(token)),
                },
                "a state is wanted here",
            )
            .help("a bracket is written `<g| D_z |g>`; there is no comparison `<` in this language"),
            Fault::BareLabel { label, ket } => {
                let (open, close) = if *ket { ("|", ">") } else { ("<", "|") };
                let label = brief(label);
                prose(format!("`{label}` is a label without its system"), "which system's state is this?").help(
                    format!(
                        "name the system, `{open}h[{label}]{close}`, or bind the state first: `state g = h[{label}]`"
                    ),
                )
            }
            Fault::BraWithoutBar { bra, found } => prose(
                format!(
                    "the bra `<{}` is not closed by `|`: {}",
                    brief(bra),
                    match found {
                        Found::EndOfEntry => "the entry ends".to_owned(),
                        Found::Token(token) => format!("`{}` follows", brief(token)),
                    }
                ),
                "`|` is missing here",
            )
            .help(format!("write `<{}| … |g>`", brief(bra))),
            Fault::MissingKet { bra, bra_text, behind_ket, found } => prose(
                match found {
                    Found::EndOfEntry => "the bracket has a bra and no ket".to_owned(),
                    Found::Token(token) => {
                        format!("`{}` stands where the bracket still wants its ket", brief(token))
                    }
                },
                "the ket `|…>` is missing here",
            )
            .related(*bra, "the bra")
            .help(if *behind_ket {
                format!(
                    "close the bracket with a ket, `{} … |g>`; a projector is put in brackets: `(|a><a|) V`",
                    brief(bra_text)
                )
            } else {
                format!("close the bracket with a ket: `{} … |g>`", brief(bra_text))
            }),
            Fault::EmptyKet => prose("no state follows the last `|` of the bracket", "a ket such as `|g>` is wanted")
                .help("write the state and close it: `|g>`"),
            Fault::KetUnclosed { ket, found } => prose(
                format!(
                    "the ket `|{}` is not closed by `>`: {}",
                    brief(ket),
                    match found {
                        Found::EndOfEntry => "the entry ends".to_owned(),
                        Found::Token(token) => format!("`{}` follows", brief(token)),
                    }
                ),
                "`>` is missing here",
            )
            .help(format!("write `|{ket}>`; an absolute value is `abs({ket})`", ket = brief(ket))),
            Fault::NotAState => prose("what stands before `>` is not a state", "this is not a state")
                .help("a bracket with an operator needs two bars: `<a| V |b>`; the overlap is `<a|b>`"),
            Fault::LoneKet(ket) => {
                prose(format!("the ket `{}` has no bra, so this is not a number", brief(ket)), "a lone ket")
                    .help(format!("write `<g| … {ket}`, or name the function: `ket u = … {ket}`", ket = brief(ket)))
            }
            Fault::LoneBra(bra) => prose(format!("the bra `{}` has no ket", brief(bra)), "a lone bra")
                .help(format!("write `{} … |g>`; a projector is `|a><a|`", brief(bra))),
            Fault::StrayBar => prose("this `|` belongs to no bra and no ket", "here")
                .help("a bracket is written `<g| D_z |g>`, a ket `|g>`; an absolute value is `abs(x)`"),
            Fault::StrayAngle => prose("this `>` closes no bracket", "here")
                .help("a bracket is written `<g| D_z |g>`; there is no comparison `>` in this language"),
            _ => prose("this cannot be read", "here"),
        }
    }

    fn character_prose(&self) -> Prose {
        match self {
            Fault::UnknownCharacter(character) => {
                let answer = prose(format!("the character `{character}` has no meaning here"), "unknown character");
                match character {
                    '√' => answer.help("a square root is written `sqrt(x)`"),
                    '†' => answer.help("the adjoint of a ket `|u>` is the bra `<u|`"),
                    '½' | '¼' | '¾' | '⅓' | '⅔' => answer.help("write the fraction out: `1/2`"),
                    '≤' | '≥' | '≠' | '≈' => {
                        answer.help("there are no comparisons; see `compare` and `expect`")
                    }
                    '∫' => answer.help("an integral is written `integrate(w in 0 .. inf, EXPR)`"),
                    '∑' => answer.help("a sum is written `sum(n in 1 .. 20, EXPR)`"),
                    '∂' | '∇' => answer.help("a derivative is written `slope(w at w0, EXPR)`"),
                    _ => answer.help("names are made of letters a-z, Greek letters, digits and `_`"),
                }
            }
            Fault::ControlCharacter(character) => prose(
                format!("the text holds an invisible control character, U+{:04X}", u32::from(*character)),
                "this character cannot be shown",
            )
            .help("delete it; a session is plain text"),
            Fault::EntryTooLong { bytes, limit } => {
                prose(format!("the entry is {bytes} bytes long, at most {limit} are read"), "the entry begins here")
                    .help("split it with `define`, or keep large matrices in a file: `matrix(H = \"h.mtx\")`")
            }
            Fault::TooDeep { limit } => {
                prose(format!("brackets, signs or powers are nested deeper than {limit} levels"), "too deep here")
                    .help("name an inner part with `define`")
            }
            Fault::TooManyTerms { limit } => prose(
                format!("the expression is built of more than {limit} terms or factors in a row"),
                "the limit is reached here",
            )
            .help("split it with `define`"),
            Fault::LiteralTooLong { digits, limit } => {
                prose(format!("the number has {digits} digits, at most {limit} are read"), "too long")
            }
            Fault::ExponentTooLarge { limit } => {
                prose(format!("the power of ten of this number is beyond {limit}"), "too large an exponent")
            }
            Fault::DecimalPoint => prose("a decimal point needs digits on both sides, and only once", "here")
                .help("write `0.5` for `.5` and `5` for `5.`; a range is `0 .. 5`"),
            Fault::ConciseWithPoint { value, uncertainty } => prose(
                format!("`{}({})` could be an uncertainty or a product", brief(value), brief(uncertainty)),
                "an uncertainty in brackets is whole digits",
            )
            .help(format!(
                "write `{value} +- {uncertainty}` or `{value} * {uncertainty}`",
                value = brief(value),
                uncertainty = brief(uncertainty)
            )),
            Fault::ConciseAfterExponent { mantissa, exponent, uncertainty } => prose(
                "the uncertainty in brackets comes before the power of ten",
                "here",
            )
            .help(format!("write `{}({}){exponent}`", brief(mantissa), brief(uncertainty))),
            Fault::PlusMinus => prose("`+-` stands between a number and its uncertainty only", "here")
                .help("both sides are plain numbers, as in `725 +- 3`; for a sum write `a - b` or `a + (-b)`"),
            Fault::NumbersSideBySide => prose("two numbers stand side by side", "a second number")
                .help("write `*` between them if a product is meant; digits are not grouped by blanks"),
            Fault::TextOutside => prose("a text in quotes cannot be part of an expression", "here")
                .help("texts name files, `matrix(H = \"h.mtx\")`, and label the lines of a budget"),
            Fault::UnclosedText => {
                prose("the quoted text is not closed on its line", "opened here").help("close it with `\"`")
            }
            Fault::Backslash => prose("`\\` has no meaning here", "here")
                .help("write names plainly: `omega`, or `ω` itself; `*` or a blank for a product"),
            Fault::Semicolon => {
                prose("`;` does not separate entries", "here").help("begin each entry on a line of its own")
            }
            _ => prose("this cannot be read", "here"),
        }
    }

    fn entry_prose(&self) -> Prose {
        match self {
            Fault::Reserved { word, begins_entry: true } => {
                prose(format!("`{word}` begins an entry and cannot stand inside an expression or be a name"), "here")
                    .help(format!("begin a line of its own with `{word}`, or choose another name"))
            }
            Fault::Reserved { word, begins_entry: false } => prose(
                format!("`{word}` is a word of the language and cannot be a name or a term"),
                "a number, a name, a bra or a bracket is wanted here",
            ),
            Fault::PromptCommand(word) => {
                prose(format!("`{word}` is a command of the prompt, not an entry"), "not part of a session")
                    .help("a session holds declarations and expressions only; commands are typed at the prompt")
            }
            Fault::CommandAsName(word) => {
                prose(format!("`{word}` is a command of the prompt and cannot be a name"), "here")
                    .help("choose another name")
            }
            Fault::MisspeltEntry { word, meant } => prose(format!("`{}` begins no entry", brief(word)), "unknown word")
                .help(format!("did you mean `{meant}`?")),
            Fault::NotDeclared { name, call } => {
                let name = brief(name);
                let arguments = if *call { "(…)" } else { "" };
                prose(format!("`{name}{arguments} = …` does not say what `{name}` is"), "what is this?").help(format!(
                    "a number is bound by `define {name}{arguments} = …`; `operator`, `resolvent`, `ket`, `state` and \
                     `system` bind the others"
                ))
            }
            Fault::EmptyLabel => prose("the label is empty", "a label such as `1s` or `0` is wanted here")
                .help("write `h[1s]`, `h[2p, m=1]` or `h[n=7, l=5, m=2]`; `m[0]` for a matrix"),
            Fault::LabelBlank => prose("a label holds no blanks", "this blank")
                .help("write `2p` for `2 p`; options follow after a comma: `h[2p, m=1]`"),
            Fault::LabelOption => prose("only options can follow the label", "an option such as `m=1` is wanted here")
                .help("write `h[2p, m=1]`"),
            Fault::LabelApart => {
                prose("the label stands apart from its system", "this blank").help("write them together: `h[1s]`")
            }
            Fault::NeedsSystem { word, name, label } => {
                let (name, label) = (brief(name), brief(label));
                prose(format!("`{label}` is a label without its system"), "which system's level is this?")
                    .help(format!("write `{word} {name} = h[{label}]`, where `h` is the name of a system"))
            }
            Fault::NeedsLabel { word, name, system } => {
                let (name, system) = (brief(name), brief(system));
                prose(
                    format!("`{word} {name}` needs a level of `{system}`, named in square brackets"),
                    "a label is missing",
                )
                .help(format!("write `{word} {name} = {system}[1s]`"))
            }
            Fault::SystemArguments { kind } => {
                let kind = brief(kind);
                prose(format!("the system kind `{kind}` wants its parameters in brackets"), "`(` is missing here")
                    .help(format!("write `{kind}(…)`, as in `hydrogenic(Z=1)`; `{kind}()` when there are none"))
            }
            Fault::NamelessDefinition { word } => {
                prose(format!("`{word}` binds a name, and none is given"), "a name is missing here")
                    .help(format!("write `{word} x = …`"))
            }
            Fault::Digits(found) => prose(
                match found {
                    Found::EndOfEntry => "`digits` does not say how many".to_owned(),
                    Found::Token(token) => format!("`digits` cannot be `{}`", brief(token)),
                },
                "a whole number or `exact`",
            )
            .help("write `digits 50` or `digits exact`"),
            Fault::SecondEntry => prose("a second entry begins here", "one entry a line")
                .help("an entry goes on over a line end only inside a bracket or after an operator"),
            Fault::EmptyEntry => prose("there is nothing to read", "here"),
            Fault::MissingHeader => prose("the file does not begin with `ketwork session 1`", "the first line")
                .help("put `ketwork session 1` on the first line"),
            Fault::WrongVersion(version) => prose(
                format!(
                    "the file is written in version {} of the format; this program reads version 1",
                    brief(version)
                ),
                "the version",
            )
            .help("the first line of a file for this program is `ketwork session 1`"),
            Fault::RecordWithoutEntry => prose("this record stands below no entry", "an indented `=`, `~` or `:` line")
                .help("a record comes directly below the entry it belongs to"),
            Fault::RecordNotIndented => prose("a line cannot begin with this sign", "here")
                .help("a record (`= …`, `~ …`, `: …`) is indented below its entry"),
            Fault::ProvenanceTooLate => prose("a `#@` line stands after the head of the file", "here")
                .help("provenance lines come directly below `ketwork session 1`; prose begins with `# `"),
            _ => prose("this cannot be read", "here"),
        }
    }
}

fn closer(bracket: char) -> char {
    match bracket {
        '(' => ')',
        '[' => ']',
        '{' => '}',
        _ => '>',
    }
}
