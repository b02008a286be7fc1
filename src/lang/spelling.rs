//! Unicode spelling to ASCII spelling, keeping the place of every byte.
//!
//! `⟨g| D_z² |g⟩`, `ω₀`, `2³P₁`, `725 ± 3` mean what their ASCII forms mean; the parser sees only the ASCII form.

use super::fault::Fault;
use super::tree::Span;

/// The ASCII form of a text, with the way back to the places of the original.
pub(super) struct Spelling {
    pub text: String,
    /// For every byte of `text` the place in the original of the character it came from; `None` where both are the same text.
    origin: Option<Vec<usize>>,
    original: String,
}

impl Spelling {
    /// Carries a span of the ASCII form over to the original text.
    pub fn original_span(&self, span: Span) -> Span {
        let Some(origin) = &self.origin else { return span };
        let place = |at: usize| origin.get(at).copied().unwrap_or(self.original.len());
        let start = place(span.start);
        let end = match span.end.checked_sub(1) {
            Some(last) if span.end > span.start => {
                let from = place(last);
                from + self.original[from..].chars().next().map_or(0, char::len_utf8)
            }
            _ => start,
        };
        Span::new(start, end.max(start))
    }
}

/// Gives the ASCII form of a single character outside superscripts and subscripts, where it has one.
pub(super) fn ascii_form(character: char) -> Option<&'static str> {
    Some(match character {
        '⟨' | '\u{2329}' | '\u{3008}' => "<",
        '⟩' | '\u{232a}' | '\u{3009}' => ">",
        '∣' => "|",
        '·' | '⋅' | '×' | '∗' => "*",
        '−' | '–' => "-",
        '÷' | '∕' | '⁄' => "/",
        '±' => "+-",
        '…' => "..",
        '′' | '’' | '‘' => "'",
        '“' | '”' | '„' => "\"",
        '\u{feff}' | '\u{a0}' | '\u{2002}'..='\u{200a}' | '\u{202f}' | '\u{205f}' | '\u{3000}' => " ",
        'ħ' | 'ℏ' => "hbar",
        'ℓ' => "l",
        'Å' | '\u{212b}' => "angstrom",
        'µ' => "mu",
        _ => return greek(character),
    })
}

fn greek(character: char) -> Option<&'static str> {
    Some(match character {
        'α' => "alpha",
        'β' => "beta",
        'γ' => "gamma",
        'δ' => "delta",
        'ε' | 'ϵ' => "epsilon",
        'ζ' => "zeta",
        'η' => "eta",
        'θ' | 'ϑ' => "theta",
        'ι' => "iota",
        'κ' | 'ϰ' => "kappa",
        'λ' => "lambda",
        'μ' => "mu",
        'ν' => "nu",
        'ξ' => "xi",
        'ο' => "omicron",
        'ρ' | 'ϱ' => "rho",
        'σ' | 'ς' => "sigma",
        'τ' => "tau",
        'υ' => "upsilon",
        'φ' | 'ϕ' => "phi",
        'χ' => "chi",
        'ψ' => "psi",
        'ω' => "omega",
        'Γ' => "Gamma",
        'Δ' => "Delta",
        'Θ' => "Theta",
        'Λ' => "Lambda",
        'Ξ' => "Xi",
        'Π' => "Pi",
        'Σ' => "Sigma",
        'Φ' => "Phi",
        'Ψ' => "Psi",
        'Ω' => "Omega",
        _ => return None,
    })
}

fn superscript(character: char) -> Option<char> {
    Some(match character {
        '⁰' => '0',
        '¹' => '1',
        '²' => '2',
        '³' => '3',
        '⁴'..='⁹' => char::from(b'4' + (u32::from(character) - u32::from('⁴')) as u8),
        '⁺' => '+',
        '⁻' => '-',
        'ⁿ' => 'n',
        'ⁱ' => 'i',
        _ => return None,
    })
}

fn subscript(character: char) -> Option<char> {
    Some(match character {
        '₀'..='₉' => char::from(b'0' + (u32::from(character) - u32::from('₀')) as u8),
        '₊' => '+',
        '₋' => '-',
        'ᵢ' => 'i',
        'ⱼ' => 'j',
        'ₖ' => 'k',
        'ₓ' => 'x',
        'ₙ' => 'n',
        'ₗ' => 'l',
        'ₘ' => 'm',
        _ => return None,
    })
}

#[derive(Clone, Copy, PartialEq)]
enum Script {
    Line,
    Above,
    Below,
}

/// Spells a text in ASCII, leaving quoted texts and comments as they are.
///
/// *Errors*: a control character, or a character that has no meaning here, with its place in `text`.
pub(super) fn spell(text: &str) -> Result<Spelling, (Span, Fault)> {
    let mut speller =
        Speller { out: String::with_capacity(text.len()), origin: Vec::new(), script: Script::Line, symbol: false };
    let plain = text.bytes().all(|byte| matches!(byte, b'\t' | b'\n' | b'\r' | b' '..=b'~'));
    if plain {
        return Ok(Spelling { text: text.to_owned(), origin: None, original: String::new() });
    }
    let (mut quoted, mut comment) = (false, false);
    for (at, character) in text.char_indices() {
        let span = Span::new(at, at + character.len_utf8());
        if is_refused(character) {
            return Err((span, Fault::ControlCharacter(character)));
        }
        match character {
            '\n' => (quoted, comment) = (false, false),
            '#' if !quoted => comment = true,
            '"' | '“' | '”' | '„' if !comment => quoted = !quoted,
            _ if quoted || comment => {
                speller.push_as_is(character, at);
                continue;
            }
            _ => {}
        }
        speller.push(character, at).map_err(|fault| (span, fault))?;
    }
    Ok(Spelling { text: speller.out, origin: Some(speller.origin), original: text.to_owned() })
}

/// Says whether a character is a control character no text of a session may hold.
///
/// The bidirectional marks belong here: with them a line can show something else than it means.
pub(super) fn is_refused(character: char) -> bool {
    (character.is_control() && !matches!(character, '\t' | '\n' | '\r'))
        || matches!(character, '\u{200b}'..='\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
}

struct Speller {
    out: String,
    origin: Vec<usize>,
    script: Script,
    /// The last character was a symbol such as π, which stands alone whatever follows.
    symbol: bool,
}

impl Speller {
    fn push_str(&mut self, spelt: &str, at: usize) {
        self.out.push_str(spelt);
        self.origin.resize(self.out.len(), at);
    }

    fn push_as_is(&mut self, character: char, at: usize) {
        self.script = Script::Line;
        self.symbol = false;
        self.push_str(character.encode_utf8(&mut [0; 4]), at);
    }

    fn push(&mut self, character: char, at: usize) -> Result<(), Fault> {
        if let Some(raised) = superscript(character) {
            if self.script != Script::Above {
                self.push_str("^", at);
            }
            self.script = Script::Above;
            self.symbol = false;
            self.push_str(raised.encode_utf8(&mut [0; 4]), at);
            return Ok(());
        }
        if let Some(lowered) = subscript(character) {
            if self.script != Script::Below && !self.out.ends_with('_') {
                self.push_str("_", at);
            }
            self.script = Script::Below;
            self.symbol = false;
            self.push_str(lowered.encode_utf8(&mut [0; 4]), at);
            return Ok(());
        }
        // `x²3` must not become x^23, nor `x²e5` x^2e5.
        let prolongs_number = character.is_ascii_digit() || matches!(character, '.' | 'e' | 'E');
        let prolongs_name =
            character.is_ascii_alphanumeric() || matches!(character, '_' | '(' | '[') || greek(character).is_some();
        if (self.script == Script::Above && prolongs_number) || (self.symbol && prolongs_name) {
            self.push_str(" ", at);
        }
        self.script = Script::Line;
        self.symbol = false;
        match character {
            'π' | '∞' => {
                if self.out.ends_with(|last: char| last.is_ascii_alphanumeric()) {
                    self.push_str(" ", at);
                }
                self.push_str(if character == 'π' { "pi" } else { "inf" }, at);
                self.symbol = true;
            }
            _ if character.is_ascii() => self.push_as_is(character, at),
            _ => match ascii_form(character) {
                Some(form) => self.push_str(form, at),
                None => return Err(Fault::UnknownCharacter(character)),
            },
        }
        Ok(())
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn spelt(text: &str) -> String {
        spell(text).map(|spelling| spelling.text).unwrap_or_default()
    }

    #[test]
    fn aliases_are_spelt_in_ascii() {
        for (unicode, ascii) in [
            ("⟨g| D_z R(ω) D_z |g⟩", "<g| D_z R(omega) D_z |g>"),
            ("2³P₁", "2^3P_1"),
            ("p⁴/8", "p^4/8"),
            ("10⁻³ x²", "10^-3 x^2"),
            ("D₊₁ ω₀", "D_+1 omega_0"),
            ("725 ± 3", "725 +- 3"),
            ("2π(x) − 1", "2 pi (x) - 1"),
            ("2·π·a", "2*pi*a"),
            ("x²3", "x^2 3"),
            ("hydrogenic(mass=∞)", "hydrogenic(mass=inf)"),
            ("1/(E(g) − H)′", "1/(E(g) - H)'"),
            ("budget \"π ħ\" # ⟨⟩", "budget \"π ħ\" # ⟨⟩"),
        ] {
            assert_eq!(spelt(unicode), ascii, "{unicode}");
        }
    }

    #[test]
    fn spans_lead_back_to_the_original() {
        let text = "⟨g|ω²|g⟩";
        let Ok(spelling) = spell(text) else { unreachable!("every character has an ASCII form") };
        assert_eq!(spelling.text, "<g|omega^2|g>");
        let omega = spelling.original_span(Span::new(3, 8));
        assert_eq!(&text[omega.start..omega.end], "ω");
        let square = spelling.original_span(Span::new(3, 10));
        assert_eq!(&text[square.start..square.end], "ω²");
        assert_eq!(spelling.original_span(Span::new(13, 13)), Span::new(text.len(), text.len()));
    }

    #[test]
    fn control_and_unknown_characters_are_refused_with_their_place() {
        assert!(matches!(spell("2 + \0"), Err((span, Fault::ControlCharacter('\0'))) if span == Span::new(4, 5)));
        assert!(matches!(spell("é + 1"), Err((span, Fault::UnknownCharacter('é'))) if span == Span::new(0, 2)));
        assert!(matches!(spell("a \u{202e} b"), Err((_, Fault::ControlCharacter('\u{202e}')))));
    }
}
