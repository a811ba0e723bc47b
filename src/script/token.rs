//! Cells cut into words, numbers, texts and symbols, as the engine cuts them.
//!
//! [`tokens`] serves the questions that must be asked of a cell's text before it is parsed: does it end in `;`, is
//! it whole, can something in it be read in two ways. The surprise: code inside `${…}` of a template is cut up too,
//! between the symbols `${` and `}`.

/// What a token is.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    /// A name or keyword.
    Word,
    Number,
    /// A text, a character, or a stretch of a template between its `${…}`.
    Text,
    Symbol,
}

/// A token with its place: byte offset, and line and column counted from 1 in characters.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct Token<'a> {
    pub kind: Kind,
    pub text: &'a str,
    pub offset: usize,
    pub line: usize,
    pub column: usize,
}

impl Token<'_> {
    pub fn is(&self, symbol: &str) -> bool {
        matches!(self.kind, Kind::Symbol | Kind::Word) && self.text == symbol
    }

    /// Byte offset just behind the token.
    pub fn end(&self) -> usize {
        self.offset + self.text.len()
    }
}

/// In what the text broke off.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Ending {
    /// Between tokens.
    Clean,
    Comment,
    /// A back-tick template, or code inside its `${`.
    Template,
    /// A `"` text whose last character is the `\` that carries it to the next line.
    CarriedText,
    /// A raw text without its closing quote.
    RawText,
    /// A `"` or `'` text that stops short: no further line can mend it.
    BrokenText,
}

/// Longest first, so that the first match is the right one.
const SYMBOLS: [&str; 38] = [
    "**=", "...", "..=", "<<=", ">>=", "===", "!==", "**", "..", "==", "!=", "<=", ">=", "&&", "||", "??", "?.", "?[",
    "=>", "->", "::", "+=", "-=", "*=", "/=", "%=", "&=", "|=", "^=", "<<", ">>", "#{", "++", "--", "()", "(*", "*)",
    "<-",
];

/// Cuts a text into tokens and says how it ended. Comments and white space are left out.
pub fn tokens(text: &str) -> (Vec<Token<'_>>, Ending) {
    let mut cutter = Cutter { text, offset: 0, line: 1, column: 1, tokens: Vec::new(), braces: Vec::new() };
    let ending = cutter.run();
    (cutter.tokens, ending)
}

/// What a `}` closes.
#[derive(Clone, Copy, PartialEq, Eq)]
enum Brace {
    Plain,
    Template,
}

struct Cutter<'a> {
    text: &'a str,
    offset: usize,
    line: usize,
    column: usize,
    tokens: Vec<Token<'a>>,
    braces: Vec<Brace>,
}

impl<'a> Cutter<'a> {
    fn rest(&self) -> &'a str {
        &self.text[self.offset..]
    }

    fn peek(&self) -> Option<char> {
        self.rest().chars().next()
    }

    fn step(&mut self) -> Option<char> {
        let next = self.peek()?;
        self.offset += next.len_utf8();
        if next == '\n' {
            self.line += 1;
            self.column = 1;
        } else {
            self.column += 1;
        }
        Some(next)
    }

    fn skip(&mut self, characters: usize) {
        for _ in 0..characters {
            self.step();
        }
    }

    fn skip_while(&mut self, accept: impl Fn(char) -> bool) {
        while self.peek().is_some_and(&accept) {
            self.step();
        }
    }

    /// Records what `cut` passes over as one token.
    fn token<R>(&mut self, kind: Kind, cut: impl FnOnce(&mut Self) -> R) -> R {
        let (offset, line, column) = (self.offset, self.line, self.column);
        let result = cut(self);
        self.tokens.push(Token { kind, text: &self.text[offset..self.offset], offset, line, column });
        result
    }

    fn run(&mut self) -> Ending {
        while let Some(next) = self.peek() {
            let ending = match next {
                _ if next.is_whitespace() => {
                    self.step();
                    Ending::Clean
                }
                '/' if self.rest().starts_with("//") => {
                    self.skip_while(|c| c != '\n');
                    Ending::Clean
                }
                '/' if self.rest().starts_with("/*") => self.comment(),
                '0'..='9' => {
                    self.token(Kind::Number, Self::number);
                    Ending::Clean
                }
                '"' | '\'' => self.token(Kind::Text, |cutter| cutter.quoted(next)),
                '`' => self.template(),
                '#' if self.rest().trim_start_matches('#').starts_with('"') => self.token(Kind::Text, Self::raw),
                '_' => {
                    self.token(Kind::Word, Self::word);
                    Ending::Clean
                }
                _ if next.is_alphabetic() => {
                    self.token(Kind::Word, Self::word);
                    Ending::Clean
                }
                '}' if self.braces.last() == Some(&Brace::Template) => {
                    self.braces.pop();
                    self.token(Kind::Symbol, |cutter| cutter.skip(1));
                    self.stretch()
                }
                _ => {
                    self.symbol();
                    Ending::Clean
                }
            };
            if ending != Ending::Clean {
                return ending;
            }
        }
        if self.braces.contains(&Brace::Template) { Ending::Template } else { Ending::Clean }
    }

    fn word(&mut self) {
        self.skip_while(|c| c.is_alphanumeric() || c == '_');
    }

    fn symbol(&mut self) {
        let rest = self.rest();
        let length = SYMBOLS.iter().find(|symbol| rest.starts_with(**symbol)).map_or(1, |symbol| symbol.len());
        match self.peek() {
            _ if rest.starts_with("#{") => self.braces.push(Brace::Plain),
            Some('{') => self.braces.push(Brace::Plain),
            Some('}') => {
                self.braces.pop();
            }
            _ => {}
        }
        self.token(Kind::Symbol, |cutter| cutter.skip(length));
    }

    /// Block comments nest.
    fn comment(&mut self) -> Ending {
        let mut depth = 0_usize;
        loop {
            if self.rest().starts_with("/*") {
                depth += 1;
                self.skip(2);
            } else if self.rest().starts_with("*/") {
                depth -= 1;
                self.skip(2);
            } else if self.step().is_none() {
                return Ending::Comment;
            }
            if depth == 0 {
                return Ending::Clean;
            }
        }
    }

    fn number(&mut self) {
        let radix = self.rest().strip_prefix('0').and_then(|rest| rest.chars().next());
        if radix.is_some_and(|mark| "xXoObB".contains(mark)) {
            self.skip(2);
            self.skip_while(|c| c.is_ascii_hexdigit() || c == '_');
            return;
        }
        let digits = |c: char| c.is_ascii_digit() || c == '_';
        self.skip_while(digits);
        // A point belongs to the number unless a name (`1.abs`) or a range (`1..3`) follows it.
        if let Some(behind) = self.rest().strip_prefix('.') {
            let name_or_range = behind.starts_with(|c: char| c.is_alphabetic() || c == '_' || c == '.');
            if !name_or_range && !behind.is_empty() {
                self.skip(1);
                self.skip_while(digits);
            }
        }
        if let Some(behind) = self.rest().strip_prefix(['e', 'E'])
            && behind.starts_with(|c: char| c.is_ascii_digit() || c == '+' || c == '-')
        {
            self.skip(2);
            self.skip_while(digits);
        }
    }

    fn quoted(&mut self, quote: char) -> Ending {
        self.step();
        while let Some(next) = self.step() {
            match next {
                '\\' => match self.step() {
                    None => return if quote == '"' { Ending::CarriedText } else { Ending::BrokenText },
                    Some('\n') if self.peek().is_none() && quote == '"' => return Ending::CarriedText,
                    Some(_) => {}
                },
                '\n' => return Ending::BrokenText,
                // A doubled quote stands for one quote.
                _ if next == quote && self.peek() == Some(quote) => {
                    self.step();
                }
                _ if next == quote => return Ending::Clean,
                _ => {}
            }
        }
        Ending::BrokenText
    }

    fn raw(&mut self) -> Ending {
        let hashes = self.rest().chars().take_while(|c| *c == '#').count();
        self.skip(hashes + 1);
        let close = format!("\"{}", "#".repeat(hashes));
        loop {
            if self.rest().starts_with(&close) {
                self.skip(hashes + 1);
                return Ending::Clean;
            }
            if self.step().is_none() {
                return Ending::RawText;
            }
        }
    }

    fn template(&mut self) -> Ending {
        self.token(Kind::Symbol, |cutter| cutter.skip(1));
        self.stretch()
    }

    /// The text of a template up to its end or the next `${`.
    fn stretch(&mut self) -> Ending {
        let opens = self.token(Kind::Text, |cutter| {
            loop {
                let rest = cutter.rest();
                if rest.starts_with("\\${") {
                    cutter.skip(3);
                } else if rest.starts_with("${") {
                    return Some(true);
                } else if rest.starts_with("``") {
                    cutter.skip(2);
                } else if rest.starts_with('`') {
                    return Some(false);
                } else {
                    cutter.step()?;
                }
            }
        });
        match opens {
            None => Ending::Template,
            Some(true) => {
                self.braces.push(Brace::Template);
                self.token(Kind::Symbol, |cutter| cutter.skip(2));
                Ending::Clean
            }
            Some(false) => {
                self.token(Kind::Symbol, |cutter| cutter.skip(1));
                Ending::Clean
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn cut(text: &str) -> Vec<&str> {
        tokens(text).0.iter().map(|token| token.text).collect()
    }

    #[test]
    fn numbers_keep_their_point_only_where_the_engine_does() {
        assert_eq!(cut("1.5e-3.K"), ["1.5e-3", ".", "K"]);
        assert_eq!(cut("298.K 1..3 1_000.5"), ["298", ".", "K", "1", "..", "3", "1_000.5"]);
        assert_eq!(cut("0xFF_00-1"), ["0xFF_00", "-", "1"]);
        assert_eq!(cut("2.e"), ["2", ".", "e"]);
        assert_eq!(cut("x**-2**=y"), ["x", "**", "-", "2", "**=", "y"]);
    }

    #[test]
    fn comments_and_texts_hide_what_they_hold() {
        assert_eq!(cut("a /* b /* c */ d */ e // f\n;"), ["a", "e", ";"]);
        let text = r###""a \" ; b" ; "say ""x""" 'c' #"raw " ; "# ;"###;
        let pieces = [r#""a \" ; b""#, ";", r#""say ""x""""#, "'c'", r###"#"raw " ; "#"###, ";"];
        assert_eq!(cut(text), pieces);
    }

    #[test]
    fn code_inside_a_template_is_cut_too() {
        assert_eq!(
            cut("`a ${#{b: 1}.b} c \\${d}`;"),
            ["`", "a ", "${", "#{", "b", ":", "1", "}", ".", "b", "}", " c \\${d}", "`", ";"]
        );
        assert_eq!(cut("`${`${x}`}`"), ["`", "", "${", "`", "", "${", "x", "}", "", "`", "}", "", "`"]);
    }

    #[test]
    fn lines_and_columns_count_characters() {
        let (found, _) = tokens("ΔrH =\n  \"é\" + x");
        let places: Vec<_> = found.iter().map(|token| (token.text, token.line, token.column)).collect();
        assert_eq!(places, [("ΔrH", 1, 1), ("=", 1, 5), ("\"é\"", 2, 3), ("+", 2, 7), ("x", 2, 9)]);
    }

    #[test]
    fn the_ending_says_what_is_still_open() {
        let cases = [
            ("a /* b", Ending::Comment),
            ("`a", Ending::Template),
            ("`a ${b", Ending::Template),
            ("`a ${b}", Ending::Template),
            ("\"a\\", Ending::CarriedText),
            ("\"a\\\n", Ending::CarriedText),
            ("\"a", Ending::BrokenText),
            ("\"a\nb\"", Ending::BrokenText),
            ("'a", Ending::BrokenText),
            ("##\"a\"# b", Ending::RawText),
            ("a // b `c", Ending::Clean),
            ("`a`", Ending::Clean),
            ("", Ending::Clean),
        ];
        for (text, ending) in cases {
            assert_eq!(tokens(text).1, ending, "{text:?}");
        }
    }
}
