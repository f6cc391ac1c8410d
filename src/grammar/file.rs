//! Reading grammar files.
//!
//! ```text
//! file        = { comment | limit | rule } .
//! limit       = "limit" ( "slots" | "size" | "flags" ) number .
//! rule        = name "=" alternative { "|" alternative } .
//! alternative = [ weight ] { binding } template .
//! weight      = "(" "weight" number ")" .
//! binding     = ( "with" | "pair" ) name { "," name } "from" ( "channels" | "flags" ) ":" .
//! ```
//!
//! A rule starts in the first column; lines that belong to it are indented.
//! `#` starts a comment. The rule called `goal` is where templates start.

use std::fs;
use std::ops::Range;
use std::path::Path;

use super::check;
use super::palette::Palette;
use super::production::productions;
use crate::template::{Ast, Parser, TextError, Token, TokenKind, tokenize};

/// The grammars that come with the program, in the order of the default run.
pub const SHIPPED: &[(&str, &str)] = &[
    ("settling", include_str!("../../grammars/settling.grammar")),
    (
        "excursion",
        include_str!("../../grammars/excursion.grammar"),
    ),
    (
        "event-response",
        include_str!("../../grammars/event-response.grammar"),
    ),
    (
        "open-start",
        include_str!("../../grammars/open-start.grammar"),
    ),
];

/// How large templates may get.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Limits {
    /// Most slots.
    pub slots: u32,
    /// Largest size.
    pub size: u32,
    /// Most flag atoms.
    pub flags: u32,
}

impl Default for Limits {
    fn default() -> Self {
        Limits {
            slots: 3,
            size: 12,
            flags: u32::MAX,
        }
    }
}

/// What a binding chooses from.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Pool {
    /// The numeric channels of the data.
    Channels,
    /// The flags of the data.
    Flags,
}

/// `with x, y from channels:` and its kin.
#[derive(Debug, Clone, PartialEq)]
pub struct Binding {
    /// The names bound, to different signals.
    pub names: Vec<String>,
    /// What they are chosen from.
    pub pool: Pool,
    /// Whether the order does not matter and units must agree (`pair`).
    pub unordered: bool,
    /// Where it stands.
    pub span: Range<usize>,
}

/// One alternative of a rule.
#[derive(Debug, Clone, PartialEq)]
pub struct Alternative {
    /// Larger weights come first.
    pub weight: f64,
    /// Signals chosen once for the whole alternative.
    pub bindings: Vec<Binding>,
    /// The template, with names of rules in it.
    pub ast: Ast,
}

/// A rule.
#[derive(Debug, Clone, PartialEq)]
pub struct Rule {
    /// Its name.
    pub name: String,
    /// Where the name stands.
    pub span: Range<usize>,
    /// What it can be, in the order of the file.
    pub alternatives: Vec<Alternative>,
}

/// A grammar that was read and checked.
#[derive(Debug, Clone, PartialEq)]
pub struct Grammar {
    /// Its name: that of a shipped grammar, or the file's.
    pub name: String,
    /// Its text.
    pub text: String,
    /// How large its templates may get.
    pub limits: Limits,
    /// Its rules, in the order of the file.
    pub rules: Vec<Rule>,
    /// The position of the rule `goal`.
    pub goal: usize,
    /// What looks useless but may be meant.
    pub warnings: Vec<String>,
}

/// A grammar that cannot be used.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum GrammarError {
    /// No such file, and no shipped grammar of that name.
    #[error("{name}: {reason}; the shipped grammars are {shipped}")]
    Missing {
        /// What was asked for.
        name: String,
        /// What the system said.
        reason: String,
        /// The shipped names.
        shipped: String,
    },
    /// A mistake in the text, drawn with its place.
    #[error("{0}")]
    Text(String),
}

impl Grammar {
    /// Opens a shipped grammar by name, or a file.
    ///
    /// # Errors
    /// When there is neither, or the text has a mistake.
    pub fn open(name: &str) -> Result<Self, GrammarError> {
        if let Some((name, text)) = SHIPPED.iter().find(|(shipped, _)| *shipped == name) {
            return Grammar::read(name, text);
        }
        let text = fs::read_to_string(Path::new(name)).map_err(|error| GrammarError::Missing {
            name: name.to_owned(),
            reason: error.to_string(),
            shipped: SHIPPED
                .iter()
                .map(|(name, _)| *name)
                .collect::<Vec<_>>()
                .join(", "),
        })?;
        Grammar::read(name, &text)
    }

    /// Reads a grammar from its text. `name` is what error messages call it.
    ///
    /// # Errors
    /// When the text has a mistake; the message shows the place.
    pub fn read(name: &str, text: &str) -> Result<Self, GrammarError> {
        let draw = |error: TextError| GrammarError::Text(error.draw(text, name));
        let plain = without_comments(text);
        let tokens = tokenize(&plain).map_err(draw)?;
        let reader = Reader {
            text: &plain,
            tokens: &tokens,
        };
        let (limits, rules) = reader.file().map_err(draw)?;
        let checked = check::check(&rules).map_err(draw)?;
        let grammar = Grammar {
            name: name.to_owned(),
            text: text.to_owned(),
            limits,
            rules,
            goal: checked.goal,
            warnings: checked.warnings,
        };
        // Whether every rule fits where it is used shows when they are put
        // together; any palette will do.
        productions(&grammar, &Palette::of(2, 2)).map_err(draw)?;
        Ok(grammar)
    }

    /// The position of a rule by name.
    pub fn rule(&self, name: &str) -> Option<usize> {
        self.rules.iter().position(|rule| rule.name == name)
    }
}

/// The text with comments blanked out, so that places stay where they are.
fn without_comments(text: &str) -> String {
    let mut plain = String::with_capacity(text.len());
    for line in text.split_inclusive('\n') {
        match line.find('#') {
            None => plain.push_str(line),
            Some(start) => {
                plain.push_str(&line[..start]);
                let ending = line.len() - line.trim_end_matches(['\r', '\n']).len();
                plain.extend(std::iter::repeat_n(' ', line.len() - start - ending));
                plain.push_str(&line[line.len() - ending..]);
            }
        }
    }
    plain
}

struct Reader<'a> {
    text: &'a str,
    tokens: &'a [Token],
}

impl Reader<'_> {
    /// Whether a token stands in the first column of a line.
    fn starts_line(&self, token: &Token) -> bool {
        token.span.start == 0 || self.text.as_bytes()[token.span.start - 1] == b'\n'
    }

    fn file(&self) -> Result<(Limits, Vec<Rule>), TextError> {
        let mut limits = Limits::default();
        let mut rules = Vec::new();
        let mut at = 0;
        while self.tokens[at].kind != TokenKind::End {
            let next = (at + 1..self.tokens.len())
                .find(|next| {
                    let token = &self.tokens[*next];
                    token.kind == TokenKind::End || self.starts_line(token)
                })
                .unwrap_or(self.tokens.len() - 1);
            let part = &self.tokens[at..next];
            if !self.starts_line(&part[0]) {
                return Err(TextError::new(
                    "the first line is indented",
                    part[0].span.clone(),
                    "expected a rule that starts in the first column",
                ));
            }
            match &part[0].kind {
                TokenKind::Word(word) if word == "limit" => limit(part, &mut limits)?,
                _ => rules.push(rule(part)?),
            }
            at = next;
        }
        Ok((limits, rules))
    }
}

fn limit(part: &[Token], limits: &mut Limits) -> Result<(), TextError> {
    let whole = part[0].span.start..part[part.len() - 1].span.end;
    if let [_, what, value] = part
        && let (TokenKind::Word(what), TokenKind::Number(number, None)) = (&what.kind, &value.kind)
    {
        let number = *number;
        if !(1.0..=1000.0).contains(&number) || number.fract() > 0.0 {
            return Err(TextError::new(
                "a limit must be a whole number from 1 to 1000",
                value.span.clone(),
                "expected a whole number",
            ));
        }
        match what.as_str() {
            "slots" => limits.slots = number as u32,
            "size" => limits.size = number as u32,
            "flags" => limits.flags = number as u32,
            other => {
                return Err(TextError::new(
                    format!("there is no limit on `{other}`"),
                    whole,
                    "expected `limit slots`, `limit size` or `limit flags`",
                ));
            }
        }
        return Ok(());
    }
    Err(TextError::new(
        "this limit cannot be read",
        whole,
        "expected something like `limit slots 3`",
    ))
}

fn rule(part: &[Token]) -> Result<Rule, TextError> {
    let name = match &part[0].kind {
        TokenKind::Word(name) => name.clone(),
        _ => {
            return Err(TextError::new(
                "a rule starts with its name",
                part[0].span.clone(),
                "expected a name, then `=`",
            ));
        }
    };
    if !matches!(part.get(1), Some(token) if token.kind == TokenKind::Sign("=")) {
        let end = part[0].span.end;
        return Err(TextError::new(
            format!("`=` is missing after the name of the rule `{name}`"),
            part.get(1).map_or(end..end, |token| token.span.clone()),
            "expected `=`",
        )
        .with_help("a line that belongs to the rule above it must be indented"));
    }
    let mut alternatives = Vec::new();
    for tokens in part[2..].split(|token| token.kind == TokenKind::Sign("|")) {
        let after = part[part.len() - 1].span.end;
        if tokens.is_empty() {
            return Err(TextError::new(
                format!("an alternative of `{name}` is empty"),
                part[1].span.start..after,
                "expected a template between the `|` signs",
            ));
        }
        alternatives.push(alternative(tokens)?);
    }
    Ok(Rule {
        name,
        span: part[0].span.clone(),
        alternatives,
    })
}

fn alternative(tokens: &[Token]) -> Result<Alternative, TextError> {
    let (weight, mut rest) = weight(tokens)?;
    let mut bindings = Vec::new();
    while let Some(TokenKind::Word(word)) = rest.first().map(|token| &token.kind)
        && (word == "with" || word == "pair")
    {
        let (found, after) = binding(rest, word == "pair")?;
        bindings.push(found);
        rest = after;
    }
    let end = tokens[tokens.len() - 1].span.end;
    let mut template = rest.to_vec();
    template.push(Token {
        kind: TokenKind::End,
        span: end..end,
    });
    let mut parser = Parser::new(&template);
    let ast = parser.expression()?;
    parser.expect_end()?;
    Ok(Alternative {
        weight,
        bindings,
        ast,
    })
}

fn weight(tokens: &[Token]) -> Result<(f64, &[Token]), TextError> {
    let is_weight = matches!(tokens, [open, word, ..]
        if open.kind == TokenKind::Sign("(") && word.kind == TokenKind::Word("weight".to_owned()));
    if !is_weight {
        return Ok((1.0, tokens));
    }
    match tokens {
        [_, _, number, close, rest @ ..] if close.kind == TokenKind::Sign(")") => {
            match number.kind {
                TokenKind::Number(weight, None) if weight > 0.0 => Ok((weight, rest)),
                _ => Err(TextError::new(
                    "a weight must be a number above zero",
                    number.span.clone(),
                    "expected something like `(weight 3)`",
                )),
            }
        }
        _ => Err(TextError::new(
            "this weight cannot be read",
            tokens[0].span.start..tokens[tokens.len() - 1].span.end,
            "expected something like `(weight 3)`",
        )),
    }
}

/// A binding and the tokens after it.
fn binding(tokens: &[Token], unordered: bool) -> Result<(Binding, &[Token]), TextError> {
    let start = tokens[0].span.start;
    let wrong = |at: usize, label: &str| {
        let last = &tokens[tokens.len() - 1];
        let place = tokens
            .get(at)
            .map_or(last.span.end..last.span.end, |t| t.span.clone());
        TextError::new("this binding cannot be read", place, label)
            .with_help("bindings look like `with x from channels:` or `pair e, g from flags:`")
    };
    let mut names = Vec::new();
    let mut at = 1;
    loop {
        match tokens.get(at).map(|token| &token.kind) {
            Some(TokenKind::Word(name)) if name != "from" => names.push(name.clone()),
            _ => return Err(wrong(at, "expected a name")),
        }
        at += 1;
        match tokens.get(at).map(|token| &token.kind) {
            Some(TokenKind::Sign(",")) => at += 1,
            Some(TokenKind::Word(word)) if word == "from" => break,
            _ => return Err(wrong(at, "expected `,` or `from`")),
        }
    }
    let pool = match tokens.get(at + 1).map(|token| &token.kind) {
        Some(TokenKind::Word(word)) if word == "channels" => Pool::Channels,
        Some(TokenKind::Word(word)) if word == "flags" => Pool::Flags,
        _ => return Err(wrong(at + 1, "expected `channels` or `flags`")),
    };
    if !matches!(tokens.get(at + 2), Some(token) if token.kind == TokenKind::Sign(":")) {
        return Err(wrong(at + 2, "expected `:`"));
    }
    let span = start..tokens[at + 2].span.end;
    if unordered && names.len() != 2 {
        return Err(TextError::new(
            "`pair` binds two names",
            span,
            "expected two names, such as `pair x, y from channels:`",
        ));
    }
    let found = Binding {
        names,
        pool,
        unordered,
        span,
    };
    Ok((found, &tokens[at + 3..]))
}
