//! The project as plain data: what is saved, what is undone, what the window edits.
//!
//! * [`Project`]: everything a user keeps, with its format version and migrations.
//! * [`Emitter`]: one source spectrum as it was read, the reversible [`Correction`]s laid over it, and its sheet.
//! * [`EmitterSet`]: a choice of emitters with bounds, locks and shares, and the [`WhiteSpec`] it is to meet.
//! * [`RecipePlan`]: one way of building a set's blend, with the numbers changed or locked since.
//! * [`WhiteSpec`]: target white, [`Region`], [`Limits`] and what to [`Maximise`].
//!
//! Out of scope: files (crate `files`), solving (crate `optimiser`) and drawing (the application).

mod emitter;
mod project;
mod recipe;
mod set;
mod spec;

pub use emitter::{
    Correction, CorrectionStep, Emitter, EmitterId, Geometry, Import, Mounting, Origin, SourceFile,
    SpectrumProblem,
};
pub use project::{FORMAT_VERSION, Project, ProjectError};
pub use recipe::RecipePlan;
pub use set::{EmitterSet, Member, SetId, ShareKind};
pub use spec::{Limit, Limits, Maximise, Metric, Region, SpecError, WhiteSpec};
