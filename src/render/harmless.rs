//! Words from files of others, made safe to show on a terminal and beside other words.
//!
//! What would steer a terminal, turn the writing round, or may not stand in XML is spelt out, `\u{1b}`: a label could
//! otherwise hide, reorder or forge what stands beside it.

use std::borrow::Cow;

fn steers(c: char) -> bool {
    c.is_control()
        || matches!(c, '\u{200e}' | '\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2066}'..='\u{2069}')
        || matches!(c, '\u{feff}' | '\u{fffe}' | '\u{ffff}')
}

fn spelt(words: &str, steers: impl Fn(char) -> bool) -> Cow<'_, str> {
    if !words.contains(&steers) {
        return Cow::Borrowed(words);
    }
    let spelt = |c: char| if steers(c) { c.escape_unicode().to_string() } else { c.to_string() };
    Cow::Owned(words.chars().map(spelt).collect())
}

/// Words as they can stand in a text of several lines.
pub fn harmless(words: &str) -> Cow<'_, str> {
    spelt(words, |c| steers(c) && c != '\n' && c != '\t')
}

/// Words as they can stand in a line, which nothing in them ends.
pub fn in_one_line(words: &str) -> Cow<'_, str> {
    spelt(words, steers)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_steers_a_terminal_is_spelt_out_and_does_not_act() {
        assert_eq!(harmless("heat \u{1b}[2J of \u{202e}noitcaer"), "heat \\u{1b}[2J of \\u{202e}noitcaer");
        assert_eq!(harmless("ΔrH°, line\tone\nline two"), "ΔrH°, line\tone\nline two");
        assert_eq!(in_one_line("label\n  forged: same"), "label\\u{a}  forged: same");
    }
}
