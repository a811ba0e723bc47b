//! Texts from files of others, made safe to show on a terminal and beside other texts.

/// A text from a file as it may be shown: what steers a terminal, or turns the direction of the text behind it, is made
/// visible, since a label could otherwise hide or reorder what stands beside it.
pub fn harmless(text: &str) -> String {
    let steers = |c: char| {
        (c.is_control() && c != '\n' && c != '\t')
            || matches!(c, '\u{200e}' | '\u{200f}' | '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}' | '\u{feff}')
            || matches!(c, '\u{fffe}' | '\u{ffff}')
    };
    if !text.contains(steers) {
        return text.to_owned();
    }
    text.chars().map(|c| if steers(c) { '\u{fffd}' } else { c }).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_steers_a_terminal_is_shown_and_does_not_act() {
        assert_eq!(harmless("heat \u{1b}[2J of \u{202e}noitcaer"), "heat \u{fffd}[2J of \u{fffd}noitcaer");
        assert_eq!(harmless("ΔrH°, line\tone\nline two"), "ΔrH°, line\tone\nline two");
    }
}
