//! Transfer curves of all stages with their limits.

use super::axis::{self, Axis};
use super::canvas::{Anchor, Canvas, Text};
use super::plot::{Entry, Plot, heading, legend_in_a_row, shortened};
use super::style::{self, Shape, Stroke};
use super::{HEIGHT, WIDTH};
use crate::report::on_curve::at;
use crate::report::phrase::short;
use crate::study::result::TransferCurve;

const CURVE: Stroke = Stroke::solid("#1d317c", 2.6);

/// Name, shape and color of each mark; all stages share them.
const MARKS: [(&str, &str, Shape, &str); 4] = [
    ("rest", "at rest", Shape::Circle, style::INK),
    (
        "grid-conduction",
        "grid conduction",
        Shape::Triangle,
        "#e4380a",
    ),
    ("plate-knee", "plate knee", Shape::Square, "#6f2a3d"),
    ("cutoff", "cutoff", Shape::Diamond, "#3a9788"),
];

/// One panel a stage: plate volts over drive, both re rest, the stage's limits marked.
pub fn transfer_svg(design: &str, curves: &[TransferCurve]) -> String {
    let columns = match curves.len() {
        0 | 1 => 1,
        2..=4 => 2,
        _ => 3,
    };
    let rows = curves.len().div_ceil(columns).max(1);
    let height = HEIGHT + 200.0 * (rows - 1) as f64;
    let title = format!("Transfer curves: {design}");
    let mut canvas = Canvas::new(WIDTH, height, &title, &description(curves));
    heading(
        &mut canvas,
        &title,
        "plate against the stage's drive (source volts before its grid), both re rest, at 1 kHz",
    );
    let (left, right, top, bottom, gap) = (84.0, 26.0, 92.0, 98.0, 84.0);
    let panel_width = (WIDTH - left - right - gap * (columns - 1) as f64) / columns as f64;
    let row_gap = 92.0;
    let panel_height = (height - top - bottom - row_gap * (rows - 1) as f64) / rows as f64;
    for (k, curve) in curves.iter().enumerate() {
        let (row, column) = (k / columns, k % columns);
        let area = [
            left + column as f64 * (panel_width + gap),
            top + row as f64 * (panel_height + row_gap),
            panel_width,
            panel_height,
        ];
        panel(&mut canvas, area, curve);
    }
    let entries: Vec<Entry> = MARKS
        .iter()
        .filter(|(name, ..)| {
            curves
                .iter()
                .any(|c| c.limits.iter().any(|(n, _)| n == name))
        })
        .map(|&(_, words, shape, color)| Entry::mark(shape, color, words))
        .collect();
    legend_in_a_row(&mut canvas, (left, height - 26.0), &entries);
    canvas.finish()
}

fn panel(canvas: &mut Canvas, area: [f64; 4], curve: &TransferCurve) {
    let x = Axis::linear("drive, V", curve.points.iter().map(|p| p.drive_v));
    let y = Axis::linear("plate, V", curve.points.iter().map(|p| p.plate_v));
    let plot = Plot::draw(canvas, area, x, y);
    let bold = Text {
        bold: true,
        ..Text::new(13.5, Anchor::Start)
    };
    let name = format!(
        "{} (driven through {})",
        shortened(&curve.stage, 28),
        short(curve.drive_ohms, "Ω")
    );
    canvas.text((area[0], area[1] - 9.0), &name, &bold);
    for (name, drive) in &curve.limits {
        if let Some(&(.., color)) = MARKS.iter().find(|m| m.0 == name) {
            let line = Stroke::dashed(color, 1.2, "4 4");
            let ends = [(*drive, y.low), (*drive, y.high)];
            plot.line(canvas, ends, &line);
        }
    }
    plot.line(
        canvas,
        curve.points.iter().map(|p| (p.drive_v, p.plate_v)),
        &CURVE,
    );
    for (name, drive) in &curve.limits {
        let mark = MARKS.iter().find(|m| m.0 == name);
        if let (Some(&(_, _, shape, color)), Some(p)) = (mark, at(&curve.points, *drive)) {
            plot.mark(canvas, (p.drive_v, p.plate_v), shape, color);
        }
    }
}

fn description(curves: &[TransferCurve]) -> String {
    let stages: Vec<String> = curves
        .iter()
        .map(|c| {
            let limits: Vec<String> = c
                .limits
                .iter()
                .map(|(name, drive)| {
                    format!("{} at {}", name.replace('-', " "), axis::volts(*drive))
                })
                .collect();
            format!("{}: {}", c.stage, limits.join(", "))
        })
        .collect();
    format!("Plate volts over drive, re rest. {}.", stages.join("; "))
}
