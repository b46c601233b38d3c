//! THD against input level.

use super::axis::{self, Axis};
use super::canvas::Canvas;
use super::plot::{Entry, Plot, heading, legend};
use super::style::{self, Shape, Stroke};
use super::{HEIGHT, WIDTH};
use crate::report::phrase::{self, short};
use crate::study::result::{GainFigures, RenderStudy};
use crate::trial::figures::ToneFigures;

/// Distortions that have a line of their own.
const RULES: [f64; 4] = [1.0, 3.0, 5.0, 10.0];
/// Below, THD is not drawn: far under what any amplifier of this kind makes audible. Chosen.
const LEAST_PERCENT: f64 = 0.01;

/// One line a gain setting at the headline tone, both axes in decades; clipping onset marked on it.
pub fn distortion_svg(study: &RenderStudy) -> String {
    let title = format!("THD against input level: {}", study.design);
    let mut canvas = Canvas::new(WIDTH, HEIGHT, &title, &description(study));
    let conditions = format!(
        "{} tone into {}, harmonics 2 to 10 re the fundamental, bias settled at each level",
        short(study.tone_hz, "Hz"),
        short(study.load_ohms, "Ω")
    );
    heading(&mut canvas, &title, &conditions);
    let (x, y) = axes(study);
    let plot = Plot::draw(&mut canvas, [84.0, 92.0, 584.0, 402.0], x, y);
    for percent in RULES {
        let words = format!("{} %", axis::plain(percent));
        plot.across(
            &mut canvas,
            percent,
            &Stroke::dashed(style::FAINT_INK, 1.2, "2 3"),
            &words,
        );
    }
    let test = Stroke::dashed(style::FAINT_INK, 1.2, "7 4");
    let words = format!(
        "test level {}",
        crate::report::phrase::short(study.test_level_v_peak, "V")
    );
    plot.upright(&mut canvas, study.test_level_v_peak, &test, &words);

    let mut entries = Vec::new();
    let (mut unsettled, mut clips) = (false, false);
    for (k, gain) in study.gain_settings.iter().enumerate() {
        let stroke = style::series(k);
        let tone = &gain.tones[0];
        let points = points(tone);
        plot.line(&mut canvas, points.iter().map(|p| (p.0, p.1)), &stroke);
        for point in points.iter().filter(|p| !p.2 && p.1.is_finite()) {
            unsettled = true;
            plot.mark(&mut canvas, (point.0, point.1), Shape::Ring, stroke.color);
        }
        if let Some(onset) = onset(tone, &points) {
            clips = true;
            plot.mark(&mut canvas, onset, Shape::Diamond, stroke.color);
        }
        let mut words = words_of(gain);
        if points.iter().all(|p| !p.1.is_finite()) {
            words += &match &tone.test.harmonics {
                Ok(_) => ": no levels".to_owned(),
                Err(missing) => format!(": {}", missing.word().replace('-', " ")),
            };
        }
        entries.push(Entry::line(stroke, words));
    }
    if clips {
        entries.push(Entry::mark(Shape::Diamond, style::INK, "clipping onset"));
    }
    if unsettled {
        entries.push(Entry::mark(Shape::Ring, style::INK, "not settled"));
    }
    legend(&mut canvas, (722.0, 108.0), &entries);
    canvas.finish()
}

pub(super) fn words_of(gain: &GainFigures) -> String {
    match gain.setting {
        Some(_) => format!("gain {}", phrase::setting(gain.setting)),
        None => "no gain control".to_owned(),
    }
}

/// Input volts, THD in percent (no number where there is none), settled.
fn points(tone: &ToneFigures) -> Vec<(f64, f64, bool)> {
    tone.levels
        .iter()
        .map(|l| {
            let thd = l.harmonics.as_ref().map_or(f64::NAN, |h| h.thd_percent);
            (l.input_v_peak, thd, l.settled)
        })
        .collect()
}

/// Onset on the drawn line: straight between levels in decades.
fn onset(tone: &ToneFigures, points: &[(f64, f64, bool)]) -> Option<(f64, f64)> {
    let volts = tone.onset.as_ref().ok()?.input_v_peak;
    let pair = points
        .windows(2)
        .find(|p| p[0].0 <= volts && volts <= p[1].0)?;
    let share = (volts / pair[0].0).ln() / (pair[1].0 / pair[0].0).ln();
    let share = if share.is_finite() { share } else { 0.0 };
    Some((volts, pair[0].1 * (pair[1].1 / pair[0].1).powf(share)))
}

fn axes(study: &RenderStudy) -> (Axis, Axis) {
    let all = || study.gain_settings.iter().flat_map(|g| points(&g.tones[0]));
    let inputs = axis::ends(all().map(|p| p.0)).unwrap_or((0.01, 1.0));
    let thd = axis::ends(all().map(|p| p.1)).unwrap_or((0.1, 10.0));
    let low = decade_below(thd.0.max(LEAST_PERCENT)).min(0.1);
    let high = if thd.1 > 20.0 { 100.0 } else { 20.0 };
    (
        Axis::logarithmic("input at the jack, peak", inputs.0, inputs.1).written(axis::volts),
        Axis::logarithmic("THD, percent", low, f64::max(high, thd.1)),
    )
}

fn decade_below(value: f64) -> f64 {
    10f64.powf((value.log10() + 1e-9).floor())
}

fn description(study: &RenderStudy) -> String {
    let settings: Vec<String> = study
        .gain_settings
        .iter()
        .map(|g| {
            let onset = match &g.tones[0].onset {
                Ok(o) => format!("clipping onset at {}", axis::volts(o.input_v_peak)),
                Err(missing) => format!("no clipping onset ({})", missing.word().replace('-', " ")),
            };
            format!("{}: {onset}", words_of(g))
        })
        .collect();
    format!("One line for each gain setting. {}.", settings.join("; "))
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    #[test]
    fn the_onset_lies_on_the_line_through_its_neighbors() {
        let tone = sample::tone(1000.0, 2.2);
        let points = points(&tone);
        let (volts, thd) = onset(&tone, &points).unwrap();
        assert_eq!(volts, 1.0 / 2.2);
        let after = points.iter().position(|p| p.0 > volts).unwrap();
        assert!(points[after - 1].1 < thd && thd < points[after].1);
    }

    #[test]
    fn axes_hold_the_rules_whatever_was_measured() {
        for study in [sample::render(), sample::render_without_figures()] {
            let (_, y) = axes(&study);
            for percent in RULES {
                assert!((0.0..=1.0).contains(&y.share(percent).unwrap()));
            }
        }
    }
}
