//! The Frontier bench: what a white spec costs, which emitters to choose, which one is missing.

mod axes;
mod choose;
mod missing;
mod pieces;
mod plot;
mod prices;
mod table;
mod trade;

use super::controls::card;
use super::paint::{Icon, elided, icon, write};
use super::theme::text;
use super::view::{Scene, View};
use super::wish::Wish;
use crate::frontier::{self as data, Aim, Basis, Choice, Missing, Trade};
use crate::jobs::{Running, Token};
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Rect, Sense, Ui, WidgetInfo, pos2, vec2};
use pieces::{Segment, button, segmented};
use project::{EmitterSet, Metric, Project, SetId};

/// Height of the bench's heading.
const HEADING: f32 = 70.0;

/// The tools of the bench.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub(super) enum Tool {
    #[default]
    Trade,
    Choose,
    Missing,
}

impl Tool {
    const ALL: [Self; 3] = [Self::Trade, Self::Choose, Self::Missing];

    const fn words(self) -> &'static str {
        match self {
            Self::Trade => "Trade-off",
            Self::Choose => "Choose emitters",
            Self::Missing => "Missing emitter",
        }
    }

    /// The key of its job.
    const fn key(self) -> &'static str {
        match self {
            Self::Trade => "frontier",
            Self::Choose => "choose",
            Self::Missing => "missing",
        }
    }

    const fn action(self) -> &'static str {
        match self {
            Self::Trade => "Draw the curve",
            Self::Choose => "Choose",
            Self::Missing => "Draw the map",
        }
    }
}

/// A job of this bench.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(super) enum Ask {
    Trade { set: SetId, metric: Metric, aim: Aim },
    Choose { set: SetId, count: usize, aim: Aim },
    Missing { set: SetId, aim: Aim },
}

/// What it answers.
#[derive(Debug)]
pub(super) enum Answer {
    Trade(Trade),
    Choice(Choice),
    Missing(Missing),
}

impl Ask {
    /// The key of the job.
    pub(super) const fn key(self) -> &'static str {
        match self {
            Self::Trade { .. } => Tool::Trade.key(),
            Self::Choose { .. } => Tool::Choose.key(),
            Self::Missing { .. } => Tool::Missing.key(),
        }
    }

    /// Does the work; on a job's thread.
    pub(super) fn run(self, project: &Project, token: &Token) -> Option<Answer> {
        match self {
            Self::Trade { set, metric, aim } => {
                data::trade(project, set, metric, aim, token).map(Answer::Trade)
            }
            Self::Choose { set, count, aim } => {
                data::choose(project, set, count, aim, token).map(Answer::Choice)
            }
            Self::Missing { set, aim } => data::missing(project, set, aim, token).map(Answer::Missing),
        }
    }
}

/// What the bench remembers; nothing of it is saved.
#[derive(Debug)]
pub(super) struct Frontier {
    tool: Tool,
    metric: Metric,
    metric_by_hand: bool,
    /// Chosen by hand; otherwise it follows the spec.
    aim: Option<Aim>,
    count: usize,
    as_table: bool,
    /// The point of the curve looked at.
    point: Option<usize>,
    /// The choice looked at.
    pick: usize,
    /// The cell of the map looked at, width and peak.
    cell: Option<(usize, usize)>,
    trade: Option<Trade>,
    choice: Option<Choice>,
    missing: Option<Missing>,
    /// The set the curve was drawn for without being asked.
    drawn_for: Option<SetId>,
    /// What answers have to agree with, and the revision it belongs to.
    bases: Option<(u64, Basis, Basis)>,
}

impl Default for Frontier {
    fn default() -> Self {
        Self {
            tool: Tool::Trade,
            metric: Metric::Ra,
            metric_by_hand: false,
            aim: None,
            count: 4,
            as_table: false,
            point: None,
            pick: 0,
            cell: None,
            trade: None,
            choice: None,
            missing: None,
            drawn_for: None,
            bases: None,
        }
    }
}

impl Frontier {
    /// Keeps an answer.
    pub(super) fn take(&mut self, answer: Option<Answer>) {
        match answer {
            Some(Answer::Trade(trade)) => {
                self.point = None;
                self.trade = Some(trade);
            }
            Some(Answer::Choice(choice)) => {
                self.pick = 0;
                self.choice = Some(choice);
            }
            Some(Answer::Missing(missing)) => {
                self.cell = None;
                self.missing = Some(missing);
            }
            None => {}
        }
    }

    fn note_bases(&mut self, scene: &Scene<'_>, set: &EmitterSet) {
        let revision = scene.state.revision();
        let known = self
            .bases
            .as_ref()
            .is_some_and(|(known, of_set, _)| *known == revision && of_set.set() == set.id);
        if !known {
            let project = scene.state.project();
            self.bases = Some((revision, Basis::of_set(project, set), Basis::of_project(project, set)));
        }
    }

    /// True when an answer of the tool is there, and whether it still holds.
    fn answer(&self, aim: Aim) -> Option<bool> {
        let (_, of_set, of_project) = self.bases.as_ref()?;
        match self.tool {
            Tool::Trade => {
                self.trade.as_ref().map(|t| t.basis == *of_set && t.aim == aim && t.metric == self.metric)
            }
            Tool::Choose => {
                self.choice.as_ref().map(|c| c.basis == *of_project && c.aim == aim && c.count == self.count)
            }
            Tool::Missing => self.missing.as_ref().map(|m| m.basis == *of_set && m.aim == aim),
        }
    }

    fn ask(&self, set: SetId, aim: Aim) -> Ask {
        match self.tool {
            Tool::Trade => Ask::Trade { set, metric: self.metric, aim },
            Tool::Choose => Ask::Choose { set, count: self.count, aim },
            Tool::Missing => Ask::Missing { set, aim },
        }
    }
}

/// Draws the bench.
pub(super) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let inner = card(ui, rect);
    let Some(set) = scene.state.current_set().filter(|set| !set.members.is_empty()) else {
        let words = "Bring emitters into a set first: the Mixing bench and its menu do that.";
        write(ui.painter(), inner.center(), Align2::CENTER_CENTER, words, text::body(), scene.palette.muted);
        return;
    };
    let bench = &mut view.frontier;
    bench.note_bases(scene, set);
    let project = scene.state.project();
    let can_efficacy = set
        .members
        .iter()
        .filter(|m| m.on)
        .all(|m| project.emitter(m.emitter).is_some_and(|e| e.wall_plug.is_some()));
    let aim = bench.aim.filter(|aim| *aim == Aim::Ler || can_efficacy).unwrap_or_else(|| {
        let spec = Aim::of(set.white.maximise);
        if can_efficacy { spec } else { Aim::Ler }
    });
    // The curve of a set comes by itself the first time; after that it is asked for.
    if bench.tool == Tool::Trade && bench.drawn_for != Some(set.id) {
        bench.drawn_for = Some(set.id);
        if !bench.metric_by_hand {
            bench.metric = tightest(scene, set);
        }
        if bench.answer(aim) != Some(true) {
            wishes.push(Wish::Frontier(bench.ask(set.id, aim)));
        }
    }
    heading(ui, inner, scene, set, bench, (aim, can_efficacy), wishes);
    let body = Rect::from_min_max(pos2(inner.left(), inner.top() + HEADING), inner.max);
    let fresh = bench.answer(aim) == Some(true);
    match bench.tool {
        Tool::Trade => trade::show(ui, body, scene, set, bench, (aim, fresh), wishes),
        Tool::Choose => choose::show(ui, body, scene, bench, (aim, fresh), wishes),
        Tool::Missing => missing::show(ui, body, scene, bench),
    }
}

/// The rendering metric with the least to spare over its floor in the present blend; Ra without any floor.
fn tightest(scene: &Scene<'_>, set: &EmitterSet) -> Metric {
    let spare = |metric: &Metric| {
        let floor = set.white.limits.of(*metric).low?;
        let line = scene.derived.ledger.iter().find(|line| line.key == metric.key())?;
        line.value.map(|value| value - floor)
    };
    data::RENDERING
        .into_iter()
        .filter_map(|metric| Some((metric, spare(&metric)?)))
        .min_by(|a, b| a.1.total_cmp(&b.1))
        .map_or(Metric::Ra, |(metric, _)| metric)
}

fn heading(
    ui: &mut Ui,
    inner: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    bench: &mut Frontier,
    (aim, can_efficacy): (Aim, bool),
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let y = inner.top() + 14.0;
    let tools = Tool::ALL.map(|tool| Segment { value: tool, words: tool.words(), hint: "", enabled: true });
    let (asked, shown) = segmented(ui, pos2(inner.left(), y), "Tool", &tools, bench.tool);
    if let Some(tool) = asked {
        bench.tool = tool;
    }
    let aims = Aim::ALL.map(|one| Segment {
        value: one,
        words: one.words(),
        hint: if one == Aim::Efficacy && !can_efficacy {
            "Needs the wall-plug efficiency of every emitter of the set"
        } else {
            ""
        },
        enabled: one == Aim::Ler || can_efficacy,
    });
    let width = pieces::segmented_width(ui, &aims);
    let left = (inner.right() - width).max(shown.right() + 20.0);
    let (asked, _) = segmented(ui, pos2(left, y), "Counted in", &aims, aim);
    if let Some(one) = asked {
        bench.aim = Some(one);
        bench.drawn_for = None;
    }

    let y = inner.top() + 48.0;
    let key = bench.tool.key();
    if let Some(running) = scene.jobs.iter().find(|job| job.key == key) {
        progress(ui, inner, y, scene, running, bench.tool, wishes);
        return;
    }
    let answer = bench.answer(aim);
    let words = match answer {
        Some(false) => "Work it out again",
        _ => bench.tool.action(),
    };
    let mut right = inner.right();
    if answer != Some(true) {
        let size = pieces::button_size(ui, words);
        let rect = Rect::from_min_size(pos2(right - size.x, y - size.y / 2.0), size);
        if super::controls::primary_button(ui, rect, words, true, "Runs beside your work; it can be stopped")
            .clicked()
        {
            wishes.push(Wish::Frontier(bench.ask(set.id, aim)));
        }
        right = rect.left() - 14.0;
    }
    let (line, colour, sign) = match (answer, bench.tool) {
        (Some(false), _) => (
            "Out of date: the set, its targets or what is asked changed since this was worked out."
                .to_owned(),
            palette.caution,
            Some(Icon::Caution),
        ),
        (_, Tool::Trade) => (
            format!("What more rendering costs in {}, all other limits kept.", aim.words()),
            palette.muted,
            None,
        ),
        (_, Tool::Choose) => (
            format!(
                "The few of all {} emitters of this project that give the most {} at this white.",
                project_emitters(scene),
                aim.words()
            ),
            palette.muted,
            None,
        ),
        (_, Tool::Missing) => (
            format!("Which one emitter more would help \u{201c}{}\u{201d} most, and how much.", set.name),
            palette.muted,
            None,
        ),
    };
    let mut x = inner.left();
    if let Some(sign) = sign {
        icon(ui.painter(), sign, pos2(x + 8.0, y), 14.0, colour);
        x += 22.0;
    }
    let shown = elided(ui.painter(), pos2(x, y - 8.0), right - x, &line, text::body(), colour);
    ui.interact(shown, ui.scope_id().with("about"), Sense::hover())
        .widget_info(|| WidgetInfo::labeled(Role::Label, true, &line));
}

fn project_emitters(scene: &Scene<'_>) -> usize {
    scene.state.project().emitters.len()
}

fn progress(
    ui: &mut Ui,
    inner: Rect,
    y: f32,
    scene: &Scene<'_>,
    running: &Running,
    tool: Tool,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let size = pieces::button_size(ui, "Stop");
    let stop = Rect::from_min_size(pos2(inner.right() - size.x, y - size.y / 2.0), size);
    if button(ui, stop, "Stop", true, "Stops working; what is shown stays") {
        wishes.push(Wish::Stop(tool.key()));
    }
    let percent = format!("{:.0} %", running.progress * 100.0);
    let words = if running.note.is_empty() {
        format!("Working\u{2026} {percent}")
    } else {
        format!("Working on {}\u{2026} {percent}", running.note)
    };
    let shown =
        write(ui.painter(), pos2(inner.left(), y), Align2::LEFT_CENTER, &words, text::body(), palette.ink);
    let bar = Rect::from_min_max(
        pos2((shown.right() + 18.0).max(inner.left() + 330.0), y - 3.0),
        pos2(stop.left() - 18.0, y + 3.0),
    );
    ui.interact(shown.union(bar), ui.scope_id().with("progress"), Sense::hover())
        .widget_info(|| WidgetInfo::labeled(Role::ProgressIndicator, true, &words));
    if bar.width() > 20.0 {
        ui.painter().rect_filled(bar, CornerRadius::same(3), palette.rule);
        let done = Rect::from_min_size(bar.min, vec2(bar.width() * running.progress as f32, bar.height()));
        ui.painter().rect_filled(done, CornerRadius::same(3), palette.accent);
    }
}
