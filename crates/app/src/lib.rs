//! Whitesmith: the window, and the same work without one.
//!
//! * [`frontier`]: what a white spec costs: trade-offs, prices, choices, the missing emitter.
//! * [`headless`]: one file a command; arguments in, documented JSON or a table out.
//! * [`making`]: a blend as a device: recipes with targets, bands and pictures.
//! * [`solving`]: a white spec and its emitters as a problem for the optimiser.
//! * [`state`]: the project, every change to it as an edit with its inverse, and what is derived from it.
//! * [`jobs`]: work too long for a frame, in the background.
//! * [`window`]: what is drawn; it reads the state, emits edits and holds no physics.
//! * [`render`]: the same drawing on the processor alone, for pictures and tests.

pub mod frontier;
pub mod headless;
pub mod jobs;
pub mod making;
pub mod render;
pub mod solving;
pub mod state;
pub mod window;
