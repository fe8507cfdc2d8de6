//! One emitter's row: its curve, the hand on it, and the keys it listens to.

use super::super::paint::{Pattern, measure, patterned};
use super::super::theme::{Emitted, text};
use super::super::view::{Scene, View};
use super::super::wish::Wish;
use super::{Pull, RowScene, edge, kind_words, row_view};
use crate::state::Edit;
use crate::state::derived::RowView;
use crate::state::mixing::kinds;
use colour::appearance::Srgb;
use egui::accesskit::{Action, Role};
use egui::{
    Align2, Color32, CursorIcon, EventFilter, Id, Key, Modifiers, Pos2, Rect, Response, Sense, Stroke, Ui,
    WidgetInfo, pos2, vec2,
};
use project::{EmitterId, Member};

/// Below this share the curve is shown as an outline of a fixed height, so that it can be seen and grabbed.
const LEAST_VISIBLE: f64 = 0.002;
/// Height of that outline, as a part of the row.
const GHOST: f32 = 0.34;

/// The identity of a row's curve in the window.
pub(super) fn id_of(emitter: EmitterId) -> Id {
    Id::unique(("loom row", emitter.0))
}

struct Plot {
    rect: Rect,
    base: f32,
    full: f32,
}

impl Plot {
    fn of(rect: Rect, scene: &RowScene<'_>) -> Self {
        let rect = Rect::from_min_max(rect.min, pos2(scene.axis.right, rect.bottom()));
        Self { rect, base: rect.bottom() - 7.0, full: rect.height() - 17.0 }
    }

    fn y(&self, share: f64, scale: f64) -> f32 {
        self.base - (share / scale) as f32 * self.full
    }
}

pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    k: usize,
    rows: &RowScene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let member = rows.set.members[k];
    let Some(emitter) = rows.scene.state.project().emitter(member.emitter) else { return };
    let palette = rows.scene.palette;
    ui.painter().hline(rect.x_range(), rect.top() + 0.5, Stroke::new(1.0, palette.rule));
    let plot = Plot::of(rect, rows);
    let row = row_view(rows.blend, k);
    let share = row.map_or(0.0, |row| row.share(rows.kind));

    let response = ui.interact(plot.rect, id_of(member.emitter), Sense::click_and_drag());
    response.widget_info(|| {
        let state = match (member.on, member.locked) {
            (false, _) => ", off",
            (true, true) => ", locked",
            (true, false) => "",
        };
        let name = format!("{}, share of {} in percent{state}", emitter.name, kind_words(rows.kind));
        WidgetInfo::slider(member.on && !member.locked, share * 100.0, name)
    });
    ui.ctx().accesskit_node_builder(response.id, |node| {
        node.set_role(Role::Slider);
        node.set_min_numeric_value(0.0);
        node.set_max_numeric_value(100.0);
        node.add_action(Action::Increment);
        node.add_action(Action::Decrement);
        node.add_action(Action::SetValue);
    });
    let response = response.on_hover_and_drag_cursor(if member.locked || !member.on {
        CursorIcon::NotAllowed
    } else {
        CursorIcon::ResizeVertical
    });
    hand(ui, &response, k, &plot, rows, &emitter.name, view, wishes);
    keys(ui, &response, k, share, rows, view, wishes);

    let emitted = palette.emitter(
        row.and_then(|r| r.light.as_ref()).map_or(Srgb { r: 128, g: 128, b: 128 }, |light| light.srgb),
    );
    let pattern = Pattern::of_row(rows.scene.derived.emitter(member.emitter).map_or(k, |e| e.pattern));
    paint(ui, &plot, &response, &member, row, share, rows, emitted, pattern, view);
    let edge_rect = Rect::from_min_max(pos2(rows.axis.right + super::EDGE_GAP, rect.top()), rect.max);
    edge::show(ui, edge_rect, k, emitter, row, (emitted, pattern), rows, view, wishes);
}

/// Follows the pointer.
#[expect(clippy::too_many_arguments, reason = "one row's whole scene")]
fn hand(
    ui: &Ui,
    response: &Response,
    k: usize,
    plot: &Plot,
    rows: &RowScene<'_>,
    name: &str,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let emitter = rows.set.members[k].emitter;
    if response.clicked() || response.drag_started() {
        response.request_focus();
    }
    if response.drag_started()
        && let Some(blend) = rows.blend
    {
        view.pull = Pull::begin(rows.set, blend, k, rows.kind, view.hold_white);
        view.pull_scale = rows.scale;
        wishes.push(Wish::Begin(format!("pull {name}")));
    }
    let Some(pull) = view.pull.as_mut().filter(|pull| pull.emitter == emitter) else { return };
    if response.dragged() {
        let (from, to, fine) =
            ui.input(|i| (i.pointer.press_origin(), i.pointer.latest_pos(), i.modifiers.shift));
        if let (Some(from), Some(to)) = (from, to) {
            let per_point = view.pull_scale / f64::from(plot.full) * if fine { 0.1 } else { 1.0 };
            pull.to(pull.start + f64::from(from.y - to.y) * per_point, rows.set, wishes);
        }
    }
    if response.drag_stopped() {
        view.pull = None;
        // The toolkit ends a drag when Escape is pressed; for us that takes the pull back.
        let taken_back = ui.input(|i| i.key_pressed(Key::Escape));
        wishes.push(if taken_back { Wish::Cancel } else { Wish::End });
    }
}

/// Listens to the keyboard and to assistive technology.
fn keys(
    ui: &Ui,
    response: &Response,
    k: usize,
    share: f64,
    rows: &RowScene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let member = rows.set.members[k];
    let (set, emitter) = (rows.set.id, member.emitter);
    let id = response.id;
    let mut wanted = None;
    ui.input(|i| {
        let steps = i.num_accesskit_action_requests(id, Action::Increment) as f64
            - i.num_accesskit_action_requests(id, Action::Decrement) as f64;
        if steps != 0.0 {
            wanted = Some(share + 0.01 * steps);
        }
        for request in i.accesskit_action_requests(id, Action::SetValue) {
            if let Some(egui::accesskit::ActionData::NumericValue(value)) = request.data {
                wanted = Some(value / 100.0);
            }
        }
    });
    if response.has_focus() {
        let filter =
            EventFilter { horizontal_arrows: true, vertical_arrows: true, tab: false, escape: false };
        ui.memory_mut(|m| m.set_focus_lock_filter(id, filter));
        let pressed =
            |modifiers: Modifiers, key: Key| ui.input_mut(|i| i.count_and_consume_key(modifiers, key)) as f64;
        let mut by = 0.0;
        for (modifiers, step) in [(Modifiers::SHIFT, 0.001), (Modifiers::NONE, 0.01)] {
            by += step * (pressed(modifiers, Key::ArrowUp) + pressed(modifiers, Key::ArrowRight));
            by -= step * (pressed(modifiers, Key::ArrowDown) + pressed(modifiers, Key::ArrowLeft));
        }
        by += 0.05 * (pressed(Modifiers::NONE, Key::PageUp) - pressed(Modifiers::NONE, Key::PageDown));
        if by != 0.0 {
            wanted = Some(share + by);
        }
        if pressed(Modifiers::NONE, Key::Home) > 0.0 {
            wanted = Some(0.0);
        }
        if pressed(Modifiers::NONE, Key::End) > 0.0 {
            wanted = Some(1.0);
        }
        if pressed(Modifiers::NONE, Key::L) > 0.0 {
            wishes.push(Wish::Edit(Edit::Lock { set, emitter, locked: !member.locked }));
        }
        if pressed(Modifiers::NONE, Key::O) > 0.0 {
            wishes.push(Wish::Edit(Edit::Switch { set, emitter, on: !member.on }));
        }
        if pressed(Modifiers::NONE, Key::Enter) > 0.0 {
            view.focus_share = Some(emitter);
        }
    }
    if let Some(wanted) = wanted {
        set_share(k, wanted, rows, view, wishes);
    }
}

/// Gives a row a share, as one step of its own; says why when it cannot.
pub(super) fn set_share(k: usize, wanted: f64, rows: &RowScene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let Some(blend) = rows.blend else { return };
    let Some(mut pull) = Pull::begin(rows.set, blend, k, rows.kind, view.hold_white) else { return };
    pull.to(wanted, rows.set, wishes);
    if let Some(stuck) = pull.stuck {
        wishes.push(Wish::Say(sentence(&stuck.to_string())));
    }
}

fn sentence(text: &str) -> String {
    let mut letters = text.chars();
    letters
        .next()
        .map_or_else(String::new, |first| first.to_uppercase().chain(letters).collect::<String>() + ".")
}

#[expect(clippy::too_many_arguments, reason = "one row's whole scene")]
fn paint(
    ui: &Ui,
    plot: &Plot,
    response: &Response,
    member: &Member,
    row: Option<&RowView>,
    share: f64,
    rows: &RowScene<'_>,
    emitted: Emitted,
    pattern: Pattern,
    view: &View,
) {
    let palette = rows.scene.palette;
    let painter = ui.painter().with_clip_rect(plot.rect.intersect(ui.clip_rect()));
    let pulled = view.pull.as_ref().filter(|pull| pull.emitter == member.emitter);
    if response.has_focus() || pulled.is_some() {
        painter.rect_filled(plot.rect.shrink2(vec2(0.0, 1.0)), 4.0, palette.accent_wash.gamma_multiply(0.45));
    } else if response.hovered() {
        painter.rect_filled(plot.rect.shrink2(vec2(0.0, 1.0)), 4.0, palette.well);
    }
    // The shared scale.
    let full = plot.y(rows.scale, rows.scale);
    painter.hline(plot.rect.x_range(), full, Stroke::new(1.0, palette.grid));
    let label = format!("{} %", rows.scale * 100.0);
    painter.text(
        pos2(plot.rect.left() + 2.0, full + 1.0),
        Align2::LEFT_TOP,
        label,
        text::tick(),
        palette.muted,
    );
    painter.hline(plot.rect.x_range(), plot.base, Stroke::new(1.0, palette.rule));

    let Some(light) = row.and_then(|row| row.light.as_ref()) else {
        let words = rows
            .scene
            .derived
            .emitter(member.emitter)
            .and_then(|e| e.light.as_ref().err().cloned())
            .unwrap_or_else(|| "no light".to_owned());
        painter.text(plot.rect.center(), Align2::CENTER_CENTER, words, text::small(), palette.short);
        return;
    };
    let peak = light.curve_peak.max(f64::MIN_POSITIVE);
    let shape = |height: f64| rows.axis.points(light.curve.iter().map(|v| v / peak), plot.base, height);
    let height_of = |share: f64| f64::from(plot.base - plot.y(share, rows.scale));

    if !member.on || share < LEAST_VISIBLE {
        let points = shape(f64::from(plot.full * GHOST));
        let colour = if member.on { emitted.line.gamma_multiply(0.75) } else { palette.bar };
        patterned(&painter, body(&points, plot.base), Stroke::new(1.2, colour), Pattern::Dotted);
    } else {
        let points = shape(height_of(share));
        rows.axis.filled(&painter, &points, plot.base, emitted.tint(0.62), emitted.tint(0.22));
        patterned(&painter, body(&points, plot.base), Stroke::new(1.8, emitted.line), pattern);
    }
    let peak_nm = light.curve.iter().enumerate().max_by(|a, b| a.1.total_cmp(b.1)).map_or(0, |(k, _)| k);
    let x = rows.axis.x(colour::FIRST_NM + peak_nm as f64);
    let top = plot.y(if share < LEAST_VISIBLE { 0.0 } else { share }, rows.scale);
    reach(&painter, plot, x, row, rows, member, pulled, view);
    if member.on {
        grip(
            &painter,
            pos2(x, top),
            emitted.line,
            palette.card,
            response.hovered() || pulled.is_some(),
            member.locked,
        );
    }
    if let Some(pull) = pulled {
        let words = match (&pull.stuck, pull.at_end) {
            (Some(stuck), _) => sentence(&stuck.to_string()),
            (None, true) => "The reach of this row ends here.".to_owned(),
            (None, false) => return,
        };
        say(&painter, plot.rect, x, &words, rows.scene);
    }
}

/// The part of a curve that stands off its base, for the line over it.
fn body(points: &[Pos2], base: f32) -> &[Pos2] {
    let off = |p: &Pos2| (base - p.y).abs() > 0.35;
    match (points.iter().position(off), points.iter().rposition(off)) {
        (Some(first), Some(last)) => &points[first.saturating_sub(1)..(last + 2).min(points.len())],
        _ => &[],
    }
}

/// The span a row can be moved over while the white is held.
#[expect(clippy::too_many_arguments, reason = "one row's whole scene")]
fn reach(
    painter: &egui::Painter,
    plot: &Plot,
    x: f32,
    row: Option<&RowView>,
    rows: &RowScene<'_>,
    member: &Member,
    pulled: Option<&Pull>,
    view: &View,
) {
    if !view.hold_white || !member.on || member.locked {
        return;
    }
    let (Some(row), Some(blend)) = (row, rows.blend) else { return };
    let Ok((low, high)) = row.held_span else { return };
    let palette = rows.scene.palette;
    let Some(held) = blend.held() else { return };
    let weights = blend.weights();
    let k = blend.rows.iter().position(|r| r.emitter == row.emitter).unwrap_or_default();
    let in_kind = |radiant: f64| {
        let shares = held.pull(k, radiant).map_or_else(|_| Vec::new(), |pulled| pulled.shares);
        kinds::from_radiant(&shares, &weights, rows.kind).get(k).copied().unwrap_or(radiant)
    };
    let (low, high) = (in_kind(low), in_kind(high));
    let (bottom, top) = (plot.y(low, rows.scale), plot.y(high, rows.scale).max(plot.rect.top() + 2.0));
    let strong = Stroke::new(2.0, palette.accent);
    painter.vline(x, top..=bottom, Stroke::new(5.0, palette.accent_wash));
    painter.vline(x, top..=bottom, Stroke::new(1.0, palette.accent));
    painter.hline(x - 6.0..=x + 6.0, bottom, strong);
    painter.hline(x - 6.0..=x + 6.0, top, strong);
    if pulled.is_some() {
        let words = [(high, top, Align2::LEFT_CENTER), (low, bottom, Align2::LEFT_CENTER)];
        for (value, y, anchor) in words {
            let y = y.clamp(plot.rect.top() + 7.0, plot.rect.bottom() - 7.0);
            painter.text(
                pos2(x + 11.0, y),
                anchor,
                format!("{:.1} %", value * 100.0),
                text::tick(),
                palette.accent,
            );
        }
    }
}

/// The point to grab.
fn grip(painter: &egui::Painter, at: Pos2, line: Color32, ground: Color32, near: bool, locked: bool) {
    if locked {
        painter.rect_filled(Rect::from_center_size(at, vec2(7.0, 7.0)), 1.0, line);
        return;
    }
    painter.circle(at, if near { 5.0 } else { 3.4 }, ground, Stroke::new(if near { 2.0 } else { 1.5 }, line));
}

fn say(painter: &egui::Painter, rect: Rect, x: f32, words: &str, scene: &Scene<'_>) {
    let palette = scene.palette;
    let size = measure(painter, words, text::small());
    let left =
        if x + 16.0 + size.x < rect.right() { x + 16.0 } else { (x - 16.0 - size.x).max(rect.left() + 4.0) };
    let centre = pos2(left + size.x / 2.0, rect.center().y);
    painter.rect_filled(
        Rect::from_center_size(centre, size + vec2(12.0, 6.0)),
        4.0,
        palette.card.gamma_multiply(0.92),
    );
    painter.text(centre, Align2::CENTER_CENTER, words, text::small(), palette.caution);
}
