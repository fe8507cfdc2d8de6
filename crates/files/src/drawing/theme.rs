//! Colours, line widths and text sizes shared by every figure: a calm ground and one accent.

use super::Ink;

/// The ground of a figure.
pub const PAPER: Ink = Ink(0xff, 0xfe, 0xfa);
/// The ground of panels inside a figure.
pub const PANEL: Ink = Ink(0xf5, 0xf3, 0xee);
/// Text and the strongest lines.
pub const INK: Ink = Ink(0x20, 0x23, 0x28);
/// Lesser text.
pub const QUIET: Ink = Ink(0x5d, 0x62, 0x69);
/// Grid lines and rules.
pub const RULE: Ink = Ink(0xdc, 0xd8, 0xce);
/// The frame of a plot.
pub const EDGE: Ink = Ink(0x9a, 0x96, 0x8c);
/// The one accent: targets and what the reader should find first.
pub const ACCENT: Ink = Ink(0x8a, 0x5a, 0x14);
/// Bars that need no accent.
pub const BAR: Ink = Ink(0xa9, 0xaf, 0xb9);

/// The blend's line, mm.
pub const HEAVY_MM: f64 = 0.55;
/// An emitter's line, mm.
pub const LINE_MM: f64 = 0.35;
/// Grid lines and ticks, mm.
pub const HAIR_MM: f64 = 0.15;

/// Axis titles and labels, pt.
pub const LABEL_PT: f64 = 8.0;
/// Numbers on axes, pt.
pub const TICK_PT: f64 = 7.0;
/// A figure's heading, pt.
pub const HEAD_PT: f64 = 9.5;
