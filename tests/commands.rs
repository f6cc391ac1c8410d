//! The program as a person runs it: results, messages, exit codes.

use std::fs;
use std::path::{Path, PathBuf};
use std::process::{Command, Output};

use serde_json::Value;
use tempfile::TempDir;

fn root() -> &'static Path {
    Path::new(env!("CARGO_MANIFEST_DIR"))
}

/// A folder to run in, with the repository's data at hand.
struct Place {
    folder: TempDir,
}

impl Place {
    fn new() -> Self {
        Place {
            folder: tempfile::tempdir().unwrap(),
        }
    }

    fn path(&self, name: &str) -> PathBuf {
        self.folder.path().join(name)
    }

    fn write(&self, name: &str, text: &str) {
        fs::write(self.path(name), text).unwrap();
    }

    /// Runs the program; words that name data of the repository are found
    /// there.
    fn run(&self, line: &str) -> Output {
        let words = line.split_whitespace().map(|word| {
            let word = word.replace('~', " ");
            let shipped = ["demo-data/", "tests/data/"]
                .iter()
                .any(|start| word.starts_with(start));
            if shipped {
                root().join(word).to_string_lossy().into_owned()
            } else {
                word
            }
        });
        Command::new(env!("CARGO_BIN_EXE_strandline"))
            .args(words)
            .current_dir(self.folder.path())
            .output()
            .unwrap()
    }

    fn ok(&self, line: &str) -> String {
        let output = self.run(line);
        let error = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(0), "{line}\n{error}");
        String::from_utf8(output.stdout).unwrap()
    }

    fn json(&self, line: &str) -> Value {
        serde_json::from_str(&self.ok(line)).unwrap()
    }

    /// Runs a line that must fail, and gives the message.
    fn fails(&self, line: &str, code: i32) -> String {
        let output = self.run(line);
        let error = String::from_utf8_lossy(&output.stderr).into_owned();
        assert_eq!(output.status.code(), Some(code), "{line}\n{error}");
        assert!(output.stdout.is_empty(), "{line}");
        assert!(!error.contains("panicked"), "{error}");
        error
    }
}

/// Two kinds of short traces, told apart by a level.
fn small_data(place: &Place) {
    let mut text = String::from("trace,label,time,x,e\n");
    for trace in 0..24 {
        let (label, top) = if trace % 2 == 0 {
            ("low", 3)
        } else {
            ("high", 8)
        };
        for t in 0..12 {
            let x = f64::from((t * (3 + trace % 5)) % 7) * 0.3 + f64::from(top * i32::from(t == 6));
            text.push_str(&format!(
                "t{trace:02},{label},{t},{x},{}\n",
                u8::from(t > trace % 4 + 2)
            ));
        }
    }
    place.write("data.csv", &text);
}

/// The labelled search on the demo: every kind described with precision and
/// recall of at least 0.95 on traces held out of the search, every description
/// checked, the same on one thread and on two.
#[test]
fn labelled_demo_is_described_on_traces_held_out() {
    let place = Place::new();
    let search = "search demo-data/lift-landings --hold-out 0.3 --quiet --json";
    let two = place.ok(&format!("{search} -o two.run --threads 2"));
    let one = place.ok(&format!("{search} -o one.run --threads 1"));
    assert_eq!(one, two, "the number of threads changed the result");
    let ranking: Value = serde_json::from_str(&two).unwrap();
    assert_eq!(ranking["schema"], "strandline-ranking/1");
    assert_eq!(ranking["run"]["verdict"], "reliable");
    assert_eq!(ranking["run"]["mode"], "labelled");
    assert!(ranking["run"]["held_out"]["accuracy"].as_f64().unwrap() >= 0.95);
    let first = place.json("explain two.run --json");
    assert_eq!(first["schema"], "strandline-template/1");
    assert_eq!(first["check"]["disagreements"], 0);
    assert!(first["check"]["verdicts"].as_u64().unwrap() >= 500);
    let groups = first["groups"].as_array().unwrap();
    assert_eq!(groups.len(), 5);
    for group in groups {
        let held_out = &group["description"]["held_out"];
        assert!(held_out["members"].as_u64().unwrap() >= 5, "{group}");
        for figure in ["precision", "recall"] {
            assert!(
                held_out[figure].as_f64().unwrap() >= 0.95,
                "{figure} of {group}"
            );
        }
    }
    // The same command again changes nothing and says so.
    let again = place.run(&format!("{search} -o two.run"));
    assert_eq!(again.status.code(), Some(0));
    assert!(String::from_utf8_lossy(&again.stderr).contains("done already"));
    assert_eq!(String::from_utf8(again.stdout).unwrap(), two);
    // Other inputs are refused, and nothing is lost.
    let error = place.fails("search demo-data/lift-landings --seed 7 -o two.run", 2);
    assert!(
        error.contains("other inputs") && error.contains("seed"),
        "{error}"
    );
    assert_eq!(place.ok("ranking two.run --json"), two);
}

/// The unlabelled search on the demo: among the first five groupings one agrees
/// with the kinds (adjusted Rand index at least 0.9), which it never saw.
#[test]
fn unlabelled_demo_finds_the_kinds() {
    let place = Place::new();
    let ranking =
        place.json("search demo-data/lift-landings --unlabelled --quiet --json -o lifts.run");
    assert_eq!(ranking["run"]["mode"], "unlabelled");
    let agreement = |entry: &Value| entry["agreement_with_labels"].as_f64().unwrap();
    let first = ranking["templates"].as_array().unwrap().iter().take(5);
    let best = first.map(agreement).fold(0.0, f64::max);
    assert!(best >= 0.9, "{best}");
    let text = place.ok("explain lifts.run");
    assert!(text.contains("A (") && text.contains("precision"), "{text}");
}

/// Searched on the train file of an open set, a panel of five sorts the test
/// file: UCR archive, set Trace; see tests/data/README.md.
#[test]
fn a_panel_sorts_traces_it_never_saw() {
    let place = Place::new();
    place.ok("search tests/data/Trace/Trace_train.csv -o trace.run --quiet");
    place.ok("handover trace.run --top 5 --as json -o panel.json");
    let file: Value =
        serde_json::from_str(&fs::read_to_string(place.path("panel.json")).unwrap()).unwrap();
    assert_eq!(file["schema"], "strandline-handover/1");
    assert_eq!(file["templates"].as_array().unwrap().len(), 5);
    assert!(
        file["caution"]
            .as_str()
            .unwrap()
            .contains("no proof of safety")
    );
    let rows = place.json("assign tests/data/Trace/Trace_test.csv --by panel.json --json");
    let text = fs::read_to_string(root().join("tests/data/Trace/Trace_test.csv")).unwrap();
    let labels: Vec<&str> = text
        .lines()
        .skip(1)
        .map(|line| line.split(',').nth(1).unwrap())
        .collect();
    let rows = rows.as_array().unwrap();
    let right = rows
        .iter()
        .zip(&labels)
        .filter(|(row, label)| row["group"] == **label)
        .count();
    assert!(
        right as f64 >= 0.95 * labels.len() as f64,
        "{right} of {}",
        labels.len()
    );
    let csv = place.ok("assign tests/data/Trace/Trace_test.csv --by panel.json");
    assert!(csv.starts_with("trace,group,votes\n") && csv.lines().count() == labels.len() + 1);
}

#[test]
fn a_small_search_end_to_end() {
    let place = Place::new();
    small_data(&place);
    let text = place.ok("search data.csv -o small.run --quiet");
    assert!(
        text.contains("Verdict:") && text.contains("precision 100 %"),
        "{text}"
    );
    assert!(text.contains("not requirements"), "{text}");
    let ranking = place.json("ranking small.run --json");
    let id = ranking["templates"][0]["id"].as_str().unwrap();
    let explained = place.json(&format!("explain small.run {id} --json"));
    assert_eq!(explained["id"], id);
    place.ok(&format!("handover small.run {id} --as json -o one.json"));
    let rows = place.ok("assign data.csv --by one.json");
    assert_eq!(
        rows.lines().filter(|row| row.contains(",high,1")).count(),
        12,
        "{rows}"
    );
}

#[test]
fn a_run_goes_on_where_it_was_cut() {
    let place = Place::new();
    small_data(&place);
    place.ok("search data.csv -o cut.run --quiet --templates 40 --grammar open-start");
    let short = place.json("ranking cut.run --json");
    assert!(
        short["run"]["stopped"]
            .as_str()
            .unwrap()
            .contains("--templates")
    );
    place.ok("search data.csv -o cut.run --quiet --templates 400 --grammar open-start");
    place.ok("search data.csv -o whole.run --quiet --templates 400 --grammar open-start");
    assert_eq!(
        place.ok("ranking cut.run --json"),
        place.ok("ranking whole.run --json")
    );
}

#[test]
fn measure_prints_boundaries_as_csv() {
    let place = Place::new();
    place.write(
        "m.csv",
        "trace,time [ms],x\na,0,1\na,10,5\na,20,2\nb,0,4\nb,10,4\nb,20,3\n",
    );
    let table = place.ok("measure m.csv --template throughout~[0,~end]~(x~<=~?)");
    assert_eq!(table, "trace,height\na,5\nb,4\n");
    let table =
        place.ok("measure m.csv --template sometime~[0,~?]~(x~>=~?) --height ?1 --points 2");
    assert!(table.starts_with("trace,"), "{table}");
    let table = place.ok("measure m.csv --template sometime~[0,~?]~(x~>=~5)");
    assert_eq!(table, "trace,height\na,10\nb,never\n");
    let table = place.ok("measure m.csv --template throughout~[0,~?]~(x~>=~0)");
    assert_eq!(table, "trace,height\na,always\nb,always\n");
    let table =
        place.json("measure m.csv --json --template throughout~[?,~end]~(x~<=~?) --points 3");
    assert_eq!(table["height"], "?2");
    assert!(
        table["columns"][0].as_str().unwrap().ends_with(" ms"),
        "{table}"
    );
}

#[test]
fn equal_gives_the_reason_or_a_witness() {
    let place = Place::new();
    place.write("m.csv", "trace,time,x\na,0,1\na,1,5\nb,0,4\nb,1,3\n");
    let whole = "throughout~[0,~end]~(x~<=~?)";
    let nested = "throughout~[0,~end]~throughout~[0,~?]~(x~<=~?)";
    let answer = place.json(&format!("equal {whole} {nested} --json"));
    assert_eq!(answer["same"], true);
    assert_eq!(answer["because"][0]["rule"], "nest-slots");
    assert!(answer.get("witness").is_none());
    let bounded = "throughout~[0,~?]~(x~<=~?)";
    let answer = place.json(&format!("equal {whole} {bounded} --json --on m.csv"));
    assert_eq!(answer["same"], false);
    let witness = &answer["witness"];
    assert_eq!(witness["template"], 2);
    let samples = witness["records"][0]["samples"]["x"].as_array().unwrap();
    assert!((1..=8).contains(&samples.len()), "{witness}");
    assert_eq!(answer["on"]["traces"], 2);
    let text = place.ok("equal x~<=~3 x~<=~4 --on m.csv");
    assert!(text.starts_with("Different."), "{text}");
    assert!(
        text.contains("On this data: different. 1 of 2 traces: b."),
        "{text}"
    );
    let text = place.ok(&format!("equal {whole} {nested} --on m.csv"));
    assert!(text.contains("indistinguishable"), "{text}");
    for (line, message) in [
        ("equal x~<=~3 x~<=~? --on m.csv", "one of the two has slots"),
        ("equal x~<= y", "the text stops too early"),
        ("equal x~<=~? nosuch~<=~? --on m.csv", "nosuch"),
    ] {
        let error = place.fails(line, 2);
        assert!(error.contains(message), "{line}: {error}");
    }
}

#[test]
fn grammars_are_counted_and_their_mistakes_drawn() {
    let place = Place::new();
    let text = place.ok("grammar settling");
    assert!(
        text.contains("templates with 3 channels and 2 flags"),
        "{text}"
    );
    assert_eq!(place.json("grammar settling --json")["name"], "settling");
    place.write("my.grammar", "goal = sometime [0, ?] f\nf = FLAGG\n");
    let error = place.fails("grammar my.grammar", 2);
    assert!(
        error.contains("my.grammar:2:5") && error.contains("did you mean `FLAG`"),
        "{error}"
    );
}

/// Command line, exit code, and parts of the message. `data.csv` is there.
const MISTAKES: &[(&str, i32, &[&str])] = &[
    (
        "search nowhere.csv -o x.run",
        2,
        &["nowhere.csv", "give a CSV file"],
    ),
    ("search data.csv", 2, &["--output"]),
    (
        "search data.csv -o no/such/folder/x.run",
        1,
        &["x.run", "choose another place"],
    ),
    (
        "search data.csv -o data.csv",
        2,
        &["not a strandline run", "left as it is"],
    ),
    (
        "search data.csv -o x.run --grammar nothing",
        2,
        &["nothing", "open-start"],
    ),
    (
        "search data.csv -o x.run --hold-out 30",
        2,
        &["expected a share"],
    ),
    (
        "search data.csv -o x.run --for soon",
        2,
        &["expected a time"],
    ),
    (
        "search data.csv -o x.run --channels z",
        2,
        &["no channel or flag `z`", "x, e"],
    ),
    (
        "search one-label.csv -o x.run",
        2,
        &["all traces have the label `a`", "--unlabelled"],
    ),
    (
        "ranking nowhere.run",
        2,
        &["no such run", "strandline search"],
    ),
    ("ranking data.csv", 2, &["not a strandline run"]),
    (
        "explain small.run zzz",
        2,
        &["no ranked template has the id `zzz`"],
    ),
    (
        "handover small.run -o x.json",
        2,
        &["give the ID of a template"],
    ),
    ("handover small.run --top 0 -o x.json", 2, &["--top"]),
    (
        "handover small.run --top 1 -o no/such/x.json",
        1,
        &["cannot be written"],
    ),
    (
        "assign data.csv --by data.csv",
        2,
        &["data.csv", "not a strandline hand-over file"],
    ),
    ("assign data.csv --by nowhere.json", 2, &["nowhere.json"]),
    (
        "assign data.csv --by old.json",
        2,
        &["schema `strandline-handover/99` is unknown"],
    ),
    (
        "measure data.csv --template x~<=",
        2,
        &["template:1:5", "stops too early"],
    ),
    (
        "measure data.csv --template throughout~[0,~end]~(z~<=~?)",
        2,
        &["no channel `z`", "`x`"],
    ),
    (
        "measure data.csv --template throughout~[0,~end]~(e~<=~?)",
        2,
        &["`e` is a flag"],
    ),
    (
        "measure data.csv --template throughout~[0,~end]~x",
        2,
        &["`x` is a channel"],
    ),
    (
        "measure data.csv --template throughout~[0,~end]~(x~<=~3)",
        2,
        &["has no slot"],
    ),
    (
        "measure data.csv --template throughout~[0,~end]~(x~<=~3~bar)~and~x~<=~?",
        2,
        &["3 bar", "whose unit is not known"],
    ),
    (
        "measure data.csv --template throughout~[0,~?]~(x~<=~?) --height ?3",
        2,
        &["?1 to ?2"],
    ),
    (
        "measure data.csv --template throughout~[0.2~s,~0.8~s]~(x~<=~?)",
        2,
        &["no sample lies in the window"],
    ),
    ("nonsense", 2, &["unrecognized subcommand"]),
];

#[test]
fn mistakes_get_a_message_and_an_exit_code() {
    let place = Place::new();
    small_data(&place);
    place.ok("search data.csv -o small.run --quiet --templates 30");
    place.write("old.json", "{\"schema\": \"strandline-handover/99\"}");
    place.write("one-label.csv", "trace,label,t0,t1\np,a,1,2\nq,a,3,5\n");
    let before = fs::read(place.path("data.csv")).unwrap();
    for (line, code, parts) in MISTAKES {
        let error = place.fails(line, *code);
        for part in *parts {
            assert!(error.contains(part), "{line}: `{part}` is not in: {error}");
        }
        assert!(!place.path("x.run").exists(), "{line} left a run behind");
    }
    assert_eq!(fs::read(place.path("data.csv")).unwrap(), before);
}

/// `--help` of every command opens with an example from the demo data, and the
/// commands that the README shows exist.
#[test]
fn help_and_readme_show_commands_that_work() {
    let place = Place::new();
    let help = place.ok("--help");
    assert!(
        help.starts_with("Example") && help.contains("demo-data/lift-landings"),
        "{help}"
    );
    let commands = [
        "search", "ranking", "explain", "handover", "assign", "measure", "grammar", "equal",
    ];
    for command in commands {
        assert!(help.contains(command));
        assert!(
            place
                .ok(&format!("{command} --help"))
                .starts_with("Example"),
            "{command}"
        );
    }
    let readme = fs::read_to_string(root().join("README.md")).unwrap();
    let mut shown = 0;
    let blocks = readme.split("```").skip(1).step_by(2);
    for line in blocks.flat_map(str::lines) {
        let Some(rest) = line.trim().strip_prefix("strandline ") else {
            continue;
        };
        let command = rest.split_whitespace().next().unwrap();
        assert!(commands.contains(&command), "{line}");
        shown += 1;
    }
    assert!(shown >= 10, "{shown}");
}
