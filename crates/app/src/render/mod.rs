//! Drawing without a graphics driver: byte-stable pictures for tests and documents, and the window of last resort.
//!
//! * [`Rasteriser`]: egui's triangles into pixels on the processor; the same bytes on every machine.
//! * [`CpuWindow`]: a real window over it, for machines where no GL context can be had.

mod cpu_window;
mod rasteriser;
mod triangle;

pub use cpu_window::{CpuApp, CpuWindow, CpuWindowError};
pub use rasteriser::Rasteriser;
