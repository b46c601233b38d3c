//! An axis: which values it spans, where they lie in the picture, where its ticks are and what they say.

/// Linear, or in decades.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Kind {
    Linear,
    Logarithmic,
}

/// An axis without its place in the picture.
#[derive(Clone, Copy, Debug)]
pub struct Axis {
    pub kind: Kind,
    pub low: f64,
    pub high: f64,
    /// Quantity and unit.
    pub label: &'static str,
    /// What a tick says.
    pub write: fn(f64) -> String,
}

/// A tick: its value, and whether it has a label.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tick {
    pub value: f64,
    pub labeled: bool,
}

/// Least distance of labeled ticks on a linear axis, in picture units: beside each other, and above each other.
pub const BESIDE: f64 = 52.0;
pub const ABOVE: f64 = 30.0;
/// Length of a decade from which 1, 2 and 5 are labeled, and from which every digit has a line.
const LABELED_DECADE: f64 = 110.0;
const LINED_DECADE: f64 = 60.0;

impl Axis {
    /// Spans `values`, ends rounded outwards to ticks.
    pub fn linear(label: &'static str, values: impl IntoIterator<Item = f64>) -> Axis {
        let (mut low, mut high) = ends(values).unwrap_or((0.0, 1.0));
        if high - low < 1e-12 * high.abs().max(low.abs()).max(1e-12) {
            let room = high.abs().max(1.0);
            (low, high) = (low - room, high + room);
        }
        let step = step_of(high - low, 8.0);
        Axis {
            kind: Kind::Linear,
            low: (low / step).floor() * step,
            high: (high / step).ceil() * step,
            label,
            write: plain,
        }
    }

    /// From `low` to `high`, both above zero, as they are.
    pub fn logarithmic(label: &'static str, low: f64, high: f64) -> Axis {
        let (low, high) = if low > 0.0 && high > low && high.is_finite() {
            (low, high)
        } else {
            (1.0, 10.0)
        };
        Axis {
            kind: Kind::Logarithmic,
            low,
            high,
            label,
            write: plain,
        }
    }

    pub fn written(self, write: fn(f64) -> String) -> Axis {
        Axis { write, ..self }
    }

    /// 0 at the low end, 1 at the high end; `None` for what has no place on it.
    pub fn share(&self, value: f64) -> Option<f64> {
        let share = match self.kind {
            Kind::Linear => (value - self.low) / (self.high - self.low),
            Kind::Logarithmic if value > 0.0 => {
                (value / self.low).ln() / (self.high / self.low).ln()
            }
            Kind::Logarithmic => return None,
        };
        share.is_finite().then_some(share)
    }

    /// Ticks for an axis of this length, labels of a linear one at least `apart`, in picture units.
    pub fn ticks(&self, length: f64, apart: f64) -> Vec<Tick> {
        match self.kind {
            Kind::Linear => {
                let step = step_of(self.high - self.low, (length / apart).max(2.0));
                let first = (self.low / step - 1e-9).ceil() as i64;
                let last = (self.high / step + 1e-9).floor() as i64;
                (first..=last)
                    .map(|k| Tick {
                        value: k as f64 * step,
                        labeled: true,
                    })
                    .collect()
            }
            Kind::Logarithmic => self.decade_ticks(length),
        }
    }

    fn decade_ticks(&self, length: f64) -> Vec<Tick> {
        let decade = length / (self.high / self.low).log10();
        let labeled: &[i32] = if decade >= LABELED_DECADE {
            &[1, 2, 5]
        } else {
            &[1]
        };
        let mut ticks = Vec::new();
        for power in self.low.log10().floor() as i32..=self.high.log10().ceil() as i32 {
            for digit in 1..10 {
                let value = decimal(digit, power);
                let inside = value >= self.low * (1.0 - 1e-9) && value <= self.high * (1.0 + 1e-9);
                let is_labeled = labeled.contains(&digit);
                if inside && (is_labeled || decade >= LINED_DECADE) {
                    ticks.push(Tick {
                        value,
                        labeled: is_labeled,
                    });
                }
            }
        }
        ticks
    }
}

/// digit · 10^power, the very number its decimal writing denotes.
fn decimal(digit: i32, power: i32) -> f64 {
    format!("{digit}e{power}")
        .parse()
        .expect("a digit and a power are a number")
}

/// Smallest of 1, 2, 5 times a power of ten that makes at most `count` steps of `span`.
fn step_of(span: f64, count: f64) -> f64 {
    let least = span / count;
    let power = least.log10().floor() as i32;
    [(1, power), (2, power), (5, power), (1, power + 1)]
        .into_iter()
        .map(|(digit, power)| decimal(digit, power))
        .find(|&step| step >= least * (1.0 - 1e-9))
        .unwrap_or(least)
}

/// Lowest and highest finite value.
pub fn ends(values: impl IntoIterator<Item = f64>) -> Option<(f64, f64)> {
    values
        .into_iter()
        .filter(|v| v.is_finite())
        .fold(None, |found, v| match found {
            None => Some((v, v)),
            Some((low, high)) => Some((f64::min(low, v), f64::max(high, v))),
        })
}

/// As few digits as the value has, with a true minus.
pub fn plain(value: f64) -> String {
    let rounded: f64 = format!("{value:.6e}").parse().unwrap_or(value);
    let rounded = if rounded.abs() < 1e-9 { 0.0 } else { rounded };
    format!("{rounded}").replace('-', "\u{2212}")
}

/// 50, 200, 1k, 20k.
pub fn hertz(value: f64) -> String {
    if value >= 1000.0 {
        format!("{}k", plain(value / 1000.0))
    } else {
        plain(value)
    }
}

/// 5 mV, 0.2 V, 1 V: from 0.1 V in volts, since "100 mV" would touch "200 mV".
pub fn volts(value: f64) -> String {
    if (0.0999..0.9999).contains(&value.abs()) {
        return format!("{} V", plain(value)).replace('-', "\u{2212}");
    }
    crate::report::phrase::short(value, "V").replace('-', "\u{2212}")
}

/// Amperes, written in milliamperes.
pub fn milliamperes(value: f64) -> String {
    plain(value * 1e3)
}

#[cfg(test)]
mod tests {
    use super::*;

    fn labels(axis: &Axis, length: f64) -> Vec<String> {
        let ticks = axis.ticks(length, BESIDE);
        let labeled = ticks.iter().filter(|t| t.labeled);
        labeled.map(|t| (axis.write)(t.value)).collect()
    }

    #[test]
    fn decades_are_labeled_at_one_two_and_five() {
        let axis = Axis::logarithmic("", 20.0, 20_000.0).written(hertz);
        let expected = [
            "20", "50", "100", "200", "500", "1k", "2k", "5k", "10k", "20k",
        ];
        assert_eq!(labels(&axis, 620.0), expected);
        assert_eq!(labels(&axis, 200.0), ["100", "1k", "10k"]);
        assert_eq!(axis.share(20.0), Some(0.0));
        assert!((axis.share(632.455532).unwrap() - 0.5).abs() < 1e-9);
        assert_eq!(axis.share(0.0), None);
        assert_eq!(axis.share(f64::NAN), None);
    }

    #[test]
    fn linear_ticks_are_round_and_not_crowded() {
        let axis = Axis::linear("", [-3.4, 3.9]);
        assert_eq!((axis.low, axis.high), (-4.0, 4.0));
        assert_eq!(
            labels(&axis, 640.0),
            ["−4", "−3", "−2", "−1", "0", "1", "2", "3", "4"]
        );
        assert_eq!(labels(&axis, 220.0), ["−4", "−2", "0", "2", "4"]);
        let axis = Axis::linear("", [0.0, 0.3]);
        assert_eq!(labels(&axis, 330.0).last().unwrap(), "0.3");
    }

    #[test]
    fn one_value_none_or_odd_ones_still_make_an_axis() {
        for values in [
            vec![],
            vec![0.0],
            vec![5.0],
            vec![f64::NAN, f64::INFINITY, 2.0],
        ] {
            let axis = Axis::linear("", values);
            assert!(axis.low < axis.high && axis.low.is_finite() && axis.high.is_finite());
            assert!((2..20).contains(&axis.ticks(400.0, ABOVE).len()));
        }
        let axis = Axis::logarithmic("", 0.0, f64::NAN);
        assert!(!axis.ticks(400.0, ABOVE).is_empty());
    }
}
