//! Reading trace files: layouts, mending, mistakes, derived signals.

use std::fs;
use std::path::{Path, PathBuf};

use strandline::support::{SignalId, TraceId};
use strandline::template::{Kind, TimeUnit, parse_signal};
use strandline::traces::{Layout, LoadOptions, Loaded, TraceError, load};
use tempfile::TempDir;

/// A folder with the given files; the path of the first, or of the folder.
fn files(contents: &[(&str, &str)]) -> (TempDir, PathBuf) {
    let folder = tempfile::tempdir().unwrap();
    for (name, text) in contents {
        fs::write(folder.path().join(name), text).unwrap();
    }
    let path = folder.path().to_owned();
    (folder, path)
}

fn load_text(text: &str) -> Result<Loaded, TraceError> {
    let (_keep, folder) = files(&[("data.csv", text)]);
    load(&folder.join("data.csv"), &LoadOptions::default())
}

fn values(loaded: &Loaded, signal: u32, trace: u32) -> Vec<f64> {
    loaded
        .traces
        .samples(SignalId(signal), TraceId(trace))
        .to_vec()
}

const LONG: &str = "trace,label,time,x [mm],e\n\
    a,good,0,1.5,0\na,good,0.1,2.5,1\na,good,0.2,3,1\n\
    b,bad,0,5,0\nb,bad,0.1,6,0\n";

/// The same traces in the layouts long and files give the same set.
#[test]
fn layouts_are_told_apart_and_agree() {
    let long = load_text(LONG).unwrap();
    assert_eq!(long.layout, Layout::Long);
    let (_keep, folder) = files(&[
        ("a.csv", "time,x [mm],e\n0,1.5,0\n0.1,2.5,1\n0.2,3,1\n"),
        ("b.csv", "time,x [mm],e\n0,5,0\n0.1,6,0\n"),
        ("labels.csv", "trace,label\nb,bad\na,good\n"),
        ("README.md", "not data"),
    ]);
    let split = load(&folder, &LoadOptions::default()).unwrap();
    assert_eq!(split.layout, Layout::Files);
    for set in [&long, &split] {
        assert_eq!(set.traces.names(), ["a", "b"]);
        assert_eq!(set.traces.labels().unwrap().names, ["bad", "good"]);
        assert_eq!(set.traces.labels().unwrap().of_trace, [1, 0]);
        assert_eq!(set.traces.grid().unit, TimeUnit::Second);
        assert!((set.traces.grid().step - 0.1).abs() < 1e-12);
        assert_eq!(set.traces.channel(SignalId(0)).unit.as_deref(), Some("mm"));
        assert_eq!(set.traces.channel(SignalId(1)).signal.kind(), Kind::Flag);
        assert_eq!(values(set, 0, 0), [1.5, 2.5, 3.0]);
        assert_eq!(values(set, 1, 1), [0.0, 0.0]);
    }
    let rows = load_text("trace,label,t0,t1,t2\na,good,1.5,2.5,3\nb,bad,5,6,\n").unwrap();
    assert_eq!(rows.layout, Layout::Rows);
    assert_eq!(values(&rows, 0, 0), [1.5, 2.5, 3.0]);
    assert_eq!(values(&rows, 0, 1), [5.0, 6.0]);
    assert_eq!(rows.traces.grid().unit, TimeUnit::Step);
    assert_eq!(rows.traces.channel(SignalId(0)).signal.to_string(), "value");
    assert_ne!(long.digest, split.digest);
}

/// A folder with one table in it is read as that table.
#[test]
fn a_folder_with_one_table_is_read_as_that_table() {
    let (_keep, folder) = files(&[("data.csv", LONG), ("README.md", "text")]);
    let loaded = load(&folder, &LoadOptions::default()).unwrap();
    assert_eq!(loaded.layout, Layout::Long);
    assert_eq!(loaded.traces.count(), 2);
}

/// Other ways to write the same numbers.
#[test]
fn spellings_of_csv_are_understood() {
    for text in [
        "\u{feff}trace,time,x,e\r\na,0,1.5,off\r\na,1,2.5,on\r\nb,0,5,off\r\nb,1,6,off\r\n",
        "# made by a logger\ntrace;time;x;e\na;0;1,5;0\na;1;2,5;1\nb;0;5;0\nb;1;6;0\n\n",
        "trace\ttime\tx\te\na\t0\t1.5\tFALSE\na\t1\t2.5\tTRUE\nb\t0\t5\tno\nb\t1\t6\tno\n",
        "trace, time, x, e\na, 0, 1.5, 0\na, 1, 2.5, 1\nb, 0, 5, 0\nb, 1, 6, 0\n,,,\n",
        "time [ms],e,x,trace\n0,0,1.5,a\n1,1,2.5,a\n0,0,5,b\n1,0,6,b\n",
        "trace,time,x,e\na,0,1.5,0\nb,0,5,0\na,1,2.5,1\nb,1,6,0\n",
    ] {
        let loaded = load_text(text).unwrap_or_else(|error| panic!("{error}\n{text}"));
        let find = |name: &str, kind| {
            let signal = parse_signal(name, kind).unwrap();
            loaded.traces.signal_id(&signal).unwrap()
        };
        let x = find("x", Kind::Numeric);
        let e = find("e", Kind::Flag);
        assert_eq!(loaded.traces.samples(x, TraceId(0)), [1.5, 2.5], "{text}");
        assert_eq!(loaded.traces.samples(e, TraceId(0)), [0.0, 1.0], "{text}");
        assert_eq!(loaded.traces.samples(x, TraceId(1)), [5.0, 6.0], "{text}");
    }
}

/// Uneven sampling, gaps and empty cells are mended by the stated rules, and
/// said.
#[test]
fn mending_is_done_by_rule_and_said() {
    let text = "trace,time,x,e\n\
        a,0,0,0\na,1,10,1\na,2,20,1\na,4,40,0\na,5,,0\na,6,60,0\n\
        b,0,0,0\nb,0.9,9,1\nb,2.1,21,1\nb,3,30,0\nb,4,,0\n";
    let loaded = load_text(text).unwrap();
    assert_eq!(
        values(&loaded, 0, 0),
        [0.0, 10.0, 20.0, 30.0, 40.0, 50.0, 60.0]
    );
    assert_eq!(values(&loaded, 1, 0), [0.0, 1.0, 1.0, 1.0, 0.0, 0.0, 0.0]);
    let b = values(&loaded, 0, 1);
    let expected = [0.0, 10.0, 20.0, 30.0];
    assert!(
        b.iter().zip(expected).all(|(x, y)| (x - y).abs() < 1e-9),
        "{b:?}"
    );
    assert!(b[4].is_nan());
    assert_eq!(values(&loaded, 1, 1), [0.0, 1.0, 1.0, 0.0, 0.0]);
    let said: Vec<String> = loaded.findings.iter().map(ToString::to_string).collect();
    for part in [
        "2 unevenly sampled",
        "1 gap(s) of up to 1",
        "1 empty cell(s) of `x`",
        "1 sample(s) of `x`",
        "differ in length",
    ] {
        assert!(
            said.iter().any(|finding| finding.contains(part)),
            "{part}: {said:?}"
        );
    }
}

/// One crooked input a row: name, files, labels file, parts of the message.
type Crooked = (
    &'static str,
    &'static [(&'static str, &'static str)],
    &'static [&'static str],
);

const CROOKED: &[Crooked] = &[
    ("empty file", &[("d.csv", "")], &["d.csv", "is empty"]),
    (
        "only a header",
        &[("d.csv", "trace,time,x\n")],
        &["is empty", "at least one row"],
    ),
    ("blank lines only", &[("d.csv", "\n \n\n")], &["is empty"]),
    (
        "ragged row, short",
        &[("d.csv", "trace,time,x\na,0,1\na,1\n")],
        &["line 3", "2 cells where the header has 3"],
    ),
    (
        "ragged row, long",
        &[("d.csv", "trace,time,x\na,0,1,7\n")],
        &["line 2", "4 cells"],
    ),
    (
        "duplicate header",
        &[("d.csv", "trace,time,x,x\na,0,1,1\n")],
        &["`x` occurs twice"],
    ),
    (
        "column without name",
        &[("d.csv", "trace,time,,x\na,0,1,1\n")],
        &["column 3 has no name"],
    ),
    (
        "no trace column",
        &[("d.csv", "time,x\n0,1\n1,2\n")],
        &["no `trace` column", "time, x", "give their folder"],
    ),
    (
        "no channel",
        &[("d.csv", "trace,time\na,0\na,1\n")],
        &["no channel"],
    ),
    (
        "files without time",
        &[("a.csv", "x\n1\n2\n"), ("b.csv", "x\n1\n2\n")],
        &["a.csv", "no `time` column", "time [ms]"],
    ),
    (
        "files with other columns",
        &[
            ("a.csv", "time,x\n0,1\n1,2\n"),
            ("b.csv", "time,y\n0,1\n1,2\n"),
        ],
        &["b.csv", "`x` is missing"],
    ),
    (
        "files with other units",
        &[
            ("a.csv", "time,x [mm]\n0,1\n1,2\n"),
            ("b.csv", "time,x [m]\n0,1\n1,2\n"),
        ],
        &["b.csv", "`x` is missing or has another unit"],
    ),
    (
        "time repeated",
        &[("d.csv", "trace,time,x\na,0,1\na,1,2\na,1,3\nb,0,1\nb,1,1\n")],
        &["line 4", "`time`", "does not come after 1"],
    ),
    (
        "time going back",
        &[("d.csv", "trace,time,x\na,0,1\na,2,2\na,1,3\n")],
        &["line 4", "time must go forward"],
    ),
    (
        "time missing in a row",
        &[("d.csv", "trace,time,x\na,0,1\na,,2\n")],
        &["line 3", "column `time`", "is empty"],
    ),
    (
        "trace name missing",
        &[("d.csv", "trace,time,x\na,0,1\n,1,2\n")],
        &["line 3", "column `trace`", "is empty"],
    ),
    (
        "not a number",
        &[("d.csv", "trace,time,x\na,0,1\na,1,12mm\n")],
        &["line 3", "column `x`", "`12mm` is not a number"],
    ),
    (
        "decimal comma in a quoted cell",
        &[("d.csv", "trace,time,x\na,0,\"1,5\"\na,1,2\n")],
        &["line 2", "`1,5` is not a number"],
    ),
    (
        "not a number in time",
        &[("d.csv", "trace,time,x\na,noon,1\n")],
        &["line 2", "column `time`", "`noon`"],
    ),
    (
        "NaN",
        &[("d.csv", "trace,time,x\na,0,1\na,1,NaN\n")],
        &["line 3", "not a finite number", "leave the cell empty"],
    ),
    (
        "infinity",
        &[("d.csv", "trace,time,x\na,0,-inf\na,1,2\n")],
        &["line 2", "`-inf` is not a finite"],
    ),
    (
        "overflow",
        &[("d.csv", "trace,time,x\na,0,1e999\na,1,2\n")],
        &["line 2", "`1e999` is not a finite"],
    ),
    (
        "gap too long",
        &[(
            "d.csv",
            "trace,time,x\na,0,1\na,1,2\na,9,3\na,10,3\nb,0,1\nb,1,1\n",
        )],
        &["line 4", "gap of 7 steps", "--max-gap 7"],
    ),
    (
        "empty cells too long",
        &[(
            "d.csv",
            "trace,time,x,y\na,0,1,1\na,1,,1\na,2,,1\na,3,,1\na,4,,1\na,5,,1\na,6,,1\na,7,2,1\n",
        )],
        &["line 9", "column `x`", "gap of 6 steps"],
    ),
    (
        "all channels constant",
        &[("d.csv", "trace,time,x\na,0,1\na,1,1\nb,0,1\nb,1,1\n")],
        &["every channel is constant"],
    ),
    (
        "one sample",
        &[("d.csv", "trace,time,x\na,0,1\nb,0,1\nb,1,2\n")],
        &["`a` has one sample only"],
    ),
    (
        "one sample in a row",
        &[("d.csv", "trace,t0,t1\na,1,\nb,1,2\n")],
        &["`a` has one sample only"],
    ),
    (
        "one trace",
        &[("d.csv", "trace,time,x\na,0,1\na,1,2\n")],
        &["one trace only (`a`)", "at least two"],
    ),
    (
        "one file",
        &[("a.csv", "time,x\n0,1\n1,2\n")],
        &["one trace only (`a`)"],
    ),
    (
        "all traces alike",
        &[("d.csv", "trace,time,x\na,0,1\na,1,2\nb,0,1\nb,1,2\n")],
        &["nothing to tell apart"],
    ),
    (
        "two rows of one name",
        &[("d.csv", "trace,t0,t1\na,1,2\nb,1,2\na,3,4\n")],
        &["line 4", "second trace is called `a`"],
    ),
    (
        "two labels for a trace",
        &[(
            "d.csv",
            "trace,label,time,x\na,p,0,1\na,q,1,2\nb,p,0,1\nb,p,1,1\n",
        )],
        &["line 3", "labels `p` and `q`"],
    ),
    (
        "a trace without label",
        &[("d.csv", "trace,label,t0,t1\na,p,1,2\nb,,3,4\n")],
        &["`b` has no label"],
    ),
    (
        "a label for no trace",
        &[
            ("a.csv", "time,x\n0,1\n1,2\n"),
            ("b.csv", "time,x\n0,3\n1,2\n"),
            ("labels.csv", "trace,label\na,p\nc,q\n"),
        ],
        &["labels.csv", "line 3", "no trace `c`"],
    ),
    (
        "labels without a column",
        &[
            ("a.csv", "time,x\n0,1\n1,2\n"),
            ("b.csv", "time,x\n0,3\n1,2\n"),
            ("labels.csv", "name,label\na,p\n"),
        ],
        &["labels.csv", "no `trace` column", "trace,label"],
    ),
    (
        "an empty label",
        &[
            ("a.csv", "time,x\n0,1\n1,2\n"),
            ("b.csv", "time,x\n0,3\n1,2\n"),
            ("labels.csv", "trace,label\na,\nb,q\n"),
        ],
        &["labels.csv, line 2", "is empty"],
    ),
    (
        "two labels in the file",
        &[
            ("a.csv", "time,x\n0,1\n1,2\n"),
            ("b.csv", "time,x\n0,3\n1,2\n"),
            ("labels.csv", "trace,label\na,p\nb,q\na,q\n"),
        ],
        &["line 4", "`p` and `q`"],
    ),
    (
        "labels for some",
        &[
            ("a.csv", "time,x\n0,1\n1,2\n"),
            ("b.csv", "time,x\n0,3\n1,2\n"),
            ("labels.csv", "trace,label\na,p\n"),
        ],
        &["`b` has no label"],
    ),
    (
        "no CSV in the folder",
        &[("notes.txt", "hello"), ("more.txt", "hello")],
        &["no CSV file"],
    ),
    (
        "broken quotes run to the end",
        &[("d.csv", "trace,time,x\na,0,\"1\na,1,2\n")],
        &["line 2", "column `x`"],
    ),
];

#[test]
fn crooked_inputs_are_refused_with_place_and_remedy() {
    for (name, contents, parts) in CROOKED {
        let (_keep, folder) = files(contents);
        let path = match contents {
            [(file, _)] if file.starts_with('d') => folder.join(file),
            _ => folder,
        };
        let error = match load(&path, &LoadOptions::default()) {
            Err(error) => error.to_string(),
            Ok(loaded) => panic!("{name}: read as {:?}", loaded.traces),
        };
        for part in *parts {
            assert!(error.contains(part), "{name}: `{part}` is not in: {error}");
        }
    }
}

#[test]
fn bytes_and_paths_that_cannot_be_read_are_refused() {
    let (_keep, folder) = files(&[]);
    let path = folder.join("latin.csv");
    fs::write(&path, b"trace,time,x\na,0,1\na,1,\xe4\n").unwrap();
    let error = load(&path, &LoadOptions::default())
        .unwrap_err()
        .to_string();
    assert!(
        error.contains("line 3") && error.contains("UTF-8"),
        "{error}"
    );
    let error = load(Path::new("no/such/place"), &LoadOptions::default()).unwrap_err();
    assert!(error.to_string().contains("no/such/place"), "{error}");
    let unknown = LoadOptions {
        channels: Some(vec!["y".to_owned()]),
        ..LoadOptions::default()
    };
    let (_keep, folder) = files(&[("data.csv", LONG)]);
    let error = load(&folder, &unknown).unwrap_err().to_string();
    assert!(
        error.contains("no channel or flag `y`") && error.contains("x, e"),
        "{error}"
    );
}

#[test]
fn constant_channels_are_set_aside_and_said() {
    let loaded = load_text("trace,time,x,k\na,0,1,7\na,1,2,7\nb,0,3,7\nb,1,3,7\n").unwrap();
    assert_eq!(loaded.traces.channels().len(), 1);
    assert!(
        loaded.findings[0]
            .to_string()
            .contains("k has one value everywhere")
    );
}

/// Derived signals against values worked out by hand.
#[test]
fn derived_signals_follow_their_definitions() {
    let text = "trace,time,x [mm],y [mm],z [bar],e\n\
        a,0,1,4,1,0\na,0.5,3,4,2,1\na,1,2,1,1,1\na,1.5,2,0,5,0\n\
        b,0,5,5,1,1\nb,0.5,5,6,1,0\n";
    let unknown = f64::NAN;
    let rows: &[(&str, Kind, [f64; 4], &str)] = &[
        ("rate(x)", Kind::Numeric, [unknown, 4.0, -2.0, 0.0], "mm/s"),
        ("abs(x - y)", Kind::Numeric, [3.0, 1.0, 1.0, 2.0], "mm"),
        (
            "smooth(x, 1 s)",
            Kind::Numeric,
            [unknown, 2.0, 2.5, 2.0],
            "mm",
        ),
        (
            "spread(x, 1 s)",
            Kind::Numeric,
            [unknown, unknown, 2.0, 1.0],
            "mm",
        ),
        (
            "spread(x, 1 step)",
            Kind::Numeric,
            [unknown, 2.0, 1.0, 0.0],
            "mm",
        ),
        ("since_start(z)", Kind::Numeric, [0.0, 1.0, 0.0, 4.0], "bar"),
        ("to_final(z)", Kind::Numeric, [-4.0, -3.0, -4.0, 0.0], "bar"),
        ("rises(e)", Kind::Flag, [unknown, 1.0, 0.0, 0.0], ""),
        ("falls(e)", Kind::Flag, [unknown, 0.0, 0.0, 1.0], ""),
        (
            "spread(rate(x), 0.5 s)",
            Kind::Numeric,
            [unknown, unknown, 6.0, 2.0],
            "mm/s",
        ),
    ];
    let mut loaded = load_text(text).unwrap();
    for (name, kind, expected, unit) in rows {
        let signal = parse_signal(name, *kind).unwrap();
        let id = loaded.traces.derive(&signal).unwrap();
        let found = loaded.traces.samples(id, TraceId(0));
        let same = found
            .iter()
            .zip(expected)
            .all(|(a, b)| a.total_cmp(b).is_eq() || (a - b).abs() < 1e-12);
        assert!(same, "{name}: {found:?}");
        assert_eq!(
            loaded.traces.channel(id).unit.as_deref().unwrap_or(""),
            *unit,
            "{name}"
        );
    }
    for (name, kind, part) in [
        ("x - z", Kind::Numeric, "the units differ"),
        (
            "rate(speed)",
            Kind::Numeric,
            "no channel `speed`; it has `x`, `y`, `z`",
        ),
        ("e - x", Kind::Numeric, "`e` is a flag in this data"),
        ("rises(x)", Kind::Flag, "`x` is a channel in this data"),
    ] {
        let error = loaded
            .traces
            .derive(&parse_signal(name, kind).unwrap())
            .unwrap_err();
        assert!(error.to_string().contains(part), "{name}: {error}");
    }
}
