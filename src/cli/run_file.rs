//! A search with its run file: make or reopen it, store each batch, finish.

use std::collections::BTreeMap;
use std::path::Path;
use std::sync::Arc;
use std::sync::atomic::{AtomicBool, Ordering};

use serde_json::{Value, json};

use super::error::CliError;
use super::progress::Progress;
use super::search::Arguments;
use crate::grammar::Grammar;
use crate::scoring::LabelledScore;
use crate::search::{
    self, BatchRecord, Budget, DataFacts, Finished, Harvest, Kept, Limits, Mode, Observer,
    RunFacts, Settings, StopReason, hold_out,
};
use crate::store::{BatchRow, RunReader, RunWriter, StoreError, TemplateRow};
use crate::support::{TraceId, digest_bytes, short_id};
use crate::template::{Kind, sentence};
use crate::traces::{self, Loaded, TraceSet};

/// The run file of a search.
pub(super) enum Opened {
    /// The search is done already.
    Complete,
    /// There is something to do.
    Ready(Box<Run>),
}

/// A search that is ready to run.
pub(super) struct Run {
    writer: RunWriter,
    settings: Settings,
    grammars: Vec<Grammar>,
    traces: TraceSet,
    held_out: Option<TraceSet>,
    data: DataFacts,
    findings: Vec<String>,
    known: BTreeMap<String, LabelledScore>,
}

/// Makes a run file, or reopens it after checking that it was made from the
/// same inputs.
pub(super) fn open(
    arguments: &Arguments,
    loaded: &Loaded,
    settings: &Settings,
    limits: &Limits,
) -> Result<Opened, CliError> {
    let path = arguments.output.as_path();
    let grammars = settings
        .open_grammars()
        .map_err(|error| CliError::input(format!("\n{error}")))?;
    if settings.use_labels
        && let Some(labels) = loaded.traces.labels()
    {
        traces::check_labels(labels).map_err(|error| CliError::input(error.to_string()))?;
    }
    let held = hold_out(&loaded.traces, settings.hold_out, settings.seed);
    let side = |wanted: bool| -> Vec<TraceId> {
        let all = loaded.traces.traces();
        all.filter(|trace| held[trace.index()] == wanted).collect()
    };
    let (searched, kept_out) = (side(false), side(true));
    let inputs = inputs(arguments, loaded, settings, &grammars);
    let mut known = BTreeMap::new();
    let writer = if path.exists() {
        let reader = RunReader::open(path)?;
        check_inputs(&reader, &inputs)?;
        if is_complete(&reader, limits)? {
            return Ok(Opened::Complete);
        }
        known = known_scores(&reader)?;
        drop(reader);
        RunWriter::reopen(path)?
    } else {
        let grid = loaded.traces.grid();
        let facts = [
            ("inputs", inputs),
            ("grid", json!({"step": grid.step, "unit": grid.unit.name()})),
            ("finished", json!(false)),
        ];
        RunWriter::create(path, &facts, &loaded.traces, &held)?
    };
    Ok(Opened::Ready(Box::new(Run {
        writer,
        settings: settings.clone(),
        grammars,
        traces: loaded.traces.select(&searched),
        held_out: (!kept_out.is_empty()).then(|| loaded.traces.select(&kept_out)),
        data: data_facts(arguments, loaded, searched.len(), kept_out.len()),
        findings: loaded.findings.iter().map(ToString::to_string).collect(),
        known,
    })))
}

/// What a run is made from, by name.
fn inputs(
    arguments: &Arguments,
    loaded: &Loaded,
    settings: &Settings,
    grammars: &[Grammar],
) -> Value {
    let grammars: Vec<Value> = grammars
        .iter()
        .map(|grammar| json!([grammar.name, digest_bytes(grammar.text.as_bytes())]))
        .collect();
    let labels = loaded.traces.labels().filter(|_| settings.use_labels);
    json!({
        "data": loaded.digest,
        "channels": arguments.traces.how.channels,
        "longest mended gap": arguments.traces.how.max_gap,
        "labels used": labels.is_some(),
        "grammars": grammars,
        "share held out": settings.hold_out,
        "seed": settings.seed,
        "program": env!("CARGO_PKG_VERSION"),
    })
}

fn check_inputs(reader: &RunReader, inputs: &Value) -> Result<(), CliError> {
    let stored = reader.fact("inputs")?.unwrap_or_default();
    let differing: Vec<&str> = inputs
        .as_object()
        .into_iter()
        .flatten()
        .filter(|(name, value)| stored.get(name.as_str()) != Some(value))
        .map(|(name, _)| name.as_str())
        .collect();
    if differing.is_empty() {
        return Ok(());
    }
    Err(CliError::from(StoreError::Inputs {
        path: reader.path().to_owned(),
        difference: format!("{} differ", differing.join(", ")),
    }))
}

/// Whether nothing is left to do within the limits.
fn is_complete(reader: &RunReader, limits: &Limits) -> Result<bool, CliError> {
    if reader.fact("finished")? != Some(json!(true)) {
        return Ok(false);
    }
    let stopped = reader.fact("stopped")?.unwrap_or_default();
    let scored = reader
        .fact("facts")?
        .and_then(|facts| facts["templates_scored"].as_u64());
    let size = reader.fact("size limit")?.and_then(|size| size.as_u64());
    let larger_size = match (size, limits.size) {
        (Some(_), None) => true,
        (Some(before), Some(now)) => u64::from(now) > before,
        (None, _) => false,
    };
    let reason: Option<StopReason> = serde_json::from_value(stopped).ok();
    Ok(match reason {
        Some(StopReason::Exhausted) => !larger_size,
        Some(StopReason::Templates) => {
            scored.is_some_and(|scored| limits.templates as u64 <= scored)
        }
        // More time, or more of it after an interruption, goes on.
        _ => false,
    })
}

fn known_scores(reader: &RunReader) -> Result<BTreeMap<String, LabelledScore>, CliError> {
    let templates = reader.templates()?;
    Ok(templates
        .into_iter()
        .filter_map(|(text, stored)| Some((text, serde_json::from_value(stored.score).ok()?)))
        .collect())
}

fn data_facts(
    arguments: &Arguments,
    loaded: &Loaded,
    searched: usize,
    held_out: usize,
) -> DataFacts {
    let set = &loaded.traces;
    let lengths: Vec<usize> = set.traces().map(|trace| set.length(trace)).collect();
    let names = |kind: Kind| -> Vec<String> {
        let of_kind = set
            .recorded()
            .iter()
            .filter(|channel| channel.signal.kind() == kind);
        of_kind.map(|channel| channel.signal.to_string()).collect()
    };
    DataFacts {
        path: shown_path(&arguments.traces.path),
        digest: loaded.digest.clone(),
        traces: searched,
        traces_held_out: held_out,
        samples: (
            lengths.iter().copied().min().unwrap_or(0),
            lengths.iter().copied().max().unwrap_or(0),
        ),
        step: set.grid().step,
        time_unit: set.grid().unit.name().to_owned(),
        channels: names(Kind::Numeric),
        flags: names(Kind::Flag),
        labels: set
            .labels()
            .map(|labels| labels.names.clone())
            .unwrap_or_default(),
    }
}

fn shown_path(path: &Path) -> String {
    path.to_string_lossy().into_owned()
}

impl Run {
    /// Runs the search and stores its end. `false` when it was interrupted.
    pub(super) fn search(
        mut self,
        arguments: &Arguments,
        limits: Limits,
    ) -> Result<bool, CliError> {
        let stop = Arc::new(AtomicBool::new(false));
        let flag = Arc::clone(&stop);
        // Without a handler the run is as safe, only the goodbye is missing.
        let _ = ctrlc::set_handler(move || flag.store(true, Ordering::Relaxed));
        let budget = Budget::start(limits);
        let mut watcher = Watcher {
            writer: &mut self.writer,
            known: &self.known,
            stop: &stop,
            progress: Progress::new(limits.templates, arguments.quiet),
            listed_before: 0,
        };
        let harvest = search::harvest(
            &mut self.traces,
            &self.grammars,
            &self.settings,
            &budget,
            &mut watcher,
        );
        watcher.progress.finish();
        let harvest = harvest.map_err(|error| CliError::failed(error.to_string()))?;
        if harvest.stopped == StopReason::Interrupted {
            return Ok(false);
        }
        if let Some(held_out) = &mut self.held_out {
            for channel in self.traces.channels() {
                // Derived from the searched traces, so it can be had here.
                let _ = held_out.derive(&channel.signal);
            }
        }
        let finished = search::finish(
            &harvest,
            &self.traces,
            self.held_out.as_ref(),
            &self.settings,
        );
        self.store_end(&harvest, &finished, &limits)?;
        Ok(true)
    }

    fn store_end(
        &mut self,
        harvest: &Harvest,
        finished: &Finished,
        limits: &Limits,
    ) -> Result<(), CliError> {
        let facts = self.run_facts(harvest, finished);
        let ranking: Vec<(String, Value, Value)> = finished
            .ranked
            .iter()
            .zip(&finished.explanations)
            .map(|(entry, explanation)| (entry.id.clone(), json!(entry), json!(explanation)))
            .collect();
        self.writer.finish(
            &ranking,
            &[
                ("facts", json!(facts)),
                ("stopped", json!(harvest.stopped)),
                ("size limit", json!(limits.size)),
                ("finished", json!(true)),
            ],
        )?;
        Ok(())
    }

    fn run_facts(&self, harvest: &Harvest, finished: &Finished) -> RunFacts {
        let labelled = self.settings.use_labels && self.traces.labels().is_some();
        RunFacts {
            program: format!("strandline {}", env!("CARGO_PKG_VERSION")),
            mode: if labelled {
                Mode::Labelled
            } else {
                Mode::Unlabelled
            },
            data: self.data.clone(),
            grammars: self
                .grammars
                .iter()
                .map(|grammar| grammar.name.clone())
                .collect(),
            seed: self.settings.seed,
            templates_listed: harvest.counts.listed,
            templates_distinct: harvest.counts.distinct,
            templates_constant: harvest.counts.constant,
            templates_folded: harvest.counts.folded,
            templates_scored: harvest.counts.scored,
            stopped: harvest.stopped.to_string(),
            verdict: finished.verdict.name().to_owned(),
            verdict_text: finished.verdict_text.clone(),
            held_out: finished.held_out,
            findings: self.findings.clone(),
        }
    }
}

/// Stores batches and shows progress.
struct Watcher<'a> {
    writer: &'a mut RunWriter,
    known: &'a BTreeMap<String, LabelledScore>,
    stop: &'a AtomicBool,
    progress: Progress,
    listed_before: usize,
}

impl Observer for Watcher<'_> {
    fn batch(&mut self, record: &BatchRecord, kept: &[Kept]) -> Result<(), String> {
        let row = BatchRow {
            number: record.number,
            grammar: record.grammar.clone(),
            size: record.size,
            listed: record.counts.listed - self.listed_before,
            distinct_here: kept.len(),
            scored: kept.len(),
            seconds: record.seconds,
        };
        self.listed_before = record.counts.listed;
        let rows: Vec<TemplateRow> = kept
            .iter()
            .map(|kept| {
                let text = kept.formula.to_string();
                TemplateRow {
                    id: short_id(&text),
                    text,
                    size: kept.formula.size(),
                    grammar: kept.grammar.clone(),
                    score: json!(kept.score),
                }
            })
            .collect();
        self.writer
            .batch(&row, &rows)
            .map_err(|error| error.to_string())?;
        let best = match &record.best {
            Some((score, formula)) => {
                format!(", best so far {score:.3}: {}", sentence(formula, &()))
            }
            None => String::new(),
        };
        let place = format!("{}, size {}{best}", record.grammar, record.size);
        self.progress.set(record.counts.scored, place);
        Ok(())
    }

    fn wants_to_stop(&self) -> bool {
        self.stop.load(Ordering::Relaxed)
    }

    fn known_score(&self, text: &str) -> Option<LabelledScore> {
        self.known.get(text).copied()
    }
}
