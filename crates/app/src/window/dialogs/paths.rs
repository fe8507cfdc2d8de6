//! Asking for a path: the system's dialog on a thread of its own, and a box to type in where there is none.

use super::super::theme::Palette;
use egui::{Key, Modal, RichText, ScrollArea, TextEdit, Ui};
use std::path::{Path, PathBuf};
use std::sync::mpsc::{Receiver, TryRecvError, channel};
use std::time::{Duration, Instant};

/// An answer quicker than any hand: there is no dialog on this system.
const NO_DIALOG: Duration = Duration::from_millis(300);
/// Entries of a folder shown at most.
const ENTRIES: usize = 200;

/// What a path is wanted for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(in crate::window) enum Purpose {
    OpenProject,
    SaveProject,
    ImportSpectra,
    SheetRon,
    SheetCsv,
    SpectrumCsv,
    ReportPdf,
    ReportHtml,
    RecipeRon,
    RecipeCsv,
    RecipeSpectrum,
    RecipeTm27,
}

impl Purpose {
    const fn title(self) -> &'static str {
        match self {
            Self::OpenProject => "Open project",
            Self::SaveProject => "Save project as",
            Self::ImportSpectra => "Import spectra",
            Self::SheetRon | Self::SheetCsv => "Save blend sheet as",
            Self::SpectrumCsv | Self::RecipeSpectrum | Self::RecipeTm27 => "Save predicted spectrum as",
            Self::ReportPdf | Self::ReportHtml => "Save report as",
            Self::RecipeRon | Self::RecipeCsv => "Save recipe as",
        }
    }

    /// The ending of files written.
    pub(in crate::window) const fn ending(self) -> &'static str {
        match self {
            Self::OpenProject | Self::SaveProject | Self::SheetRon | Self::RecipeRon => "ron",
            Self::ReportPdf => "pdf",
            Self::ReportHtml => "html",
            Self::RecipeTm27 => "spdx",
            Self::RecipeCsv | Self::RecipeSpectrum => "csv",
            Self::ImportSpectra => "",
            Self::SheetCsv | Self::SpectrumCsv => "csv",
        }
    }

    const fn writes(self) -> bool {
        !matches!(self, Self::OpenProject | Self::ImportSpectra)
    }

    const fn button(self) -> &'static str {
        match self {
            Self::OpenProject => "Open",
            Self::ImportSpectra => "Import",
            _ => "Save",
        }
    }
}

/// Asks for paths, one purpose at a time.
#[derive(Debug, Default)]
pub(in crate::window) struct Paths {
    asking: Option<Asking>,
    typing: Option<Typing>,
    /// Goes straight to the box.
    pub(in crate::window) without_dialogs: bool,
    last_folder: Option<PathBuf>,
}

#[derive(Debug)]
struct Asking {
    purpose: Purpose,
    since: Instant,
    suggestion: String,
    answer: Receiver<Option<Vec<PathBuf>>>,
}

#[derive(Debug)]
struct Typing {
    purpose: Purpose,
    path: String,
    fresh: bool,
}

impl Paths {
    /// True while something covers the benches.
    pub(in crate::window) fn is_open(&self) -> bool {
        self.typing.is_some()
    }

    /// Asks for a path; the answer comes from [`Self::poll`] or [`Self::show`].
    pub(in crate::window) fn ask(&mut self, context: &egui::Context, purpose: Purpose, suggestion: &str) {
        if self.asking.is_some() {
            return;
        }
        if self.without_dialogs {
            self.type_it(purpose, suggestion);
            return;
        }
        let (sender, answer) = channel();
        let (context, name, folder) = (context.clone(), suggestion.to_owned(), self.last_folder.clone());
        let spawned = std::thread::Builder::new().name("file dialog".to_owned()).spawn(move || {
            let mut dialog = rfd::FileDialog::new().set_title(purpose.title());
            if let Some(folder) = folder {
                dialog = dialog.set_directory(folder);
            }
            if !purpose.ending().is_empty() {
                dialog = dialog.add_filter(purpose.ending(), &[purpose.ending()]);
            }
            if purpose.writes() {
                dialog = dialog.set_file_name(name);
            }
            let chosen = match purpose {
                Purpose::ImportSpectra => dialog.pick_files(),
                _ if purpose.writes() => dialog.save_file().map(|path| vec![path]),
                _ => dialog.pick_file().map(|path| vec![path]),
            };
            // The window may be gone: then nobody waits for the answer.
            let _ = sender.send(chosen);
            context.request_repaint();
        });
        match spawned {
            Ok(_) => {
                let suggestion = suggestion.to_owned();
                self.asking = Some(Asking { purpose, since: Instant::now(), suggestion, answer });
            }
            Err(_) => self.type_it(purpose, suggestion),
        }
    }

    fn type_it(&mut self, purpose: Purpose, suggestion: &str) {
        let folder = self.last_folder.clone().or_else(|| std::env::current_dir().ok()).unwrap_or_default();
        let path = folder.join(suggestion).display().to_string();
        self.typing = Some(Typing { purpose, path, fresh: true });
    }

    /// The answer of the system's dialog, when there is one.
    pub(in crate::window) fn poll(&mut self) -> Option<(Purpose, Vec<PathBuf>)> {
        let asking = self.asking.as_ref()?;
        let chosen = match asking.answer.try_recv() {
            Ok(chosen) => chosen,
            Err(TryRecvError::Empty) => return None,
            Err(TryRecvError::Disconnected) => None,
        };
        let asking = self.asking.take()?;
        match chosen {
            Some(paths) => {
                self.remember(&paths);
                Some((asking.purpose, paths))
            }
            None => {
                if asking.since.elapsed() < NO_DIALOG {
                    self.type_it(asking.purpose, &asking.suggestion);
                }
                None
            }
        }
    }

    fn remember(&mut self, paths: &[PathBuf]) {
        self.last_folder = paths.first().and_then(|path| path.parent()).map(Path::to_path_buf);
    }

    /// Draws the box to type in, while it is open, and returns what was typed.
    pub(in crate::window) fn show(&mut self, ui: &Ui) -> Option<(Purpose, Vec<PathBuf>)> {
        let typing = self.typing.as_mut()?;
        let mut done = None;
        let modal = Modal::new(egui::Id::unique("path box"))
            .frame(super::super::controls::sheet_frame(ui))
            .show(ui.ctx(), |ui| {
                ui.set_width(560.0);
                ui.heading(typing.purpose.title());
                ui.add_space(6.0);
                let label = ui.weak("Type the path, or choose below.");
                let field = ui
                    .add(TextEdit::singleline(&mut typing.path).desired_width(f32::INFINITY))
                    .labelled_by(label.id);
                if typing.fresh {
                    typing.fresh = false;
                    field.request_focus();
                }
                let entered = field.lost_focus() && ui.input(|i| i.key_pressed(Key::Enter));
                listing(ui, typing);
                ui.add_space(8.0);
                let path = PathBuf::from(typing.path.trim());
                let problem = problem(typing.purpose, &path);
                if let Some(problem) = &problem {
                    ui.label(RichText::new(problem).color(Palette::of(ui.ctx()).caution));
                }
                ui.horizontal(|ui| {
                    let accept = ui
                        .add_enabled(problem.is_none(), egui::Button::new(typing.purpose.button()))
                        .clicked();
                    if (accept || entered) && problem.is_none() {
                        done = Some((typing.purpose, vec![path]));
                    }
                    ui.button("Cancel").clicked()
                })
                .inner
            });
        let cancelled = modal.inner || modal.should_close();
        if let Some((purpose, paths)) = done {
            self.typing = None;
            self.remember(&paths);
            return Some((purpose, paths));
        }
        if cancelled {
            self.typing = None;
        }
        None
    }
}

fn problem(purpose: Purpose, path: &Path) -> Option<String> {
    if purpose.writes() {
        let folder = path.parent().filter(|p| !p.as_os_str().is_empty());
        if path.file_name().is_none() || path.is_dir() {
            return Some("A file name is missing.".to_owned());
        }
        return folder.filter(|f| !f.is_dir()).map(|f| format!("There is no folder {}.", f.display()));
    }
    (!path.is_file()).then(|| "There is no such file yet.".to_owned())
}

/// What lies in the folder being typed.
fn listing(ui: &mut Ui, typing: &mut Typing) {
    let typed = PathBuf::from(&typing.path);
    let (folder, start) = if typed.is_dir() {
        (typed, String::new())
    } else {
        let start = typed.file_name().map(|n| n.to_string_lossy().to_lowercase()).unwrap_or_default();
        (typed.parent().map(Path::to_path_buf).unwrap_or_default(), start)
    };
    let Ok(entries) = std::fs::read_dir(&folder) else { return };
    let mut found: Vec<(bool, String)> = entries
        .flatten()
        .map(|e| (e.path().is_dir(), e.file_name().to_string_lossy().into_owned()))
        .filter(|(_, name)| !name.starts_with('.'))
        .collect();
    if !start.is_empty()
        && found.iter().any(|(_, n)| n.to_lowercase().starts_with(&start))
        && !typing.purpose.writes()
    {
        found.retain(|(_, n)| n.to_lowercase().starts_with(&start));
    }
    found.sort_by(|a, b| b.0.cmp(&a.0).then_with(|| a.1.to_lowercase().cmp(&b.1.to_lowercase())));
    found.truncate(ENTRIES);
    ScrollArea::vertical().max_height(200.0).auto_shrink([false, true]).show(ui, |ui| {
        if let Some(up) = folder.parent()
            && ui.selectable_label(false, "\u{2190} the folder above").clicked()
        {
            typing.path = up.display().to_string();
        }
        for (is_folder, name) in found {
            let words = if is_folder { format!("{name}/") } else { name.clone() };
            if ui.selectable_label(false, words).clicked() {
                let path = folder.join(&name);
                typing.path =
                    if is_folder { format!("{}/", path.display()) } else { path.display().to_string() };
            }
        }
    });
}
