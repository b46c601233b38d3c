//! What a trial finds.

use crate::measure::harmonics::HarmonicReport;

/// Why a figure does not exist.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Missing {
    /// Not reached up to the highest input that was tried.
    NotReached,
    /// Already past it at the lowest input that was tried.
    AlreadyPast,
    /// Silence, or nothing at the fundamental.
    NoSignal,
    /// The steady state did not settle at the level in question.
    NotSettled,
    /// At or above half the sample rate.
    AboveBand,
    /// No such thing in this design.
    NotPresent,
}

impl Missing {
    pub fn word(self) -> &'static str {
        match self {
            Missing::NotReached => "not-reached",
            Missing::AlreadyPast => "already-past",
            Missing::NoSignal => "no-signal",
            Missing::NotSettled => "not-settled",
            Missing::AboveBand => "above-band",
            Missing::NotPresent => "not-present",
        }
    }
}

/// A figure, or why there is none.
pub type Figure<T> = Result<T, Missing>;

/// One tone at one level, settled.
#[derive(Clone, Debug, PartialEq)]
pub struct LevelFigures {
    /// At the jack.
    pub input_v_peak: f64,
    /// At the loudspeaker terminals, everything but DC.
    pub output_v_rms: f64,
    /// Into the load's resistance, everything but DC.
    pub output_w: f64,
    /// Fundamental out over input, dB.
    pub gain_db: Figure<f64>,
    pub harmonics: Figure<HarmonicReport>,
    /// One per stage.
    pub stages: Vec<StageLevel>,
    pub settled: bool,
}

/// One stage at one level.
#[derive(Clone, Debug, PartialEq)]
pub struct StageLevel {
    /// Mean grid volts to the cathode, less their value at rest.
    pub bias_shift_v: f64,
    /// Second and third harmonic of the plate's volts, signed, percent of their fundamental.
    pub h2_percent: Figure<f64>,
    pub h3_percent: Figure<f64>,
    /// Peak of the plate volts' swing.
    pub plate_v_peak: f64,
    pub plate_watts: f64,
    pub screen_watts: f64,
    pub plate_amperes: f64,
    pub screen_amperes: f64,
    pub grid_amperes: f64,
    /// Mean grid volts to the cathode.
    pub v_gk_mean: f64,
    /// How far this stage has gone towards each limit; 1 is the limit.
    pub towards: Towards,
}

/// Measures of the limits of one stage: each reaches 1 where the limit counts as met.
#[derive(Clone, Copy, Debug, Default, PartialEq)]
pub struct Towards {
    pub grid_conduction: f64,
    pub plate_knee: f64,
    pub cutoff: f64,
}

/// How a stage first clips.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Mechanism {
    GridConduction,
    PlateKnee,
    Cutoff,
}

impl Mechanism {
    pub fn word(self) -> &'static str {
        match self {
            Mechanism::GridConduction => "grid-conduction",
            Mechanism::PlateKnee => "plate-knee",
            Mechanism::Cutoff => "cutoff",
        }
    }
}

/// Lowest input at which any stage meets one of its limits.
#[derive(Clone, Debug, PartialEq)]
pub struct ClippingOnset {
    pub input_v_peak: f64,
    pub stage: usize,
    pub mechanism: Mechanism,
}

/// First limit of one stage.
#[derive(Clone, Debug, PartialEq)]
pub struct StageHeadroom {
    pub stage: usize,
    pub first: Figure<(f64, Mechanism)>,
    /// dB of input between this stage's first limit and the next stage's to clip; `None` for the last.
    pub to_next_db: Option<f64>,
    /// Input at which mean grid current reaches +0.3 µA (the mark European sheets use).
    pub grid_mark_v_peak: Figure<f64>,
}

/// Input for a stated THD.
#[derive(Clone, Debug, PartialEq)]
pub struct ThdCrossing {
    pub percent: f64,
    /// First upward crossing.
    pub input_v_peak: Figure<f64>,
    /// How often the curve crosses, up and down, over the levels tried.
    pub crossings: usize,
}

/// Output power at stated points, watts into the rated resistance.
#[derive(Clone, Debug, PartialEq)]
pub struct Power {
    pub at_onset_w: Figure<f64>,
    pub at_5_percent_w: Figure<f64>,
    pub at_10_percent_w: Figure<f64>,
    /// The most at any level tried.
    pub max_w: f64,
}

/// Everything about one tone at one gain setting.
#[derive(Clone, Debug, PartialEq)]
pub struct ToneFigures {
    pub nominal_hz: f64,
    /// What was used: a whole number of steps to the period.
    pub tone_hz: f64,
    /// At the test level.
    pub test: LevelFigures,
    /// Over levels, rising.
    pub levels: Vec<LevelFigures>,
    pub onset: Figure<ClippingOnset>,
    pub headroom: Vec<StageHeadroom>,
    /// For 1, 3, 5 and 10 %.
    pub thd_inputs: Vec<ThdCrossing>,
    pub compression_1db_v_peak: Figure<f64>,
    pub power: Power,
}

/// Small-signal response from jack to loudspeaker terminals.
#[derive(Clone, Debug, PartialEq)]
pub struct Response {
    /// (Hz, dB re the gain at 1 kHz), rising.
    pub points: Vec<(f64, f64)>,
    pub gain_1khz_db: f64,
    /// −3 dB re the highest point between 20 Hz and 20 kHz, nearest to it on either side.
    pub low_3db_hz: Figure<f64>,
    pub high_3db_hz: Figure<f64>,
}

/// Aliases of one rendered tone.
#[derive(Clone, Debug, PartialEq)]
pub struct Alias {
    pub tone_hz: f64,
    pub input_v_peak: f64,
    /// Worst line below 20 kHz that is no harmonic, dB re the fundamental.
    pub worst_dbc: Figure<f64>,
    pub worst_hz: Figure<f64>,
}
