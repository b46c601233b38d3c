//! A transfer curve between its points.

use crate::study::result::TransferPoint;

/// The curve at this drive, by straight lines between its points; `None` beyond its ends.
pub fn at(points: &[TransferPoint], drive_v: f64) -> Option<TransferPoint> {
    let pair = points
        .windows(2)
        .find(|p| p[0].drive_v <= drive_v && drive_v <= p[1].drive_v)?;
    let span = pair[1].drive_v - pair[0].drive_v;
    let share = if span > 0.0 {
        (drive_v - pair[0].drive_v) / span
    } else {
        0.0
    };
    let between = |read: fn(&TransferPoint) -> f64| {
        read(&pair[0]) + share * (read(&pair[1]) - read(&pair[0]))
    };
    Some(TransferPoint {
        drive_v,
        v_gk: between(|p| p.v_gk),
        plate_v: between(|p| p.plate_v),
        plate_a: between(|p| p.plate_a),
        grid_a: between(|p| p.grid_a),
        relative_gain: between(|p| p.relative_gain),
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::report::sample;

    #[test]
    fn between_points_the_curve_is_straight() {
        let curve = sample::transfer(0);
        let (a, b) = (curve.points[10], curve.points[11]);
        let middle = at(&curve.points, 0.5 * (a.drive_v + b.drive_v)).unwrap();
        assert!((middle.plate_v - 0.5 * (a.plate_v + b.plate_v)).abs() < 1e-12);
        assert_eq!(at(&curve.points, 1e3), None);
        assert_eq!(at(&[], 0.0), None);
    }
}
