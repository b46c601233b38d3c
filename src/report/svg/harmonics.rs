//! Harmonics at the test level.

use super::axis::{self, Axis};
use super::canvas::{Anchor, Canvas, Text};
use super::distortion::words_of;
use super::plot::{Entry, Plot, heading, legend};
use super::style;
use super::{HEIGHT, WIDTH};
use crate::report::phrase::{percent, short};
use crate::study::result::{GainFigures, RenderStudy};

/// Lowest end of the level axis: nothing below can be heard beside the fundamental. Chosen.
const LOWEST_DB: f64 = -140.0;

/// H2 to H10 of each gain setting at the test level, as bars from the lower end of the level axis.
pub fn harmonics_svg(study: &RenderStudy) -> String {
    let title = format!("Harmonics at the test level: {}", study.design);
    let mut canvas = Canvas::new(WIDTH, HEIGHT, &title, &description(study));
    let all = study
        .gain_settings
        .iter()
        .flat_map(levels)
        .flatten()
        .chain([0.0, -60.0]);
    let (low, high) = axis::ends(all).unwrap_or((-60.0, 0.0));
    let low = ((low - 5.0) / 20.0).floor().max(LOWEST_DB / 20.0) * 20.0;
    let conditions = format!(
        "{} tone, {} peak at the jack, into {}; no bar: below {} dB",
        short(study.tone_hz, "Hz"),
        short(study.test_level_v_peak, "V"),
        short(study.load_ohms, "Ω"),
        axis::plain(low)
    );
    heading(&mut canvas, &title, &conditions);
    let y = Axis::linear("level, dB re the fundamental", [low, high]);
    let x = Axis {
        low: 1.5,
        high: 10.5,
        ..Axis::linear("harmonic", [2.0, 10.0])
    }
    .written(|_| String::new());
    let area = [84.0, 78.0, 596.0, 416.0];
    let plot = Plot::draw(&mut canvas, area, x, y);
    for n in 2..=10 {
        if let Some((at, bottom)) = plot.place((f64::from(n), y.low)) {
            let text = Text::new(12.5, Anchor::Middle);
            canvas.text((at, bottom + 18.0), &format!("H{n}"), &text);
        }
    }
    let count = study.gain_settings.len().max(1) as f64;
    let bar = (0.74 / count).min(0.2);
    let mut entries = Vec::new();
    for (k, gain) in study.gain_settings.iter().enumerate() {
        let stroke = style::series(k);
        for (i, level) in levels(gain).iter().enumerate() {
            let center = (i + 2) as f64 + (k as f64 - 0.5 * (count - 1.0)) * bar;
            let Some(db) = level.filter(|&db| db > y.low) else {
                continue;
            };
            let corner = plot.place((center - 0.43 * bar, db));
            let foot = plot.place((center + 0.43 * bar, y.low));
            if let (Some((left, top)), Some((right, bottom))) = (corner, foot) {
                canvas.rectangle([left, top, right - left, bottom - top], stroke.color, None);
            }
        }
        let line = super::style::Stroke::solid(stroke.color, 10.0);
        entries.push(Entry::line(line, words(gain)));
    }
    legend(&mut canvas, (702.0, 94.0), &entries);
    canvas.finish()
}

/// H2 to H10; empty where there are none.
fn levels(gain: &GainFigures) -> Vec<Option<f64>> {
    match &gain.tones[0].test.harmonics {
        Ok(h) => h.harmonics_dbc.to_vec(),
        Err(_) => Vec::new(),
    }
}

fn words(gain: &GainFigures) -> String {
    match &gain.tones[0].test.harmonics {
        Ok(h) => format!("{}: {}", words_of(gain), percent(h.thd_percent)),
        Err(missing) => format!("{}: {}", words_of(gain), missing.word().replace('-', " ")),
    }
}

fn description(study: &RenderStudy) -> String {
    let settings: Vec<String> = study
        .gain_settings
        .iter()
        .map(|g| {
            let harmonics: Vec<String> = levels(g)
                .iter()
                .enumerate()
                .filter_map(|(i, db)| Some(format!("H{} {:.1}", i + 2, (*db)?)))
                .collect();
            format!("{} THD; {}", words(g), harmonics.join(", "))
        })
        .collect();
    format!("Decibels re the fundamental. {}.", settings.join(". "))
}
