//! A folder of designs with one flaw each, and the code and place expected.
//!
//! Each file of `tests/broken_designs` marks its faulty lines with `# <- code path`; nothing else may be found. A line
//! `# set: PATH=VALUE` is an override, whose faults are marked in the same way.

use forehear::design::{self, Design, Kind, RailFeed, keys};
use forehear::diagnostic::{Code, Diagnostic, Place};
use proptest::prelude::*;
use std::collections::BTreeSet;
use std::path::PathBuf;

const MARK: &str = "# <- ";
const SET: &str = "# set: ";

struct Broken {
    file: String,
    text: String,
    overrides: Vec<String>,
    /// Place, code and path of each fault.
    expected: BTreeSet<(String, String, String)>,
}

fn broken_designs() -> Vec<Broken> {
    let folder = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("tests/broken_designs");
    let mut designs = Vec::new();
    for entry in std::fs::read_dir(folder).expect("the folder of broken designs") {
        let path = entry.expect("an entry").path();
        let text = std::fs::read_to_string(&path).expect("a text file");
        let mut overrides = Vec::new();
        let mut expected = BTreeSet::new();
        for (index, line) in text.lines().enumerate() {
            let (statement, mark) = line.split_once(MARK).unwrap_or((line, ""));
            let mut place = format!("line {}", index + 1);
            if let Some(given) = statement.strip_prefix(SET) {
                overrides.push(given.trim().to_owned());
                place = format!("set {}", given.trim());
            }
            if !mark.is_empty() {
                let (code, path) = mark.trim().split_once(' ').unwrap_or((mark.trim(), ""));
                expected.insert((place, code.to_owned(), path.to_owned()));
            }
        }
        designs.push(Broken {
            file: path
                .file_name()
                .expect("a name")
                .to_string_lossy()
                .into_owned(),
            text,
            overrides,
            expected,
        });
    }
    designs.sort_by(|a, b| a.file.cmp(&b.file));
    designs
}

fn seen(text: &str, fault: &Diagnostic) -> (String, String, String) {
    let place = match &fault.place {
        Place::Text(span) => format!("line {}", text[..span.start].matches('\n').count() + 1),
        Place::Override(set) => format!("set {set}"),
        Place::Whole => "nowhere".to_owned(),
    };
    (place, fault.code.to_string(), fault.path.clone())
}

#[test]
fn every_broken_design_gets_the_faults_it_marks_and_no_others() {
    let designs = broken_designs();
    assert!(designs.len() >= 40, "{} broken designs", designs.len());
    let mut wrong = String::new();
    for broken in &designs {
        let faults = match design::read(&broken.text, &broken.overrides) {
            Ok(_) => Vec::new(),
            Err(faults) => faults,
        };
        let found: BTreeSet<_> = faults
            .iter()
            .map(|fault| seen(&broken.text, fault))
            .collect();
        if found != broken.expected || faults.len() != found.len() {
            wrong += &format!(
                "{}\n  expected {:?}\n  found    {found:?}\n",
                broken.file, broken.expected
            );
        }
    }
    assert!(wrong.is_empty(), "{wrong}");
}

/// Codes of a design file that the reader cannot meet, with who does.
const MET_ELSEWHERE: &[Code] = &[];

#[test]
fn every_code_of_a_design_file_is_provoked_by_a_broken_design() {
    let marked: BTreeSet<String> = broken_designs()
        .into_iter()
        .flat_map(|broken| broken.expected.into_iter().map(|(_, code, _)| code))
        .collect();
    let source = include_str!("../../src/diagnostic/code.rs");
    let own = source
        .split("// -- design file")
        .nth(1)
        .expect("the design file's codes");
    let own = own.split("// --").next().expect("an end");
    let mut checked = 0;
    for code in Code::ALL {
        if own.contains(&format!("\"{}\"", code.word())) && !MET_ELSEWHERE.contains(code) {
            assert!(marked.contains(code.word()), "no broken design for {code}");
            checked += 1;
        }
    }
    assert!(checked >= 30, "{checked} codes of a design file");
}

#[test]
fn every_fault_says_what_is_wrong_and_most_say_what_would_do() {
    let mut with_hint = 0;
    let mut all = 0;
    for broken in broken_designs() {
        for fault in design::read(&broken.text, &broken.overrides).expect_err(&broken.file) {
            assert!(
                fault.message.len() > 8,
                "{}: {}",
                broken.file,
                fault.message
            );
            all += 1;
            with_hint += usize::from(fault.hint.is_some_and(|hint| !hint.is_empty()));
        }
    }
    assert!(
        10 * with_hint > 8 * all,
        "{with_hint} hints for {all} faults"
    );
}

#[test]
fn a_misspelled_word_is_answered_with_the_nearest_valid_one() {
    for (file, word) in [
        ("unknown-key.toml", "`resistor`"),
        ("unknown-word.toml", "`series`"),
        ("unknown-rectifier.toml", "`silicon-bridge`"),
        ("unknown-rail.toml", "`main`"),
        ("unknown-feed.toml", "`main`"),
        ("unknown-gain-control.toml", "`volume`"),
        ("set-unknown-stage.toml", "`power`"),
        ("set-unknown-key.toml", "`resistor`"),
        ("unknown-key-at-the-top.toml", "`load`"),
        (
            "unknown-key-of-another-table.toml",
            "`stage.NAME.cathode.bypass`",
        ),
    ] {
        let broken = broken_designs()
            .into_iter()
            .find(|broken| broken.file == file)
            .expect(file);
        let faults = design::read(&broken.text, &broken.overrides).expect_err(file);
        let said = faults.iter().any(|fault| {
            fault
                .hint
                .as_deref()
                .is_some_and(|hint| hint.contains(word))
        });
        assert!(said, "{file}: {faults:?}");
    }
}

/// A design in which every key of the table has a place to stand.
fn roomy_design() -> &'static str {
    design::shipped()[0].1
}

/// Path of a key in the roomy design.
fn path_in_roomy_design(path: &str) -> String {
    path.replace("supply.rail.*", "supply.rail.screens")
        .replace("stage.*.input.*", "stage.second.input.volume")
        .replace("stage.*", "stage.power")
}

#[test]
fn the_reader_takes_the_example_of_every_key() {
    // Faults of a value itself, as opposed to those that lie in what stands beside it.
    const OF_THE_VALUE: [Code; 8] = [
        Code::UnknownKey,
        Code::UnknownName,
        Code::WrongType,
        Code::WrongUnit,
        Code::UnreadableValue,
        Code::OutOfRange,
        Code::UnknownWord,
        Code::InvalidOverride,
    ];
    for key in keys() {
        if matches!(key.kind, Kind::Table | Kind::Tables) {
            continue;
        }
        let set = format!("{}={}", path_in_roomy_design(key.path), key.example);
        if let Err(faults) = design::read(roomy_design(), std::slice::from_ref(&set)) {
            for fault in faults {
                assert!(!OF_THE_VALUE.contains(&fault.code), "{set}: {fault:?}");
            }
        }
    }
}

#[test]
fn the_reader_refuses_values_just_beyond_every_range() {
    let mut checked = 0;
    for key in keys() {
        let Some((low, high)) = key.range else {
            continue;
        };
        for beyond in [low - 1e-6 * low.abs() - 1e-15, high + 1e-6 * high.abs()] {
            let value = match key.kind {
                Kind::Quantities(_) => format!("[{beyond:e}]"),
                Kind::Count => format!("{}", if beyond > high { high + 1.0 } else { low - 1.0 }),
                _ => format!("{beyond:e}"),
            };
            let path = path_in_roomy_design(key.path);
            let faults =
                design::read(roomy_design(), &[format!("{path}={value}")]).expect_err(&path);
            let found = faults.iter().any(|fault| {
                // Nothing at all on a plate is refused with a reason of its own.
                (fault.code == Code::OutOfRange || fault.code == Code::NotSupported)
                    && fault.path == path
            });
            assert!(found, "{path}={value}: {faults:?}");
            checked += 1;
        }
    }
    assert!(checked > 80, "{checked} limits");
}

/// What every design that comes out keeps, whatever went in.
fn keeps_its_promises(design: &Design) {
    assert!(!design.stages.is_empty() && !design.supply.rails.is_empty());
    for (index, rail) in design.supply.rails.iter().enumerate() {
        match rail.from {
            RailFeed::Source => assert_eq!(index, 0, "{}", rail.name),
            RailFeed::Resistor { rail, .. } | RailFeed::Choke { rail, .. } => assert!(rail < index),
        }
    }
    let (last, before) = design.stages.split_last().expect("a stage");
    assert!(last.plate.resistor.is_none());
    assert!(before.iter().all(|stage| stage.plate.resistor.is_some()));
    for stage in &design.stages {
        assert!(stage.plate.rail < design.supply.rails.len());
        assert!(
            stage
                .screen
                .as_ref()
                .is_none_or(|screen| screen.rail < design.supply.rails.len())
        );
        assert!((1..=4).contains(&stage.parallel));
    }
    assert!(!design.control.settings.is_empty());
    if let Some(gain) = design.control.gain {
        assert!(gain.element < design.stages[gain.stage].input.len());
    }
}

/// Reading must not panic, and what it says must lie in the text.
fn read_safely(text: &str, overrides: &[String]) {
    match design::read(text, overrides) {
        Ok(reading) => {
            keeps_its_promises(&reading.design);
            for (path, place) in reading.places.iter() {
                assert!(lies_in(text, overrides, place), "{path}: {place:?}");
            }
        }
        Err(faults) => {
            assert!(!faults.is_empty());
            for fault in faults {
                assert!(lies_in(text, overrides, &fault.place), "{fault:?}");
            }
        }
    }
}

fn lies_in(text: &str, overrides: &[String], place: &Place) -> bool {
    match place {
        Place::Text(span) => text.get(span.clone()).is_some(),
        Place::Override(set) => overrides.contains(set),
        Place::Whole => true,
    }
}

/// A slip at one line of a file.
#[derive(Clone, Debug)]
enum Slip {
    Drop(usize),
    Double(usize),
    Swap(usize, usize),
    /// The value after `=` replaced.
    Value(usize, String),
    /// The key before `=` replaced.
    Key(usize, String),
    /// Everything behind a byte gone.
    Cut(usize),
    /// A character put in.
    Insert(usize, char),
}

fn value() -> impl Strategy<Value = String> {
    prop_oneof![
        prop::sample::select(vec![
            "0",
            "-1",
            "1e999",
            "nan",
            "-inf",
            "true",
            "[]",
            "[1, 2]",
            "{}",
            "{a = 1}",
            "\"\"",
            "\"source\"",
            "\"main\"",
            "\"power\"",
            "\"triode\"",
            "\"22n\"",
            "\"1M\"",
            "\"0\"",
            "\"bias\"",
            "\"divider\"",
            "\"series\"",
            "2000-01-01",
            "\"\"\"a\nb\"\"\"",
            "0xff",
            "9999999999999999999999",
        ])
        .prop_map(str::to_owned),
        "\"\\PC{0,12}\"",
        "\\PC{0,12}",
    ]
}

fn key_word() -> impl Strategy<Value = String> {
    let words: Vec<String> = keys().iter().map(|key| key.name().to_owned()).collect();
    prop_oneof![prop::sample::select(words), "[a-z_.]{1,12}", "\\PC{0,8}"]
}

fn slip() -> impl Strategy<Value = Slip> {
    let line = 0..200usize;
    prop_oneof![
        line.clone().prop_map(Slip::Drop),
        line.clone().prop_map(Slip::Double),
        (line.clone(), line.clone()).prop_map(|(a, b)| Slip::Swap(a, b)),
        (line.clone(), value()).prop_map(|(at, value)| Slip::Value(at, value)),
        (line.clone(), key_word()).prop_map(|(at, key)| Slip::Key(at, key)),
        (0..6000usize).prop_map(Slip::Cut),
        (0..6000usize, any::<char>()).prop_map(|(at, character)| Slip::Insert(at, character)),
    ]
}

/// A place between two characters of the text.
fn boundary(text: &str, at: usize) -> usize {
    let at = at % (text.len() + 1);
    (0..=at)
        .rev()
        .find(|index| text.is_char_boundary(*index))
        .unwrap_or(0)
}

fn slipped(text: &str, slips: &[Slip]) -> String {
    let mut text = text.to_owned();
    for slip in slips {
        let mut lines: Vec<String> = text.lines().map(str::to_owned).collect();
        let count = lines.len().max(1);
        match slip {
            Slip::Drop(at) if !lines.is_empty() => drop(lines.remove(at % count)),
            Slip::Double(at) if !lines.is_empty() => {
                lines.insert(at % count, lines[at % count].clone())
            }
            Slip::Swap(a, b) if !lines.is_empty() => lines.swap(a % count, b % count),
            Slip::Value(at, value) if !lines.is_empty() => {
                if let Some((key, _)) = lines[at % count].split_once('=') {
                    lines[at % count] = format!("{key}= {value}");
                }
            }
            Slip::Key(at, key) if !lines.is_empty() => {
                if let Some((_, value)) = lines[at % count].split_once('=') {
                    lines[at % count] = format!("{key} ={value}");
                }
            }
            Slip::Cut(at) => {
                text.truncate(boundary(&text, *at));
                continue;
            }
            Slip::Insert(at, character) => {
                text.insert(boundary(&text, *at), *character);
                continue;
            }
            _ => {}
        }
        text = lines.join("\n");
    }
    text
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, cases: 400, ..Default::default() })]

    #[test]
    fn any_text_is_read_without_panic(text in "(\\PC|\n){0,400}") {
        read_safely(&text, &[]);
    }

    #[test]
    fn slips_of_the_pen_are_read_without_panic(
        which in 0..design::shipped().len(),
        slips in prop::collection::vec(slip(), 1..6),
    ) {
        read_safely(&slipped(design::shipped()[which].1, &slips), &[]);
    }

    #[test]
    fn any_override_is_read_without_panic(
        sets in prop::collection::vec(
            prop_oneof![
                "\\PC{0,40}",
                (prop::sample::select(keys().to_vec()), value())
                    .prop_map(|(key, value)| format!("{}={value}", path_in_roomy_design(key.path))),
            ],
            1..4,
        ),
    ) {
        read_safely(roomy_design(), &sets);
    }
}

/// The most faults that are told keep a file of nothing but faults from taking the square of its length.
#[test]
fn a_long_file_of_nothing_but_faults_is_answered_soon() {
    let keys: String = (0..40_000).map(|n| format!("resistor{n} = 1\n")).collect();
    let stages = "[[stage]]\n[[stage.input]]\n".repeat(5_000);
    let start = std::time::Instant::now();
    let faults = design::read(&format!("{keys}{stages}"), &[]).expect_err("faults");
    assert!(faults.len() >= 100, "{}", faults.len());
    // Measured: 2.1 s unoptimized on a busy core; the limit only tells linear from quadratic.
    let seconds = start.elapsed().as_secs_f64();
    assert!(seconds < 20.0, "{seconds} s");
}
