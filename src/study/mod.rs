//! The study: its file, its plan, its run, and what is written of it.

mod answer;
mod compose;
mod deposits;
mod figures;
mod footprints;
mod frame_choice;
mod inspect;
mod limits;
mod methods;
mod parse;
mod plan;
mod progress;
mod publish;
mod run;
mod schema;
mod seen;
mod settings;
mod spell;
mod tables;

pub use compose::{NamedFiles, compose};
pub use deposits::Deposit;
pub use inspect::inspect;
pub use parse::{DEFAULT_LEVEL, DEFAULT_SEED};
pub use plan::{Plan, PlannedLayer, PlannedPotential, PlannedSlice};
pub use progress::{Progress, Silent};
pub use publish::{RunOptions, run_and_publish};
pub use run::{Findings, ReferenceFinding, SliceFinding, run};
pub use settings::{
    BodyChoice, Conductivity, Deposits, FrameChoice, MappedLines, Model, Potential, PotentialKind, SliceChoice, Study,
    TestChoice,
};
