//! What a test may be said to have shown.

use std::fmt;

/// Why a test gives no answer.
#[derive(Debug, Clone, PartialEq)]
pub enum Refusal {
    /// The footprints share no cell, or too few to shift at all.
    NoRoom {
        /// Cells that the footprints share.
        cells: usize,
    },
    /// The subject has fewer than two cells where the reference has data.
    TooFewMembers {
        /// How many it has.
        cells: usize,
    },
    /// No cell lies within the distance, or every cell does.
    NoContrast {
        /// Cells within the distance.
        near: usize,
        /// All cells.
        cells: usize,
    },
    /// A strength, or the measure itself, takes one value only.
    Constant,
    /// The footprint holds too few independent shifts to reach the level.
    TooFewShifts {
        /// How many it holds.
        found: f64,
        /// True if effectively independent shifts are counted, false for all.
        independent: bool,
        /// How many would be needed.
        needed: f64,
    },
}

impl fmt::Display for Refusal {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::NoRoom { cells } => write!(f, "cannot tell: the footprints share {cells} cells, too few to shift"),
            Self::TooFewMembers { cells } => {
                write!(f, "cannot tell: {cells} subject cells where the reference has data, at least 2 wanted")
            }
            Self::NoContrast { near, cells } => {
                write!(
                    f,
                    "cannot tell: {near} of {cells} cells lie within the distance, so there is nothing to compare"
                )
            }
            Self::Constant => f.write_str("cannot tell: a layer is constant here"),
            Self::TooFewShifts { found, independent: true, needed } => {
                write!(f, "cannot tell: this footprint holds {found:.1} independent shifts, {needed:.0} are needed")
            }
            Self::TooFewShifts { found, independent: false, needed } => {
                write!(f, "cannot tell: this footprint holds {found:.0} shifts, {needed:.0} are needed")
            }
        }
    }
}

/// The outcome of one test, in words a reader can act on.
#[derive(Debug, Clone, PartialEq)]
pub enum Verdict {
    /// The family-wise p-value is at or below the level.
    Found,
    /// The test alone is at or below the level, the family is not.
    OnlyAlone,
    /// Neither is.
    NotFound,
    /// A measure that describes; its level is approximate, so it carries no test in the family.
    Described,
    /// The data cannot tell, for the reason given.
    CannotTell(Refusal),
}

impl fmt::Display for Verdict {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        match self {
            Self::Found => f.write_str("beyond chance, the family counted"),
            Self::OnlyAlone => f.write_str("beyond chance on its own, not once the family is counted"),
            Self::NotFound => f.write_str("not beyond chance"),
            Self::Described => f.write_str("described only: the level of this measure is approximate"),
            Self::CannotTell(refusal) => refusal.fmt(f),
        }
    }
}
