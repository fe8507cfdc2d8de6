//! Where the project is kept: opening, saving, exporting, and the journal of changes since.

use super::command::Command;
use super::dialogs::paths::Purpose;
use crate::state::{JournalEntry, State};
use files::blend_sheet::{BlendSheet, blend_sheet_csv};
use files::journal::{self, Header, Journal, LeftBehind};
use files::project_file::{open_project, project_text, read_project};
use files::save::save;
use files::spectrum_csv::predicted_spectrum_csv;
use project::SetId;
use std::path::{Path, PathBuf};

/// The program as it names itself in files.
const PROGRAM: &str = concat!("whitesmith ", env!("CARGO_PKG_VERSION"));

/// A demonstration carried in the program, as a state with nothing to undo.
pub(super) fn demonstration(text: &str) -> State {
    let opened =
        read_project(text.as_bytes()).expect("the project carried in the program is valid; a test opens it");
    State::new(opened.project, None).expect("the project carried in the program is valid; a test opens it")
}

/// The journal of one window.
#[derive(Default)]
pub(super) struct Session {
    journal: Option<Journal>,
    folder: Option<PathBuf>,
    /// SHA-256 of the project file as last read or written, to notice that another program changed it.
    on_disk: Option<String>,
    /// Changes of a window that ended without saving.
    pub(super) left_behind: Vec<LeftBehind<JournalEntry>>,
}

impl Session {
    /// A session with a journal in the user's own folder, where there is one.
    pub(super) fn journalled(state: &State) -> Self {
        let Some(folder) = journal::default_folder() else { return Self::default() };
        let mut left_behind = journal::left_behind::<JournalEntry>(&folder);
        // A journal without a change holds nothing to bring back.
        left_behind.retain(|left| {
            if left.entries.is_empty() {
                let _ = std::fs::remove_file(&left.path);
            }
            !left.entries.is_empty()
        });
        let mut session = Self { folder: Some(folder), left_behind, ..Self::default() };
        session.restart(state);
        session
    }

    fn header(state: &State) -> Header {
        Header::new(PROGRAM, state.path().map(Path::to_path_buf), state.project().clone())
    }

    /// Begins the journal anew: what has been is saved, or another project took its place.
    pub(super) fn restart(&mut self, state: &State) {
        let Some(folder) = &self.folder else { return };
        let header = Self::header(state);
        let kept = self.journal.as_mut().map(|journal| journal.restart(&header));
        if !matches!(kept, Some(Ok(()))) {
            // Without a journal the program works on; only recovery is lost.
            self.journal = Journal::begin(folder, &header).ok();
        }
    }

    /// Writes down the changes since the last call.
    pub(super) fn keep(&mut self, state: &mut State) -> Result<(), String> {
        let entries = state.take_journal();
        match &mut self.journal {
            Some(journal) if !entries.is_empty() => journal
                .append(&entries)
                .map_err(|e| format!("Changes are not being recorded: {e}. Save to keep them.")),
            _ => Ok(()),
        }
    }

    /// Ends the journal: nothing is left to bring back.
    pub(super) fn finish(&mut self) {
        if let Some(journal) = self.journal.take() {
            let _ = journal.finish();
        }
    }

    /// Opens a project file.
    pub(super) fn open(&mut self, path: &Path) -> Result<State, String> {
        let opened = open_project(path).map_err(|e| e.to_string())?;
        let state = State::new(opened.project, Some(path.to_path_buf())).map_err(|e| e.to_string())?;
        self.on_disk = Some(opened.sha256);
        Ok(state)
    }

    /// Saves the project; as a new file when `path` is not where it is kept.
    pub(super) fn save(&mut self, state: &mut State, path: &Path) -> Result<(), String> {
        let text = project_text(state.project()).map_err(|e| e.to_string())?;
        let same = state.path() == Some(path);
        let expected = if same { self.on_disk.as_deref() } else { None };
        let saved = save(path, text.as_bytes(), expected).map_err(|e| e.to_string())?;
        self.on_disk = Some(saved.sha256);
        let revision = state.revision();
        state.mark_saved(path.to_path_buf(), revision);
        state.take_journal();
        self.restart(state);
        Ok(())
    }

    /// The state a window left behind, its changes made again, and whether all of them could be.
    pub(super) fn bring_back(&mut self) -> Option<Result<State, String>> {
        let left = self.left_behind.pop()?;
        let back = (|| {
            let mut state = State::new(left.header.base, left.header.path).map_err(|e| e.to_string())?;
            for entry in left.entries {
                state.replay(entry).map_err(|e| e.to_string())?;
            }
            Ok(state)
        })();
        let _ = std::fs::remove_file(&left.path);
        Some(back)
    }

    /// Leaves the changes of an ended window aside for good.
    pub(super) fn discard(&mut self) {
        for left in self.left_behind.drain(..) {
            let _ = std::fs::remove_file(&left.path);
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

impl Session {
    /// Takes over what another session knew of the file on disk.
    pub(super) fn continuing(mut self, before: Self) -> Self {
        self.on_disk = before.on_disk;
        self
    }
}
