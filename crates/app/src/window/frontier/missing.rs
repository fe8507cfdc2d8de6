//! The emitter that is missing: a map over its peak and width, and proposals.

use super::super::controls::focus_ring;
use super::super::paint::{fixed, write};
use super::super::theme::{Palette, text};
use super::super::view::Scene;
use super::axes::Axes;
use super::pieces::{halo, sentence};
use super::{Frontier, Tool, plot};
use crate::frontier::contour::{self, decimals, round_step, round_values};
use crate::frontier::{Missing, Proposal};
use egui::accesskit::Role;
use egui::{
    Align2, Color32, CornerRadius, EventFilter, Key, Modifiers, Painter, Pos2, Rect, Sense, Stroke,
    StrokeKind, Ui, WidgetInfo, pos2, vec2,
};

pub(super) fn show(ui: &mut Ui, body: Rect, scene: &Scene<'_>, bench: &mut Frontier) {
    let palette = scene.palette;
    let working = scene.jobs.iter().any(|job| job.key == Tool::Missing.key());
    let Some(missing) = bench.missing.as_ref() else {
        let words = if working {
            "The map is being drawn."
        } else {
            "No map yet: it tries one emitter more at every peak and width."
        };
        plot::nothing(ui, body, words);
        return;
    };
    if let Some(why) = &missing.refusal {
        plot::nothing(ui, body, why);
        return;
    }
    let Some(span) = missing.span() else {
        plot::nothing(ui, body, "No emitter more, at any peak or width, lets the limits be met.");
        return;
    };
    let split = body.right() - (body.width() * 0.32).clamp(240.0, 400.0);
    let left = Rect::from_min_max(body.min, pos2(split - 18.0, body.bottom()));
    let right = Rect::from_min_max(pos2(split, body.top()), body.max);
    ui.painter().vline(split - 9.0, body.y_range(), Stroke::new(1.0, palette.rule));
    let reading = Rect::from_min_max(pos2(left.left(), left.bottom() - 40.0), left.max);
    let picture = Rect::from_min_max(left.min, pos2(left.right(), reading.top() - 4.0));
    let (pointed, moved) = map(ui, picture, missing, span, bench.cell);
    let words = match pointed.or(bench.cell) {
        Some((width, peak)) => format!("{}.", missing.cell_words(width, peak)),
        None => "Point at the map, or step over it with the arrow keys, to read its values.".to_owned(),
    };
    let ink = if pointed.or(bench.cell).is_some() { palette.ink } else { palette.muted };
    sentence(ui, reading.min + vec2(0.0, 4.0), reading.width(), &words, text::small_strong(), ink);
    proposals(ui, right, missing, span, &palette);
    if let Some(cell) = moved {
        bench.cell = Some(cell);
    }
}

/// The grey of a value: paper at the least, nearly ink at the most.
fn shade(palette: &Palette, value: f64, (low, high): (f64, f64)) -> Color32 {
    let part = if high - low > 1e-9 { (value - low) / (high - low) } else { 0.0 };
    palette.well.lerp_to_gamma(palette.ink, 0.02 + 0.62 * part as f32)
}

/// Draws the map; the cell pointed at, and the cell moved to by click or key.
#[allow(clippy::type_complexity, reason = "two cells, told apart by the sentence above")]
fn map(
    ui: &Ui,
    rect: Rect,
    missing: &Missing,
    span: (f64, f64),
    cursor: Option<(usize, usize)>,
) -> (Option<(usize, usize)>, Option<(usize, usize)>) {
    let palette = Palette::of(ui.ctx());
    let painter = ui.painter().clone();
    let (columns, rows) = (missing.peaks_nm.len(), missing.widths_nm.len());
    let half = |values: &[f64]| (values[1] - values[0]) / 2.0;
    let (half_x, half_y) = (half(&missing.peaks_nm), half(&missing.widths_nm));
    let x = (missing.peaks_nm[0] - half_x, missing.peaks_nm[columns - 1] + half_x);
    let y = (missing.widths_nm[0] - half_y, missing.widths_nm[rows - 1] + half_y);
    let titles = ("peak of the added emitter, nm", "its full width at half maximum, nm");
    let axes = Axes::draw(&painter, rect, (x, y), titles, &palette);
    let cell_rect = |width: usize, peak: usize| {
        let (x, y) = (missing.peaks_nm[peak], missing.widths_nm[width]);
        Rect::from_two_pos(axes.at(x - half_x, y - half_y), axes.at(x + half_x, y + half_y))
    };
    for width in 0..rows {
        for peak in 0..columns {
            let cell = cell_rect(width, peak);
            match missing.at(width, peak) {
                // Slightly larger than the cell, so that no seam shows between neighbours.
                Some(value) => {
                    painter.rect_filled(cell.expand(0.4), CornerRadius::ZERO, shade(&palette, value, span));
                }
                None => {
                    let stroke = Stroke::new(1.0, palette.rule);
                    painter.line_segment([cell.left_bottom(), cell.right_top()], stroke);
                }
            }
        }
    }
    contours(&painter, &axes, missing, span, &palette);
    for (k, one) in missing.proposals.iter().enumerate() {
        let at = axes.at(one.peak_nm, one.width_nm);
        let at = pos2(
            at.x.clamp(axes.field.left() + 10.0, axes.field.right() - 10.0),
            at.y.clamp(axes.field.top() + 10.0, axes.field.bottom() - 10.0),
        );
        numeral(&painter, at, k + 1, &palette);
    }
    let id = ui.scope_id().with("map");
    let response = ui.interact(axes.field, id, Sense::click());
    let spoken = match cursor {
        Some((width, peak)) => format!("{} Looked at: {}.", missing.words(), missing.cell_words(width, peak)),
        None => missing.words(),
    };
    response.widget_info(|| WidgetInfo::labeled(Role::Slider, true, &spoken));
    focus_ring(ui, &response, 3);
    let under = |at: Pos2| {
        let part = (at - axes.field.min) / axes.field.size();
        let (peak, width) = (part.x * columns as f32, (1.0 - part.y) * rows as f32);
        ((width as usize).min(rows - 1), (peak as usize).min(columns - 1))
    };
    let pointed = response.hover_pos().map(under);
    let mut moved = None;
    if response.clicked() {
        moved = pointed;
        response.request_focus();
    }
    if response.has_focus() {
        let filter =
            EventFilter { horizontal_arrows: true, vertical_arrows: true, tab: false, escape: false };
        ui.memory_mut(|m| m.set_focus_lock_filter(id, filter));
        let pressed = |key: Key| ui.input_mut(|i| i.count_and_consume_key(Modifiers::NONE, key)) as i64;
        let across = pressed(Key::ArrowRight) - pressed(Key::ArrowLeft);
        let up = pressed(Key::ArrowUp) - pressed(Key::ArrowDown);
        if across != 0 || up != 0 {
            let (width, peak) = cursor.unwrap_or((rows / 2, columns / 2));
            let by = |at: usize, by: i64, count: usize| (at as i64 + by).clamp(0, count as i64 - 1) as usize;
            moved = Some((by(width, up, rows), by(peak, across, columns)));
        }
    }
    for (width, peak) in pointed.into_iter().chain(moved.or(cursor)) {
        let cell = cell_rect(width, peak);
        painter.rect_stroke(cell, 0.0, Stroke::new(3.0, palette.card), StrokeKind::Outside);
        painter.rect_stroke(cell, 0.0, Stroke::new(1.6, palette.accent), StrokeKind::Outside);
    }
    (pointed, moved)
}

fn contours(painter: &Painter, axes: &Axes, missing: &Missing, span: (f64, f64), palette: &Palette) {
    let columns = missing.peaks_nm.len();
    let step = round_step(span.0, span.1, 6);
    let places = decimals(step);
    let place = |[column, row]: contour::Place| {
        let along = |values: &[f64], at: f64| {
            let k = (at as usize).min(values.len() - 2);
            values[k] + (values[k + 1] - values[k]) * (at - k as f64)
        };
        axes.at(along(&missing.peaks_nm, column), along(&missing.widths_nm, row))
    };
    let mut taken: Vec<Rect> = missing
        .proposals
        .iter()
        .map(|one| Rect::from_center_size(axes.at(one.peak_nm, one.width_nm), vec2(26.0, 26.0)))
        .collect();
    for value in round_values(span.0, span.1, 6) {
        let segments = contour::line(&missing.map, columns, value);
        for [from, to] in &segments {
            painter.line_segment([place(*from), place(*to)], Stroke::new(1.3, palette.accent));
        }
        // A figure where the line is well inside the field and no other figure stands.
        let spot = segments.iter().map(|[from, _]| place(*from)).find(|at| {
            let room = Rect::from_center_size(*at, vec2(46.0, 20.0));
            axes.field.contains_rect(room) && taken.iter().all(|other| !other.intersects(room))
        });
        if let Some(at) = spot {
            halo(painter, at, Align2::CENTER_CENTER, &fixed(value, places), palette.card, palette.ink);
            taken.push(Rect::from_center_size(at, vec2(60.0, 26.0)));
        }
    }
}

fn numeral(painter: &Painter, at: Pos2, number: usize, palette: &Palette) {
    painter.circle(at, 9.0, palette.card, Stroke::new(1.6, palette.ink));
    write(painter, at, Align2::CENTER_CENTER, number, text::small_strong(), palette.ink);
}

fn proposals(ui: &Ui, rect: Rect, missing: &Missing, span: (f64, f64), palette: &Palette) {
    let painter = ui.painter();
    let title = write(painter, rect.min, Align2::LEFT_TOP, "Proposals", text::strong(), palette.ink);
    let without = match missing.without {
        Some(without) => format!("Without an added emitter: {} {}.", fixed(without, 1), missing.aim.words()),
        None => "Without an added emitter no blend meets the limits.".to_owned(),
    };
    let at = pos2(rect.left(), title.bottom() + 4.0);
    let mut y = sentence(ui, at, rect.width(), &without, text::small(), palette.muted) + 12.0;
    for (k, one) in missing.proposals.iter().enumerate() {
        numeral(painter, pos2(rect.left() + 10.0, y + 9.0), k + 1, palette);
        y = proposal(ui, pos2(rect.left() + 30.0, y), rect.width() - 30.0, one, missing, palette) + 12.0;
    }
    if missing.proposals.is_empty() {
        y = sentence(ui, pos2(rect.left(), y), rect.width(), "None helps.", text::small(), palette.ink)
            + 12.0;
    }
    // The scale of the greys.
    let bar = Rect::from_min_size(pos2(rect.left(), y + 8.0), vec2(rect.width().min(240.0), 12.0));
    let steps = 32;
    for k in 0..steps {
        let part = |k: i32| bar.left() + bar.width() * k as f32 / steps as f32;
        let cell = Rect::from_min_max(pos2(part(k), bar.top()), pos2(part(k + 1) + 0.4, bar.bottom()));
        let value = span.0 + (span.1 - span.0) * (f64::from(k) + 0.5) / f64::from(steps);
        painter.rect_filled(cell, CornerRadius::ZERO, shade(palette, value, span));
    }
    painter.rect_stroke(bar, 0.0, Stroke::new(1.0, palette.rule), StrokeKind::Outside);
    let foot = bar.bottom() + 4.0;
    write(painter, pos2(bar.left(), foot), Align2::LEFT_TOP, fixed(span.0, 1), text::tick(), palette.muted);
    let most = format!("{} lm/W", fixed(span.1, 1));
    write(painter, pos2(bar.right(), foot), Align2::RIGHT_TOP, most, text::tick(), palette.muted);
    let note =
        "The added emitter is a Gaussian over wavelength. Lines join equal lm/W; struck cells meet no limit.";
    sentence(ui, pos2(rect.left(), foot + 22.0), rect.width(), note, text::small(), palette.muted);
}

fn proposal(ui: &Ui, at: Pos2, width: f32, one: &Proposal, missing: &Missing, palette: &Palette) -> f32 {
    let head = format!("{} nm, {} nm wide", fixed(one.peak_nm, 0), fixed(one.width_nm, 0));
    let y = sentence(ui, at, width, &head, text::strong(), palette.ink) + 2.0;
    let gain = match missing.without {
        Some(without) => format!("{} lm/W more", fixed(one.objective - without, 1)),
        None => "opens the limits".to_owned(),
    };
    let words = format!(
        "{} lm/W ({gain}), with {}\u{2009}% of the radiant power.",
        fixed(one.objective, 1),
        fixed(one.share * 100.0, 1)
    );
    sentence(ui, pos2(at.x, y), width, &words, text::small(), palette.ink)
}
