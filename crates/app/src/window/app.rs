//! One frame after another: draw, collect wishes, grant them.

use super::command::Command;
use super::dialogs;
use super::theme::{self, Palette};
use super::view::{Proof, Scene, View};
use super::wish::Wish;
use super::{ledger, loom, top_bar};
use crate::state::derived::{Cache, Derived};
use crate::state::{Edit, State};
use egui::{Context, Rect, Theme, Ui, ViewportCommand, pos2};
use project::Project;
use std::path::PathBuf;
use std::sync::Arc;

/// Width of the ledger.
const LEDGER_WIDTH: f32 = 372.0;
/// Room round the sheets.
const GAP: f32 = 12.0;

/// The window: the project being edited and everything shown of it.
pub struct Window {
    state: State,
    cache: Cache,
    view: View,
    proof: Option<(u64, Proof)>,
    title: String,
    zoom: f32,
}

impl Window {
    /// The window on a project or on spectra files; on the demonstration when there are none.
    pub fn open(context: &Context, files: &[PathBuf]) -> Self {
        let _ = files;
        let state = State::new(demo(), None).expect("the demonstration is a valid project");
        Self::on(context, state)
    }

    /// The window on a state.
    pub fn on(context: &Context, state: State) -> Self {
        theme::install(context);
        Self {
            state,
            cache: Cache::new(),
            view: View::default(),
            proof: None,
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

    /// Work before a frame that paints nothing.
    pub(super) fn before_frame(&mut self, context: &Context) {
        self.fit(context);
    }

    /// Keeps text at a comfortable size for the room the window has.
    fn fit(&mut self, context: &Context) {
        let zoom = context.zoom_factor();
        let size = context.content_rect().size() * zoom;
        if size.x < 100.0 {
            return;
        }
        let wanted = theme::comfortable_zoom(size.x, size.y);
        // A zoom the user chose by keys stays until the window's own choice changes.
        if (wanted - self.zoom).abs() > 0.001 {
            self.zoom = wanted;
            context.set_zoom_factor(wanted);
        }
    }

    /// Draws a frame.
    pub(super) fn frame(&mut self, ui: &mut Ui) {
        let mut wishes: Vec<Wish> = Command::pressed(ui.ctx()).into_iter().map(Wish::Command).collect();
        let derived = self.cache.of(&self.state);
        let scene = Scene {
            palette: Palette::of(ui.ctx()),
            state: &self.state,
            derived: &derived,
            proof: self.proof.as_ref().filter(|(r, _)| *r == self.state.revision()).map(|(_, p)| p),
            solving: None,
        };
        let saved = self.saved();
        self.view.dialog_open = self.view.details.is_some();
        let full = ui.max_rect();
        ui.painter().rect_filled(full, 0.0, scene.palette.ground);
        let bar = Rect::from_min_max(full.min, pos2(full.right(), full.top() + top_bar::HEIGHT));
        top_bar::show(ui, bar, &scene, &saved, &mut wishes);
        let body = Rect::from_min_max(pos2(full.left(), bar.bottom()), full.max).shrink(GAP);
        let split = body.right() - LEDGER_WIDTH;
        let loom_rect = Rect::from_min_max(body.min, pos2(split - GAP, body.bottom()));
        let ledger_rect = Rect::from_min_max(pos2(split, body.top()), body.max);
        ui.push_id("loom", |ui| loom::show(ui, loom_rect, &scene, &mut self.view, &mut wishes));
        ui.push_id("ledger", |ui| ledger::show(ui, ledger_rect, &scene, &mut self.view, &mut wishes));
        dialogs::emitter::show(ui, &scene, &mut self.view, &mut wishes);
        drop(derived);
        self.grant(ui.ctx(), wishes);
        self.set_title(ui.ctx());
    }

    fn saved(&self) -> String {
        match (self.state.path(), self.state.unsaved()) {
            (Some(_), false) => "saved".to_owned(),
            (Some(_), true) => "changed since saved".to_owned(),
            (None, _) => "not saved to a file".to_owned(),
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
                Wish::Edit(edit) => self.apply(edit),
                Wish::Begin(label) => self.state.begin_gesture(label),
                Wish::End => self.state.end_gesture(),
                Wish::Cancel => self.state.cancel_gesture(),
                Wish::Say(words) => self.say(words),
                Wish::Command(command) => self.run(context, command),
            }
        }
        if self.state.revision() != before {
            // What was drawn is out of date: draw this frame again before it is shown.
            context.request_discard("the project changed");
        }
    }

    fn apply(&mut self, edit: Edit) {
        if let Err(error) = self.state.apply(edit) {
            self.say(error.to_string());
        }
    }

    fn say(&mut self, _words: String) {}

    fn run(&mut self, context: &Context, command: Command) {
        match command {
            Command::Undo => {
                self.state.undo();
            }
            Command::Redo => {
                self.state.redo();
            }
            Command::HoldWhite => self.view.hold_white = !self.view.hold_white,
            Command::Appearance => {
                let other = if context.theme() == Theme::Dark { Theme::Light } else { Theme::Dark };
                context.set_theme(other);
            }
            Command::Quit => context.send_viewport_cmd(ViewportCommand::Close),
            _ => {}
        }
    }
}

fn demo() -> Project {
    let mut p = Project::new("Night-ferry cabin panel");
    let mut set = project::EmitterSet {
        id: project::SetId(100),
        name: "Set A".into(),
        note: String::new(),
        members: vec![],
        white: project::WhiteSpec::default(),
    };
    for (k, (name, peak, width, share)) in [
        ("Kingfisher blue", 458.0, 27.0, 0.12),
        ("Reed teal", 497.0, 37.0, 0.0),
        ("Fern green", 531.0, 55.0, 0.252),
        ("Brass amber", 586.0, 70.0, 0.302),
        ("Rowan red", 627.0, 46.0, 0.326),
    ]
    .into_iter()
    .enumerate()
    {
        let w: Vec<f64> = (380..=780).map(f64::from).collect();
        let s: Vec<f64> =
            w.iter().map(|x: &f64| (-4.0 * 2f64.ln() * ((x - peak) / width).powi(2)).exp()).collect();
        let id = project::EmitterId(k as u64 + 1);
        p.emitters.push(project::Emitter {
            id,
            name: name.into(),
            invented: true,
            note: String::new(),
            import: project::Import { wavelengths_nm: w, power_per_nm: s, ..Default::default() },
            corrections: vec![],
            geometry: Default::default(),
            origin: Default::default(),
            mounting: Default::default(),
            instrument_range_nm: None,
            wall_plug: Some(0.3),
            sheet: Default::default(),
        });
        let mut m = project::Member::new(id);
        m.share = share;
        m.locked = k == 3;
        m.on = k != 1;
        set.members.push(m);
    }
    set.white.limits.ra = project::Limit::at_least(90.0);
    set.white.limits.r9 = project::Limit::at_least(60.0);
    set.white.limits.rg = project::Limit::between(95.0, 105.0);
    set.white.limits.efficacy = project::Limit::at_least(125.0);
    set.white.region = project::Region::Quadrangle { nominal_k: 3000 };
    p.next_id = 200;
    p.sets.push(set);
    p
}
