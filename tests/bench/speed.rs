//! Speed as ratios within one run: `cargo run --release -p forehear-bench`.
//!
//! Every figure is the least of several interleaved passes, so that a busy machine spoils a pass and not a
//! ratio. Two triode sections and a pentode, 48 kHz mono, 8 times oversampled, one thread.

use std::hint::black_box;
use std::time::{Duration, Instant};

use forehear::render::{Kernel, Model};
use forehear::resample::Oversampler;
use forehear::stage::amplifier::Amplifier;
use forehear::stage::resolve;
use forehear::stage::wiring::LoadKind;
use forehear::trial::steady::{Shooter, Tone};
use forehear::trial::tone;
use forehear::tube::Catalog;
use forehear::{design, signal, wav};

const OVERSAMPLE: usize = 8;
/// Many short passes: on a busy machine a long one is never left alone, and a ratio of a long to a short one lies.
const PASSES: usize = 40;
const STEADY_PASSES: usize = 5;
/// The part of the take that is played, in seconds.
const PART_S: (f64, f64) = (1.0, 1.4);

fn timed(least: &mut Duration, work: impl FnOnce()) {
    let start = Instant::now();
    work();
    *least = (*least).min(start.elapsed());
}

fn main() {
    let text = design::shipped()
        .iter()
        .find(|(name, _)| *name == "corner-room")
        .expect("shipped")
        .1;
    let reading = design::read(text, &[]).expect("shipped designs are valid");
    let catalog = Catalog::shipped();
    let prepared = resolve::prepare(&reading.design, &reading.places, &catalog, &|_| None)
        .expect("shipped designs resolve");
    let di = wav::read(signal::DEFAULT_DI).expect("the embedded recording is valid");
    let frame = |s: f64| (s * 48e3) as usize;
    let input = &di.channels[0][frame(PART_S.0)..frame(PART_S.1)];
    let rate = 48e3 * OVERSAMPLE as f64;
    let amps: Vec<Amplifier> = [2.0, 5.0, 10.0]
        .iter()
        .map(|g| {
            Amplifier::solve(
                &prepared.design,
                &prepared.devices,
                &prepared.iron,
                Some(*g),
                LoadKind::Rated,
            )
            .expect("shipped designs settle")
        })
        .collect();
    let models: Vec<Model> = amps
        .iter()
        .map(|a| Model::new(a, rate, 1.0).expect("shipped designs rest"))
        .collect();
    let oversampler = Oversampler::new(OVERSAMPLE).expect("8 is a factor");

    let mut bare = Duration::MAX;
    let mut one = Duration::MAX;
    let mut three = Duration::MAX;
    let mut building = Duration::MAX;
    let mut surfaces = Duration::MAX;
    for _ in 0..PASSES {
        timed(&mut bare, || {
            black_box(oversampler.process(input, |_| {}).expect("finite"));
        });
        timed(&mut one, || {
            let mut kernel = Kernel::<1>::new([&models[1]]);
            let out = oversampler.process(input, |block| {
                for x in block {
                    *x = kernel.step([*x])[0];
                }
            });
            black_box(out.expect("finite"));
        });
        timed(&mut three, || {
            let mut kernel = Kernel::<3>::new([&models[0], &models[1], &models[2]]);
            let out = oversampler.process_lanes::<3>(input, |up, lanes| {
                for (n, x) in up.iter().enumerate() {
                    let y = kernel.step([*x; 3]);
                    for l in 0..3 {
                        lanes[l][n] = y[l];
                    }
                }
            });
            black_box(out.expect("finite"));
        });
        timed(&mut building, || {
            black_box(Model::new(&amps[1], rate, 1.0).expect("rests"));
        });
        timed(&mut surfaces, || {
            black_box(Model::surfaces_only(&amps[1], rate, 1.0));
        });
    }
    let seconds = input.len() as f64 / 48e3;
    let bare_s = bare.as_secs_f64();
    println!("part of the take              {seconds:.2} s");
    println!(
        "bare up and down              {:.1} times real time",
        seconds / bare_s
    );
    println!(
        "one render                    {:.1} times real time, {:.1} times bare",
        seconds / one.as_secs_f64(),
        one.as_secs_f64() / bare_s
    );
    println!(
        "three gain settings in lanes  {:.1} times real time, {:.1} times bare per setting",
        seconds / three.as_secs_f64(),
        three.as_secs_f64() / bare_s / 3.0
    );
    println!(
        "surfaces of three stages      {:.2} ms",
        1e3 * surfaces.as_secs_f64()
    );
    println!(
        "whole model with its rest     {:.2} ms",
        1e3 * building.as_secs_f64()
    );

    let model = Model::new(&amps[1], rate, tone::HIGHEST_LEVEL_V).expect("rests");
    let mut least = Duration::MAX;
    let levels = tone::levels();
    let mut periods = 0;
    for _ in 0..STEADY_PASSES {
        let mut shooter = Shooter::new(&model, Tone::new(1000.0, rate));
        periods = 0;
        timed(&mut least, || {
            for level in &levels {
                periods += black_box(shooter.steady(*level)).periods;
            }
        });
    }
    println!(
        "steady state at 1 kHz         {:.3} ms a point over {} levels, {:.1} periods a point",
        1e3 * least.as_secs_f64() / levels.len() as f64,
        levels.len(),
        periods as f64 / levels.len() as f64
    );
}
