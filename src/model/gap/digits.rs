//! Two adjacent digits of a figure swapped, as fingers do it.

/// The texts that differ from `text` by one swap of neighbouring digits of its number; a decimal point between them does
/// not part them. An exponent and what follows the number are left alone.
pub fn swapped(text: &str) -> Vec<String> {
    let chars: Vec<char> = text.chars().collect();
    let end = chars.iter().position(|c| !(c.is_ascii_digit() || ".-−+ ".contains(*c))).unwrap_or(chars.len());
    let digits: Vec<usize> = (0..end).filter(|&at| chars[at].is_ascii_digit()).collect();
    let mut texts = Vec::new();
    for pair in digits.windows(2) {
        if let [left, right] = *pair
            && chars[left] != chars[right]
        {
            let mut swapped = chars.clone();
            swapped.swap(left, right);
            texts.push(swapped.into_iter().collect());
        }
    }
    texts
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn each_swap_of_two_neighbours_is_one_text() {
        assert_eq!(swapped("-393.51"), ["-933.51", "-339.51", "-395.31", "-393.15"]);
        assert_eq!(swapped("450 degC"), ["540 degC", "405 degC"]);
        assert_eq!(swapped("-285.830(20) kJ/mol[H2O]").len(), 5);
        assert_eq!(swapped("1.1e12"), [] as [&str; 0]);
    }
}
