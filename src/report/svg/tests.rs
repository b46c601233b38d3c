//! What holds for every picture.

use super::*;
use crate::report::sample;
use crate::study::result::{CurveStudy, RenderStudy};

fn pictures(study: &RenderStudy, curves: &[CurveStudy]) -> Vec<String> {
    let mut all = vec![
        transfer_svg(&study.design, &study.transfer),
        distortion_svg(study),
        harmonics_svg(study),
        response_svg(study),
    ];
    all.extend(curves.iter().map(plate_svg));
    all
}

fn odd() -> (RenderStudy, Vec<CurveStudy>) {
    let mut study = sample::render_without_figures();
    study.design = "A <room> & \"more\"".into();
    study.transfer[0].points.clear();
    study.transfer[1].points.truncate(1);
    study.gain_settings[1].response.points.clear();
    study.gain_settings[2].tones[0].levels.clear();
    let mut curve = sample::curve(0);
    curve.diagram.curves.clear();
    curve.diagram.dissipation_w = None;
    curve.diagram.plate_volts_limit = None;
    curve.diagram.alternating_line = vec![(f64::NAN, f64::INFINITY)];
    (study, vec![curve])
}

/// Every start has its end, attributes are quoted, texts hold no bare markup: enough of XML for what is drawn here.
fn assert_well_formed(svg: &str) {
    let mut open = Vec::new();
    let mut rest = svg;
    while let Some(start) = rest.find('<') {
        assert!(!rest[..start].contains('>'), "{}", &rest[..start]);
        let end = start + rest[start..].find('>').expect("a tag ends");
        let tag = &rest[start + 1..end];
        assert_eq!(tag.matches('"').count() % 2, 0, "{tag}");
        if let Some(name) = tag.strip_prefix('/') {
            assert_eq!(open.pop(), Some(name));
        } else if !tag.ends_with('/') {
            open.push(tag.split(' ').next().unwrap());
        }
        rest = &rest[end + 1..];
    }
    assert!(open.is_empty() && rest.trim().is_empty());
    for piece in svg.split('&').skip(1) {
        assert!(
            ["amp;", "lt;", "gt;", "quot;"]
                .iter()
                .any(|e| piece.starts_with(e))
        );
    }
}

#[test]
fn every_picture_is_well_formed_and_has_title_and_description() {
    let (study, curves) = odd();
    let mut empty = sample::render();
    empty.gain_settings.clear();
    empty.transfer.clear();
    let all = pictures(&sample::render(), &[sample::curve(0), sample::curve(1)])
        .into_iter()
        .chain(pictures(&study, &curves))
        .chain(pictures(&empty, &[]));
    for svg in all {
        assert_well_formed(&svg);
        assert!(svg.starts_with("<svg xmlns=") && svg.ends_with("</svg>\n"));
        assert!(svg.contains("<title>") && svg.contains("<desc>"));
        assert!(!svg.contains("NaN") && !svg.contains("inf"), "{svg}");
    }
}

#[test]
fn every_number_lies_on_the_paper() {
    for svg in pictures(&sample::render(), &[sample::curve(0), sample::curve(1)]) {
        for line in svg
            .lines()
            .filter(|l| l.starts_with("<polyline") || l.starts_with("<polygon"))
        {
            let points = line.split('"').nth(1).unwrap();
            for pair in points.split(' ') {
                let (x, y) = pair.split_once(',').unwrap();
                assert!((0.0..=WIDTH).contains(&x.parse().unwrap()), "{line}");
                assert!((0.0..=HEIGHT).contains(&y.parse().unwrap()), "{line}");
            }
        }
    }
}

#[test]
fn what_was_found_is_in_the_picture() {
    let study = sample::render();
    let svg = distortion_svg(&study);
    for words in [
        "gain 2",
        "gain 5",
        "gain 10",
        "10 %",
        "test level 200 mV",
        "clipping onset",
    ] {
        assert!(svg.contains(&format!(">{words}<")), "{words}");
    }
    let svg = harmonics_svg(&study);
    // A bar for each harmonic of each gain setting above the lower end of the axis.
    for k in 0..3 {
        let bars = svg
            .lines()
            .filter(|l| l.starts_with("<rect") && l.contains(style::series(k).color))
            .count();
        let h = study.gain_settings[k].tones[0]
            .test
            .harmonics
            .as_ref()
            .unwrap();
        let above = h
            .harmonics_dbc
            .iter()
            .flatten()
            .filter(|db| **db > -140.0)
            .count();
        assert_eq!(bars, above);
    }
    let svg = transfer_svg(&study.design, &study.transfer);
    for words in ["at rest", "grid conduction", "plate knee", "cutoff"] {
        assert!(svg.contains(&format!(">{words}<")), "{words}");
    }
    let svg = plate_svg(&sample::curve(1));
    for words in [
        "limit 12 W",
        "operating point",
        "load line, DC",
        "\u{2212}4 V",
    ] {
        assert!(svg.contains(&format!(">{words}<")), "{words}");
    }
}

#[test]
fn series_differ_in_color_or_dash() {
    for a in 0..12 {
        for b in 0..a {
            assert_ne!(style::series(a), style::series(b), "{a} {b}");
        }
    }
}
