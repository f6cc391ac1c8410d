//! The tokens of the language, shared by templates and grammar files.

use std::ops::Range;

use super::error::TextError;

/// What a token is.
#[derive(Debug, Clone, PartialEq)]
pub enum TokenKind {
    /// A plain word: a name, or a word of the language.
    Word(String),
    /// A name in double quotes.
    Quoted(String),
    /// A number, with the unit that follows it, if any.
    Number(f64, Option<String>),
    /// `?` with the name that follows it, if any.
    Slot(Option<String>),
    /// One of `( ) [ ] , : | = - <= >= < >`.
    Sign(&'static str),
    /// The end of the text.
    End,
}

/// A token and where it stands.
#[derive(Debug, Clone, PartialEq)]
pub struct Token {
    /// What it is.
    pub kind: TokenKind,
    /// The bytes of the text it was made from.
    pub span: Range<usize>,
}

/// Words that have a meaning in the language and so are names only in quotes.
pub const RESERVED: &[&str] = &[
    "throughout",
    "sometime",
    "until",
    "and",
    "or",
    "not",
    "implies",
    "end",
    "step",
    "steps",
    "share",
    "with",
    "pair",
    "from",
    "weight",
    "limit",
    "CHANNEL",
    "FLAG",
];

/// Whether a name can be written without quotes.
pub fn is_plain_name(name: &str) -> bool {
    let mut characters = name.chars();
    characters
        .next()
        .is_some_and(|first| first.is_alphabetic() || first == '_')
        && characters.all(|c| c.is_alphanumeric() || c == '_')
        && !RESERVED.contains(&name)
}

const SIGNS: &[&str] = &[
    "<=", ">=", "<", ">", "(", ")", "[", "]", ",", ":", "|", "=", "-",
];

/// Cuts a text into tokens; the last one is [`TokenKind::End`].
///
/// # Errors
/// At a character that starts no token, an unclosed quote, or a number that
/// cannot be read.
pub fn tokenize(text: &str) -> Result<Vec<Token>, TextError> {
    let mut lexer = Lexer { text, at: 0 };
    let mut tokens = Vec::new();
    loop {
        lexer.skip_space();
        let start = lexer.at;
        let kind = lexer.next_kind()?;
        let done = kind == TokenKind::End;
        tokens.push(Token {
            kind,
            span: start..lexer.at,
        });
        if done {
            return Ok(tokens);
        }
    }
}

struct Lexer<'a> {
    text: &'a str,
    at: usize,
}

impl Lexer<'_> {
    fn rest(&self) -> &str {
        &self.text[self.at..]
    }

    fn skip_space(&mut self) {
        let rest = self.rest();
        self.at += rest.len() - rest.trim_start().len();
    }

    /// Takes the longest start of the rest whose characters all pass.
    fn take_while(&mut self, pass: impl Fn(char) -> bool) -> String {
        let rest = self.rest();
        let length = rest.find(|c| !pass(c)).unwrap_or(rest.len());
        let taken = rest[..length].to_owned();
        self.at += length;
        taken
    }

    fn next_kind(&mut self) -> Result<TokenKind, TextError> {
        let Some(first) = self.rest().chars().next() else {
            return Ok(TokenKind::End);
        };
        if first.is_ascii_digit() || (first == '.' && self.starts_number_at(1)) {
            return self.number();
        }
        if first.is_alphabetic() || first == '_' {
            return Ok(TokenKind::Word(
                self.take_while(|c| c.is_alphanumeric() || c == '_'),
            ));
        }
        if first == '?' {
            self.at += 1;
            let name = self.take_while(|c| c.is_alphanumeric() || c == '_');
            return Ok(TokenKind::Slot((!name.is_empty()).then_some(name)));
        }
        if first == '"' {
            return self.quoted();
        }
        if let Some(sign) = SIGNS.iter().find(|sign| self.rest().starts_with(**sign)) {
            self.at += sign.len();
            return Ok(TokenKind::Sign(sign));
        }
        Err(TextError::new(
            format!("`{first}` has no meaning here"),
            self.at..self.at + first.len_utf8(),
            "expected a name, a number, `?` or a word of the language",
        )
        .with_help("a name with special characters is written in double quotes: \"flow rate\""))
    }

    fn starts_number_at(&self, offset: usize) -> bool {
        self.rest()[offset..].starts_with(|c: char| c.is_ascii_digit())
    }

    fn quoted(&mut self) -> Result<TokenKind, TextError> {
        let start = self.at;
        self.at += 1;
        let name = self.take_while(|c| c != '"' && c != '\n');
        if !self.rest().starts_with('"') {
            return Err(TextError::new(
                "a quoted name is not closed",
                start..self.at,
                "expected a closing `\"`",
            ));
        }
        self.at += 1;
        if name.is_empty() {
            return Err(TextError::new(
                "a quoted name is empty",
                start..self.at,
                "expected a name between the quotes",
            ));
        }
        Ok(TokenKind::Quoted(name))
    }

    fn number(&mut self) -> Result<TokenKind, TextError> {
        let start = self.at;
        self.take_while(|c| c.is_ascii_digit() || c == '.');
        let rest = self.rest();
        let mut after = rest.chars();
        if matches!(after.next(), Some('e' | 'E')) {
            let sign = usize::from(matches!(after.next(), Some('+' | '-')));
            if rest[1 + sign..].starts_with(|c: char| c.is_ascii_digit()) {
                self.at += 1 + sign;
                self.take_while(|c| c.is_ascii_digit());
            }
        }
        let digits = &self.text[start..self.at];
        let value: f64 = digits
            .parse()
            .ok()
            .filter(|v: &f64| v.is_finite())
            .ok_or_else(|| {
                TextError::new(
                    format!("`{digits}` is not a number"),
                    start..self.at,
                    "expected a finite decimal number such as 2.5",
                )
            })?;
        Ok(TokenKind::Number(value, self.unit()))
    }

    /// The unit after a number: a run of letters and the signs used in units,
    /// unless it is a word of the language.
    fn unit(&mut self) -> Option<String> {
        let before = self.at;
        self.take_while(|c| c == ' ' || c == '\t');
        let starts = |c: char| c.is_alphabetic() || matches!(c, '%' | '°');
        if !self.rest().starts_with(starts) {
            self.at = before;
            return None;
        }
        let unit = self.take_while(|c| {
            c.is_alphanumeric() || matches!(c, '%' | '°' | '/' | '^' | '²' | '³' | '·' | '_')
        });
        let is_word = RESERVED.contains(&unit.as_str()) && !unit.starts_with("step");
        if is_word {
            self.at = before;
            return None;
        }
        Some(unit)
    }
}
