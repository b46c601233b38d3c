//! Level at which a figure, sampled at rising levels, passes a mark.

use thiserror::Error;

use crate::numeric::root::{RootError, bracketed_root};

/// On a logarithmic scale, values below this share of the mark are raised to it: how far below
/// -120 dB a curve starts says nothing about where it crosses. Chosen.
const LEAST_SHARE: f64 = 1e-6;

/// How the values of a curve are drawn between its samples. Levels are always logarithmic.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum ValueScale {
    /// For ratios that grow as powers of the level, such as THD: a power law is met exactly.
    Logarithmic,
    /// For values already in decibels, or of either sign.
    Linear,
}

/// Why a curve cannot be searched.
#[derive(Clone, Copy, Debug, PartialEq, Error)]
pub enum CrossingError {
    #[error("{levels} levels beside {values} values; two or more of each are needed")]
    Shape { levels: usize, values: usize },
    #[error("level {index} is {level}; levels must be positive and rise")]
    BadLevel { index: usize, level: f64 },
    #[error("value {index} is {value}, which has no place on this scale")]
    BadValue { index: usize, value: f64 },
    #[error("a mark of {mark} has no place on this scale")]
    BadMark { mark: f64 },
    #[error("no crossing found between two levels that enclose one: {0}")]
    Search(#[from] RootError),
}

/// Where a curve passes a mark.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Crossings {
    /// Level of the first upward crossing; `None` if the curve never rises through the mark.
    pub first_upward: Option<f64>,
    /// Upward crossings: more than one where distortion dips again by cancellation.
    pub upward: usize,
    /// Downward crossings.
    pub downward: usize,
    /// The curve is at or above the mark at the lowest level already, so the level that first
    /// reaches it, if there is one, lies below the sampled range.
    pub starts_above: bool,
}

/// Crossings of `mark` by the curve through (`levels`, `values`).
///
/// A crossing is counted between two neighboring samples when one is below the mark and the other
/// at or above it; the level is where the monotone cubic through the samples passes the mark, drawn
/// over the logarithm of the level. It makes no extrema between samples, so it adds no crossings,
/// and a dip narrower than the spacing of the levels is not seen.
///
/// Source of the slopes: F. N. Fritsch, J. Butland, A method for constructing local monotone
/// piecewise cubic interpolants, SIAM J. Sci. Stat. Comput. 5 (1984) 300-304, weighted for unequal
/// steps; three-point slopes at the ends.
///
/// # Errors
/// [`CrossingError`].
///
/// ```
/// use forehear::measure::crossing::{ValueScale, crossings};
///
/// // A third harmonic alone grows as the square of the level.
/// let levels = [0.1, 0.2, 0.4, 0.8];
/// let thd = levels.map(|level: f64| 5.0 * level.powi(2));
/// let found = crossings(&levels, &thd, 1.0, ValueScale::Logarithmic)?;
/// assert!((found.first_upward.unwrap() - 0.2f64.sqrt()).abs() < 1e-12);
/// # Ok::<(), forehear::measure::crossing::CrossingError>(())
/// ```
pub fn crossings(
    levels: &[f64],
    values: &[f64],
    mark: f64,
    scale: ValueScale,
) -> Result<Crossings, CrossingError> {
    let shape = CrossingError::Shape {
        levels: levels.len(),
        values: values.len(),
    };
    if levels.len() != values.len() || levels.len() < 2 {
        return Err(shape);
    }
    for (index, &level) in levels.iter().enumerate() {
        let before = if index == 0 { 0.0 } else { levels[index - 1] };
        if !level.is_finite() || level <= before {
            return Err(CrossingError::BadLevel { index, level });
        }
    }
    let is_logarithmic = scale == ValueScale::Logarithmic;
    if !mark.is_finite() || (is_logarithmic && mark <= 0.0) {
        return Err(CrossingError::BadMark { mark });
    }
    for (index, &value) in values.iter().enumerate() {
        if !value.is_finite() || (is_logarithmic && value < 0.0) {
            return Err(CrossingError::BadValue { index, value });
        }
    }
    // Zero is the mark.
    let height = |value: f64| match scale {
        ValueScale::Logarithmic => (value / mark).max(LEAST_SHARE).ln(),
        ValueScale::Linear => value - mark,
    };
    let x: Vec<f64> = levels.iter().map(|l| l.ln()).collect();
    let y: Vec<f64> = values.iter().map(|&v| height(v)).collect();
    let is_above = |i: usize| values[i] >= mark;
    let mut found = Crossings {
        first_upward: None,
        upward: 0,
        downward: 0,
        starts_above: is_above(0),
    };
    for i in 1..x.len() {
        match (is_above(i - 1), is_above(i)) {
            (false, true) => {
                found.upward += 1;
                if found.first_upward.is_none() {
                    found.first_upward = Some(passage(&x, &y, i - 1)?.exp());
                }
            }
            (true, false) => found.downward += 1,
            _ => {}
        }
    }
    Ok(found)
}

/// Where the cubic between samples `i` and `i + 1` is zero.
fn passage(x: &[f64], y: &[f64], i: usize) -> Result<f64, RootError> {
    let h = x[i + 1] - x[i];
    let (slope_0, slope_1) = (slope(x, y, i) * h, slope(x, y, i + 1) * h);
    let cubic = |t: f64| {
        let s = 1.0 - t;
        s * s * (y[i] * (1.0 + 2.0 * t) + slope_0 * t)
            + t * t * (y[i + 1] * (1.0 + 2.0 * s) - slope_1 * s)
    };
    Ok(x[i] + h * bracketed_root(cubic, 0.0, 1.0, 0.0)?)
}

/// Slope of the monotone cubic at sample `i`.
fn slope(x: &[f64], y: &[f64], i: usize) -> f64 {
    let last = x.len() - 1;
    let step = |j: usize| x[j + 1] - x[j];
    let secant = |j: usize| (y[j + 1] - y[j]) / step(j);
    if last == 1 {
        return secant(0);
    }
    if i == 0 {
        return end_slope(step(0), step(1), secant(0), secant(1));
    }
    if i == last {
        return end_slope(
            step(last - 1),
            step(last - 2),
            secant(last - 1),
            secant(last - 2),
        );
    }
    let (left, right) = (secant(i - 1), secant(i));
    if left * right <= 0.0 {
        return 0.0;
    }
    let weight_left = 2.0 * step(i) + step(i - 1);
    let weight_right = step(i) + 2.0 * step(i - 1);
    (weight_left + weight_right) / (weight_left / left + weight_right / right)
}

/// Slope at an end from a parabola through three samples, held back where it would overshoot.
fn end_slope(near: f64, far: f64, secant_near: f64, secant_far: f64) -> f64 {
    let slope = ((2.0 * near + far) * secant_near - near * secant_far) / (near + far);
    if slope * secant_near <= 0.0 {
        0.0
    } else if secant_near * secant_far <= 0.0 && slope.abs() > 3.0 * secant_near.abs() {
        3.0 * secant_near
    } else {
        slope
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    proptest! {
        #[test]
        fn power_law_is_met_exactly(
            order in 0.5..6.0f64,
            mark_at in 0.011..0.99f64,
            count in 2usize..20,
        ) {
            let levels: Vec<f64> = (0..count)
                .map(|i| 0.01 * 100f64.powf(i as f64 / (count - 1) as f64))
                .collect();
            let values: Vec<f64> = levels.iter().map(|l| l.powf(order)).collect();
            // Far below the mark the curve is flattened; keep within.
            prop_assume!((0.01 / mark_at).powf(order) > LEAST_SHARE);
            let found = crossings(&levels, &values, mark_at.powf(order), ValueScale::Logarithmic);
            let found = found.unwrap();
            prop_assert!((found.first_upward.unwrap() / mark_at - 1.0).abs() < 1e-12);
            prop_assert_eq!((found.upward, found.downward, found.starts_above), (1, 0, false));
        }

        #[test]
        fn crossing_lies_between_its_samples_and_scales_with_the_level(
            values in prop::collection::vec(0.0..10.0f64, 2..12),
            scale in 1e-3..1e3f64,
        ) {
            let levels: Vec<f64> = (1..=values.len()).map(|i| i as f64).collect();
            let scaled: Vec<f64> = levels.iter().map(|l| l * scale).collect();
            let here = crossings(&levels, &values, 3.0, ValueScale::Linear).unwrap();
            let there = crossings(&scaled, &values, 3.0, ValueScale::Linear).unwrap();
            prop_assert_eq!(here.upward, there.upward);
            if let Some(level) = here.first_upward {
                prop_assert!((there.first_upward.unwrap() / (scale * level) - 1.0).abs() < 1e-9);
                let i = levels.iter().rposition(|&l| l < level).unwrap();
                prop_assert!(values[i] < 3.0 && values[i + 1] >= 3.0);
            }
            let ups_less_downs = here.upward as i64 - here.downward as i64;
            let ends = i64::from(values[values.len() - 1] >= 3.0) - i64::from(values[0] >= 3.0);
            prop_assert_eq!(ups_less_downs, ends);
        }
    }

    #[test]
    fn cancellation_dip_counts_as_two_crossings() {
        let levels = [0.1, 0.2, 0.3, 0.4, 0.5, 0.6];
        let thd = [0.2, 2.0, 3.0, 0.5, 4.0, 9.0];
        let found = crossings(&levels, &thd, 1.0, ValueScale::Logarithmic).unwrap();
        assert_eq!((found.upward, found.downward), (2, 1));
        let level = found.first_upward.unwrap();
        assert!(0.1 < level && level < 0.2);
    }

    #[test]
    fn curve_that_starts_above_says_so() {
        let found = crossings(&[1.0, 2.0], &[5.0, 9.0], 1.0, ValueScale::Logarithmic).unwrap();
        assert!(found.starts_above);
        assert_eq!(found.first_upward, None);
        let never = crossings(&[1.0, 2.0], &[0.0, 0.9], 1.0, ValueScale::Logarithmic).unwrap();
        assert_eq!((never.first_upward, never.starts_above), (None, false));
    }

    #[test]
    fn sample_on_the_mark_is_the_crossing() {
        let found = crossings(&[1.0, 2.0, 4.0], &[0.0, 1.0, 3.0], 1.0, ValueScale::Linear).unwrap();
        assert!((found.first_upward.unwrap() - 2.0).abs() < 1e-12);
        assert_eq!(found.upward, 1);
    }

    #[test]
    fn curves_without_sense_are_refused() {
        let of = |l: &[f64], v: &[f64], mark| crossings(l, v, mark, ValueScale::Logarithmic);
        assert!(matches!(
            of(&[1.0], &[1.0], 1.0),
            Err(CrossingError::Shape { .. })
        ));
        assert!(matches!(
            of(&[1.0, 2.0], &[1.0], 1.0),
            Err(CrossingError::Shape { .. })
        ));
        for levels in [[0.0, 1.0], [2.0, 1.0], [1.0, 1.0], [1.0, f64::NAN]] {
            let refused = of(&levels, &[1.0, 2.0], 1.0);
            assert!(matches!(refused, Err(CrossingError::BadLevel { .. })));
        }
        let below = CrossingError::BadValue {
            index: 1,
            value: -2.0,
        };
        assert_eq!(of(&[1.0, 2.0], &[1.0, -2.0], 1.0), Err(below));
        assert_eq!(
            of(&[1.0, 2.0], &[1.0, 2.0], 0.0),
            Err(CrossingError::BadMark { mark: 0.0 })
        );
        assert!(crossings(&[1.0, 2.0], &[-1.0, 2.0], 0.0, ValueScale::Linear).is_ok());
    }
}
