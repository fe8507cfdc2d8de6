//! Targets and limits, edited where they are read.

use super::super::controls::Number;
use super::super::paint::{elided, measure, write};
use super::super::theme::text;
use super::super::view::Scene;
use super::super::wish::Wish;
use crate::state::Edit;
use crate::state::derived::LedgerLine;
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Popup, PopupCloseBehavior, Rect, Sense, Ui, WidgetInfo, pos2};
use project::{EmitterSet, Limit, Metric, WhiteSpec};

/// The edit that gives a set another white spec.
pub(super) fn white(set: &EmitterSet, change: impl FnOnce(&mut WhiteSpec)) -> Wish {
    let mut white = set.white.clone();
    change(&mut white);
    Wish::Edit(Edit::White { set: set.id, white: Box::new(white) })
}

fn metric(key: &str) -> Option<Metric> {
    Metric::ALL.into_iter().find(|metric| metric.key() == key)
}

/// The limit column of a line.
pub(super) fn edit(
    ui: &mut Ui,
    rect: Rect,
    line: &LedgerLine,
    scene: &Scene<'_>,
    set: &EmitterSet,
    wishes: &mut Vec<Wish>,
) {
    match line.key {
        "cct" => {
            let spec = Field {
                name: "target CCT in kelvin",
                decimals: 0,
                plus: false,
                speed: 10.0,
                range: (1000.0, 20_000.0),
            };
            number(ui, rect, "target", set.white.cct_k, &spec, scene, wishes, |value| {
                white(set, |w| w.cct_k = value)
            });
        }
        "duv" => {
            let spec =
                Field { name: "target Duv", decimals: 4, plus: true, speed: 0.0001, range: (-0.05, 0.05) };
            number(ui, rect, "target", set.white.duv, &spec, scene, wishes, |value| {
                white(set, |w| w.duv = value)
            });
        }
        "light" => {
            elided(
                ui.painter(),
                pos2(rect.left() + 4.0, rect.center().y - 7.0),
                rect.width() + 58.0,
                &line.limit,
                text::small(),
                scene.palette.muted,
            );
        }
        key => {
            if let Some(metric) = metric(key) {
                limit(ui, rect, metric, line, scene, set, wishes);
            }
        }
    }
}

struct Field<'a> {
    name: &'a str,
    decimals: usize,
    plus: bool,
    speed: f64,
    range: (f64, f64),
}

#[expect(clippy::too_many_arguments, reason = "a typed number with its words and what it does")]
fn number(
    ui: &mut Ui,
    rect: Rect,
    lead: &str,
    value: f64,
    field: &Field<'_>,
    scene: &Scene<'_>,
    wishes: &mut Vec<Wish>,
    edit: impl FnOnce(f64) -> Wish,
) -> f32 {
    let palette = scene.palette;
    let y = rect.center().y;
    let lead = write(
        ui.painter(),
        pos2(rect.left() + 4.0, y),
        Align2::LEFT_CENTER,
        lead,
        text::small(),
        palette.muted,
    );
    let room = Rect::from_min_max(pos2(lead.right() + 1.0, rect.top()), rect.max);
    let mut number = Number::new(field.name, value)
        .decimals(field.decimals)
        .speed(field.speed)
        .range(field.range.0, field.range.1)
        .style(super::super::theme::small_strong_style());
    if field.plus {
        number = number.plus();
    }
    let typed = number.show(ui, room);
    if typed.response.drag_started() {
        wishes.push(Wish::Begin(format!("change the {}", field.name)));
    }
    if let Some(value) = typed.value {
        wishes.push(edit(value));
    }
    if typed.response.drag_stopped() {
        wishes.push(Wish::End);
    }
    typed.response.rect.right()
}

const fn name(metric: Metric) -> &'static str {
    match metric {
        Metric::Ra => "Ra",
        Metric::R9 => "R9",
        Metric::Rf => "Rf",
        Metric::Rg => "Rg",
        Metric::Ler => "LER",
        Metric::Efficacy => "device lm/W",
    }
}

/// A sensible first limit.
const fn usual(metric: Metric) -> f64 {
    match metric {
        Metric::Ra => 90.0,
        Metric::R9 => 50.0,
        Metric::Rf => 85.0,
        Metric::Rg => 97.0,
        Metric::Ler => 300.0,
        Metric::Efficacy => 100.0,
    }
}

fn decimals(value: f64) -> usize {
    if (value - value.round()).abs() < 1e-9 { 0 } else { 1 }
}

fn limit(
    ui: &mut Ui,
    rect: Rect,
    metric: Metric,
    line: &LedgerLine,
    scene: &Scene<'_>,
    set: &EmitterSet,
    wishes: &mut Vec<Wish>,
) {
    let current = *set.white.limits.of(metric);
    let change = |limit: Limit| white(set, |w| *w.limits.of_mut(metric) = limit);
    let low_name = format!("least {}", name(metric));
    let high_name = format!("greatest {}", name(metric));
    let field = |name, value| Field {
        name,
        decimals: decimals(value),
        plus: false,
        speed: 0.5,
        range: (-1000.0, 1e5),
    };
    let mut right = rect.left();
    match (current.low, current.high) {
        (Some(low), None) => {
            right = number(ui, rect, "at least", low, &field(&low_name, low), scene, wishes, |v| {
                change(Limit { low: Some(v), high: None })
            });
        }
        (None, Some(high)) => {
            right = number(ui, rect, "at most", high, &field(&high_name, high), scene, wishes, |v| {
                change(Limit { low: None, high: Some(v) })
            });
        }
        (Some(low), Some(high)) => {
            let first = number(ui, rect, "", low, &field(&low_name, low), scene, wishes, |v| {
                change(Limit { low: Some(v), high: Some(high.max(v)) })
            });
            let rest = Rect::from_min_max(pos2(first - 2.0, rect.top()), rect.max);
            right = number(ui, rest, "to", high, &field(&high_name, high), scene, wishes, |v| {
                change(Limit { low: Some(low.min(v)), high: Some(v) })
            });
        }
        (None, None) => {}
    }
    menu(ui, rect, right, metric, current, line, scene, wishes, &change);
}

/// The words that open the choice of ends.
#[expect(clippy::too_many_arguments, reason = "one limit's whole scene")]
fn menu(
    ui: &mut Ui,
    rect: Rect,
    right: f32,
    metric: Metric,
    current: Limit,
    line: &LedgerLine,
    scene: &Scene<'_>,
    wishes: &mut Vec<Wish>,
    change: &impl Fn(Limit) -> Wish,
) {
    let palette = scene.palette;
    let open = current.is_open();
    let words = if open { "no limit" } else { "" };
    let size = measure(ui.painter(), words, text::small());
    let left = if open { rect.left() } else { right + 1.0 };
    let width = if open { size.x + 24.0 } else { 17.0 };
    let area =
        Rect::from_min_max(pos2(left, rect.center().y - 10.0), pos2(left + width, rect.center().y + 10.0));
    let response = ui.interact(area, ui.scope_id().with(("limit menu", line.key)), Sense::click());
    response.widget_info(|| {
        WidgetInfo::labeled(Role::Button, true, format!("Kind of limit on {}", name(metric)))
    });
    if response.hovered() || response.has_focus() {
        ui.painter().rect_filled(area, CornerRadius::same(4), palette.accent_wash);
    }
    if open {
        write(
            ui.painter(),
            pos2(area.left() + 4.0, area.center().y),
            Align2::LEFT_CENTER,
            words,
            text::small(),
            palette.muted,
        );
    }
    super::super::paint::icon(
        ui.painter(),
        super::super::paint::Icon::Open,
        pos2(area.right() - 8.0, area.center().y),
        8.0,
        palette.bar,
    );
    super::super::controls::focus_ring(ui, &response, 4);
    Popup::menu(&response).close_behavior(PopupCloseBehavior::CloseOnClick).show(|ui| {
        ui.set_min_width(150.0);
        let low = current.low.unwrap_or_else(|| usual(metric));
        let high = current.high.unwrap_or_else(|| low + if metric == Metric::Rg { 6.0 } else { 10.0 });
        for (words, limit) in [
            ("no limit", Limit::default()),
            ("at least", Limit::at_least(low)),
            ("at most", Limit { low: None, high: Some(current.high.unwrap_or(low)) }),
            ("from \u{2026} to \u{2026}", Limit::between(low.min(high), high)),
        ] {
            let same = current.low.is_some() == limit.low.is_some()
                && current.high.is_some() == limit.high.is_some();
            if ui.selectable_label(same, words).clicked() && !same {
                wishes.push(change(limit));
            }
        }
    });
    response.on_hover_text(format!("Kind of limit on {}", name(metric)));
}
