//! What the shipped designs promise.

use std::sync::atomic::AtomicBool;

use forehear::design;
use forehear::stage::resolve::{self, Prepared};
use forehear::study::{self, Watch};
use forehear::tube::Catalog;

fn prepared(text: &str) -> Prepared {
    let reading = design::read(text, &[]).expect("shipped designs are valid");
    resolve::prepare(
        &reading.design,
        &reading.places,
        &Catalog::shipped(),
        &|_| None,
    )
    .expect("shipped designs resolve")
}

/// At idle, and driven with up to 1 V at the jack at the highest gain setting.
#[test]
fn every_shipped_design_keeps_its_ratings() {
    let stop = AtomicBool::new(false);
    let watch = Watch {
        progress: &|_, _| {},
        stop: &stop,
    };
    for (name, text) in design::shipped() {
        let study = study::bias::study(&prepared(text), &watch).expect("shipped designs settle");
        let exceeded: Vec<String> = study
            .ratings
            .iter()
            .filter(|r| r.exceeded)
            .map(|r| {
                format!(
                    "{} {} {:.3} of {:.3}",
                    r.stage,
                    r.kind.word(),
                    r.value,
                    r.limit
                )
            })
            .collect();
        assert!(exceeded.is_empty(), "{name}: {exceeded:?}");
        assert!(
            study.ratings.len() > 5 * study.point.stages.len(),
            "{name}: hardly a rating was checked"
        );
    }
}

#[test]
fn no_shipped_design_puts_a_6v6_behind_a_12ax7() {
    for (name, text) in design::shipped() {
        let devices = prepared(text).devices;
        for pair in devices.windows(2) {
            let (driver, driven) = (&pair[0].tube().name, &pair[1].tube().name);
            assert!(
                !(driver == "12AX7" && driven == "6V6"),
                "{name}: {driver} drives {driven}"
            );
        }
    }
}
