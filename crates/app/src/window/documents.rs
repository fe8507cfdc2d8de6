//! Where the project is kept: opening, exporting, and the keeper of its changes.

use super::command::Command;
use super::dialogs::paths::Purpose;
use crate::state::State;
use crate::state::keeping::{Keeper, Leftover, PROGRAM};
use files::blend_sheet::{BlendSheet, blend_sheet_csv};
use files::project_file::{open_project, read_project};
use files::save::save;
use files::spectrum_csv::predicted_spectrum_csv;
use project::SetId;
use std::path::Path;

/// A demonstration carried in the program, as a state with nothing to undo.
pub(super) fn demonstration(text: &str) -> State {
    let opened =
        read_project(text.as_bytes()).expect("the project carried in the program is valid; a test opens it");
    State::new(opened.project, None).expect("the project carried in the program is valid; a test opens it")
}

/// Opens a project file; with the fingerprint of the file.
pub(super) fn open(path: &Path) -> Result<(State, String), String> {
    let opened = open_project(path).map_err(|e| e.to_string())?;
    let state = State::new(opened.project, Some(path.to_path_buf())).map_err(|e| e.to_string())?;
    Ok((state, opened.sha256))
}

/// Keeps one window's project.
pub(super) struct Documents {
    keeper: Option<Keeper>,
    journalled: bool,
    /// What ended windows left unsaved.
    pub(super) left_behind: Vec<Leftover>,
}

impl Documents {
    /// Keeps a state: in the user's journal folder, or without a journal.
    pub(super) fn start(state: &mut State, journalled: bool) -> Self {
        let left_behind = if journalled { Keeper::left_behind() } else { Vec::new() };
        let mut documents = Self { keeper: None, journalled, left_behind };
        documents.begin(state, None);
        documents
    }

    fn begin(&mut self, state: &mut State, sha256: Option<String>) {
        self.keeper = Some(if self.journalled {
            Keeper::start(state, sha256)
        } else {
            Keeper::start_in(None, state, sha256)
        });
    }

    /// Ends keeping `before` and begins keeping `after`.
    pub(super) fn change(&mut self, before: &mut State, after: &mut State, sha256: Option<String>) {
        self.close(before);
        self.begin(after, sha256);
    }

    /// Writes down the changes since the last call; a sentence when that is not possible.
    pub(super) fn note(&mut self, state: &mut State) -> Option<String> {
        let keeper = self.keeper.as_mut()?;
        keeper.note(state);
        keeper.take_problem()
    }

    /// Saves the project.
    pub(super) fn save(&mut self, state: &mut State, path: &Path) -> Result<(), String> {
        match &mut self.keeper {
            Some(keeper) => keeper.save(state, path, false).map_err(|e| e.to_string()),
            None => Ok(()),
        }
    }

    /// Ends keeping: with nothing unsaved no journal stays.
    pub(super) fn close(&mut self, state: &mut State) {
        if let Some(keeper) = self.keeper.take() {
            keeper.close(state);
        }
    }
}

/// What an export command asks for.
pub(super) const fn export_purpose(command: Command) -> Option<Purpose> {
    match command {
        Command::ExportSheetRon => Some(Purpose::SheetRon),
        Command::ExportSheetCsv => Some(Purpose::SheetCsv),
        Command::ExportSpectrum => Some(Purpose::SpectrumCsv),
        Command::ExportReportPdf => Some(Purpose::ReportPdf),
        Command::ExportReportHtml => Some(Purpose::ReportHtml),
        Command::ExportRecipeRon => Some(Purpose::RecipeRon),
        Command::ExportRecipeCsv => Some(Purpose::RecipeCsv),
        Command::ExportRecipeSpectrum => Some(Purpose::RecipeSpectrum),
        Command::ExportRecipeTm27 => Some(Purpose::RecipeTm27),
        _ => None,
    }
}

/// Writes a recipe, its spectrum or its report.
pub(super) fn export_recipe(
    state: &State,
    set: SetId,
    plan: usize,
    proof: Option<&str>,
    purpose: Purpose,
    path: &Path,
) -> Result<(), String> {
    use crate::headless::recipe::{spectrum_csv, spectrum_tm27};
    let project = state.project();
    let making = crate::making::make(project, set, plan).map_err(|e| e.to_string())?;
    let report = || {
        let seconds = std::time::SystemTime::now()
            .duration_since(std::time::UNIX_EPOCH)
            .map_or(0, |since| since.as_secs());
        let note = project.set(set).map_or("", |set| set.note.as_str());
        let proof = proof.unwrap_or(note);
        crate::making::report::of_making(project, &making, &crate::making::report::day(seconds), proof)
    };
    let text = |text: Result<String, String>| text.map(String::into_bytes);
    let bytes = match purpose {
        Purpose::ReportPdf => files::report::pdf::pages(&report()).map_err(|e| e.to_string())?,
        Purpose::ReportHtml => files::report::html::page(&report()).into_bytes(),
        Purpose::RecipeRon => text(making.document(project).to_ron().map_err(|e| e.to_string()))?,
        Purpose::RecipeCsv => text(making.document(project).to_csv().map_err(|e| e.to_string()))?,
        Purpose::RecipeTm27 => {
            text(spectrum_tm27(&making, &making.document(project)).map_err(|e| e.to_string()))?
        }
        _ => spectrum_csv(&making).into_bytes(),
    };
    save(path, &bytes, None).map(|_| ()).map_err(|e| e.to_string())
}

/// Writes an export.
pub(super) fn export(
    state: &State,
    set: SetId,
    proof: Option<String>,
    purpose: Purpose,
    path: &Path,
) -> Result<(), String> {
    let project = state.project();
    let sheet = || BlendSheet::of(project, set, PROGRAM, proof).map_err(|e| e.to_string());
    let text = match purpose {
        Purpose::SheetRon => sheet()?.to_ron().map_err(|e| e.to_string())?,
        Purpose::SheetCsv => blend_sheet_csv(&sheet()?).map_err(|e| e.to_string())?,
        _ => predicted_spectrum_csv(project, set).map_err(|e| e.to_string())?,
    };
    save(path, text.as_bytes(), None).map(|_| ()).map_err(|e| e.to_string())
}
