//! The window: the loom, the ledger and the benches. It reads the state, asks for edits, and holds no physics.
//!
//! * [`open`]: the window on the screen, by whichever renderer works.
//! * [`Window`]: one frame after another; usable with any egui context, so that tests need no screen.
//! * [`theme`]: every colour, typeface and size.
//!
//! A frame draws from the state and from what is derived of it, and collects wishes; they are granted at its end. When
//! one of them changed the project, the frame is drawn again before it is shown: a pull and the ledger never disagree.

mod app;
mod command;
mod controls;
mod dialogs;
mod documents;
mod frontier;
mod launch;
mod ledger;
mod loom;
mod notice;
mod paint;
mod plots;
mod proof;
mod recipe;
pub mod theme;
mod top_bar;
mod view;
mod wish;

pub use app::Window;
pub use launch::{Renderer, open};
