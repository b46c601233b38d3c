//! Plate curves with load lines.

use super::axis::{self, Axis};
use super::canvas::{Anchor, Canvas, Text};
use super::plot::{Entry, Plot, heading, legend};
use super::style::{self, Shape, Stroke};
use super::{HEIGHT, WIDTH};
use crate::report::phrase::short;
use crate::study::result::{CurveStudy, PlateDiagram};

const CURVE: Stroke = Stroke::solid("#757a86", 1.5);
const DIRECT: Stroke = Stroke::dashed("#1d317c", 2.2, "9 4");
const ALTERNATING: Stroke = Stroke::solid("#3a9788", 2.6);
const DISSIPATION: Stroke = Stroke::dashed(style::ALARM, 2.0, "3 3");
const PLATE_LIMIT: Stroke = Stroke::dashed(style::ALARM, 2.0, "12 4 3 4");

/// Plate curves, both load lines, the operating point, and the tube's limits of plate watts and volts.
pub fn plate_svg(study: &CurveStudy) -> String {
    let d = &study.diagram;
    let title = format!(
        "Plate diagram: {}, {} ({})",
        study.design, study.stage, study.tube
    );
    let mut canvas = Canvas::new(WIDTH, HEIGHT, &title, &description(study));
    let screen = d
        .screen_volts
        .map_or(String::new(), |v| format!(", screen at {}", short(v, "V")));
    let conditions = format!("volts to the cathode, all sections together{screen}");
    heading(&mut canvas, &title, &conditions);
    let (x, y) = axes(d);
    let plot = Plot::draw(&mut canvas, [84.0, 78.0, 562.0, 416.0], x, y);
    let mut taken = Vec::new();
    for (grid, points) in &d.curves {
        plot.line(&mut canvas, points.iter().copied(), &CURVE);
        label(&mut canvas, &plot, *grid, points, &mut taken);
    }
    let mut entries = vec![
        Entry::line(CURVE, "grid volts as written"),
        Entry::line(ALTERNATING, "load line, 1 kHz"),
        Entry::line(DIRECT, "load line, DC"),
    ];
    if let Some(watts) = d.dissipation_w {
        let hyperbola = (1..=400)
            .map(|i| x.high * f64::from(i) / 400.0)
            .map(|v| (v, watts / v));
        plot.line(&mut canvas, hyperbola, &DISSIPATION);
        let beyond = if watts / x.high > y.high {
            ", above"
        } else {
            ""
        };
        entries.push(Entry::line(
            DISSIPATION,
            format!("limit {}{beyond}", short(watts, "W")),
        ));
    }
    if let Some(volts) = d.plate_volts_limit {
        plot.line(&mut canvas, [(volts, y.low), (volts, y.high)], &PLATE_LIMIT);
        entries.push(Entry::line(
            PLATE_LIMIT,
            format!("limit {} at rest", short(volts, "V")),
        ));
    }
    plot.line(&mut canvas, d.direct_line.iter().copied(), &DIRECT);
    plot.line(
        &mut canvas,
        d.alternating_line.iter().copied(),
        &ALTERNATING,
    );
    plot.mark(&mut canvas, d.operating, Shape::Circle, style::INK);
    entries.push(Entry::mark(Shape::Circle, style::INK, "operating point"));
    let (volts, amperes) = d.operating;
    legend(&mut canvas, (706.0, 94.0), &entries);
    let text = Text::new(13.0, Anchor::Start);
    let below = 94.0 + 24.0 * entries.len() as f64;
    canvas.text((748.0, below), &short(volts, "V"), &text);
    canvas.text((748.0, below + 19.0), &short(amperes, "A"), &text);
    canvas.finish()
}

/// Grid volts at the end of a curve: right of it, or above where it leaves the plot; not over another label.
fn label(
    canvas: &mut Canvas,
    plot: &Plot,
    grid: f64,
    points: &[(f64, f64)],
    taken: &mut Vec<(f64, f64)>,
) {
    let leaves = points.iter().position(|p| p.1 > plot.y.high);
    let (at, shift, anchor) = match leaves {
        Some(0) | None => (points.last().copied(), (5.0, 4.0), Anchor::Start),
        Some(k) => {
            let (a, b) = (points[k - 1], points[k]);
            let share = (plot.y.high - a.1) / (b.1 - a.1);
            let top = (a.0 + share * (b.0 - a.0), plot.y.high);
            (Some(top), (0.0, -6.0), Anchor::Middle)
        }
    };
    let Some((px, py)) = at.and_then(|p| plot.place_inside(p)) else {
        return;
    };
    let spot = (px + shift.0, py + shift.1);
    let free = taken
        .iter()
        .all(|t: &(f64, f64)| (t.0 - spot.0).abs() > 34.0 || (t.1 - spot.1).abs() > 12.0);
    if free {
        let text = Text {
            color: style::FAINT_INK,
            ..Text::new(11.5, anchor)
        };
        canvas.text(spot, &format!("{} V", axis::plain(grid)), &text);
        taken.push(spot);
    }
}

fn axes(d: &PlateDiagram) -> (Axis, Axis) {
    let curves = || d.curves.iter().flat_map(|(_, points)| points);
    let right = axis::ends(curves().map(|p| p.0)).map_or(1.0, |e| e.1);
    let curves_top = axis::ends(curves().map(|p| p.1)).map_or(0.0, |e| e.1);
    // The load line decides: far above it the curves say nothing about this stage.
    let line_top = axis::ends(d.alternating_line.iter().map(|p| p.1)).map_or(0.0, |e| e.1);
    let wanted = (1.05 * line_top).max(1.6 * d.operating.1);
    let top = wanted.min(curves_top.max(1.1 * d.operating.1));
    let limit = d
        .plate_volts_limit
        .filter(|v| *v < 1.6 * right)
        .unwrap_or(0.0);
    let x = Axis::linear("plate to cathode, V", [0.0, right, 1.02 * limit]);
    let x = Axis {
        high: right.max(1.02 * limit),
        ..x
    };
    let y = Axis::linear("plate current, mA", [0.0, top]).written(axis::milliamperes);
    (x, Axis { high: top, ..y })
}

fn description(study: &CurveStudy) -> String {
    let d = &study.diagram;
    let grids: Vec<String> = d.curves.iter().map(|(g, _)| axis::plain(*g)).collect();
    let mut text = format!(
        "Plate current over plate volts at grid volts {}. Operating point {}, {}.",
        grids.join(", "),
        short(d.operating.0, "V"),
        short(d.operating.1, "A")
    );
    if let Some(watts) = d.dissipation_w {
        text += &format!(" Dissipation limit {}.", short(watts, "W"));
    }
    if let Some(volts) = d.plate_volts_limit {
        text += &format!(" Plate volts limit {}.", short(volts, "V"));
    }
    text
}
