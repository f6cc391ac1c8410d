//! The parser: tokens to the tree as written.
//!
//! Recursive descent, one function for each level of binding: comparisons bind
//! tightest, then `not`, `throughout` and `sometime`, then `until`, `and`,
//! `or`, `implies`. The depth of nesting is bounded, so no input can exhaust
//! the stack.

use std::ops::Range;

use super::ast::{Ast, AstKind};
use super::atom::Comparison;
use super::error::TextError;
use super::token::{RESERVED, Token, TokenKind, tokenize};

/// Deepest nesting accepted. Far above any template a person would read.
const DEEPEST: usize = 64;

/// Parses a whole text as one piece of the language.
///
/// # Errors
/// At the first place where the text is not as the language needs it.
pub fn parse_ast(text: &str) -> Result<Ast, TextError> {
    let tokens = tokenize(text)?;
    let mut parser = Parser::new(&tokens);
    let ast = parser.expression()?;
    parser.expect_end()?;
    Ok(ast)
}

/// A parser over a run of tokens; also used for the alternatives of grammars.
#[derive(Debug)]
pub struct Parser<'a> {
    tokens: &'a [Token],
    at: usize,
    depth: usize,
}

impl<'a> Parser<'a> {
    /// A parser at the start of some tokens, the last of which is
    /// [`TokenKind::End`].
    ///
    /// # Panics
    /// When the tokens do not end with the end of the text.
    pub fn new(tokens: &'a [Token]) -> Self {
        assert!(matches!(tokens.last(), Some(token) if token.kind == TokenKind::End));
        Parser {
            tokens,
            at: 0,
            depth: 0,
        }
    }

    fn peek(&self) -> &'a Token {
        &self.tokens[self.at.min(self.tokens.len() - 1)]
    }

    fn advance(&mut self) -> &'a Token {
        let token = self.peek();
        self.at += 1;
        token
    }

    fn is_sign(&self, sign: &str) -> bool {
        matches!(self.peek().kind, TokenKind::Sign(s) if s == sign)
    }

    fn is_word(&self, word: &str) -> bool {
        matches!(&self.peek().kind, TokenKind::Word(w) if w == word)
    }

    fn take_word(&mut self, word: &str) -> bool {
        let found = self.is_word(word);
        self.at += usize::from(found);
        found
    }

    fn expect_sign(&mut self, sign: &str, why: &str) -> Result<Range<usize>, TextError> {
        if self.is_sign(sign) {
            return Ok(self.advance().span.clone());
        }
        Err(self.unexpected(&format!("expected `{sign}` {why}")))
    }

    fn unexpected(&self, label: &str) -> TextError {
        let token = self.peek();
        let message = match &token.kind {
            TokenKind::End => "the text stops too early".to_owned(),
            TokenKind::Word(word) => format!("`{word}` cannot stand here"),
            TokenKind::Quoted(name) => format!("the name \"{name}\" cannot stand here"),
            TokenKind::Number(..) => "a number cannot stand here".to_owned(),
            TokenKind::Slot(_) => "a slot cannot stand here".to_owned(),
            TokenKind::Sign(sign) => format!("`{sign}` cannot stand here"),
        };
        TextError::new(message, token.span.clone(), label)
    }

    /// Fails unless all tokens are used up.
    ///
    /// # Errors
    /// At the first token that is left.
    pub fn expect_end(&self) -> Result<(), TextError> {
        match self.peek().kind {
            TokenKind::End => Ok(()),
            _ => {
                Err(self
                    .unexpected("expected the end of the text, or `and`, `or`, `until`, `implies`"))
            }
        }
    }

    /// A whole formula (or, in a grammar, whatever a rule can stand for).
    ///
    /// # Errors
    /// At the first token that cannot stand where it does.
    pub fn expression(&mut self) -> Result<Ast, TextError> {
        self.depth += 1;
        if self.depth > DEEPEST {
            return Err(TextError::new(
                format!("nested more than {DEEPEST} deep"),
                self.peek().span.clone(),
                "expected a simpler formula",
            ));
        }
        let left = self.disjunction()?;
        let ast = if self.take_word("implies") {
            let right = self.expression()?;
            let span = left.span.start..right.span.end;
            AstKind::Implies(Box::new(left), Box::new(right)).at(span)
        } else {
            left
        };
        self.depth -= 1;
        Ok(ast)
    }

    fn disjunction(&mut self) -> Result<Ast, TextError> {
        self.chain("or", Self::conjunction, AstKind::Or)
    }

    fn conjunction(&mut self) -> Result<Ast, TextError> {
        self.chain("and", Self::until, AstKind::And)
    }

    /// Operands of one level with a word between them.
    fn chain(
        &mut self,
        word: &str,
        operand: impl Fn(&mut Self) -> Result<Ast, TextError>,
        make: impl Fn(Vec<Ast>) -> AstKind,
    ) -> Result<Ast, TextError> {
        let mut operands = vec![operand(self)?];
        while self.take_word(word) {
            operands.push(operand(self)?);
        }
        if operands.len() == 1 {
            return Ok(operands.swap_remove(0));
        }
        let span = operands[0].span.start..operands[operands.len() - 1].span.end;
        Ok(make(operands).at(span))
    }

    fn until(&mut self) -> Result<Ast, TextError> {
        let left = self.unary()?;
        if !self.take_word("until") {
            return Ok(left);
        }
        let window = self.window("until")?;
        let right = self.unary()?;
        if self.is_word("until") {
            return Err(self
                .unexpected("`until` stands between two operands only")
                .with_help("use parentheses to say which `until` is meant first"));
        }
        let span = left.span.start..right.span.end;
        Ok(AstKind::Until(Box::new(left), Box::new(window), Box::new(right)).at(span))
    }

    fn unary(&mut self) -> Result<Ast, TextError> {
        let start = self.peek().span.start;
        let word = match &self.peek().kind {
            TokenKind::Word(word) => word.as_str(),
            _ => return self.comparison(),
        };
        if !matches!(word, "not" | "throughout" | "sometime") {
            return self.comparison();
        }
        self.depth += 1;
        if self.depth > DEEPEST {
            return Err(self.unexpected("expected a simpler formula"));
        }
        self.advance();
        let kind = if word == "not" {
            AstKind::Not(Box::new(self.unary()?))
        } else {
            let window = Box::new(self.window(word)?);
            let operand = Box::new(self.unary()?);
            if word == "throughout" {
                AstKind::Throughout(window, operand)
            } else {
                AstKind::Sometime(window, operand)
            }
        };
        self.depth -= 1;
        let end = self.tokens[self.at - 1].span.end;
        Ok(kind.at(start..end))
    }

    fn window(&mut self, word: &str) -> Result<[Ast; 2], TextError> {
        self.expect_sign("[", &format!("after `{word}`: a window such as [0, 5 s]"))?;
        let lower = self.bound()?;
        self.expect_sign(",", "between the two bounds of a window")?;
        let upper = self.bound()?;
        self.expect_sign("]", "after the second bound of a window")?;
        Ok([lower, upper])
    }

    fn bound(&mut self) -> Result<Ast, TextError> {
        if self.is_word("end") {
            let span = self.advance().span.clone();
            return Ok(AstKind::End.at(span));
        }
        match &self.peek().kind {
            TokenKind::Number(..) | TokenKind::Slot(_) | TokenKind::Word(_) => self.primary(),
            TokenKind::Sign("-") => Err(TextError::new(
                "a bound cannot be negative",
                self.peek().span.clone(),
                "a template looks forward in time",
            )),
            _ => Err(self.unexpected("expected a duration such as 5 s, a slot `?`, or `end`")),
        }
    }

    fn comparison(&mut self) -> Result<Ast, TextError> {
        let left = self.difference()?;
        let comparison = match self.peek().kind {
            TokenKind::Sign("<=") => Comparison::AtMost,
            TokenKind::Sign(">=") => Comparison::AtLeast,
            TokenKind::Sign("<") => Comparison::Below,
            TokenKind::Sign(">") => Comparison::Above,
            TokenKind::Sign("=") => {
                return Err(self
                    .unexpected("expected `<=`, `>=`, `<` or `>`")
                    .with_help(
                        "equality of measured numbers is not in the language; use two bounds",
                    ));
            }
            _ => return Ok(left),
        };
        self.advance();
        let right = self.difference()?;
        let span = left.span.start..right.span.end;
        Ok(AstKind::Compare(Box::new(left), comparison, Box::new(right)).at(span))
    }

    fn difference(&mut self) -> Result<Ast, TextError> {
        let mut left = self.primary()?;
        while self.is_sign("-") {
            self.advance();
            let right = self.primary()?;
            let span = left.span.start..right.span.end;
            left = AstKind::Minus(Box::new(left), Box::new(right)).at(span);
        }
        Ok(left)
    }

    fn primary(&mut self) -> Result<Ast, TextError> {
        let token = self.peek();
        match &token.kind {
            TokenKind::Number(value, unit) => {
                self.advance();
                Ok(AstKind::Number(*value, unit.clone()).at(token.span.clone()))
            }
            TokenKind::Slot(name) => {
                self.advance();
                Ok(AstKind::Slot(name.clone()).at(token.span.clone()))
            }
            TokenKind::Quoted(name) => {
                self.advance();
                let (name, quoted) = (name.clone(), true);
                Ok(AstKind::Name { name, quoted }.at(token.span.clone()))
            }
            TokenKind::Word(word) => self.word(word, token.span.clone()),
            TokenKind::Sign("-") => self.negative(token.span.start),
            TokenKind::Sign("(") => {
                self.advance();
                let inner = self.expression()?;
                let close = self.expect_sign(")", "to close the parenthesis")?;
                Ok(inner.kind.at(token.span.start..close.end))
            }
            _ => Err(self.unexpected("expected a formula, a channel or a flag")),
        }
    }

    /// A negative number.
    fn negative(&mut self, start: usize) -> Result<Ast, TextError> {
        self.advance();
        match &self.peek().kind {
            TokenKind::Number(value, unit) => {
                let end = self.advance().span.end;
                Ok(AstKind::Number(-value, unit.clone()).at(start..end))
            }
            _ => Err(self.unexpected("expected a number after the minus sign")),
        }
    }

    /// A name, or a function with its arguments.
    fn word(&mut self, word: &str, span: Range<usize>) -> Result<Ast, TextError> {
        let is_place_holder = matches!(word, "CHANNEL" | "FLAG");
        if RESERVED.contains(&word) && !is_place_holder {
            return Err(self
                .unexpected("expected a formula, a channel or a flag")
                .with_help(format!(
                    "`{word}` is a word of the language; a channel of that name is written \"{word}\""
                )));
        }
        self.advance();
        let name = word.to_owned();
        if is_place_holder || !self.is_sign("(") {
            let quoted = false;
            return Ok(AstKind::Name { name, quoted }.at(span));
        }
        self.advance();
        let mut arguments = Vec::new();
        while !self.is_sign(")") {
            if !arguments.is_empty() {
                self.expect_sign(",", "between two arguments")?;
            }
            arguments.push(self.expression()?);
        }
        let close = self.advance().span.end;
        Ok(AstKind::Call(name, arguments).at(span.start..close))
    }
}
