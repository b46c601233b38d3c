//! The core figures of one tone at one gain setting.

use super::entry::{NineFigures, Nullable, objects};
use crate::measure::harmonics::HarmonicReport;
use crate::report::phrase::{dbfs, dbv};
use crate::trial::figures::{ClippingOnset, Figure, StageHeadroom, ToneFigures};

objects! {
    /// Levels are at the jack; the figures without a level in their name stand at the test level.
    ToneEntry {
        tone_hz: f64,
        nominal_hz: f64,
        settled: bool,
        thd_percent: Nullable<f64>,
        thd_total_percent: Nullable<f64>,
        residual_percent: Nullable<f64>,
        harmonics_dbc: Nullable<NineFigures>,
        harmonics_phase_deg: Nullable<NineFigures>,
        stages: Vec<StageDistortion>,
        clipping_onset: Nullable<Onset>,
        input_v_peak_for_thd: Vec<ThdInput>,
        compression_1db_input_v_peak: Nullable<f64>,
        gain_db: Nullable<f64>,
        output_v_rms: f64,
        output_w: f64,
        power: PowerEntry,
        headroom: Vec<Headroom>,
    }
    /// Signed, in percent of the fundamental at the plate.
    StageDistortion {
        stage: String,
        h2_percent: Nullable<f64>,
        h3_percent: Nullable<f64>,
        bias_shift_v: f64,
    }
    Onset {
        input_v_peak: f64,
        input_dbv: f64,
        input_dbfs: f64,
        stage: String,
        mechanism: &'static str,
    }
    ThdInput {
        percent: f64,
        input_v_peak: Nullable<f64>,
        crossings: usize,
    }
    PowerEntry {
        at_onset_w: Nullable<f64>,
        at_5_percent_w: Nullable<f64>,
        at_10_percent_w: Nullable<f64>,
        max_w: f64,
    }
    Headroom {
        stage: String,
        mechanism: Nullable<&'static str>,
        input_v_peak: Nullable<f64>,
        to_next_db: Nullable<f64>,
        grid_mark_input_v_peak: Nullable<f64>,
    }
}

/// What the figures of a tone are put in relation to.
pub(super) struct Frame<'a> {
    pub full_scale_v_peak: f64,
    /// Half of it is where harmonics end.
    pub rate_hz: f64,
    pub stages: &'a [String],
}

pub(super) fn figure<T: Copy>(figure: &Figure<T>) -> Nullable<T> {
    figure.map_err(|missing| missing.word())
}

impl Frame<'_> {
    fn stage(&self, k: usize) -> String {
        self.stages
            .get(k)
            .cloned()
            .unwrap_or_else(|| format!("stage {k}"))
    }

    pub(super) fn tone(&self, t: &ToneFigures) -> ToneEntry {
        let harmonics = t.test.harmonics.as_ref().map_err(|missing| missing.word());
        let percent = |read: fn(&HarmonicReport) -> f64| harmonics.map(read);
        let nine = |read: fn(&HarmonicReport) -> [Option<f64>; 9]| {
            harmonics.map(|h| self.nine(t.tone_hz, read(h)))
        };
        let stages = t.test.stages.iter().enumerate();
        ToneEntry {
            tone_hz: t.tone_hz,
            nominal_hz: t.nominal_hz,
            settled: t.test.settled,
            thd_percent: percent(|h| h.thd_percent),
            thd_total_percent: percent(|h| h.thd_total_percent),
            residual_percent: percent(|h| h.residual_percent),
            harmonics_dbc: nine(|h| h.harmonics_dbc),
            harmonics_phase_deg: nine(|h| h.phases_deg),
            stages: stages
                .map(|(k, s)| StageDistortion {
                    stage: self.stage(k),
                    h2_percent: figure(&s.h2_percent),
                    h3_percent: figure(&s.h3_percent),
                    bias_shift_v: s.bias_shift_v,
                })
                .collect(),
            clipping_onset: t
                .onset
                .as_ref()
                .map(|o| self.onset(o))
                .map_err(|missing| missing.word()),
            input_v_peak_for_thd: t
                .thd_inputs
                .iter()
                .map(|c| ThdInput {
                    percent: c.percent,
                    input_v_peak: figure(&c.input_v_peak),
                    crossings: c.crossings,
                })
                .collect(),
            compression_1db_input_v_peak: figure(&t.compression_1db_v_peak),
            gain_db: figure(&t.test.gain_db),
            output_v_rms: t.test.output_v_rms,
            output_w: t.test.output_w,
            power: PowerEntry {
                at_onset_w: figure(&t.power.at_onset_w),
                at_5_percent_w: figure(&t.power.at_5_percent_w),
                at_10_percent_w: figure(&t.power.at_10_percent_w),
                max_w: t.power.max_w,
            },
            headroom: t.headroom.iter().map(|h| self.headroom(h)).collect(),
        }
    }

    fn nine(&self, tone_hz: f64, figures: [Option<f64>; 9]) -> NineFigures {
        NineFigures(std::array::from_fn(|i| {
            let above_band = (i + 2) as f64 * tone_hz >= 0.5 * self.rate_hz;
            figures[i].ok_or(if above_band {
                "above-band"
            } else {
                "below-rounding"
            })
        }))
    }

    fn onset(&self, onset: &ClippingOnset) -> Onset {
        Onset {
            input_v_peak: onset.input_v_peak,
            input_dbv: dbv(onset.input_v_peak),
            input_dbfs: dbfs(onset.input_v_peak, self.full_scale_v_peak),
            stage: self.stage(onset.stage),
            mechanism: onset.mechanism.word(),
        }
    }

    fn headroom(&self, h: &StageHeadroom) -> Headroom {
        Headroom {
            stage: self.stage(h.stage),
            mechanism: figure(&h.first).map(|(_, mechanism)| mechanism.word()),
            input_v_peak: figure(&h.first).map(|(input, _)| input),
            to_next_db: match (h.to_next_db, &h.first) {
                (Some(db), _) => Ok(db),
                (None, Ok(_)) => Err("last-to-clip"),
                (None, Err(missing)) => Err(missing.word()),
            },
            grid_mark_input_v_peak: figure(&h.grid_mark_v_peak),
        }
    }
}
