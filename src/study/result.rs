//! What a study hands to the reports.

use crate::diagnostic::Code;
use crate::stage::operating_point::OperatingPoint;
use crate::stage::ratings::RatingCheck;
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

/// A stage's output against its drive at the chosen bias: the slice of the surface at rest, seen at 1 kHz.
#[derive(Clone, Debug, PartialEq)]
pub struct TransferCurve {
    pub stage: String,
    pub points: Vec<TransferPoint>,
    /// Marks on the curve: (name of the limit, drive in volts). Names: "grid-conduction", "plate-knee", "cutoff", "rest".
    pub limits: Vec<(String, f64)>,
    /// Source resistance through which the grid is driven, ohms.
    pub drive_ohms: f64,
}

#[derive(Clone, Copy, Debug, PartialEq)]
pub struct TransferPoint {
    /// Open-circuit drive re rest, volts.
    pub drive_v: f64,
    /// Grid to cathode, volts.
    pub v_gk: f64,
    /// Plate re rest, volts.
    pub plate_v: f64,
    pub plate_a: f64,
    pub grid_a: f64,
    /// Incremental gain re the one at rest (1 at rest).
    pub relative_gain: f64,
}

/// Plate curves with load lines.
#[derive(Clone, Debug, PartialEq)]
pub struct PlateDiagram {
    /// Grid volts of each curve and its (plate volts to cathode, plate amperes).
    pub curves: Vec<(f64, Vec<(f64, f64)>)>,
    /// Through the operating point, direct and alternating.
    pub direct_line: Vec<(f64, f64)>,
    pub alternating_line: Vec<(f64, f64)>,
    pub operating: (f64, f64),
    /// Plate dissipation limit as a hyperbola, when the rating is known: watts for all sections.
    pub dissipation_w: Option<f64>,
    pub plate_volts_limit: Option<f64>,
    /// Screen volts to the cathode at which the curves stand.
    pub screen_volts: Option<f64>,
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
