//! Mistakes in a text that a person wrote (a template or a grammar), with the
//! place, and the one function that draws them.

use std::ops::Range;

use annotate_snippets::{AnnotationKind, Level, Renderer, Snippet};

/// A mistake in a text: what is wrong, where, and what to do about it.
#[derive(Debug, Clone, PartialEq, Eq, thiserror::Error)]
#[error("{message}")]
pub struct TextError {
    /// What is wrong, in one sentence without a full stop.
    pub message: String,
    /// The bytes of the text that are meant.
    pub span: Range<usize>,
    /// What was expected there; stands under the marker.
    pub label: String,
    /// What to do, when there is something to say beyond the label.
    pub help: Option<String>,
}

impl TextError {
    /// A mistake at a place.
    pub fn new(message: impl Into<String>, span: Range<usize>, label: impl Into<String>) -> Self {
        TextError {
            message: message.into(),
            span,
            label: label.into(),
            help: None,
        }
    }

    /// The same with a remedy.
    #[must_use]
    pub fn with_help(mut self, help: impl Into<String>) -> Self {
        self.help = Some(help.into());
        self
    }

    /// The mistake drawn for a person: message, place (`origin` is a file name
    /// or "template"), the line with a marker under it, and the remedy. Plain
    /// text, no colour.
    pub fn draw(&self, text: &str, origin: &str) -> String {
        let end = self.span.end.min(text.len());
        let start = self.span.start.min(end);
        let snippet = Snippet::source(text)
            .path(origin)
            .annotation(AnnotationKind::Primary.span(start..end).label(&self.label));
        let mut group = Level::ERROR.primary_title(&self.message).element(snippet);
        if let Some(help) = &self.help {
            group = group.element(Level::HELP.message(help));
        }
        Renderer::plain().render(&[group]).to_string()
    }
}
