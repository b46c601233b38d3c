//! What a study hands to the reports.

use crate::diagnostic::Code;
use crate::stage::operating_point::OperatingPoint;
use crate::stage::ratings::RatingCheck;
pub use crate::stage::transfer::{PlateDiagram, TransferCurve, TransferPoint};
use crate::trial::figures::{Alias, Figure, Response, ToneFigures};

/// A finding that the builder must see before any figure.
#[derive(Clone, Debug, PartialEq)]
pub struct Warning {
    pub code: Code,
    /// Dotted path or stage name.
    pub place: String,
    pub message: String,
}

/// What `forehear bias` shows.
#[derive(Clone, Debug, PartialEq)]
pub struct BiasStudy {
    pub design: String,
    pub description: String,
    /// Gain setting at which the worst drive was sought.
    pub gain: Option<f64>,
    pub point: OperatingPoint,
    /// Idle, cold start, and the worst over drive.
    pub ratings: Vec<RatingCheck>,
    pub warnings: Vec<Warning>,
}

/// One stage's transfer curve and plate diagram, as `forehear curve` shows them.
#[derive(Clone, Debug, PartialEq)]
pub struct CurveStudy {
    pub design: String,
    pub stage: String,
    pub tube: String,
    pub transfer: TransferCurve,
    pub diagram: PlateDiagram,
    pub warnings: Vec<Warning>,
}

/// What `forehear render` found, apart from the sound.
#[derive(Clone, Debug, PartialEq)]
pub struct RenderStudy {
    pub design: String,
    pub description: String,
    pub full_scale_v_peak: f64,
    pub test_level_v_peak: f64,
    pub tone_hz: f64,
    pub oversample: usize,
    /// 48 kHz times the oversampling: the rate of every figure.
    pub rate_hz: f64,
    pub di: DiFacts,
    /// Factor applied to every WAV of the set, in dB; the WAVs' full scale then stands for `wav_full_scale_v`.
    pub scale_db: f64,
    pub wav_full_scale_v_peak: f64,
    pub load_ohms: f64,
    /// What the renders drive: "loudspeaker" or "resistance".
    pub render_load: String,
    /// What the listening copy went through, one phrase.
    pub listening: String,
    pub point: OperatingPoint,
    pub ratings: Vec<RatingCheck>,
    pub gain_settings: Vec<GainFigures>,
    /// One per stage, at the first gain setting.
    pub transfer: Vec<TransferCurve>,
    pub warnings: Vec<Warning>,
}

/// The recording that was played in.
#[derive(Clone, Debug, PartialEq)]
pub struct DiFacts {
    pub name: String,
    pub rate_hz: u32,
    pub frames: usize,
    pub channels: usize,
    /// Volts at the jack.
    pub peak_v: f64,
    pub rms_v: f64,
}

/// One gain setting.
#[derive(Clone, Debug, PartialEq)]
pub struct GainFigures {
    /// `None`: the design has no gain control.
    pub setting: Option<f64>,
    /// File names within the set.
    pub wav: Option<String>,
    pub listening_wav: Option<String>,
    /// The headline tone first, then 82.4 and 220 Hz.
    pub tones: Vec<ToneFigures>,
    pub response: Response,
    pub alias: Alias,
    pub loudness_lufs: Figure<f64>,
    /// Peak of the render at the loudspeaker terminals, volts.
    pub output_peak_v: f64,
    /// Most negative and positive bias shift of each stage while the DI played, volts.
    pub bias_excursion_v: Vec<(f64, f64)>,
}
