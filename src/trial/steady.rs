//! Periodic steady state by shooting.

use nalgebra::{DMatrix, DVector};

use crate::render::{Kernel, Model, Observation};

/// A settled period.
#[derive(Clone, Debug)]
pub struct Cycle {
    /// Volts at the loudspeaker terminals, one per step.
    pub output: Vec<f64>,
    /// What each stage's tube did: `stages[stage][step]`.
    pub stages: Vec<Vec<Observation>>,
    pub settled: bool,
    /// Periods that were run to get here.
    pub periods: usize,
}

/// A tone with a whole number of steps to the period.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Tone {
    pub nominal_hz: f64,
    pub steps: usize,
    pub hz: f64,
}

impl Tone {
    /// The nearest tone whose period is an odd number of steps.
    ///
    /// An odd number keeps the tone off the divisors of the base rate. What lies above half the oversampled
    /// rate folds onto the harmonics; the alias figure, taken with a tone of many periods to the window,
    /// shows how little that is.
    pub fn new(nominal_hz: f64, rate: f64) -> Tone {
        let half = (rate / nominal_hz / 2.0 - 0.5).round().max(4.0);
        let steps = 2 * half as usize + 1;
        Tone {
            nominal_hz,
            steps,
            hz: rate / steps as f64,
        }
    }
}

/// Residual that counts as settled: volts, and amperes of inductors times 1000.
///
/// Ten microvolts on a cathode or a coupling capacitor move THD by far less than 0.001 point.
const SETTLED: f64 = 1e-5;
/// A state forgotten to this share after one period follows by itself.
const FORGOTTEN: f64 = 1e-3;
/// Quasi-Newton steps before the Jacobian is taken anew.
const STEPS_PER_JACOBIAN: usize = 8;
const JACOBIANS: usize = 4;
/// Periods of plain waiting when shooting does not settle.
const PATIENCE: usize = 400;

/// Finds steady states of one amplifier, warm-started from one call to the next.
pub struct Shooter<'a> {
    model: &'a Model,
    kernel: Kernel<1>,
    tone: Tone,
    sine: Vec<f64>,
    /// States that remember the last period.
    slow: Vec<usize>,
    scale: Vec<f64>,
    jacobian: Option<DMatrix<f64>>,
    uses: usize,
    periods: usize,
}

impl<'a> Shooter<'a> {
    /// At rest; finds which states are slow at this tone.
    pub fn new(model: &'a Model, tone: Tone) -> Shooter<'a> {
        let kernel = Kernel::<1>::new([model]);
        let sine = (0..tone.steps)
            .map(|k| (std::f64::consts::TAU * k as f64 / tone.steps as f64).sin())
            .collect();
        let scale = model.state_scales();
        let mut shooter = Shooter {
            model,
            kernel,
            tone,
            sine,
            slow: (0..model.rest.len()).collect(),
            scale,
            jacobian: None,
            uses: 0,
            periods: 0,
        };
        let rest = shooter.kernel.state(0);
        let map = shooter.differences(0.0, &rest);
        shooter.slow = (0..rest.len())
            .filter(|&j| (0..rest.len()).any(|i| map[(i, j)].abs() > FORGOTTEN))
            .collect();
        shooter.reset();
        shooter
    }

    pub fn tone(&self) -> Tone {
        self.tone
    }

    /// Back to rest.
    pub fn reset(&mut self) {
        self.kernel.reset([self.model]);
        self.jacobian = None;
    }

    /// The state as the last call left it.
    pub fn state(&self) -> Vec<f64> {
        self.kernel.state(0)
    }

    /// Goes on from a state that [`Shooter::state`] gave at another level.
    pub fn resume(&mut self, state: &[f64]) {
        self.kernel.set_state(0, state);
    }

    pub fn model(&self) -> &Model {
        self.model
    }

    fn period(&mut self, level: f64) {
        for s in &self.sine {
            self.kernel.step([level * s]);
        }
        self.periods += 1;
    }

    /// Slopes of the period map over the slow states, in scaled units.
    fn differences(&mut self, level: f64, from: &[f64]) -> DMatrix<f64> {
        let slow = self.slow.clone();
        let n = slow.len();
        self.kernel.set_state(0, from);
        self.period(level);
        let base = self.kernel.state(0);
        let mut map = DMatrix::zeros(n, n);
        for (column, &j) in slow.iter().enumerate() {
            let nudge = 1e-4 * self.scale[j];
            let mut state = from.to_vec();
            state[j] += nudge;
            self.kernel.set_state(0, &state);
            self.period(level);
            let moved = self.kernel.state(0);
            for (row, &i) in slow.iter().enumerate() {
                map[(row, column)] = (moved[i] - base[i]) / self.scale[i] / 1e-4;
            }
        }
        map
    }

    fn residual(&self, before: &[f64], after: &[f64]) -> DVector<f64> {
        DVector::from_iterator(
            self.slow.len(),
            self.slow
                .iter()
                .map(|&i| (after[i] - before[i]) / self.scale[i]),
        )
    }

    /// The settled period at a peak input of `level` volts, and whether it settled.
    ///
    /// Newton's method on x ↦ period(x) − x over the slow states with a difference Jacobian, kept up by
    /// Broyden's rank-one updates from step to step and level to level; the fast states follow by
    /// themselves. When that fails the amplifier is simply left running for a while.
    pub fn steady(&mut self, level: f64) -> Cycle {
        let started = self.periods;
        let mut settled = self.shoot(level);
        if !settled {
            // From rest by doublings: a far level is out of reach of one tangent.
            self.reset();
            settled = (0..=6)
                .rev()
                .map(|k| self.shoot(level * 0.5f64.powi(k)))
                .last()
                .unwrap_or(false);
        }
        if !settled {
            self.jacobian = None;
            for _ in 0..PATIENCE {
                let before = self.kernel.state(0);
                self.period(level);
                let after = self.kernel.state(0);
                if self.residual(&before, &after).amax() < SETTLED {
                    settled = true;
                    break;
                }
            }
        }
        self.record(level, settled, started)
    }

    fn shoot(&mut self, level: f64) -> bool {
        for attempt in 0..JACOBIANS {
            if self.uses >= 7 * STEPS_PER_JACOBIAN || attempt > 0 {
                self.jacobian = None;
            }
            let mut x = self.kernel.state(0);
            if self.jacobian.is_none() {
                // One period first: the fast states and the iterations' memories catch up with the level.
                self.period(level);
                x = self.kernel.state(0);
                let mut j = self.differences(level, &x);
                for k in 0..j.nrows() {
                    j[(k, k)] -= 1.0;
                }
                self.jacobian = Some(j);
                self.uses = 0;
                self.kernel.set_state(0, &x);
            }
            self.period(level);
            let mut image = self.kernel.state(0);
            let mut f = self.residual(&x, &image);
            let mut smallest = f.amax();
            for _ in 0..STEPS_PER_JACOBIAN {
                if f.amax() < SETTLED {
                    return true;
                }
                self.uses += 1;
                let Some(j) = &self.jacobian else { break };
                let Some(step) = j.clone().lu().solve(&(-&f)) else {
                    break;
                };
                if !step.amax().is_finite() || step.amax() > 200.0 {
                    break;
                }
                let mut next = image.clone();
                for (k, &i) in self.slow.iter().enumerate() {
                    next[i] = x[i] + step[k] * self.scale[i];
                }
                self.kernel.set_state(0, &next);
                self.period(level);
                let next_image = self.kernel.state(0);
                let next_f = self.residual(&next, &next_image);
                if !next_f.amax().is_finite() {
                    self.kernel.reset([self.model]);
                    break;
                }
                if let Some(j) = &mut self.jacobian {
                    let change = &next_f - &f - &*j * &step;
                    let size = step.norm_squared();
                    if size > 0.0 {
                        *j += change * step.transpose() / size;
                    }
                }
                x = next;
                image = next_image;
                f = next_f;
                if f.amax() > 10.0 * smallest.max(SETTLED) {
                    break;
                }
                smallest = smallest.min(f.amax());
            }
        }
        false
    }

    fn record(&mut self, level: f64, settled: bool, started: usize) -> Cycle {
        let stages = self.kernel.stages();
        let mut output = Vec::with_capacity(self.tone.steps);
        let mut traces = vec![Vec::with_capacity(self.tone.steps); stages];
        for k in 0..self.sine.len() {
            output.push(self.kernel.step([level * self.sine[k]])[0]);
            for (s, trace) in traces.iter_mut().enumerate() {
                trace.push(self.kernel.observe(s, 0));
            }
        }
        self.periods += 1;
        Cycle {
            output,
            stages: traces,
            settled,
            periods: self.periods - started,
        }
    }

    /// The kernel as the last call left it, for trials that go on from a settled bias.
    pub fn kernel(&mut self) -> &mut Kernel<1> {
        &mut self.kernel
    }
}
