//! Colors, dashes and shapes.

/// How a line is drawn.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Stroke {
    pub color: &'static str,
    pub width: f64,
    /// Lengths of dashes and gaps; empty for a solid line.
    pub dash: &'static str,
}

impl Stroke {
    pub const fn solid(color: &'static str, width: f64) -> Stroke {
        Stroke {
            color,
            width,
            dash: "",
        }
    }

    pub const fn dashed(color: &'static str, width: f64, dash: &'static str) -> Stroke {
        Stroke { color, width, dash }
    }
}

/// What marks a point.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Shape {
    Circle,
    Square,
    Triangle,
    Diamond,
    /// An open circle.
    Ring,
}

pub const GROUND: &str = "#fcfbf8";
pub const PLOT_GROUND: &str = "#ffffff";
pub const INK: &str = "#23262d";
pub const FAINT_INK: &str = "#5d626c";
pub const GRID: &str = "#dedfe2";
pub const FINE_GRID: &str = "#eeeff1";
pub const ALARM: &str = "#a8202f";

/// Colors of series, found by a search for six that stay apart for eyes that lack one kind of cone (projection of
/// Viénot, Brettel and Mollon 1999, its matrices from memory). Dash and mark differ too.
const SERIES: [&str; 6] = [
    "#1d317c", "#e4380a", "#56b0a0", "#6f2a3d", "#94a663", "#666898",
];
const DASHES: [&str; 6] = ["", "9 4", "3 3", "12 4 3 4", "6 3", "2 4"];

/// Stroke of the k-th series.
pub fn series(k: usize) -> Stroke {
    Stroke {
        color: SERIES[k % SERIES.len()],
        width: 2.2,
        dash: DASHES[(k + k / SERIES.len()) % DASHES.len()],
    }
}
