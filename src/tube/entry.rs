//! What the catalog knows of one tube type.

use super::grid::GridLaw;
use super::pentode::PentodeLaw;
use super::triode::TriodeLaw;
use crate::units::{Amperes, Ohms, Volts, Watts};

/// One tube type, one section of it.
#[derive(Clone, Debug, PartialEq)]
pub struct Tube {
    pub name: String,
    /// Other type designations of the same tube.
    pub aliases: Vec<String>,
    pub description: String,
    /// What a user must know before trusting the entry, such as a provisional fit.
    pub caution: Option<String>,
    pub law: Law,
    pub grid_law: GridLaw,
    /// True when no grid-current data of this type stand behind `grid_law`.
    pub grid_current_assumed: bool,
    pub ratings: Ratings,
    pub capacitances: Capacitances,
    pub fitted_range: FittedRange,
    pub provenance: Provenance,
}

impl Tube {
    /// Triode or pentode.
    pub fn kind(&self) -> TubeKind {
        match self.law {
            Law::Triode(_) => TubeKind::Triode,
            Law::Pentode(_) => TubeKind::Pentode,
        }
    }
}

/// How many grids act. Beam tetrodes count as pentodes.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum TubeKind {
    Triode,
    Pentode,
}

/// Law of plate and screen current.
#[derive(Clone, Copy, Debug, PartialEq)]
pub enum Law {
    Triode(TriodeLaw),
    Pentode(PentodeLaw),
}

/// Interelectrode capacitances in farads, of one section without socket.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Capacitances {
    pub grid_plate: f64,
    /// Grid to cathode; for a pentode grid to everything but the plate, the screen being at rest.
    pub grid_cathode: f64,
    /// Plate to cathode; for a pentode plate to everything but the grid.
    pub plate_cathode: f64,
}

/// Maximum ratings of one section. `None`: not known, so nothing can be checked against it.
#[derive(Clone, Debug, PartialEq)]
pub struct Ratings {
    /// Rating system in the sheet's words, such as "design center".
    pub system: String,
    pub plate_volts: Option<Volts>,
    pub screen_volts: Option<Volts>,
    pub plate_dissipation: Option<Watts>,
    pub screen_dissipation: Option<Watts>,
    /// Average cathode current.
    pub cathode_current: Option<Amperes>,
    /// Largest grid-circuit resistance with fixed bias.
    pub grid_leak_fixed_bias: Option<Ohms>,
    /// Largest grid-circuit resistance with cathode bias.
    pub grid_leak_cathode_bias: Option<Ohms>,
    /// Between heater and cathode, either way.
    pub heater_cathode_volts: Option<Volts>,
    /// Most negative grid volts (a negative number).
    pub grid_volts_minimum: Option<Volts>,
}

/// Where the data lay that the law was fitted to: ranges of volts to the cathode, and of plate current.
#[derive(Clone, Debug, PartialEq)]
pub struct FittedRange {
    pub plate_volts: Span<Volts>,
    /// `None` for a triode.
    pub screen_volts: Option<Span<Volts>>,
    pub grid_volts: Span<Volts>,
    pub plate_current: Span<Amperes>,
}

/// From the lowest to the highest, both included.
#[derive(Clone, Copy, Debug, PartialEq)]
pub struct Span<Q> {
    pub low: Q,
    pub high: Q,
}

impl<Q: PartialOrd> Span<Q> {
    /// True from `low` to `high`.
    pub fn contains(&self, value: Q) -> bool {
        self.low <= value && value <= self.high
    }
}

/// Where each group of figures comes from.
#[derive(Clone, Debug, PartialEq)]
pub struct Provenance {
    pub law: Origin,
    pub grid_current: Origin,
    pub ratings: Origin,
    pub capacitances: Origin,
    pub fitted_range: Origin,
}

/// Source of a group of figures and how far to trust it.
#[derive(Clone, Debug, PartialEq)]
pub struct Origin {
    pub source: String,
    pub confidence: Confidence,
    /// Keys of the group whose figures are recalled from memory, whatever the rest's confidence.
    pub from_memory: Vec<String>,
}

/// How a figure is known.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub enum Confidence {
    ReadInSheet,
    TwoAgreeingPlaces,
    GraphReading,
    SingleQuotation,
    Fitted,
    Assumed,
    FromMemory,
}

impl Confidence {
    /// Every degree, the surest first.
    pub const ALL: [Confidence; 7] = [
        Confidence::ReadInSheet,
        Confidence::TwoAgreeingPlaces,
        Confidence::GraphReading,
        Confidence::SingleQuotation,
        Confidence::Fitted,
        Confidence::Assumed,
        Confidence::FromMemory,
    ];

    /// The words a tube file uses.
    pub fn words(self) -> &'static str {
        match self {
            Confidence::ReadInSheet => "read in the sheet",
            Confidence::TwoAgreeingPlaces => "two agreeing places",
            Confidence::GraphReading => "graph reading",
            Confidence::SingleQuotation => "single quotation",
            Confidence::Fitted => "fitted",
            Confidence::Assumed => "assumed",
            Confidence::FromMemory => "from memory",
        }
    }
}
