//! A picture under construction: rectangles, lines, texts and marks in its own units, y downwards.

use std::fmt::Write;

use super::style::{self, Shape, Stroke};

/// Where a text hangs on its point.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Anchor {
    Start,
    Middle,
    End,
}

/// How a text looks.
#[derive(Clone, Copy, Debug)]
pub struct Text {
    pub size: f64,
    pub color: &'static str,
    pub bold: bool,
    pub anchor: Anchor,
    /// Degrees, clockwise.
    pub turn: f64,
}

impl Text {
    pub const fn new(size: f64, anchor: Anchor) -> Text {
        Text {
            size,
            color: style::INK,
            bold: false,
            anchor,
            turn: 0.0,
        }
    }
}

/// A picture under construction.
pub struct Canvas {
    body: String,
    width: f64,
    height: f64,
    title: String,
    description: String,
}

impl Canvas {
    /// An empty picture; `title` and `description` are for readers that do not see it.
    pub fn new(width: f64, height: f64, title: &str, description: &str) -> Canvas {
        let mut canvas = Canvas {
            body: String::new(),
            width,
            height,
            title: title.to_owned(),
            description: description.to_owned(),
        };
        canvas.rectangle([0.0, 0.0, width, height], style::GROUND, None);
        canvas
    }

    /// `[x, y, width, height]`.
    pub fn rectangle(&mut self, area: [f64; 4], fill: &str, border: Option<Stroke>) {
        let [x, y, w, h] = area.map(number);
        let border = border.map_or(String::new(), |s| stroke(&s));
        let _ = writeln!(
            self.body,
            r#"<rect x="{x}" y="{y}" width="{w}" height="{h}" fill="{fill}"{border}/>"#
        );
    }

    pub fn line(&mut self, from: (f64, f64), to: (f64, f64), style: &Stroke) {
        self.polyline(&[from, to], style);
    }

    pub fn polyline(&mut self, points: &[(f64, f64)], style: &Stroke) {
        if points.len() < 2 {
            return;
        }
        let points: Vec<String> = points
            .iter()
            .map(|&(x, y)| format!("{},{}", number(x), number(y)))
            .collect();
        let _ = writeln!(
            self.body,
            r#"<polyline points="{}" fill="none" stroke-linejoin="round"{}/>"#,
            points.join(" "),
            stroke(style)
        );
    }

    pub fn text(&mut self, at: (f64, f64), words: &str, text: &Text) {
        let (x, y) = (number(at.0), number(at.1));
        let anchor = match text.anchor {
            Anchor::Start => "start",
            Anchor::Middle => "middle",
            Anchor::End => "end",
        };
        let bold = if text.bold {
            r#" font-weight="bold""#
        } else {
            ""
        };
        let turn = if text.turn == 0.0 {
            String::new()
        } else {
            format!(r#" transform="rotate({} {x} {y})""#, number(text.turn))
        };
        let _ = writeln!(
            self.body,
            r#"<text x="{x}" y="{y}" font-size="{}" fill="{}" text-anchor="{anchor}"{bold}{turn}>{}</text>"#,
            number(text.size),
            text.color,
            escaped(words)
        );
    }

    pub fn mark(&mut self, at: (f64, f64), shape: Shape, color: &str) {
        let (x, y) = at;
        let polygon = |offsets: &[(f64, f64)]| {
            let points: Vec<String> = offsets
                .iter()
                .map(|(dx, dy)| format!("{},{}", number(x + dx), number(y + dy)))
                .collect();
            format!(
                r##"<polygon points="{}" fill="{color}" stroke="#ffffff" stroke-width="1.2"/>"##,
                points.join(" ")
            )
        };
        let circle = |radius: f64, paint: String| {
            format!(
                r#"<circle cx="{}" cy="{}" r="{radius}" {paint}/>"#,
                number(x),
                number(y)
            )
        };
        let element = match shape {
            Shape::Circle => circle(
                5.0,
                format!(r##"fill="{color}" stroke="#ffffff" stroke-width="1.2""##),
            ),
            Shape::Ring => circle(
                4.0,
                format!(r##"fill="#ffffff" stroke="{color}" stroke-width="1.6""##),
            ),
            Shape::Square => polygon(&[(-4.6, -4.6), (4.6, -4.6), (4.6, 4.6), (-4.6, 4.6)]),
            Shape::Triangle => polygon(&[(0.0, -6.2), (5.8, 4.4), (-5.8, 4.4)]),
            Shape::Diamond => polygon(&[(0.0, -6.6), (5.6, 0.0), (0.0, 6.6), (-5.6, 0.0)]),
        };
        self.body += &element;
        self.body.push('\n');
    }

    /// The finished document.
    pub fn finish(self) -> String {
        let (w, h) = (number(self.width), number(self.height));
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" viewBox=\"0 0 {w} {h}\" width=\"{w}\" height=\"{h}\" \
             role=\"img\" font-family=\"sans-serif\">\n<title>{}</title>\n<desc>{}</desc>\n{}</svg>\n",
            escaped(&self.title),
            escaped(&self.description),
            self.body
        )
    }
}

fn stroke(style: &Stroke) -> String {
    let dash = if style.dash.is_empty() {
        String::new()
    } else {
        format!(r#" stroke-dasharray="{}""#, style.dash)
    };
    format!(
        r#" stroke="{}" stroke-width="{}"{dash}"#,
        style.color,
        number(style.width)
    )
}

/// Two decimals at most: a hundredth of a unit is below what an eye or a screen resolves.
fn number(x: f64) -> String {
    let text = format!("{x:.2}");
    let text = text.trim_end_matches('0').trim_end_matches('.');
    match text {
        "-0" => "0".to_owned(),
        _ => text.to_owned(),
    }
}

/// Text as XML allows it: markup escaped, control characters left out.
fn escaped(text: &str) -> String {
    let mut out = String::new();
    for c in text.chars() {
        match c {
            '&' => out += "&amp;",
            '<' => out += "&lt;",
            '>' => out += "&gt;",
            '"' => out += "&quot;",
            c if c.is_control() || matches!(c, '\u{fffe}' | '\u{ffff}') => out.push(' '),
            c => out.push(c),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn texts_are_escaped() {
        assert_eq!(
            escaped("a<b & \"c\">\u{1b}"),
            "a&lt;b &amp; &quot;c&quot;&gt; "
        );
    }

    #[test]
    fn numbers_are_short_and_have_no_negative_zero() {
        assert_eq!(number(1.0), "1");
        assert_eq!(number(-0.001), "0");
        assert_eq!(number(12.345), "12.35");
        assert_eq!(number(100.0), "100");
    }
}
