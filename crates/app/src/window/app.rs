//! One frame after another: draw, collect wishes, grant them.

use super::command::Command;
use super::dialogs;
use super::dialogs::import::{Asked, Imports, Source};
use super::dialogs::paths::{Paths, Purpose};
use super::documents::{self, Documents};
use super::notice::Notice;
use super::proof::{self, Question, Solved};
use super::theme::{self, Palette};
use super::view::{Bench, Proof, Scene, View};
use super::wish::Wish;
use super::{frontier, ledger, loom, recipe, top_bar};
use crate::jobs::{Answer, Jobs};
use crate::making::MakingError;
use crate::making::best::{DeviceBest, best_for_device};
use crate::state::demo::{CABIN, LIBRARY};
use crate::state::derived::{Cache, Derived};
use crate::state::{Edit, EditError, State};
use egui::{Context, Event, Frame, Margin, Panel, Rect, RichText, Theme, Ui, ViewportCommand, pos2};
use files::read::Reading;
use project::{Project, RecipePlan, SetId};
use std::path::{Path, PathBuf};
use std::sync::Arc;

/// Width of the ledger.
const LEDGER_WIDTH: f32 = 372.0;
/// Room round the sheets.
const GAP: f32 = 12.0;
/// Largest file looked at.
const GREATEST_FILE: u64 = files::read::MAX_FILE_BYTES;

/// What background jobs answer.
enum Done {
    Solved(Box<Option<Solved>>),
    Read(Box<Reading>),
    Frontier(Box<Option<frontier::Answer>>),
    /// The set, the plan it was asked for, and the best blend of that device.
    Device(SetId, Box<RecipePlan>, Box<Result<DeviceBest, MakingError>>),
}

/// An answer of the solver, and the shares it gave.
struct Kept {
    set: SetId,
    question: Question,
    /// The shares it belongs to; `None` for a refusal, which holds for any.
    shares: Option<Vec<f64>>,
    proof: Proof,
}

/// The window: the project being edited and everything shown of it.
pub struct Window {
    state: State,
    cache: Cache,
    view: View,
    jobs: Jobs<Done>,
    kept: Vec<Kept>,
    paths: Paths,
    imports: Imports,
    notice: Notice,
    documents: Documents,
    demonstration: bool,
    title: String,
    zoom: f32,
}

impl Window {
    /// The window on a project or on spectra files; on the demonstration when there are none. Changes are journalled.
    pub fn open(context: &Context, files: &[PathBuf]) -> Self {
        let is_project = |path: &&PathBuf| path.extension().is_some_and(|e| e.eq_ignore_ascii_case("ron"));
        let spectra: Vec<PathBuf> = files.iter().filter(|path| !is_project(path)).cloned().collect();
        let project = files.iter().rev().find(is_project);
        let mut problem = None;
        let opened =
            project.and_then(|path| documents::open(path).map_err(|sentence| problem = Some(sentence)).ok());
        let mut window = match opened {
            Some((state, sha256)) => Self::keeping(context, state, true, Some(sha256)),
            None if !spectra.is_empty() => Self::keeping(context, empty_state(), true, None),
            None => {
                let mut window = Self::keeping(context, documents::demonstration(CABIN), true, None);
                window.demonstration = true;
                window
            }
        };
        if let Some(problem) = problem {
            window.say(context, problem);
        }
        window.bring_in(context, &spectra);
        window
    }

    /// The window on a state, with no journal and no system dialogs: for tests and pictures.
    pub fn on(context: &Context, state: State) -> Self {
        let mut window = Self::keeping(context, state, false, None);
        window.paths.without_dialogs = true;
        window
    }

    /// The same on the demonstration.
    pub fn on_demonstration(context: &Context) -> Self {
        let mut window = Self::on(context, documents::demonstration(CABIN));
        window.demonstration = true;
        window
    }

    fn keeping(context: &Context, mut state: State, journalled: bool, sha256: Option<String>) -> Self {
        theme::install(context);
        let repaint = {
            let context = context.clone();
            Arc::new(move || context.request_repaint())
        };
        let mut documents = Documents::start(&mut state, journalled);
        if sha256.is_some() {
            documents.change(&mut State::clone(&state), &mut state, sha256);
        }
        Self {
            state,
            cache: Cache::new(),
            view: View::default(),
            jobs: Jobs::for_this_machine(repaint),
            kept: Vec::new(),
            paths: Paths::default(),
            imports: Imports::default(),
            notice: Notice::default(),
            documents,
            demonstration: false,
            title: String::new(),
            zoom: 0.0,
        }
    }

    /// The project being edited.
    pub fn state(&self) -> &State {
        &self.state
    }

    /// Everything derived from it.
    pub fn derived(&mut self) -> Arc<Derived> {
        self.cache.of(&self.state)
    }

    /// True while a solve runs.
    pub fn is_solving(&self) -> bool {
        self.jobs.progress_of("solve").is_some()
    }

    /// True while any job waits or runs.
    pub fn is_working(&self) -> bool {
        !self.jobs.is_idle()
    }

    /// Makes an edit, as a control of the window would.
    ///
    /// # Errors
    /// When it cannot be made; the project is then as it was.
    pub fn make(&mut self, edit: Edit) -> Result<(), EditError> {
        self.state.apply(edit)
    }

    /// The solver's last word on the blend as it stands, as the ledger shows it.
    pub fn proof_words(&self) -> Option<&str> {
        self.proof().map(|proof| proof.words.as_str())
    }

    /// Work before a frame that paints nothing.
    pub(super) fn before_frame(&mut self, context: &Context) {
        self.fit(context);
        let before = self.state.revision();
        for finished in self.jobs.poll() {
            match finished.answer {
                Answer::Done(Done::Solved(solved)) => self.solved(context, *solved),
                Answer::Done(Done::Read(reading)) => self.imports.read(*reading),
                Answer::Done(Done::Frontier(answer)) => self.view.frontier.take(*answer),
                Answer::Done(Done::Device(set, plan, best)) => self.device_solved(context, set, &plan, *best),
                Answer::Panicked(message) => {
                    self.say(context, format!("The work stopped unexpectedly: {message}"));
                }
            }
        }
        if let Some((purpose, paths)) = self.paths.poll() {
            self.chosen(context, purpose, &paths);
        }
        self.take_dropped(context);
        if self.state.revision() != before {
            self.journal(context);
        }
    }

    /// Keeps text at a comfortable size for the room the window has.
    fn fit(&mut self, context: &Context) {
        let zoom = context.zoom_factor();
        let size = context.content_rect().size() * zoom;
        if size.x < 100.0 || size.x > 20_000.0 {
            return;
        }
        let wanted = theme::comfortable_zoom(size.x, size.y);
        // A size the user chose by keys stays until the window's own choice changes.
        if (wanted - self.zoom).abs() > 0.001 {
            self.zoom = wanted;
            context.set_zoom_factor(wanted);
        }
    }

    /// Draws a frame.
    pub(super) fn frame(&mut self, ui: &mut Ui) {
        let context = ui.ctx().clone();
        let mut wishes: Vec<Wish> = Command::pressed(&context).into_iter().map(Wish::Command).collect();
        self.pasted(&context);
        self.recovery(ui);
        let derived = self.cache.of(&self.state);
        let saved = self.saved();
        self.view.dialog_open = self.view.details.is_some() || self.paths.is_open() || self.imports.is_open();
        let running = self.jobs.running();
        let mut view = std::mem::take(&mut self.view);
        let mut derived = derived;
        if view.bench == Bench::Recipe
            && let Some(worked) = view.recipe.work(&self.state)
            && let Some(project) = recipe::device_shares(&self.state, &worked)
        {
            // The ledger judges the light the device makes, not the blend it was asked for.
            derived = Arc::new(self.cache.of_project(&project, self.state.revision()));
        }
        {
            let scene = Scene {
                palette: Palette::of(&context),
                state: &self.state,
                derived: &derived,
                proof: self.proof(),
                solving: self.jobs.progress_of("solve").map(|job| job.progress),
                jobs: &running,
                device_job: self.jobs.progress_of("device").is_some(),
            };
            draw(ui, &scene, &saved, &mut view, &mut wishes);
        }
        self.view = view;
        drop(derived);
        if let Some((purpose, paths)) = self.paths.show(ui) {
            self.chosen(&context, purpose, &paths);
        }
        for asked in self.imports.show(ui, self.state.current_set().is_some()) {
            self.imported(&context, asked);
        }
        self.notice.show(ui);
        self.grant(&context, wishes);
        self.set_title(&context);
    }

    fn proof(&self) -> Option<&Proof> {
        let set = self.state.current_set()?;
        let question = Question::of(self.state.project(), set);
        self.kept
            .iter()
            .rev()
            .find(|kept| {
                kept.set == set.id
                    && kept.question == question
                    && kept
                        .shares
                        .as_ref()
                        .is_none_or(|shares| set.members.iter().map(|m| m.share).eq(shares.iter().copied()))
            })
            .map(|kept| &kept.proof)
    }

    fn saved(&self) -> String {
        match (self.state.path(), self.state.unsaved()) {
            (Some(_), false) => "saved".to_owned(),
            (Some(_), true) => "changed since saved".to_owned(),
            (None, _) if self.demonstration => "demonstration, invented data".to_owned(),
            (None, false) => "new".to_owned(),
            (None, true) => "not saved yet".to_owned(),
        }
    }

    fn set_title(&mut self, context: &Context) {
        let name = &self.state.project().name;
        let title =
            if name.is_empty() { "Whitesmith".to_owned() } else { format!("{name} \u{2013} Whitesmith") };
        if title != self.title {
            context.send_viewport_cmd(ViewportCommand::Title(title.clone()));
            self.title = title;
        }
    }

    fn grant(&mut self, context: &Context, wishes: Vec<Wish>) {
        let before = self.state.revision();
        for wish in wishes {
            match wish {
                Wish::Edit(edit) => self.apply(context, edit),
                Wish::Begin(label) => self.state.begin_gesture(label),
                Wish::End => self.state.end_gesture(),
                Wish::Cancel => self.state.cancel_gesture(),
                Wish::Say(words) => self.say(context, words),
                Wish::Command(command) => self.run(context, command),
                Wish::Frontier(ask) => {
                    self.state.end_gesture();
                    let project = self.state.project().clone();
                    self.jobs.start(ask.key(), self.state.revision(), move |token| {
                        Done::Frontier(Box::new(ask.run(&project, token)))
                    });
                }
                Wish::Stop(key) => self.jobs.cancel(key),
            }
        }
        self.journal(context);
        if self.state.revision() != before {
            // What was drawn is out of date: draw this frame again before it is shown.
            context.request_discard("the project changed");
        }
    }

    fn journal(&mut self, context: &Context) {
        if let Some(problem) = self.documents.note(&mut self.state) {
            self.say(context, problem);
        }
    }

    fn apply(&mut self, context: &Context, edit: Edit) {
        if let Err(error) = self.state.apply(edit) {
            let mut words = error.to_string();
            if let Some(first) = words.get(..1).map(str::to_uppercase) {
                words.replace_range(..1, &first);
            }
            self.say(context, words);
        }
    }

    fn say(&mut self, context: &Context, words: String) {
        self.notice.say(words, context.time());
    }

    /// Puts another state in place; `sha256` is the fingerprint of the file it was opened from.
    fn replace(&mut self, state: State, sha256: Option<String>) {
        self.jobs.cancel_all();
        let mut before = std::mem::replace(&mut self.state, state);
        self.documents.change(&mut before, &mut self.state, sha256);
        self.cache.forget_revision();
        self.view.pull = None;
        self.view.details = None;
        self.view.frontier = frontier::Frontier::default();
        self.kept.clear();
        self.demonstration = false;
    }

    fn run(&mut self, context: &Context, command: Command) {
        match command {
            Command::New => self.replace_kept(context, empty_state()),
            Command::OpenDemo => {
                self.replace_kept(context, documents::demonstration(CABIN));
                self.demonstration = true;
            }
            Command::OpenLibrary => {
                self.replace_kept(context, documents::demonstration(LIBRARY));
                self.demonstration = true;
            }
            Command::Open => self.paths.ask(context, Purpose::OpenProject, ""),
            Command::Save => match self.state.path().map(Path::to_path_buf) {
                Some(path) => self.save(context, &path),
                None => self.ask_save(context),
            },
            Command::SaveAs => self.ask_save(context),
            Command::Import => self.paths.ask(context, Purpose::ImportSpectra, ""),
            Command::Paste => context.send_viewport_cmd(ViewportCommand::RequestPaste),
            Command::SolveDevice => self.solve_device(context),
            Command::ExportReportPdf
            | Command::ExportReportHtml
            | Command::ExportRecipeRon
            | Command::ExportRecipeCsv
            | Command::ExportRecipeSpectrum
            | Command::ExportRecipeTm27 => {
                if let Some(purpose) = documents::export_purpose(command) {
                    let name = self.state.current_set().map_or("recipe", |set| set.name.as_str());
                    let what = match purpose {
                        Purpose::ReportPdf | Purpose::ReportHtml => "report",
                        Purpose::RecipeRon | Purpose::RecipeCsv => "recipe",
                        _ => "device spectrum",
                    };
                    let name = format!("{}.{}", file_name(&format!("{name} {what}")), purpose.ending());
                    self.paths.ask(context, purpose, &name);
                }
            }
            Command::ExportSheetRon | Command::ExportSheetCsv | Command::ExportSpectrum => {
                if let Some(purpose) = documents::export_purpose(command) {
                    let name = self.state.current_set().map_or("blend", |set| set.name.as_str());
                    let what = if purpose == Purpose::SpectrumCsv { "spectrum" } else { "blend sheet" };
                    let name = format!("{}.{}", file_name(&format!("{name} {what}")), purpose.ending());
                    self.paths.ask(context, purpose, &name);
                }
            }
            Command::Undo => {
                self.view.pull = None;
                self.state.undo();
            }
            Command::Redo => {
                self.view.pull = None;
                self.state.redo();
            }
            Command::Solve => self.solve(context),
            Command::StopSolving => self.jobs.cancel("solve"),
            Command::Show(bench) => self.view.bench = bench,
            Command::HoldWhite => self.view.hold_white = !self.view.hold_white,
            Command::AddSet => {
                let edit = self.state.adding_set("New set");
                self.apply(context, edit);
            }
            Command::DuplicateSet => {
                if let Some(edit) = self.state.current_set().and_then(|set| self.state.duplicating(set.id)) {
                    self.apply(context, edit);
                }
            }
            Command::RemoveSet => {
                if let Some(set) = self.state.current_set().map(|set| set.id) {
                    self.apply(context, Edit::RemoveSet(set));
                }
            }
            Command::Appearance => {
                let other = if context.theme() == Theme::Dark { Theme::Light } else { Theme::Dark };
                context.set_theme(other);
            }
            Command::Quit => context.send_viewport_cmd(ViewportCommand::Close),
        }
    }

    /// Puts another project in place as an edit, so that undo brings the one before back.
    fn replace_kept(&mut self, context: &Context, state: State) {
        if !self.state.unsaved() {
            self.replace(state, None);
            return;
        }
        let project = state.project().clone();
        self.apply(context, Edit::ReplaceProject(Box::new(project)));
        self.demonstration = false;
        self.say(context, "The project before was not saved: undo brings it back.".to_owned());
    }

    fn ask_save(&mut self, context: &Context) {
        let name = format!("{}.ron", file_name(&self.state.project().name));
        self.paths.ask(context, Purpose::SaveProject, &name);
    }

    fn save(&mut self, context: &Context, path: &Path) {
        self.state.end_gesture();
        match self.documents.save(&mut self.state, path) {
            Ok(()) => {
                self.demonstration = false;
                self.say(context, format!("Saved as {}.", path.display()));
            }
            Err(problem) => self.say(context, problem),
        }
    }

    fn chosen(&mut self, context: &Context, purpose: Purpose, paths: &[PathBuf]) {
        let Some(first) = paths.first() else { return };
        match purpose {
            Purpose::OpenProject => self.open_file(context, first),
            Purpose::SaveProject => {
                let path =
                    if first.extension().is_some() { first.clone() } else { first.with_extension("ron") };
                self.save(context, &path);
            }
            Purpose::ImportSpectra => self.bring_in(context, paths),
            Purpose::SheetRon | Purpose::SheetCsv | Purpose::SpectrumCsv => {
                let Some(set) = self.state.current_set().map(|set| set.id) else { return };
                let proof = self.proof().map(|proof| proof.words.clone());
                let words = match documents::export(&self.state, set, proof, purpose, first) {
                    Ok(()) => format!("Written to {}.", first.display()),
                    Err(problem) => problem,
                };
                self.say(context, words);
            }
            Purpose::ReportPdf
            | Purpose::ReportHtml
            | Purpose::RecipeRon
            | Purpose::RecipeCsv
            | Purpose::RecipeSpectrum
            | Purpose::RecipeTm27 => {
                let Some(set) = self.state.current_set().map(|set| set.id) else { return };
                let proof = self.proof().map(|proof| proof.words.clone());
                let plan = self.view.recipe.chosen;
                let words = match documents::export_recipe(
                    &self.state,
                    set,
                    plan,
                    proof.as_deref(),
                    purpose,
                    first,
                ) {
                    Ok(()) => format!("Written to {}.", first.display()),
                    Err(problem) => problem,
                };
                self.say(context, words);
            }
        }
        context.request_repaint();
    }

    fn open_file(&mut self, context: &Context, path: &Path) {
        match documents::open(path) {
            Ok((state, sha256)) => {
                let unsaved = self.state.unsaved();
                self.replace(state, Some(sha256));
                if unsaved {
                    let words =
                        "The project before was not saved: the next start offers to bring its changes back.";
                    self.say(context, words.to_owned());
                }
            }
            Err(problem) => self.say(context, problem),
        }
    }

    /// Reads files and shows what a reader makes of them.
    fn bring_in(&mut self, context: &Context, paths: &[PathBuf]) {
        for path in paths {
            let name = path
                .file_name()
                .map_or_else(|| path.display().to_string(), |n| n.to_string_lossy().into_owned());
            let size = std::fs::metadata(path).map(|about| about.len());
            match size {
                Ok(size) if size > GREATEST_FILE => {
                    self.say(context, format!("{name} is larger than any spectra file this program reads."));
                }
                Ok(_) => match std::fs::read(path) {
                    Ok(bytes) => self.imports.add(Source { name, bytes: Arc::new(bytes) }),
                    Err(error) => self.say(context, format!("{name} could not be read: {error}")),
                },
                Err(error) => self.say(context, format!("{name} could not be read: {error}")),
            }
        }
    }

    fn take_dropped(&mut self, context: &Context) {
        let dropped = context.input(|i| i.raw.dropped_files.clone());
        for file in dropped {
            let path = file.path().to_path_buf();
            if path.extension().is_some_and(|e| e.eq_ignore_ascii_case("ron")) {
                self.open_file(context, &path);
            } else {
                self.bring_in(context, &[path]);
            }
        }
    }

    /// A table pasted outside any text field is read like a file.
    fn pasted(&mut self, context: &Context) {
        if context.text_edit_focused() || self.paths.is_open() || self.imports.is_open() {
            return;
        }
        let pasted = context.input_mut(|input| {
            let at = input.events.iter().position(|event| matches!(event, Event::Paste(_)))?;
            match input.events.remove(at) {
                Event::Paste(text) => Some(text),
                _ => None,
            }
        });
        if let Some(text) = pasted.filter(|text| !text.trim().is_empty()) {
            self.imports.add(Source { name: "pasted table".to_owned(), bytes: Arc::new(text.into_bytes()) });
        }
    }

    fn imported(&mut self, context: &Context, asked: Asked) {
        match asked {
            Asked::Read(source, answers) => {
                self.jobs.start("read", self.state.revision(), move |_| {
                    Done::Read(Box::new(files::read::read_bytes(&source.name, &source.bytes, &answers)))
                });
            }
            Asked::Take(emitters, into_set) => {
                if emitters.is_empty() {
                    return;
                }
                if self.state.current_set().is_none() {
                    let set = self.state.adding_set("Set A");
                    self.apply(context, set);
                }
                let set = self
                    .state
                    .current_set()
                    .map(|set| set.id)
                    .filter(|_| into_set || self.state.project().emitters.is_empty());
                let edit = self.state.adding(emitters, set);
                self.apply(context, edit);
                self.journal(context);
                context.request_discard("emitters were added");
            }
        }
    }

    /// Offers what an ended window left unsaved.
    fn recovery(&mut self, ui: &mut Ui) {
        let Some(left) = self.documents.left_behind.first() else { return };
        let changes =
            if left.changes == 1 { "1 change".to_owned() } else { format!("{} changes", left.changes) };
        let words =
            format!("\u{201c}{}\u{201d}: {changes} were not saved when the program last ended.", left.name);
        let palette = Palette::of(ui.ctx());
        let frame = Frame::new().fill(palette.accent_wash).inner_margin(Margin::symmetric(16, 6));
        let (mut back, mut discard) = (false, false);
        Panel::top("recovery").frame(frame).show(ui, |ui| {
            ui.horizontal(|ui| {
                ui.label(RichText::new(words).color(palette.ink));
                back = ui.button("Bring them back").clicked();
                discard = ui.button("Discard them").clicked();
            });
        });
        if back {
            let left = self.documents.left_behind.remove(0);
            let context = ui.ctx().clone();
            match left.recover() {
                Ok((state, made)) => {
                    self.replace(state, None);
                    // Its changes count as unsaved here; the old journal has done its work.
                    let _ = left.discard();
                    if made < left.changes {
                        let words = format!("{made} of {} changes could be brought back.", left.changes);
                        self.say(&context, words);
                    }
                }
                Err(problem) => {
                    self.say(&context, format!("The changes could not be brought back: {problem}"));
                }
            }
        } else if discard {
            // A journal that cannot be removed is offered again at the next start.
            let _ = self.documents.left_behind.remove(0).discard();
        }
    }

    fn solve(&mut self, context: &Context) {
        let Some(set) = self.state.current_set().map(|set| set.id) else { return };
        self.state.end_gesture();
        let project = self.state.project().clone();
        self.jobs.start("solve", self.state.revision(), move |token| {
            Done::Solved(Box::new(proof::solve(&project, set, token)))
        });
        context.request_repaint();
    }

    /// Searches the best blend of the device on the Recipe bench.
    fn solve_device(&mut self, context: &Context) {
        let Some(set) = self.state.current_set() else { return };
        self.view.bench = Bench::Recipe;
        let plan = recipe::plan_on_bench(set, self.view.recipe.chosen);
        let (id, project) = (set.id, self.state.project().clone());
        self.state.end_gesture();
        self.jobs.start("device", self.state.revision(), move |token| {
            let cancelled = token.flag();
            let control = optimiser::Control { progress: &|_| {}, cancelled: &cancelled };
            let best = match project.set(id) {
                Some(set) => best_for_device(&project, set, &plan, &control),
                None => Err(MakingError::NoSet),
            };
            Done::Device(id, Box::new(plan), Box::new(best))
        });
        context.request_repaint();
    }

    fn device_solved(
        &mut self,
        context: &Context,
        id: SetId,
        plan: &RecipePlan,
        best: Result<DeviceBest, MakingError>,
    ) {
        let best = match best {
            Ok(best) => best,
            Err(why) => return self.say(context, why.to_string()),
        };
        let Some(set) = self.state.project().set(id) else { return };
        let place = set.recipes.iter().position(|other| other == plan);
        if set.members.len() != best.shares.len() || (place.is_none() && !set.recipes.is_empty()) {
            return self.say(context, "The device changed while searching: search again.".to_owned());
        }
        let mut edits = vec![Edit::Shares { set: id, shares: best.shares }];
        if let Some(place) = place {
            let mut recipes = set.recipes.clone();
            recipes[place].made = None;
            edits.push(Edit::Recipes { set: id, recipes });
        }
        self.apply(context, Edit::Together { label: "best blend for the device".to_owned(), edits });
        self.say(context, best.sentence);
    }

    fn solved(&mut self, context: &Context, solved: Option<Solved>) {
        let Some(solved) = solved else { return };
        let Some(set) = self.state.project().set(solved.set).cloned() else { return };
        if Question::of(self.state.project(), &set) != solved.question {
            self.say(context, "The targets or emitters changed while solving: solve again.".to_owned());
            return;
        }
        let proof = solved.proof(&set);
        let edit = solved.edit(&set);
        let found = edit.is_some();
        if let Some(edit) = edit {
            self.apply(context, Edit::Together { label: "solve".to_owned(), edits: vec![edit] });
        }
        let shares = self
            .state
            .project()
            .set(set.id)
            .filter(|_| found)
            .map(|set| set.members.iter().map(|m| m.share).collect());
        self.kept.push(Kept { set: set.id, question: solved.question, shares, proof });
        if self.kept.len() > 200 {
            self.kept.remove(0);
        }
        context.request_repaint();
    }
}

impl Drop for Window {
    fn drop(&mut self) {
        self.jobs.cancel_all();
        self.state.end_gesture();
        // With something unsaved the journal stays: the next start offers it.
        self.documents.close(&mut self.state);
    }
}

fn draw(ui: &mut Ui, scene: &Scene<'_>, saved: &str, view: &mut View, wishes: &mut Vec<Wish>) {
    let full = ui.available_rect_before_wrap();
    ui.painter().rect_filled(ui.max_rect(), 0.0, scene.palette.ground);
    let bar = Rect::from_min_max(full.min, pos2(full.right(), full.top() + top_bar::HEIGHT));
    top_bar::show(ui, bar, scene, saved, view.bench, wishes);
    let body = Rect::from_min_max(pos2(full.left(), bar.bottom()), full.max).shrink(GAP);
    let split = body.right() - LEDGER_WIDTH;
    let loom_rect = Rect::from_min_max(body.min, pos2(split - GAP, body.bottom()));
    let ledger_rect = Rect::from_min_max(pos2(split, body.top()), body.max);
    match view.bench {
        Bench::Mixing => ui.push_id("loom", |ui| loom::show(ui, loom_rect, scene, view, wishes)),
        Bench::Frontier => ui.push_id("frontier", |ui| frontier::show(ui, loom_rect, scene, view, wishes)),
        Bench::Recipe => ui.push_id("recipe", |ui| recipe::show(ui, loom_rect, scene, view, wishes)),
    };
    ui.push_id("ledger", |ui| ledger::show(ui, ledger_rect, scene, view, wishes));
    dialogs::emitter::show(ui, scene, view, wishes);
}

fn empty_state() -> State {
    State::new(Project::new("New project"), None).expect("an empty project is valid")
}

/// A name that every file system takes.
fn file_name(name: &str) -> String {
    let plain: String = name
        .chars()
        .map(|c| if c.is_alphanumeric() || matches!(c, '-' | '_' | ' ') { c } else { '-' })
        .collect();
    let plain = plain.trim().replace(' ', "-").to_lowercase();
    if plain.is_empty() { "whitesmith".to_owned() } else { plain }
}
