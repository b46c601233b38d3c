//! Small-signal response over frequency.

use super::figures::{Figure, Missing, Response};
use crate::circuit::alternating::Axis;
use crate::stage::amplifier::Amplifier;

/// Lowest and highest frequency of the response, in hertz, and points to the decade.
const FROM_HZ: f64 = 10.0;
const TO_HZ: f64 = 40e3;
const POINTS_PER_DECADE: f64 = 40.0;
/// Band in which the top of the response is sought.
const TOP_BAND_HZ: (f64, f64) = (20.0, 20e3);

/// Jack to loudspeaker terminals by AC analysis in continuous time, on the load the amplifier was solved with.
pub fn response(amp: &Amplifier) -> Response {
    let db = |hz: f64| 20.0 * amp.gain_at(hz, Axis::Continuous).norm().log10();
    let gain_1khz_db = db(1000.0);
    let count = ((TO_HZ / FROM_HZ).log10() * POINTS_PER_DECADE).ceil() as usize;
    let points: Vec<(f64, f64)> = (0..=count)
        .map(|k| {
            let hz = FROM_HZ * (TO_HZ / FROM_HZ).powf(k as f64 / count as f64);
            (hz, db(hz) - gain_1khz_db)
        })
        .collect();
    let top = points
        .iter()
        .enumerate()
        .filter(|(_, p)| p.0 >= TOP_BAND_HZ.0 && p.0 <= TOP_BAND_HZ.1)
        .max_by(|a, b| a.1.1.total_cmp(&b.1.1))
        .map(|(k, _)| k)
        .unwrap_or(0);
    let mark = points[top].1 - 10.0 * 2f64.log10();
    let corner = |inside: usize, outside: usize| -> f64 {
        let (mut a, mut b) = (points[inside].0.ln(), points[outside].0.ln());
        for _ in 0..60 {
            let m = 0.5 * (a + b);
            if db(m.exp()) - gain_1khz_db > mark {
                a = m;
            } else {
                b = m;
            }
        }
        (0.5 * (a + b)).exp()
    };
    let low_3db_hz: Figure<f64> = (0..top)
        .rev()
        .find(|&k| points[k].1 < mark)
        .map(|k| corner(k + 1, k))
        .ok_or(Missing::NotReached);
    let high_3db_hz: Figure<f64> = (top + 1..points.len())
        .find(|&k| points[k].1 < mark)
        .map(|k| corner(k - 1, k))
        .ok_or(Missing::NotReached);
    Response {
        points,
        gain_1khz_db,
        low_3db_hz,
        high_3db_hz,
    }
}
