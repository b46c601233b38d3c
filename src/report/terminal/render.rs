//! What a builder reads first after a render.

use super::page::Page;
use crate::measure::harmonics::HarmonicReport;
use crate::report::phrase::{self, percent, short};
use crate::report::safety;
use crate::study::result::{GainFigures, RenderStudy};
use crate::trial::figures::{ClippingOnset, Figure};

/// The files of a render.
#[derive(Clone, Copy, Debug)]
pub struct WrittenSet<'a> {
    pub directory: &'a str,
    /// Names within it.
    pub files: &'a [String],
}

/// Warnings, one line of figures for each gain setting, the files.
pub fn render_text(study: &RenderStudy, set: Option<&WrittenSet>, page: &Page) -> String {
    let mut out = page.alerts(&study.ratings, &study.warnings);
    out += &page.paragraph(&format!("{}: {}", study.design, study.description), 0);
    let di = &study.di;
    out += &page.paragraph(
        &format!(
            "Played {}: {:.2} s, {} at the jack at its peak, {} RMS; digital full scale is {}.",
            di.name,
            di.frames as f64 / f64::from(di.rate_hz.max(1)),
            short(di.peak_v, "V"),
            short(di.rms_v, "V"),
            short(study.full_scale_v_peak, "V"),
        ),
        0,
    );
    out += &page.paragraph(
        &format!(
            "Figures: {} at {} peak, into {}, bias settled. Harmonics re the fundamental; clean watts are those at clipping \
             onset; inputs are peak at the jack.",
            short(study.tone_hz, "Hz"),
            short(study.test_level_v_peak, "V"),
            short(study.load_ohms, "Ω"),
        ),
        0,
    );
    out.push('\n');
    out += &page.table(
        ">>>>>~><>",
        &[
            "gain",
            "clean",
            "at 5 %\nTHD",
            "at 10 %\nTHD",
            "clipping\nonset at",
            "where and how",
            "THD",
            "strongest\nharmonics",
            "worst\nalias",
        ],
        study.gain_settings.iter().map(|g| row(study, g)).collect(),
    );
    out.push('\n');
    out += &page.paragraph(
        &format!(
            "Sound: into the {}, all files scaled by {} (their full scale is {}); listening copies through {}.",
            study.render_load,
            phrase::decibels(study.scale_db),
            short(study.wav_full_scale_v_peak, "V"),
            study.listening,
        ),
        0,
    );
    if let Some(set) = set {
        let files = set.files.join(", ");
        out += &page.paragraph(&format!("Written to {}: {files}", set.directory), 2);
    }
    out.push('\n');
    out += &page.paragraph(safety::CAUTION, 0);
    out
}

fn row(study: &RenderStudy, g: &GainFigures) -> Vec<String> {
    let tone = &g.tones[0];
    let watts = |w: &f64| short(*w, "W");
    let onset = tone.onset.as_ref().map_err(|&missing| missing);
    let harmonics = tone.test.harmonics.as_ref().map_err(|&missing| missing);
    vec![
        phrase::setting(g.setting),
        cell(&tone.power.at_onset_w, watts),
        cell(&tone.power.at_5_percent_w, watts),
        cell(&tone.power.at_10_percent_w, watts),
        cell(&onset, |o| short(o.input_v_peak, "V")),
        cell(&onset, |o| cause(study, o)),
        cell(&harmonics, |h| percent(h.thd_percent)),
        cell(&harmonics, |h| strongest(h)),
        cell(&g.alias.worst_dbc, |db| phrase::decibels(*db)),
    ]
}

/// The figure, or why there is none, on short lines.
fn cell<T>(figure: &Figure<T>, write: impl FnOnce(&T) -> String) -> String {
    match figure {
        Ok(value) => write(value),
        Err(missing) => missing.word().replace('-', "\n"),
    }
}

fn cause(study: &RenderStudy, onset: &ClippingOnset) -> String {
    let stage = study.point.stages.get(onset.stage);
    let stage = stage.map_or("?", |s| s.name.as_str());
    format!("{stage}: {}", phrase::mechanism(onset.mechanism))
}

/// The two strongest harmonics.
fn strongest(harmonics: &HarmonicReport) -> String {
    let mut present: Vec<(usize, f64)> = (2..=10)
        .filter_map(|n| Some((n, harmonics.dbc(n)?)))
        .collect();
    present.sort_by(|a, b| b.1.total_cmp(&a.1));
    let words: Vec<_> = present
        .iter()
        .take(2)
        .map(|(n, db)| format!("H{n} {db:.0} dB"))
        .collect();
    if words.is_empty() {
        "none".into()
    } else {
        words.join("\n")
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    #[test]
    fn warnings_come_first_and_files_after_the_figures() {
        let files = ["gain-2.wav".to_owned(), "report.json".to_owned()];
        let set = WrittenSet {
            directory: "out/corner-room",
            files: &files,
        };
        let out = render_text(&sample::render(), Some(&set), &Page::default());
        assert!(out.starts_with("!! RATING EXCEEDED"), "{out}");
        let order = [
            "di-level",
            "Corner Room",
            "where and how",
            "report.json",
            "Caution",
        ];
        let found: Vec<_> = order.iter().map(|w| out.find(w).expect(w)).collect();
        assert!(found.is_sorted(), "{out}");
        assert!(out.lines().all(|l| l.chars().count() <= 100), "{out}");
        assert!(out.contains("power: grid conduction"));
    }

    #[test]
    fn every_gain_setting_has_its_own_figures() {
        let study = sample::render();
        let out = render_text(&study, None, &Page::default());
        for g in &study.gain_settings {
            let onset = g.tones[0].onset.as_ref().unwrap().input_v_peak;
            assert!(out.contains(&short(onset, "V")), "{out}");
        }
    }

    #[test]
    fn the_two_strongest_harmonics_are_named() {
        let mut level = sample::level(0.2, 1.0);
        let h = level.harmonics.as_mut().unwrap();
        h.harmonics_dbc = [
            -60.0, -30.0, -70.0, -90.0, -45.0, -99.0, -99.0, -99.0, -99.0,
        ]
        .map(Some);
        assert_eq!(strongest(h), "H3 -30 dB\nH6 -45 dB");
        h.harmonics_dbc = [None; 9];
        assert_eq!(strongest(h), "none");
    }

    #[test]
    fn missing_figures_say_why() {
        let out = render_text(&sample::render_without_figures(), None, &Page::default());
        assert!(out.contains("settled"), "{out}");
        assert!(!out.contains("NaN"));
    }
}
