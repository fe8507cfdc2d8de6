//! What drawing a frame asks for; the application grants it after the frame is drawn.

use super::command::Command;
use super::frontier::Ask;
use crate::state::Edit;

/// One thing asked for.
#[derive(Debug)]
pub(super) enum Wish {
    /// Change the project.
    Edit(Edit),
    /// Open an undo step that lasts until `End`.
    Begin(String),
    /// Close it.
    End,
    /// Take it back.
    Cancel,
    /// Do what a menu, button or key stands for.
    Command(Command),
    /// Start a job of the Frontier bench.
    Frontier(Ask),
    /// Stop the job of that key.
    Stop(&'static str),
    /// Tell the user something.
    Say(String),
}
