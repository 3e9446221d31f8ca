//! The study: its file, its plan, its run, and what is written of it.

mod answer;
mod columns;
mod compose;
mod contact_details;
mod deposits;
mod derive;
mod fields;
mod figures;
mod footprints;
mod frame_choice;
mod inspect;
mod limits;
mod methods;
mod parse;
mod parse_references;
mod plan;
mod progress;
mod publish;
mod references;
mod run;
mod schema;
mod seen;
mod series;
mod settings;
mod slices;
mod spell;
mod tables;
mod tables_of_bodies;
mod tables_of_layers;
mod tables_of_tests;

pub use compose::{NamedFiles, compose};
pub use contact_details::ContactDetails;
pub use deposits::Deposit;
pub use derive::{Derivation, derive_raster, describe_transforms};
pub use fields::{FieldNoise, NoiseOrigin};
pub use inspect::inspect;
pub use parse::{DEFAULT_HEIGHT_PER_DEPTH, DEFAULT_LEVEL, DEFAULT_SEED};
pub use plan::{Plan, PlannedLayer, PlannedPotential, PlannedSlice};
pub use progress::{Progress, Silent};
pub use publish::{RunOptions, run_and_publish};
pub use references::ReferenceFinding;
pub use run::{FieldFinding, Findings, SubjectFinding, run};
pub use series::Series;
pub use settings::{
    BodyChoice, Conductivity, ContactChoice, Deposits, FrameChoice, MappedLines, MappedUnits, Model, Potential,
    PotentialKind, Resolution, SliceChoice, Study, TestChoice, UnitRole,
};
pub use slices::SliceFinding;
