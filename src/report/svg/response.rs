//! Small-signal frequency response.

use super::axis::{self, Axis};
use super::canvas::Canvas;
use super::distortion::words_of;
use super::plot::{Entry, Plot, heading, legend};
use super::style::{self, Shape, Stroke};
use super::{HEIGHT, WIDTH};
use crate::report::phrase::{decibels, short};
use crate::study::result::RenderStudy;
use crate::trial::figures::{Figure, Response};

/// How far below the highest point the picture goes, in dB. Chosen.
const DEPTH_DB: f64 = 36.0;

/// One line a gain setting, from jack to loudspeaker terminals, re the gain at 1 kHz; −3 dB corners marked.
pub fn response_svg(study: &RenderStudy) -> String {
    let title = format!("Frequency response: {}", study.design);
    let mut canvas = Canvas::new(WIDTH, HEIGHT, &title, &description(study));
    let conditions = format!(
        "small signal, jack to loudspeaker terminals, into {}; 0 dB is the gain at 1 kHz",
        short(study.load_ohms, "Ω")
    );
    heading(&mut canvas, &title, &conditions);
    let points = || study.gain_settings.iter().flat_map(|g| &g.response.points);
    let (low_hz, high_hz) = axis::ends(points().map(|p| p.0)).unwrap_or((20.0, 20e3));
    let (low, high) = axis::ends(points().map(|p| p.1)).unwrap_or((-3.0, 0.0));
    let x = Axis::logarithmic("frequency, Hz", low_hz, high_hz).written(axis::hertz);
    let y = Axis::linear(
        "gain, dB re 1 kHz",
        [low.max(high - DEPTH_DB).min(-3.0), high.max(0.0) + 1.0],
    );
    let plot = Plot::draw(&mut canvas, [84.0, 78.0, 596.0, 416.0], x, y);
    let mut entries = Vec::new();
    for (k, gain) in study.gain_settings.iter().enumerate() {
        let stroke = style::series(k);
        plot.line(&mut canvas, gain.response.points.iter().copied(), &stroke);
        entries.push(Entry::line(stroke, words_of(gain)));
    }
    for (k, gain) in study.gain_settings.iter().enumerate() {
        let r = &gain.response;
        for corner in [&r.low_3db_hz, &r.high_3db_hz] {
            if let Some(point) = on_line(r, corner) {
                plot.mark(&mut canvas, point, Shape::Circle, style::series(k).color);
            }
        }
    }
    entries.push(Entry::mark(
        Shape::Circle,
        style::INK,
        "\u{2212}3 dB re the top",
    ));
    plot.line(
        &mut canvas,
        [(x.low, 0.0), (x.high, 0.0)],
        &Stroke::solid(style::FAINT_INK, 1.0),
    );
    legend(&mut canvas, (702.0, 94.0), &entries);
    canvas.finish()
}

/// A corner on the drawn line: straight between points in decades.
fn on_line(response: &Response, corner: &Figure<f64>) -> Option<(f64, f64)> {
    let hz = *corner.as_ref().ok()?;
    let pair = response
        .points
        .windows(2)
        .find(|p| p[0].0 <= hz && hz <= p[1].0)?;
    let share = (hz / pair[0].0).ln() / (pair[1].0 / pair[0].0).ln();
    let share = if share.is_finite() { share } else { 0.0 };
    Some((hz, pair[0].1 + share * (pair[1].1 - pair[0].1)))
}

fn description(study: &RenderStudy) -> String {
    let corner = |f: &Figure<f64>| match f {
        Ok(hz) => short(*hz, "Hz"),
        Err(missing) => missing.word().replace('-', " "),
    };
    let settings: Vec<String> = study
        .gain_settings
        .iter()
        .map(|g| {
            format!(
                "{}: {} at 1 kHz, \u{2212}3 dB at {} and {}",
                words_of(g),
                decibels(g.response.gain_1khz_db),
                corner(&g.response.low_3db_hz),
                corner(&g.response.high_3db_hz)
            )
        })
        .collect();
    format!("One line for each gain setting. {}.", settings.join("; "))
}
