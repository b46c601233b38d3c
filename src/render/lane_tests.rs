//! Lanes do not touch each other, and no input brings the loop down.

use super::tests::amplifier;
use super::{Kernel, Model};

const RATE: f64 = 384e3;

/// A burst that goes from small to far beyond clipping, in volts.
fn burst() -> impl Iterator<Item = f64> {
    (0..6000).map(|n| {
        let t = n as f64 / RATE;
        80.0 * t * (std::f64::consts::TAU * 1000.0 * t).sin()
    })
}

#[test]
fn three_lanes_are_three_kernels_bit_for_bit() {
    let models = [2.0, 5.0, 10.0].map(|g| Model::new(&amplifier(g), RATE, 1.0).unwrap());
    let mut lanes = Kernel::<3>::new([&models[0], &models[1], &models[2]]);
    let mut alone = models.each_ref().map(|m| Kernel::<1>::new([m]));
    let mut peaks = [0.0f64; 3];
    for (n, x) in burst().enumerate() {
        // Different input per lane, so that lanes settle after different numbers of iterations.
        let input = [x, -0.5 * x, 0.25 * x];
        let together = lanes.step(input);
        for l in 0..3 {
            let single = alone[l].step([input[l]])[0];
            assert_eq!(
                together[l].to_bits(),
                single.to_bits(),
                "sample {n}, lane {l}"
            );
            assert_eq!(lanes.observe(1, l), alone[l].observe(1, 0));
            peaks[l] = peaks[l].max(single.abs());
        }
    }
    assert!(
        peaks.iter().all(|p| *p > 0.1),
        "the burst is heard: {peaks:?}"
    );
    let looks: u64 = alone.iter().map(|k| k.looks).sum();
    let strayed: u64 = alone.iter().map(|k| k.strayed).sum();
    assert_eq!(lanes.strayed, strayed);
    assert_eq!(lanes.looks, looks);
}

#[test]
fn unfit_input_never_panics_and_stays_in_its_lane() {
    let model = Model::new(&amplifier(5.0), RATE, 1.0).unwrap();
    for unfit in [f64::NAN, f64::INFINITY, f64::NEG_INFINITY, 1e300, -1e300] {
        let mut pair = Kernel::<2>::new([&model, &model]);
        let mut sound = Kernel::<1>::new([&model]);
        for (n, x) in burst().take(300).enumerate() {
            let bad = if n == 100 { unfit } else { x };
            let out = pair.step([bad, x]);
            assert_eq!(out[1].to_bits(), sound.step([x])[0].to_bits());
        }
        assert!(pair.strayed > 0, "{unfit} is reported");
        pair.reset([&model, &model]);
        let silence = pair.step([0.0; 2]);
        assert!(
            silence.iter().all(|y| y.abs() < 1e-6),
            "{unfit}: {silence:?} after a reset"
        );
    }
}
