//! The first few harmonics of short periods, by direct correlation with kept cosines and sines.
//!
//! Ten lines of a period of some hundred samples cost less this way than the whole transform, above
//! all at lengths with large prime factors such as 383. Samples `m` and `N - m` share a cosine and,
//! but for its sign, a sine: they are added and subtracted first, which halves the work.

use std::cell::RefCell;
use std::f64::consts::TAU;
use std::rc::Rc;

use rustfft::num_complex::Complex64;

/// Bases kept for each thread, most recent last. Chosen: a sweep uses a few lengths in turn.
const KEPT: usize = 8;

thread_local! {
    static CACHE: RefCell<Vec<Rc<Basis>>> = const { RefCell::new(Vec::new()) };
}

/// Cosines and sines of `count` harmonics of a tone with `periods` periods in `len` samples.
#[derive(Debug)]
pub(super) struct Basis {
    len: usize,
    periods: usize,
    count: usize,
    /// Row n: cos(2π n periods m / len) for m = 1..=half, harmonics 1..=count.
    cosines: Vec<f64>,
    /// The same for the sine.
    sines: Vec<f64>,
}

impl Basis {
    /// The basis for this shape, made at its first use in this thread.
    pub(super) fn get(len: usize, periods: usize, count: usize) -> Rc<Basis> {
        CACHE.with(|cache| {
            let mut kept = cache.borrow_mut();
            let found = kept
                .iter()
                .position(|b| b.len == len && b.periods == periods && b.count == count);
            let basis = match found {
                Some(place) => kept.remove(place),
                None => {
                    if kept.len() == KEPT {
                        kept.remove(0);
                    }
                    Rc::new(Basis::new(len, periods, count))
                }
            };
            kept.push(Rc::clone(&basis));
            basis
        })
    }

    fn new(len: usize, periods: usize, count: usize) -> Basis {
        let half = (len - 1) / 2;
        let mut cosines = Vec::with_capacity(count * half);
        let mut sines = Vec::with_capacity(count * half);
        for n in 1..=count {
            for m in 1..=half {
                // Reduced in whole numbers, so that the angle keeps its full precision.
                let turns = (n * periods * m) % len;
                let (sin, cos) = (TAU * turns as f64 / len as f64).sin_cos();
                cosines.push(cos);
                sines.push(sin);
            }
        }
        Basis {
            len,
            periods,
            count,
            cosines,
            sines,
        }
    }

    fn half(&self) -> usize {
        (self.len - 1) / 2
    }

    /// Harmonics 1..=count of `samples` less their `mean`, and the mean squares beside them.
    pub(super) fn lines(&self, samples: &[f64], mean: f64) -> Lines {
        assert_eq!(samples.len(), self.len, "a basis serves one length");
        let half = self.half();
        let front = samples[1..=half].iter();
        let back = samples[self.len - half..].iter().rev();
        let (sums, differences): (Vec<f64>, Vec<f64>) = front
            .zip(back)
            .map(|(&a, &b)| ((a - mean) + (b - mean), a - b))
            .unzip();
        let first = samples[0] - mean;
        let middle = self
            .len
            .is_multiple_of(2)
            .then(|| samples[self.len / 2] - mean);
        let sign_at_middle = |n: usize| if n * self.periods % 2 == 1 { -1.0 } else { 1.0 };
        let scale = 2.0 / self.len as f64;
        let amplitudes: Vec<Complex64> = (1..=self.count)
            .map(|n| {
                let row = (n - 1) * half..n * half;
                let re = first
                    + dot(&self.cosines[row.clone()], &sums)
                    + middle.map_or(0.0, |x| sign_at_middle(n) * x);
                let im = -dot(&self.sines[row], &differences);
                Complex64::new(re, im) * scale
            })
            .collect();

        // Samples m and N - m: x² + y² = ((x + y)² + (x - y)²)/2, before and after taking out the
        // fundamental, whose sum is 2 re cos and whose difference is -2 im sin.
        let fundamental = amplitudes[0];
        let (re, im) = (2.0 * fundamental.re, -2.0 * fundamental.im);
        let paired = 0.5 * (dot(&sums, &sums) + dot(&differences, &differences));
        let paired_residual = 0.5
            * (sum_of_squared_remainders(&sums, re, &self.cosines[..half])
                + sum_of_squared_remainders(&differences, im, &self.sines[..half]));
        let unpaired = first.powi(2) + middle.map_or(0.0, |x| x.powi(2));
        let unpaired_residual = (first - fundamental.re).powi(2)
            + middle.map_or(0.0, |x| (x - sign_at_middle(1) * fundamental.re).powi(2));
        Lines {
            amplitudes,
            ac_mean_square: (paired + unpaired) / self.len as f64,
            residual_mean_square: (paired_residual + unpaired_residual) / self.len as f64,
        }
    }
}

/// What one pass over a period finds.
#[derive(Clone, Debug)]
pub(super) struct Lines {
    /// Complex peak amplitudes of harmonics 1, 2, ...
    pub(super) amplitudes: Vec<Complex64>,
    /// Mean square without DC.
    pub(super) ac_mean_square: f64,
    /// Mean square without DC and fundamental. The fundamental is taken out of the samples: the
    /// difference of two mean squares would lose half the digits.
    pub(super) residual_mean_square: f64,
}

/// Σ (a - scale b)², in eight partial sums.
fn sum_of_squared_remainders(a: &[f64], scale: f64, b: &[f64]) -> f64 {
    let (a_blocks, a_rest) = a.as_chunks::<8>();
    let (b_blocks, b_rest) = b.as_chunks::<8>();
    let mut parts = [0.0; 8];
    for (x, y) in a_blocks.iter().zip(b_blocks) {
        for lane in 0..8 {
            let r = x[lane] - scale * y[lane];
            parts[lane] += r * r;
        }
    }
    let rest = a_rest
        .iter()
        .zip(b_rest)
        .map(|(x, y)| (x - scale * y).powi(2));
    parts.iter().sum::<f64>() + rest.sum::<f64>()
}

/// Dot product in eight partial sums, which the compiler keeps in vector registers.
fn dot(a: &[f64], b: &[f64]) -> f64 {
    let (a_blocks, a_rest) = a.as_chunks::<8>();
    let (b_blocks, b_rest) = b.as_chunks::<8>();
    let mut parts = [0.0; 8];
    for (x, y) in a_blocks.iter().zip(b_blocks) {
        for lane in 0..8 {
            parts[lane] += x[lane] * y[lane];
        }
    }
    let rest: f64 = a_rest.iter().zip(b_rest).map(|(x, y)| x * y).sum();
    parts.iter().sum::<f64>() + rest
}
