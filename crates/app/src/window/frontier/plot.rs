//! The curve: the most lm/W at each level of a metric, the band up to its bounds, limits as lines, the present blend.

use super::super::controls::focus_ring;
use super::super::paint::{Pattern, band, fixed, patterned, write};
use super::super::theme::{Palette, text};
use super::axes::{Axes, roomy};
use super::pieces::halo;
use crate::frontier::{Point, Trade, title};
use egui::accesskit::Role;
use egui::{
    Align2, EventFilter, Key, Modifiers, Painter, Pos2, Rect, Response, Sense, Shape, Stroke, Ui, WidgetInfo,
    pos2, vec2,
};
use optimiser::Grade;

/// What the user did with the curve.
#[derive(Debug, Default)]
pub(super) struct Asked {
    /// Look at this point.
    pub(super) point: Option<usize>,
    /// Load the point that is looked at.
    pub(super) load: bool,
}

/// One point in words.
pub(super) fn point_words(trade: &Trade, point: &Point) -> String {
    let bound = point.bound.map_or_else(
        || "no bound known".to_owned(),
        |bound| format!("no blend gives more than {}", fixed(bound, 2)),
    );
    format!(
        "{} at least {}: {} lm/W, {bound} ({})",
        title(trade.metric),
        fixed(point.level, 1),
        fixed(point.objective, 2),
        point.worth()
    )
}

/// Draws the curve. `present` is the present blend's place on the axes.
pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    trade: &Trade,
    present: Option<(f64, f64)>,
    chosen: Option<usize>,
) -> Asked {
    let palette = Palette::of(ui.ctx());
    let painter = ui.painter().clone();
    let (x, y) = ranges(trade, present);
    let x_title = format!("{} at least, points", title(trade.metric));
    let y_title = format!("{}, lm/W", trade.aim.words());
    let axes = Axes::draw(&painter, rect, (x, y), (&x_title, &y_title), &palette);
    let inside = painter.with_clip_rect(axes.field.expand(1.0));

    let on = |point: &Point, value: f64| axes.at(point.level, value);
    let line: Vec<Pos2> = trade.curve.iter().map(|point| on(point, point.objective)).collect();
    let bounded: Vec<&Point> = trade.curve.iter().filter(|point| point.bound.is_some()).collect();
    let upper: Vec<Pos2> = bounded.iter().map(|p| on(p, p.bound.unwrap_or(p.objective))).collect();
    let lower: Vec<Pos2> = bounded.iter().map(|p| on(p, p.objective)).collect();
    band(&inside, &upper, &lower, palette.accent.gamma_multiply(0.22));
    patterned(&inside, &upper, Stroke::new(1.0, palette.accent), Pattern::Dotted);
    limits(&inside, &axes, trade, &palette);
    inside.add(Shape::line(line.clone(), Stroke::new(2.0, palette.ink)));

    if let Some(k) = chosen.filter(|k| *k < line.len()) {
        let at = line[k];
        let dotted = Stroke::new(1.0, palette.accent);
        patterned(&inside, &[at, pos2(at.x, axes.field.bottom())], dotted, Pattern::Dotted);
        patterned(&inside, &[at, pos2(axes.field.left(), at.y)], dotted, Pattern::Dotted);
        inside.circle_stroke(at, 8.0, Stroke::new(2.0, palette.accent));
    }
    for (point, at) in trade.curve.iter().zip(&line) {
        let fill = if point.grade == Grade::Proven { palette.ink } else { palette.card };
        inside.circle(*at, 3.6, fill, Stroke::new(1.4, palette.ink));
    }
    if let Some((x, y)) = present.filter(|(x, y)| axes.holds(*x, *y)) {
        let at = axes.at(x, y);
        diamond(&inside, at, &palette);
        let right = at.x < axes.field.center().x;
        // Above the curve, which falls to the right.
        let (side, anchor) = if right { (11.0, Align2::LEFT_CENTER) } else { (-11.0, Align2::RIGHT_CENTER) };
        let lift = if right { -14.0 } else { 14.0 };
        halo(&inside, at + vec2(side, lift), anchor, "present blend", palette.well, palette.ink);
    }
    if let [only] = trade.curve.as_slice() {
        let words = format!(
            "{} {} costs nothing, and the other limits leave no more of it.",
            title(trade.metric),
            fixed(only.level, 1)
        );
        let at = axes.field.center_bottom() - vec2(0.0, 30.0);
        halo(&inside, at, Align2::CENTER_BOTTOM, &words, palette.well, palette.ink);
    }
    legend(&painter, &axes, trade, &palette);
    interact(ui, &axes, trade, &line, chosen)
}

/// The ranges of the axes: the curve, and what else is near enough to be worth the room.
fn ranges(trade: &Trade, present: Option<(f64, f64)>) -> ((f64, f64), (f64, f64)) {
    let spread = |values: &mut dyn Iterator<Item = f64>| {
        values.fold((f64::INFINITY, f64::NEG_INFINITY), |(low, high), v| (low.min(v), high.max(v)))
    };
    let with = |(low, high): (f64, f64), extra: &mut dyn Iterator<Item = f64>| {
        let reach = 0.6 * (high - low).max(1.0);
        extra
            .filter(|v| *v > low - reach && *v < high + reach)
            .fold((low, high), |(a, b), v| (a.min(v), b.max(v)))
    };
    let [along, up] = trade.limits;
    let x = spread(&mut trade.curve.iter().map(|p| p.level));
    let x = with(x, &mut along.low.into_iter().chain(along.high).chain(present.map(|p| p.0)));
    let y = spread(&mut trade.curve.iter().flat_map(|p| [p.objective, p.bound.unwrap_or(p.objective)]));
    let y = with(y, &mut up.low.into_iter().chain(up.high).chain(present.map(|p| p.1)));
    (roomy(x.0, x.1, 0.05), roomy(y.0, y.1, 0.08))
}

/// The spec's limits as lines with teeth on the side they exclude.
fn limits(painter: &Painter, axes: &Axes, trade: &Trade, palette: &Palette) {
    let field = axes.field;
    let stroke = Stroke::new(1.4, palette.short);
    let tooth = Stroke::new(1.0, palette.short.gamma_multiply(0.7));
    let [along, up] = trade.limits;
    for (value, side, word) in [(along.low, -1.0, "at least"), (along.high, 1.0, "at most")] {
        let Some(value) = value.filter(|v| (axes.x.0..=axes.x.1).contains(v)) else { continue };
        let x = axes.at(value, axes.y.0).x;
        patterned(painter, &[pos2(x, field.top()), pos2(x, field.bottom())], stroke, Pattern::LongDash);
        let mut y = field.top() + 6.0;
        while y < field.bottom() {
            painter.line_segment([pos2(x, y), pos2(x + 5.0 * side, y + 5.0)], tooth);
            y += 12.0;
        }
        let words = format!("{} {word} {}", title(trade.metric), figure(value));
        // On the side with room, over the axis, where the curve never is.
        let left = x - field.left() > 120.0;
        let anchor = if left { Align2::RIGHT_BOTTOM } else { Align2::LEFT_BOTTOM };
        let at = pos2(x + if left { -10.0 } else { 10.0 }, field.bottom() - 8.0);
        halo(painter, at, anchor, &words, palette.well, palette.short);
    }
    for (value, side, word) in [(up.low, 1.0, "at least"), (up.high, -1.0, "at most")] {
        let Some(value) = value.filter(|v| (axes.y.0..=axes.y.1).contains(v)) else { continue };
        let y = axes.at(axes.x.0, value).y;
        patterned(painter, &[pos2(field.left(), y), pos2(field.right(), y)], stroke, Pattern::LongDash);
        let mut x = field.left() + 6.0;
        while x < field.right() {
            painter.line_segment([pos2(x, y), pos2(x + 5.0, y + 5.0 * side)], tooth);
            x += 12.0;
        }
        let words = format!("{word} {} lm/W", figure(value));
        let anchor = if side > 0.0 { Align2::LEFT_TOP } else { Align2::LEFT_BOTTOM };
        halo(painter, pos2(field.left() + 8.0, y + 9.0 * side), anchor, &words, palette.well, palette.short);
    }
}

fn figure(value: f64) -> String {
    let text = fixed(value, 1);
    text.strip_suffix(".0").map_or_else(|| text.clone(), str::to_owned)
}

fn diamond(painter: &Painter, at: Pos2, palette: &Palette) {
    let points = [(0.0, -7.0), (6.0, 0.0), (0.0, 7.0), (-6.0, 0.0)].map(|(x, y)| at + vec2(x, y));
    painter.add(Shape::convex_polygon(points.to_vec(), palette.accent, Stroke::new(1.5, palette.card)));
}

/// What the marks mean, in the corner the curve leaves free.
fn legend(painter: &Painter, axes: &Axes, trade: &Trade, palette: &Palette) {
    let mut at = pos2(axes.field.right() - 10.0, axes.field.top() + 12.0);
    let proven = trade.curve.iter().any(|p| p.grade == Grade::Proven);
    let open = trade.curve.iter().any(|p| p.grade != Grade::Proven);
    for (wanted, filled, words) in
        [(proven, true, "proven within 0.1 %"), (open, false, "bound further away, or none")]
    {
        if wanted {
            let shown = halo(painter, at, Align2::RIGHT_CENTER, words, palette.well, palette.muted);
            let fill = if filled { palette.ink } else { palette.card };
            painter.circle(pos2(shown.left() - 9.0, at.y), 3.6, fill, Stroke::new(1.4, palette.ink));
            at.y += 17.0;
        }
    }
    if trade.curve.iter().any(|p| p.bound.is_some()) {
        let words = match trade.greatest_gap_percent() {
            Some(gap) => format!("no blend lies above (at most {} % higher)", fixed(gap, 2)),
            None => "no blend lies above".to_owned(),
        };
        let shown = halo(painter, at, Align2::RIGHT_CENTER, &words, palette.well, palette.muted);
        let ends = [pos2(shown.left() - 17.0, at.y), pos2(shown.left() - 4.0, at.y)];
        patterned(painter, &ends, Stroke::new(1.2, palette.accent), Pattern::Dotted);
    }
}

fn interact(ui: &Ui, axes: &Axes, trade: &Trade, line: &[Pos2], chosen: Option<usize>) -> Asked {
    let mut asked = Asked::default();
    let id = ui.scope_id().with("curve");
    let response: Response = ui.interact(axes.field, id, Sense::click());
    let spoken = match chosen.and_then(|k| trade.curve.get(k)) {
        Some(point) => format!("{} Looked at: {}.", trade.words(), point_words(trade, point)),
        None => trade.words(),
    };
    response.widget_info(|| WidgetInfo::labeled(Role::Slider, true, &spoken));
    focus_ring(ui, &response, 3);
    let nearest = |at: Pos2| {
        (0..line.len()).min_by(|a, b| (line[*a].x - at.x).abs().total_cmp(&(line[*b].x - at.x).abs()))
    };
    if response.clicked() || response.double_clicked() {
        asked.point = response.interact_pointer_pos().and_then(nearest);
        asked.load = response.double_clicked();
        response.request_focus();
    }
    if response.has_focus() && !line.is_empty() {
        let filter =
            EventFilter { horizontal_arrows: true, vertical_arrows: true, tab: false, escape: false };
        ui.memory_mut(|m| m.set_focus_lock_filter(id, filter));
        let pressed = |key: Key| ui.input_mut(|i| i.count_and_consume_key(Modifiers::NONE, key)) as i64;
        let forward = pressed(Key::ArrowRight) + pressed(Key::ArrowDown);
        let back = pressed(Key::ArrowLeft) + pressed(Key::ArrowUp);
        let last = line.len() - 1;
        if forward + back > 0 {
            let from = chosen.map_or(if forward > 0 { -1 } else { last as i64 + 1 }, |k| k as i64);
            asked.point = Some((from + forward - back).clamp(0, last as i64) as usize);
        }
        if pressed(Key::Home) > 0 {
            asked.point = Some(0);
        }
        if pressed(Key::End) > 0 {
            asked.point = Some(last);
        }
        asked.load |= chosen.is_some() && pressed(Key::Enter) > 0;
    }
    if let Some(k) = response.hover_pos().and_then(nearest) {
        ui.painter().circle_stroke(line[k], 6.5, Stroke::new(1.2, Palette::of(ui.ctx()).accent));
        response.on_hover_text_at_pointer(point_words(trade, &trade.curve[k]));
    }
    asked
}

/// A sentence in the field's middle, where there is no curve.
pub(super) fn nothing(ui: &Ui, rect: Rect, words: &str) {
    let palette = Palette::of(ui.ctx());
    ui.painter().rect_filled(rect, 6.0, palette.well);
    write(ui.painter(), rect.center(), Align2::CENTER_CENTER, words, text::body(), palette.muted);
}
