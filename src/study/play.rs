//! A recording played through gain settings, lane beside lane.

use super::{StudyFault, Watch};
use crate::render::{Kernel, Model};
use crate::resample::Oversampler;

/// What came out of one lane.
pub struct Played {
    /// Volts at the loudspeaker terminals.
    pub output: Vec<f64>,
    /// Most negative and positive mean grid shift of each stage over any block, in volts.
    pub excursion: Vec<(f64, f64)>,
    /// Steps at which a stage left its surface.
    pub strayed: u64,
}

/// Most gain settings stepped together: beyond, the lanes no longer fit the registers.
pub const MOST_LANES: usize = 4;

/// Steps between two looks at the bias.
const LOOK_EVERY: usize = 16;
/// Input frames between two looks at the stop flag.
const PIECE: usize = 1 << 14;

/// Plays `volts` (at the jack) through up to [`MOST_LANES`] models at once.
pub fn play(
    models: &[&Model],
    volts: &[f64],
    oversample: usize,
    watch: &Watch,
    done: &(dyn Fn(usize) + Sync),
) -> Result<Vec<Played>, StudyFault> {
    match *models {
        [a] => lanes([a], volts, oversample, watch, done),
        [a, b] => lanes([a, b], volts, oversample, watch, done),
        [a, b, c] => lanes([a, b, c], volts, oversample, watch, done),
        [a, b, c, d] => lanes([a, b, c, d], volts, oversample, watch, done),
        _ => panic!("callers hand over one to four models"),
    }
}

fn lanes<const L: usize>(
    models: [&Model; L],
    volts: &[f64],
    oversample: usize,
    watch: &Watch,
    done: &(dyn Fn(usize) + Sync),
) -> Result<Vec<Played>, StudyFault> {
    let mut kernel = Kernel::<L>::new(models);
    let stages = kernel.stages();
    let mut excursion = vec![[(0.0f64, 0.0f64); L]; stages];
    let mut stage = |up: &[f64], out: &mut [Vec<f64>; L]| {
        let mut sums = vec![[0.0; L]; stages];
        let mut looks = 0.0;
        for (n, x) in up.iter().enumerate() {
            let y = kernel.step([*x; L]);
            for l in 0..L {
                out[l][n] = y[l];
            }
            if n % LOOK_EVERY == 0 {
                looks += 1.0;
                for (k, sum) in sums.iter_mut().enumerate() {
                    for (l, s) in sum.iter_mut().enumerate() {
                        *s += kernel.observe(k, l).v_gk;
                    }
                }
            }
        }
        for (k, sum) in sums.iter().enumerate() {
            for l in 0..L {
                let shift = sum[l] / looks - models[l].stage_rest[k].v_gk;
                let e = &mut excursion[k][l];
                *e = (e.0.min(shift), e.1.max(shift));
            }
        }
    };
    let oversampler = Oversampler::new(oversample)?;
    let mut stream = oversampler.stream::<L>();
    let mut output: [Vec<f64>; L] = std::array::from_fn(|_| Vec::with_capacity(volts.len()));
    for piece in volts.chunks(PIECE) {
        watch.check()?;
        stream.push(piece, &mut stage, &mut output)?;
        done(piece.len());
    }
    stream.finish(&mut stage, &mut output)?;
    let strayed = kernel.strayed;
    Ok(output
        .into_iter()
        .enumerate()
        .map(|(l, output)| Played {
            output,
            excursion: excursion.iter().map(|e| e[l]).collect(),
            strayed,
        })
        .collect())
}
