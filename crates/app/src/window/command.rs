//! Every command: its words, its key, what it does in one line. Menus, buttons and keys all read from here.

use super::view::Bench;
use egui::{Key, KeyboardShortcut, Modifiers};

/// The commands of the window.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Command {
    New,
    OpenDemo,
    OpenLibrary,
    Open,
    Save,
    SaveAs,
    Import,
    Paste,
    ExportSheetRon,
    ExportSheetCsv,
    ExportSpectrum,
    ExportReportPdf,
    ExportReportHtml,
    ExportRecipeRon,
    ExportRecipeCsv,
    ExportRecipeSpectrum,
    ExportRecipeTm27,
    SolveDevice,
    Undo,
    Redo,
    Solve,
    StopSolving,
    HoldWhite,
    Show(Bench),
    AddSet,
    DuplicateSet,
    RemoveSet,
    Appearance,
    Quit,
}

impl Command {
    /// All commands with a key.
    const KEYED: [Self; 13] = [
        Self::SaveAs,
        Self::Save,
        Self::Open,
        Self::New,
        Self::Import,
        Self::Redo,
        Self::Undo,
        Self::Solve,
        Self::HoldWhite,
        Self::Show(Bench::Mixing),
        Self::Show(Bench::Frontier),
        Self::Show(Bench::Recipe),
        Self::Quit,
    ];

    /// The words in menus.
    pub(super) const fn words(self) -> &'static str {
        match self {
            Self::New => "New project",
            Self::OpenDemo => "Demonstration: night-ferry cabin",
            Self::OpenLibrary => "Demonstration: night-ferry library",
            Self::Open => "Open project\u{2026}",
            Self::Save => "Save",
            Self::SaveAs => "Save as\u{2026}",
            Self::Import => "Import spectra\u{2026}",
            Self::Paste => "Paste a table of spectra",
            Self::ExportSheetRon => "Blend sheet (RON)\u{2026}",
            Self::ExportSheetCsv => "Blend sheet (CSV)\u{2026}",
            Self::ExportSpectrum => "Predicted spectrum (CSV)\u{2026}",
            Self::ExportReportPdf => "Report (PDF)\u{2026}",
            Self::ExportReportHtml => "Report (HTML)\u{2026}",
            Self::ExportRecipeRon => "Recipe (RON)\u{2026}",
            Self::ExportRecipeCsv => "Recipe (CSV)\u{2026}",
            Self::ExportRecipeSpectrum => "Predicted spectrum of the device (CSV)\u{2026}",
            Self::ExportRecipeTm27 => "Predicted spectrum of the device (TM-27)\u{2026}",
            Self::SolveDevice => "Best blend for this device",
            Self::Undo => "Undo",
            Self::Redo => "Redo",
            Self::Solve => "Solve",
            Self::StopSolving => "Stop solving",
            Self::HoldWhite => "Hold the white while pulling",
            Self::Show(bench) => bench.words(),
            Self::AddSet => "New empty set",
            Self::DuplicateSet => "Duplicate this set",
            Self::RemoveSet => "Remove this set",
            Self::Appearance => "Light or dark appearance",
            Self::Quit => "Quit",
        }
    }

    /// The key, where there is one.
    pub(super) const fn key(self) -> Option<KeyboardShortcut> {
        let shift = Modifiers { alt: false, ctrl: false, shift: true, mac_cmd: false, command: true };
        Some(match self {
            Self::New => KeyboardShortcut::new(Modifiers::COMMAND, Key::N),
            Self::Open => KeyboardShortcut::new(Modifiers::COMMAND, Key::O),
            Self::Save => KeyboardShortcut::new(Modifiers::COMMAND, Key::S),
            Self::SaveAs => KeyboardShortcut::new(shift, Key::S),
            Self::Import => KeyboardShortcut::new(Modifiers::COMMAND, Key::I),
            Self::Paste => KeyboardShortcut::new(Modifiers::COMMAND, Key::V),
            Self::Undo => KeyboardShortcut::new(Modifiers::COMMAND, Key::Z),
            Self::Redo => KeyboardShortcut::new(Modifiers::COMMAND, Key::Y),
            Self::Solve => KeyboardShortcut::new(Modifiers::COMMAND, Key::Enter),
            Self::HoldWhite => KeyboardShortcut::new(Modifiers::COMMAND, Key::H),
            Self::Show(Bench::Mixing) => KeyboardShortcut::new(Modifiers::COMMAND, Key::Num1),
            Self::Show(Bench::Frontier) => KeyboardShortcut::new(Modifiers::COMMAND, Key::Num2),
            Self::Show(Bench::Recipe) => KeyboardShortcut::new(Modifiers::COMMAND, Key::Num3),
            Self::Quit => KeyboardShortcut::new(Modifiers::COMMAND, Key::Q),
            _ => return None,
        })
    }

    /// The words with the key behind them, for hovering.
    pub(super) fn hint(self, context: &egui::Context) -> String {
        let words = self.words().trim_end_matches('\u{2026}');
        self.key()
            .map_or_else(|| words.to_owned(), |key| format!("{words} ({})", context.format_shortcut(&key)))
    }

    /// The commands whose keys were pressed. Undo and redo inside a text field stay with the field.
    pub(super) fn pressed(context: &egui::Context) -> Vec<Self> {
        let typing = context.text_edit_focused();
        let redo_too = KeyboardShortcut::new(
            Modifiers { alt: false, ctrl: false, shift: true, mac_cmd: false, command: true },
            Key::Z,
        );
        context.input_mut(|input| {
            let mut pressed = Vec::new();
            if !typing && input.consume_shortcut(&redo_too) {
                pressed.push(Self::Redo);
            }
            for command in Self::KEYED {
                if typing && matches!(command, Self::Undo | Self::Redo) {
                    continue;
                }
                if command.key().is_some_and(|key| input.consume_shortcut(&key)) {
                    pressed.push(command);
                }
            }
            pressed
        })
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn no_two_commands_share_a_key() {
        for (k, a) in Command::KEYED.iter().enumerate() {
            assert!(a.key().is_some(), "{a:?}");
            assert!(Command::KEYED[..k].iter().all(|b| b.key() != a.key()), "{a:?}");
        }
    }
}
