//! A plot: two axes with grid and labels, and what is drawn between them in values instead of picture units.

use super::axis::{self, Axis};
use super::canvas::{Anchor, Canvas, Text};
use super::style::{self, Shape, Stroke};

/// Two axes and their place in the picture.
pub struct Plot {
    pub x: Axis,
    pub y: Axis,
    left: f64,
    top: f64,
    width: f64,
    height: f64,
}

/// One line of a legend.
pub struct Entry {
    pub stroke: Option<Stroke>,
    pub mark: Option<(Shape, &'static str)>,
    pub words: String,
}

impl Entry {
    pub fn line(stroke: Stroke, words: impl Into<String>) -> Entry {
        Entry {
            stroke: Some(stroke),
            mark: None,
            words: words.into(),
        }
    }

    pub fn mark(shape: Shape, color: &'static str, words: impl Into<String>) -> Entry {
        Entry {
            stroke: None,
            mark: Some((shape, color)),
            words: words.into(),
        }
    }
}

const TICK_TEXT: f64 = 12.5;

impl Plot {
    /// Draws ground, grid, ticks and labels. `area` is that between the axes.
    pub fn draw(canvas: &mut Canvas, area: [f64; 4], x: Axis, y: Axis) -> Plot {
        let [left, top, width, height] = area;
        let plot = Plot {
            x,
            y,
            left,
            top,
            width,
            height,
        };
        canvas.rectangle(area, style::PLOT_GROUND, None);
        plot.vertical_grid(canvas);
        plot.horizontal_grid(canvas);
        canvas.rectangle(area, "none", Some(Stroke::solid(style::FAINT_INK, 1.0)));
        plot
    }

    fn bottom(&self) -> f64 {
        self.top + self.height
    }

    fn vertical_grid(&self, canvas: &mut Canvas) {
        for tick in self.x.ticks(self.width, axis::BESIDE) {
            let Some(share) = self.x.share(tick.value) else {
                continue;
            };
            let at = self.left + share * self.width;
            canvas.line((at, self.top), (at, self.bottom()), &grid(tick.labeled));
            if tick.labeled {
                let text = Text::new(TICK_TEXT, Anchor::Middle);
                canvas.text(
                    (at, self.bottom() + 18.0),
                    &(self.x.write)(tick.value),
                    &text,
                );
            }
        }
        let middle = self.left + 0.5 * self.width;
        let text = Text::new(13.5, Anchor::Middle);
        canvas.text((middle, self.bottom() + 40.0), self.x.label, &text);
    }

    fn horizontal_grid(&self, canvas: &mut Canvas) {
        for tick in self.y.ticks(self.height, axis::ABOVE) {
            let Some(share) = self.y.share(tick.value) else {
                continue;
            };
            let at = self.bottom() - share * self.height;
            canvas.line(
                (self.left, at),
                (self.left + self.width, at),
                &grid(tick.labeled),
            );
            if tick.labeled {
                let text = Text::new(TICK_TEXT, Anchor::End);
                canvas.text(
                    (self.left - 7.0, at + 4.3),
                    &(self.y.write)(tick.value),
                    &text,
                );
            }
        }
        let text = Text {
            turn: -90.0,
            ..Text::new(13.5, Anchor::Middle)
        };
        let middle = self.top + 0.5 * self.height;
        canvas.text((self.left - 52.0, middle), self.y.label, &text);
    }

    /// Place of a point in the picture, wherever it is; `None` for what has none.
    pub fn place(&self, (x, y): (f64, f64)) -> Option<(f64, f64)> {
        Some((
            self.left + self.x.share(x)? * self.width,
            self.bottom() - self.y.share(y)? * self.height,
        ))
    }

    /// Place of a point that lies between the axes.
    pub fn place_inside(&self, point: (f64, f64)) -> Option<(f64, f64)> {
        let (x, y) = self.place(point)?;
        let room = 0.01;
        let inside = x >= self.left - room
            && x <= self.left + self.width + room
            && y >= self.top - room
            && y <= self.bottom() + room;
        inside.then_some((x, y))
    }

    /// A line through the points, cut off at the axes and broken where a point has no place.
    pub fn line(
        &self,
        canvas: &mut Canvas,
        points: impl IntoIterator<Item = (f64, f64)>,
        style: &Stroke,
    ) {
        let mut piece: Vec<(f64, f64)> = Vec::new();
        let mut last: Option<(f64, f64)> = None;
        for point in points {
            let here = self.place(point);
            let cut = last.zip(here).and_then(|(a, b)| self.cut(a, b));
            match cut {
                Some((a, b)) => {
                    if piece.last() != Some(&a) {
                        canvas.polyline(&piece, style);
                        piece = vec![a];
                    }
                    piece.push(b);
                }
                None => {
                    canvas.polyline(&piece, style);
                    piece.clear();
                }
            }
            last = here;
        }
        canvas.polyline(&piece, style);
    }

    /// The part of a straight piece that lies between the axes (Liang and Barsky's way).
    fn cut(&self, a: (f64, f64), b: (f64, f64)) -> Option<((f64, f64), (f64, f64))> {
        let (dx, dy) = (b.0 - a.0, b.1 - a.1);
        let (mut from, mut to) = (0.0f64, 1.0f64);
        for (toward, distance) in [
            (-dx, a.0 - self.left),
            (dx, self.left + self.width - a.0),
            (-dy, a.1 - self.top),
            (dy, self.bottom() - a.1),
        ] {
            if toward == 0.0 {
                if distance < 0.0 {
                    return None;
                }
            } else if toward < 0.0 {
                from = from.max(distance / toward);
            } else {
                to = to.min(distance / toward);
            }
        }
        let at = |t: f64| (a.0 + t * dx, a.1 + t * dy);
        // Ends that are not cut keep their exact place, so that pieces join.
        let start = if from == 0.0 { a } else { at(from) };
        let end = if to == 1.0 { b } else { at(to) };
        (from < to).then_some((start, end))
    }

    /// A straight line across at this height, with words in the margin to its right.
    pub fn across(&self, canvas: &mut Canvas, y: f64, style: &Stroke, words: &str) {
        let Some((right, at)) = self.place_inside((self.x.high, y)) else {
            return;
        };
        canvas.line((self.left, at), (right, at), style);
        let text = Text {
            color: style.color,
            ..Text::new(12.0, Anchor::Start)
        };
        canvas.text((right + 6.0, at + 4.0), words, &text);
    }

    /// A straight line up at this value, with words above it.
    pub fn upright(&self, canvas: &mut Canvas, x: f64, style: &Stroke, words: &str) {
        let Some((at, top)) = self.place_inside((x, self.y.high)) else {
            return;
        };
        canvas.line((at, self.bottom()), (at, top), style);
        let text = Text {
            color: style.color,
            ..Text::new(12.0, Anchor::Middle)
        };
        canvas.text((at, top - 6.0), words, &text);
    }

    /// A mark at a point, if it lies between the axes.
    pub fn mark(&self, canvas: &mut Canvas, point: (f64, f64), shape: Shape, color: &str) {
        if let Some(at) = self.place_inside(point) {
            canvas.mark(at, shape, color);
        }
    }
}

fn grid(labeled: bool) -> Stroke {
    Stroke::solid(
        if labeled {
            style::GRID
        } else {
            style::FINE_GRID
        },
        1.0,
    )
}

/// Entries below each other, the first at `at`.
pub fn legend(canvas: &mut Canvas, at: (f64, f64), entries: &[Entry]) {
    for (k, entry) in entries.iter().enumerate() {
        draw_entry(canvas, (at.0, at.1 + 24.0 * k as f64), entry);
    }
}

/// Entries beside each other, each as wide as its words.
pub fn legend_in_a_row(canvas: &mut Canvas, at: (f64, f64), entries: &[Entry]) {
    let mut x = at.0;
    for entry in entries {
        draw_entry(canvas, (x, at.1), entry);
        x += 54.0 + 7.2 * entry.words.chars().count() as f64;
    }
}

fn draw_entry(canvas: &mut Canvas, (x, y): (f64, f64), entry: &Entry) {
    const SAMPLE: f64 = 34.0;
    if let Some(stroke) = &entry.stroke {
        canvas.line((x, y), (x + SAMPLE, y), stroke);
    }
    if let Some((shape, color)) = entry.mark {
        canvas.mark((x + 0.5 * SAMPLE, y), shape, color);
    }
    let text = Text::new(13.0, Anchor::Start);
    canvas.text((x + SAMPLE + 8.0, y + 4.5), &entry.words, &text);
}

/// What the picture shows, and under which conditions.
pub fn heading(canvas: &mut Canvas, title: &str, conditions: &str) {
    let bold = Text {
        bold: true,
        ..Text::new(17.0, Anchor::Start)
    };
    canvas.text((24.0, 30.0), &shortened(title, 80), &bold);
    let small = Text {
        color: style::FAINT_INK,
        ..Text::new(12.5, Anchor::Start)
    };
    canvas.text((24.0, 50.0), conditions, &small);
}

/// At most `most` characters.
pub fn shortened(words: &str, most: usize) -> String {
    if words.chars().count() <= most {
        words.to_owned()
    } else {
        let mut out: String = words.chars().take(most - 1).collect();
        out.push('…');
        out
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn plot() -> (Canvas, Plot) {
        let mut canvas = Canvas::new(300.0, 300.0, "t", "d");
        let (x, y) = (Axis::linear("", [0.0, 10.0]), Axis::linear("", [0.0, 10.0]));
        let plot = Plot::draw(&mut canvas, [100.0, 100.0, 100.0, 100.0], x, y);
        (canvas, plot)
    }

    #[test]
    fn values_go_to_the_right_and_up() {
        let (_, plot) = plot();
        assert_eq!(plot.place((0.0, 0.0)), Some((100.0, 200.0)));
        assert_eq!(plot.place((10.0, 2.0)), Some((200.0, 180.0)));
        assert_eq!(plot.place_inside((10.5, 2.0)), None);
    }

    #[test]
    fn lines_end_at_the_axes() {
        let (_, plot) = plot();
        let cut = plot.cut((50.0, 150.0), (250.0, 150.0));
        assert_eq!(cut, Some(((100.0, 150.0), (200.0, 150.0))));
        assert_eq!(plot.cut((50.0, 50.0), (250.0, 50.0)), None);
        let inside = ((120.0, 130.0), (140.0, 190.0));
        assert_eq!(plot.cut(inside.0, inside.1), Some(inside));
    }

    #[test]
    fn a_line_breaks_where_a_point_has_no_place() {
        let (mut canvas, plot) = plot();
        let points = [
            (1.0, 1.0),
            (2.0, 1.0),
            (f64::NAN, 1.0),
            (4.0, 1.0),
            (5.0, 20.0),
            (6.0, 1.0),
            (7.0, 1.0),
        ];
        plot.line(&mut canvas, points, &Stroke::solid("#123456", 1.0));
        let text = canvas.finish();
        let lines: Vec<_> = text.lines().filter(|l| l.contains("#123456")).collect();
        assert_eq!(lines.len(), 3, "{lines:#?}");
        assert!(lines[0].contains(r#"points="110,190 120,190""#));
        assert!(lines[1].contains(r#"points="140,190 144.74,100""#));
    }
}
