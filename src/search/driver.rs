//! The loop of a search: list, drop what is equivalent, embed, drop what is
//! constant or the same on this data, score, report the batch, go on.
//!
//! Whatever decides (order, batches, what is dropped) goes by counts, never by
//! a clock: time only cuts the sequence after a whole batch.

use std::ops::ControlFlow;

use rayon::prelude::*;
use serde::{Deserialize, Serialize};

use super::budget::{Budget, StopReason};
use super::fold::{Folder, Novelty};
use super::noise::noisy_copy;
use super::settings::{Settings, known, palette};
use crate::embedding::{Embedding, embed_batch, request};
use crate::equivalence::{Outcome, Seen};
use crate::grammar::{Canonical, Enumerator, Grammar, Palette, ProductionError};
use crate::scoring::{Consensus, LabelledScore, score};
use crate::template::Formula;
use crate::traces::TraceSet;

/// Templates of a batch.
const BATCH: usize = 256;

/// A template that was scored (or, without labels, takes part in the
/// consensus).
#[derive(Debug, Clone)]
pub struct Kept {
    /// The template, in canonical form. Its embedding is not kept: it is
    /// computed again for the few that need it at the end.
    pub formula: Formula,
    /// The grammar that proposed it.
    pub grammar: String,
    /// Its score, in a labelled search.
    pub score: Option<LabelledScore>,
    /// Templates that are the same on this data.
    pub same_on_data: usize,
}

/// What is counted along the way.
#[derive(Debug, Clone, Copy, Default, PartialEq, Eq, Serialize, Deserialize)]
pub struct Counts {
    /// Templates listed by the grammars.
    pub listed: usize,
    /// Templates left after equivalence.
    pub distinct: usize,
    /// Templates that are constant on this data.
    pub constant: usize,
    /// Templates that are the same on this data as a simpler one.
    pub folded: usize,
    /// Templates scored.
    pub scored: usize,
}

/// One batch, as it is told to the observer.
#[derive(Debug, Clone, PartialEq)]
pub struct BatchRecord {
    /// Its number, from 0.
    pub number: usize,
    /// The grammar under way.
    pub grammar: String,
    /// The size under way.
    pub size: u32,
    /// Counts of the whole search so far.
    pub counts: Counts,
    /// Time since the start, in seconds.
    pub seconds: f64,
    /// The best labelled score so far and its template.
    pub best: Option<(f64, Formula)>,
}

/// Watches a search: stores batches, shows progress, asks it to stop.
pub trait Observer {
    /// Told after each batch, with what was kept in it.
    ///
    /// # Errors
    /// What makes going on pointless, such as a full disk.
    fn batch(&mut self, record: &BatchRecord, kept: &[Kept]) -> Result<(), String>;

    /// Whether to stop after the batch under way.
    fn wants_to_stop(&self) -> bool;

    /// The score that an earlier, interrupted search gave to a template.
    fn known_score(&self, text: &str) -> Option<LabelledScore>;
}

/// Everything that a search kept.
#[derive(Debug)]
pub struct Harvest {
    /// The templates kept, in the order in which they were listed.
    pub kept: Vec<Kept>,
    /// The groups proposed, in an unlabelled search.
    pub consensus: Consensus,
    /// The counts.
    pub counts: Counts,
    /// Why it stopped.
    pub stopped: StopReason,
}

/// A search that cannot go on.
#[derive(Debug, Clone, PartialEq, thiserror::Error)]
pub enum SearchError {
    /// A grammar does not fit together on this data.
    #[error("{0}")]
    Grammar(ProductionError),
    /// The observer gave up.
    #[error("{0}")]
    Observer(String),
}

/// Runs a search over grammars on traces.
///
/// # Errors
/// When a grammar does not fit together, or the observer gives up.
pub fn harvest(
    traces: &mut TraceSet,
    grammars: &[Grammar],
    settings: &Settings,
    budget: &Budget,
    observer: &mut dyn Observer,
) -> Result<Harvest, SearchError> {
    let labelled = settings.use_labels && traces.labels().is_some();
    let mut noisy = noisy_copy(traces, settings.seed);
    let mut driver = Driver {
        traces,
        noisy: (!labelled).then_some(&mut noisy),
        seed: settings.seed,
        budget,
        observer,
        folder: Folder::default(),
        harvest: Harvest {
            kept: Vec::new(),
            consensus: Consensus::default(),
            counts: Counts::default(),
            stopped: StopReason::Exhausted,
        },
        batch: Vec::new(),
        batches: 0,
        place: (String::new(), 0),
        bytes: 0,
        error: None,
    };
    let palette = palette(driver.traces);
    let mut seen = Seen::bounded(known(driver.traces), budget.limits().memory / 4 * 3);
    for (scope, grammar) in grammars.iter().enumerate() {
        if driver
            .grammar(grammar, scope as u64, &palette, &mut seen)?
            .is_break()
        {
            break;
        }
    }
    if driver.harvest.stopped == StopReason::Exhausted && driver.error.is_none() {
        let _ = driver.flush();
    }
    match driver.error {
        Some(error) => Err(error),
        None => Ok(driver.harvest),
    }
}

/// Compares the parts of one grammar.
struct Parts<'a> {
    seen: &'a mut Seen,
    scope: u64,
}

impl Canonical for Parts<'_> {
    fn part(&mut self, rule: usize, formula: &Formula) -> Option<Formula> {
        self.seen.part(self.scope, rule, formula)
    }
}

struct Driver<'a> {
    traces: &'a mut TraceSet,
    noisy: Option<&'a mut TraceSet>,
    seed: u64,
    budget: &'a Budget,
    observer: &'a mut dyn Observer,
    folder: Folder,
    harvest: Harvest,
    batch: Vec<Formula>,
    batches: usize,
    place: (String, u32),
    /// Bytes that the memory of templates takes.
    bytes: usize,
    error: Option<SearchError>,
}

impl Driver<'_> {
    fn grammar(
        &mut self,
        grammar: &Grammar,
        scope: u64,
        palette: &Palette,
        seen: &mut Seen,
    ) -> Result<ControlFlow<()>, SearchError> {
        let mut enumerator = Enumerator::new(grammar, palette).map_err(SearchError::Grammar)?;
        let largest = self.budget.limits().size.unwrap_or(u32::MAX);
        let mut parts = Parts { seen, scope };
        for size in 1..=enumerator.largest_size().min(largest) {
            self.place = (grammar.name.clone(), size);
            let flow = enumerator.for_each(size, &mut parts, |parts, formula| {
                self.listed(&formula, parts.seen)
            });
            if flow.is_break() {
                return Ok(flow);
            }
            // A batch never mixes sizes, so that a limit on size cuts cleanly.
            if self.flush().is_break() {
                return Ok(ControlFlow::Break(()));
            }
            parts.seen.finish_layer();
        }
        Ok(ControlFlow::Continue(()))
    }

    /// Takes one listed template.
    fn listed(&mut self, formula: &Formula, seen: &mut Seen) -> ControlFlow<()> {
        self.harvest.counts.listed += 1;
        // Without a slot there is nothing to embed by.
        if formula.slots().is_empty() {
            return ControlFlow::Continue(());
        }
        if let Outcome::New(form) = seen.template(formula)
            && !form.slots().is_empty()
        {
            self.harvest.counts.distinct += 1;
            self.batch.push(form);
        }
        self.bytes = seen.bytes();
        if self.batch.len() >= BATCH {
            return self.flush();
        }
        ControlFlow::Continue(())
    }

    /// Works through the batch that has gathered.
    fn flush(&mut self) -> ControlFlow<()> {
        if self.batch.is_empty() {
            return ControlFlow::Continue(());
        }
        let batch = std::mem::take(&mut self.batch);
        let first = self.harvest.kept.len();
        let embeddings = self.keep_new(&batch);
        self.judge(first, &embeddings);
        let kept = &self.harvest.kept[first..];
        let record = BatchRecord {
            number: self.batches,
            grammar: self.place.0.clone(),
            size: self.place.1,
            counts: self.harvest.counts,
            seconds: self.budget.elapsed().as_secs_f64(),
            best: best(&self.harvest.kept),
        };
        self.batches += 1;
        if let Err(message) = self.observer.batch(&record, kept) {
            self.error = Some(SearchError::Observer(message));
            return ControlFlow::Break(());
        }
        let stop = if self.observer.wants_to_stop() {
            Err(StopReason::Interrupted)
        } else {
            self.budget.check(self.harvest.counts.scored, self.bytes)
        };
        match stop {
            Ok(()) => ControlFlow::Continue(()),
            Err(reason) => {
                self.harvest.stopped = reason;
                ControlFlow::Break(())
            }
        }
    }

    /// Embeds a batch and keeps what is neither constant nor the same on this
    /// data as an earlier one; gives the embeddings of what was kept.
    fn keep_new(&mut self, batch: &[Formula]) -> Vec<Embedding> {
        // A template whose signals do not fit together (units that differ)
        // says nothing here.
        let fitting: Vec<&Formula> = batch
            .iter()
            .filter(|formula| {
                let mut signals = formula.signals().into_iter();
                signals.all(|signal| self.traces.derive(&signal).is_ok())
            })
            .collect();
        let traces: &TraceSet = self.traces;
        let requests = fitting
            .iter()
            .filter_map(|formula| request(formula, traces).ok())
            .collect();
        let embeddings = embed_batch(requests, traces);
        let mut new = Vec::new();
        for embedding in embeddings.into_iter().flatten() {
            match self.folder.insert(&embedding, self.harvest.kept.len()) {
                Novelty::Constant => self.harvest.counts.constant += 1,
                Novelty::SameAs(number) => {
                    self.harvest.counts.folded += 1;
                    self.harvest.kept[number].same_on_data += 1;
                }
                Novelty::New => {
                    self.harvest.kept.push(Kept {
                        formula: embedding.formula.clone(),
                        grammar: self.place.0.clone(),
                        score: None,
                        same_on_data: 0,
                    });
                    new.push(embedding);
                }
            }
        }
        self.harvest.counts.scored += new.len();
        new
    }

    /// Scores what was kept from `first` on, given its embeddings.
    fn judge(&mut self, first: usize, embeddings: &[Embedding]) {
        match &mut self.noisy {
            Some(noisy) => {
                let rough = noisy_embeddings(noisy, embeddings);
                let templates: Vec<(usize, &Embedding, &Embedding)> = embeddings
                    .iter()
                    .zip(&rough)
                    .enumerate()
                    .filter_map(|(at, (clean, rough))| Some((first + at, clean, rough.as_ref()?)))
                    .collect();
                self.harvest.consensus.add(&templates, self.seed);
            }
            None => {
                let Some(labels) = self.traces.labels() else {
                    return;
                };
                let known: Vec<Option<LabelledScore>> = embeddings
                    .iter()
                    .map(|embedding| self.observer.known_score(&embedding.formula.to_string()))
                    .collect();
                let seed = self.seed;
                let scores: Vec<LabelledScore> = embeddings
                    .par_iter()
                    .zip(known)
                    .map(|(embedding, known)| {
                        known.unwrap_or_else(|| score(embedding, labels, seed))
                    })
                    .collect();
                for (kept, score) in self.harvest.kept[first..].iter_mut().zip(scores) {
                    kept.score = Some(score);
                }
            }
        }
    }
}

/// The embeddings of the noisy traces on the same axes.
fn noisy_embeddings(noisy: &mut TraceSet, embeddings: &[Embedding]) -> Vec<Option<Embedding>> {
    for signal in embeddings.iter().flat_map(|clean| clean.formula.signals()) {
        // It was derived from the clean traces, so it can be derived here.
        let _ = noisy.derive(&signal);
    }
    let noisy: &TraceSet = noisy;
    let request = |clean: &Embedding| (clean.formula.clone(), clean.height, clean.axes.clone());
    let requests = embeddings.iter().map(request).collect();
    embed_batch(requests, noisy)
        .into_iter()
        .map(Result::ok)
        .collect()
}

/// The best labelled score so far.
fn best(kept: &[Kept]) -> Option<(f64, Formula)> {
    let scored = kept
        .iter()
        .filter_map(|kept| Some((kept.score?.score, kept)));
    scored
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(score, kept)| (score, kept.formula.clone()))
}
