//! Laws: what a report says of a shipped design is what was solved, whole and readable.

use forehear::design::{self, Connection};
use forehear::report::json::bias_document;
use forehear::report::terminal::{Page, bias_text};
use forehear::stage::amplifier::Amplifier;
use forehear::stage::wiring::LoadKind;
use forehear::stage::{iron, operating_point, ratings};
use forehear::study::result::BiasStudy;
use forehear::tube::{Catalog, Device};
use serde_json::Value;

/// The JSON reader of these tests may be off by a unit in the last place.
const READING: f64 = 2.0 * f64::EPSILON;

fn same(read: Option<f64>, solved: Option<f64>) -> bool {
    match (read, solved) {
        (Some(a), Some(b)) => (a - b).abs() <= READING * b.abs(),
        (a, b) => a == b,
    }
}

fn studies() -> Vec<BiasStudy> {
    let catalog = Catalog::shipped();
    let study = |&(name, text): &(&str, &str)| {
        let design = design::read(text, &[])
            .unwrap_or_else(|f| panic!("{name}: {f:?}"))
            .design;
        let devices: Vec<Device> = design
            .stages
            .iter()
            .map(|s| {
                let tube = catalog
                    .find(&s.tube)
                    .expect("shipped designs use shipped tubes");
                Device::new(&tube, s.connection == Some(Connection::Triode), s.parallel)
            })
            .collect();
        let iron = iron::from_label(&design.transformer).expect("a label that can be");
        let amp = Amplifier::solve(&design, &devices, &iron, None, LoadKind::Rated).expect(name);
        let point = operating_point::operating_point(&amp);
        BiasStudy {
            design: design.name.clone(),
            description: design.description.clone(),
            gain: None,
            ratings: ratings::at_idle(&amp, &point),
            point,
            warnings: vec![],
        }
    };
    design::shipped().iter().map(study).collect()
}

#[test]
fn the_document_holds_every_solved_figure_and_none_is_lost() {
    for study in studies() {
        let text = bias_document(&study);
        assert!(!text.contains("not-finite"), "{text}");
        let document: Value = serde_json::from_str(&text).expect("JSON");
        let p = &study.point;
        for (stage, entry) in p
            .stages
            .iter()
            .zip(document["operating_point"].as_array().unwrap())
        {
            assert!(same(entry["plate_a"].as_f64(), Some(stage.plate_amperes)));
            assert!(same(entry["screen_v"].as_f64(), stage.screen_volts));
            assert_eq!(
                entry["screen_v"].is_null(),
                entry["screen_v_reason"].is_string()
            );
        }
        for (key, count) in [
            ("operating_point", p.stages.len()),
            ("rails", p.rails.len()),
            ("resistors", p.resistors.len()),
            ("capacitors", p.capacitors.len()),
            ("ratings", study.ratings.len()),
        ] {
            assert_eq!(document[key].as_array().map(Vec::len), Some(count), "{key}");
        }
    }
}

#[test]
fn the_page_names_everything_within_its_width() {
    for study in studies() {
        for width in [80, 100] {
            let page = Page {
                width,
                ..Page::default()
            };
            let text = bias_text(&study, &page);
            let longest = text.lines().max_by_key(|l| l.chars().count()).unwrap();
            assert!(longest.chars().count() <= width, "{longest}");
            if width < 100 {
                continue;
            }
            let p = &study.point;
            let parts = p
                .resistors
                .iter()
                .map(|r| &r.name)
                .chain(p.capacitors.iter().map(|c| &c.name));
            for name in parts.chain(p.stages.iter().map(|s| &s.name)) {
                assert!(text.contains(name.as_str()), "{name}\n{text}");
            }
        }
    }
}
