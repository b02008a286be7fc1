//! The prompt's own text, and how an entry over several lines stands below it.

use crate::report::paint::Paint;

/// The prompt of the entry with this number.
pub fn prompt(number: usize) -> String {
    format!("ket {number}> ")
}

/// Marks the space before continuations, keeping its width.
pub fn shown_continuations(line: &str, width: usize, paint: Paint) -> String {
    let blanks = " ".repeat(width);
    let mark = paint.faint(&format!("{:>width$}", "..> "));
    line.replace(&format!("\n{blanks}"), &format!("\n{mark}"))
}

/// The text of an entry as it is laid out for editing.
pub fn for_editing(text: &str, width: usize) -> String {
    let blanks = " ".repeat(width);
    text.lines()
        .enumerate()
        .map(|(position, line)| if position == 0 { line.to_string() } else { format!("{blanks}{}", line.trim_start()) })
        .collect::<Vec<_>>()
        .join("\n")
}

/// The text of an entry as it is kept: continuations moved in by two blanks, unless they would then be taken for a record.
pub fn as_kept(typed: &str, width: usize) -> String {
    let blanks = " ".repeat(width);
    let keep = |line: &str| match line.strip_prefix(&blanks) {
        Some(rest) if rest.trim().is_empty() => String::new(),
        Some(rest) if rest.trim_start().starts_with(['=', '~', ':']) => rest.trim_start().to_string(),
        Some(rest) => format!("  {rest}"),
        None => line.to_string(),
    };
    let mut lines = typed.lines();
    let first = lines.next().unwrap_or_default().to_string();
    std::iter::once(first).chain(lines.map(keep)).collect::<Vec<_>>().join("\n")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn continuations_come_and_go_with_their_layout() {
        let kept = "define a = (1 +\n  2)";
        let shown = for_editing(kept, 7);
        assert_eq!(shown, "define a = (1 +\n       2)");
        assert_eq!(as_kept(&shown, 7), kept);
        assert_eq!(as_kept("(1\n       ", 7), "(1\n");
        assert_eq!(as_kept("(a\n       = b", 7), "(a\n= b");
    }

    #[test]
    fn the_mark_has_the_width_of_the_blanks_it_covers() {
        let width = prompt(3).len();
        let blanks = " ".repeat(width);
        assert_eq!(shown_continuations(&format!("(1 +\n{blanks}2"), width, Paint::PLAIN), "(1 +\n   ..> 2");
    }
}
