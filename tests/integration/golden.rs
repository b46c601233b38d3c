//! Pictures of our own, recorded: what the program draws today is what it drew when the picture was looked at.
//!
//! `FOREHEAR_RECORD=1 cargo test golden` records them anew; look at the pictures before committing them.

use std::path::PathBuf;

use forehear::report::svg::plate_svg;
use forehear::stage::resolve;
use forehear::study::curve;
use forehear::study::result::CurveStudy;
use forehear::tube::Catalog;
use forehear::{design, study::StudyFault};

/// Numbers in a picture are coordinates in pixels, written to a hundredth. Two steps of that are left for mathematical
/// libraries that round otherwise; nobody sees them.
const NUMBER_TOLERANCE: f64 = 0.02;

/// The curves of the output stage of the default design.
fn output_stage() -> Result<CurveStudy, StudyFault> {
    let (_, text) = design::shipped()[0];
    let reading = design::read(text, &[]).expect("shipped designs are valid");
    let catalog = Catalog::shipped();
    let prepared = resolve::prepare(&reading.design, &reading.places, &catalog, &|_| None)
        .expect("shipped designs resolve");
    curve::study(&prepared, prepared.design.stages.len() - 1)
}

/// A picture cut into what is a number and what is not.
#[derive(Debug, PartialEq)]
enum Piece<'a> {
    Number(f64),
    Words(&'a str),
}

fn pieces(text: &str) -> Vec<Piece<'_>> {
    let is_number = |c: char| c.is_ascii_digit() || c == '.' || c == '-';
    let mut pieces = Vec::new();
    let mut rest = text;
    while let Some(first) = rest.chars().next() {
        let kind = is_number(first);
        let end = rest.find(|c| is_number(c) != kind).unwrap_or(rest.len());
        let (piece, after) = rest.split_at(end);
        pieces.push(match piece.parse() {
            Ok(number) if kind => Piece::Number(number),
            _ => Piece::Words(piece),
        });
        rest = after;
    }
    pieces
}

/// The first difference between two pictures, or none.
fn difference(recorded: &str, drawn: &str) -> Option<String> {
    let (recorded, drawn) = (pieces(recorded), pieces(drawn));
    for (k, (a, b)) in recorded.iter().zip(&drawn).enumerate() {
        let alike = match (a, b) {
            (Piece::Number(a), Piece::Number(b)) => (a - b).abs() <= NUMBER_TOLERANCE,
            (a, b) => a == b,
        };
        if !alike {
            return Some(format!("piece {k}: recorded {a:?}, drawn {b:?}"));
        }
    }
    (recorded.len() != drawn.len())
        .then(|| format!("recorded {} pieces, drawn {}", recorded.len(), drawn.len()))
}

fn hold_against_recorded(name: &str, drawn: &str) {
    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR"))
        .join("tests/golden")
        .join(name);
    if std::env::var_os("FOREHEAR_RECORD").is_some_and(|v| v == "1") {
        std::fs::write(&path, drawn).expect("the folder of recorded pictures is writable");
        return;
    }
    let recorded = std::fs::read_to_string(&path)
        .unwrap_or_else(|e| panic!("{name}: {e}; FOREHEAR_RECORD=1 records it"));
    if let Some(difference) = difference(&recorded, drawn) {
        panic!("{name}: {difference}; if it is meant, FOREHEAR_RECORD=1 records it anew");
    }
}

#[test]
fn golden_plate_diagram_of_the_default_design_is_drawn_as_recorded() {
    let study = output_stage().expect("the default design has a rest");
    hold_against_recorded("corner-room-power-plate-curves.svg", &plate_svg(&study));
}

#[test]
fn golden_comparison_sees_a_moved_point_a_word_and_a_missing_end() {
    let picture = r#"<path d="M1.25,-3 L4,5.5"/><text>43 mA</text>"#;
    assert_eq!(difference(picture, picture), None);
    assert_eq!(difference(picture, &picture.replace("1.25", "1.26")), None);
    for (from, to) in [
        ("1.25", "1.28"),
        ("mA", "mV"),
        ("43 ", ""),
        ("-3", "3"),
        ("</text>", ""),
    ] {
        assert!(
            difference(picture, &picture.replace(from, to)).is_some(),
            "{from} -> {to}"
        );
    }
}
