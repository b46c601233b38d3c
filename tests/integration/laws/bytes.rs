//! The same samples whatever the threads, the blocks and the lanes.

use std::sync::atomic::AtomicBool;

use forehear::render::{Kernel, Model};
use forehear::resample::Oversampler;
use forehear::study::Watch;
use forehear::study::render::{Plan, Sound, Take, study};

use super::{RATE_HZ, amplifier, default_amplifier, prepared};

/// A decaying pluck of `frames` at 48 kHz, loud enough to drive every stage.
fn pluck(frames: usize, hz: f64) -> Vec<f64> {
    (0..frames)
        .map(|n| {
            let t = n as f64 / 48e3;
            0.5 * (-6.0 * t).exp() * (std::f64::consts::TAU * hz * t).sin()
        })
        .collect()
}

fn bits(sounds: &[Sound]) -> Vec<u64> {
    sounds
        .iter()
        .flat_map(|s| s.terminals.iter().chain(&s.listening))
        .flatten()
        .map(|x| x.to_bits())
        .collect()
}

#[test]
fn one_thread_and_two_render_and_measure_the_same() {
    let prepared = prepared(forehear::design::shipped()[0].1, &[]);
    let take = Take {
        name: "pluck".into(),
        rate: 48_000,
        channels: vec![pluck(2000, 110.0), pluck(2000, 329.6)],
        full_scale_v: 1.0,
    };
    let plan = Plan {
        settings: vec![2.0, 5.0, 10.0],
        test_level_v: 0.2,
        tone_hz: 1000.0,
        oversample: 2,
        cabinet: None,
    };
    let run = |threads: usize| {
        let stop = AtomicBool::new(false);
        let watch = Watch {
            progress: &|_, _| {},
            stop: &stop,
        };
        rayon::ThreadPoolBuilder::new()
            .num_threads(threads)
            .build()
            .expect("a pool of threads")
            .install(|| study(&prepared, &take, &plan, &watch))
            .expect("the study runs")
    };
    let (one, sounds_one) = run(1);
    let (two, sounds_two) = run(2);
    assert_eq!(bits(&sounds_one).len(), 3 * 2 * 2 * 2000);
    assert!(bits(&sounds_one) == bits(&sounds_two));
    let figures = |s: &forehear::study::result::RenderStudy| format!("{:?}", s.gain_settings);
    assert!(figures(&one) == figures(&two));
}

#[test]
fn blocks_of_one_sixty_four_and_the_whole_render_the_same() {
    let model = Model::new(&default_amplifier(), RATE_HZ, 1.0).expect("the model comes to rest");
    let input = pluck(5000, 196.0);
    let run = |block: usize| {
        let mut kernel = Kernel::<1>::new([&model]);
        let mut stage = |up: &[f64], out: &mut [Vec<f64>; 1]| {
            for (x, y) in up.iter().zip(&mut out[0]) {
                *y = kernel.step([*x])[0];
            }
        };
        let mut stream = Oversampler::new(8).expect("a factor of 8").stream::<1>();
        let mut output = [Vec::new()];
        for piece in input.chunks(block) {
            stream
                .push(piece, &mut stage, &mut output)
                .expect("finite samples");
        }
        stream
            .finish(&mut stage, &mut output)
            .expect("finite samples");
        let [output] = output;
        output.into_iter().map(f64::to_bits).collect::<Vec<_>>()
    };
    let whole = run(input.len());
    assert_eq!(whole.len(), input.len());
    assert!(run(1) == whole);
    assert!(run(64) == whole);
}

/// Lanes against single runs, re the output's peak: the order of additions may differ, nothing else.
const LANES: f64 = 1e-9;

fn three_models() -> [Model; 3] {
    let prepared = prepared(forehear::design::shipped()[0].1, &[]);
    [2.0, 5.0, 10.0].map(|gain| {
        Model::new(&amplifier(&prepared, Some(gain)), RATE_HZ, 1.0).expect("comes to rest")
    })
}

/// Largest difference between lanes and single runs re the output's peak, over 0.1 s of a loud tone.
fn lanes_against_singles(lanes: &mut Kernel<3>, models: &[Model; 3]) -> [f64; 3] {
    let mut singles = [0, 1, 2].map(|l| Kernel::<1>::new([&models[l]]));
    let (mut worst, mut peak) = ([0.0f64; 3], [0.0f64; 3]);
    for n in 0..40_000 {
        let t = f64::from(n) / RATE_HZ;
        let x = 0.5 * (std::f64::consts::TAU * 330.0 * t).sin();
        let together = lanes.step([x; 3]);
        for l in 0..3 {
            let alone = singles[l].step([x])[0];
            worst[l] = worst[l].max((together[l] - alone).abs());
            peak[l] = peak[l].max(alone.abs());
        }
    }
    println!("lanes against single runs: {worst:?} V of {peak:?} V");
    [0, 1, 2].map(|l| {
        assert!(peak[l] > 0.1, "lane {l} is driven");
        worst[l] / peak[l]
    })
}

#[test]
fn three_lanes_put_at_rest_are_three_single_runs() {
    let models = three_models();
    let each = [&models[0], &models[1], &models[2]];
    let mut lanes = Kernel::<3>::new(each);
    lanes.reset(each);
    for (l, model) in models.iter().enumerate() {
        lanes.set_state(l, &model.rest);
    }
    for (l, share) in lanes_against_singles(&mut lanes, &models)
        .iter()
        .enumerate()
    {
        assert!(*share < LANES, "lane {l}: {share:e}");
    }
}

#[test]
fn three_lanes_are_three_single_runs() {
    let models = three_models();
    let mut lanes = Kernel::<3>::new([&models[0], &models[1], &models[2]]);
    for (l, share) in lanes_against_singles(&mut lanes, &models)
        .iter()
        .enumerate()
    {
        assert!(*share < LANES, "lane {l}: {share:e}");
    }
}

#[test]
fn silence_stays_silent_in_three_lanes() {
    let models = three_models();
    let mut lanes = Kernel::<3>::new([&models[0], &models[1], &models[2]]);
    let mut loudest = [0.0f64; 3];
    for _ in 0..100_000 {
        let y = lanes.step([0.0; 3]);
        for l in 0..3 {
            loudest[l] = loudest[l].max(y[l].abs());
        }
    }
    println!("silent lanes: {loudest:?} V");
    assert!(
        loudest.iter().all(|y| *y < super::linear::SILENCE_V),
        "{loudest:?}"
    );
}
