//! What a microphone would hear of the loudspeaker: a last step that no figure includes.

use rustfft::FftPlanner;
use rustfft::num_complex::Complex64;

/// Corners of the plain band-limit, in hertz: a guitar loudspeaker in a small open cabinet. Chosen.
pub const LISTENING_BAND_HZ: (f64, f64) = (90.0, 4500.0);

/// A plain guitar loudspeaker: second-order Butterworth high-pass, fourth-order Butterworth low-pass.
///
/// ```text
/// H(s) = s²/(s² + √2·ωl·s + ωl²) · Π ωh²/(s² + ωh·s/Qk + ωh²),   Q = 0.5412, 1.3066
/// ```
///
/// with ωl, ωh from [`LISTENING_BAND_HZ`], each section by the bilinear transform with its corner
/// prewarped. Where the upper corner lies above 0.45 of the rate it is left out.
pub fn band_limit(samples: &[f64], rate: f64) -> Vec<f64> {
    let (low, high) = LISTENING_BAND_HZ;
    let mut out = samples.to_vec();
    Biquad::high_pass(low, std::f64::consts::FRAC_1_SQRT_2, rate).run(&mut out);
    if high < 0.45 * rate {
        for q in [0.541_196_100_146_197, 1.306_562_964_876_376_5] {
            Biquad::low_pass(high, q, rate).run(&mut out);
        }
    }
    out
}

struct Biquad {
    b: [f64; 3],
    a: [f64; 2],
}

impl Biquad {
    fn low_pass(hz: f64, q: f64, rate: f64) -> Biquad {
        let k = (std::f64::consts::PI * hz / rate).tan();
        let norm = 1.0 / (1.0 + k / q + k * k);
        let b = k * k * norm;
        Biquad {
            b: [b, 2.0 * b, b],
            a: [2.0 * (k * k - 1.0) * norm, (1.0 - k / q + k * k) * norm],
        }
    }

    fn high_pass(hz: f64, q: f64, rate: f64) -> Biquad {
        let k = (std::f64::consts::PI * hz / rate).tan();
        let norm = 1.0 / (1.0 + k / q + k * k);
        Biquad {
            b: [norm, -2.0 * norm, norm],
            a: [2.0 * (k * k - 1.0) * norm, (1.0 - k / q + k * k) * norm],
        }
    }

    fn run(&self, samples: &mut [f64]) {
        // Below this the tail is silence; it keeps the recursion out of denormals.
        const SILENCE: f64 = 1e-30;
        let (mut s1, mut s2) = (0.0f64, 0.0f64);
        for x in samples {
            let y = self.b[0] * *x + s1;
            s1 = self.b[1] * *x - self.a[0] * y + s2;
            s2 = self.b[2] * *x - self.a[1] * y;
            if s1.abs() < SILENCE {
                s1 = 0.0;
            }
            if s2.abs() < SILENCE {
                s2 = 0.0;
            }
            *x = y;
        }
    }
}

/// Convolves with an impulse response of the same rate; as long as the input, starting with it.
///
/// Overlap-add with transforms of at least four times the response.
pub fn convolve(samples: &[f64], response: &[f64]) -> Vec<f64> {
    if response.is_empty() || samples.is_empty() {
        return vec![0.0; samples.len()];
    }
    let size = (4 * response.len()).next_power_of_two().max(1024);
    let block = size - response.len() + 1;
    let mut planner = FftPlanner::new();
    let (forward, inverse) = (
        planner.plan_fft_forward(size),
        planner.plan_fft_inverse(size),
    );
    let padded = |x: &[f64]| {
        let mut z: Vec<Complex64> = x.iter().map(|v| Complex64::new(*v, 0.0)).collect();
        z.resize(size, Complex64::default());
        z
    };
    let mut h = padded(response);
    forward.process(&mut h);
    let mut out = vec![0.0; samples.len()];
    for (k, piece) in samples.chunks(block).enumerate() {
        let mut z = padded(piece);
        forward.process(&mut z);
        for (z, h) in z.iter_mut().zip(&h) {
            *z *= h / size as f64;
        }
        inverse.process(&mut z);
        for (slot, z) in out[k * block..].iter_mut().zip(&z) {
            *slot += z.re;
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn convolution_is_the_plain_sum() {
        let x: Vec<f64> = (0..3000).map(|k| ((k * k) as f64 * 0.01).sin()).collect();
        let h: Vec<f64> = (0..300)
            .map(|k| (-(k as f64) / 50.0).exp() * (k as f64 * 0.7).cos())
            .collect();
        let y = convolve(&x, &h);
        for n in [0, 5, 299, 1000, 2999] {
            let direct: f64 = (0..h.len().min(n + 1)).map(|k| h[k] * x[n - k]).sum();
            assert!((y[n] - direct).abs() < 1e-10);
        }
    }

    #[test]
    fn the_band_limit_is_3_db_down_at_its_corners() {
        let rate = 48e3;
        for hz in [LISTENING_BAND_HZ.0, LISTENING_BAND_HZ.1] {
            let x: Vec<f64> = (0..96_000)
                .map(|k| (std::f64::consts::TAU * hz * k as f64 / rate).sin())
                .collect();
            let y = band_limit(&x, rate);
            let rms = (y[48_000..].iter().map(|v| v * v).sum::<f64>() / 48_000.0).sqrt();
            let db = 20.0 * (rms * 2f64.sqrt()).log10();
            assert!((db + 3.01).abs() < 0.05, "{hz} Hz: {db}");
        }
    }
}
