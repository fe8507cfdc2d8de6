//! The fabrication numbers: value, lock, and the band that keeps the white inside the spec.

use super::super::controls::{Number as Field, sign_button};
use super::super::paint::{Icon, fixed, write};
use super::super::theme::{small_strong_style, text};
use super::super::view::{Scene, View};
use super::super::wish::Wish;
use super::worked::Worked;
use super::{figures, replace, sentence};
use crate::making::{Making, Number};
use egui::{Align2, CornerRadius, Rect, RichText, Sense, Stroke, Ui, pos2, vec2};
use project::EmitterSet;

const ROW: f32 = 26.0;

pub(super) fn show(
    ui: &mut Ui,
    set: &EmitterSet,
    making: &Making,
    worked: &Worked,
    scene: &Scene<'_>,
    view: &View,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    ui.add_space(8.0);
    let width = ui.available_width();
    let (head, _) = ui.allocate_exact_size(vec2(width, 20.0), Sense::hover());
    let columns = Columns::of(width);
    let write_head = |x: f32, words: &str| {
        write(
            ui.painter(),
            pos2(head.left() + x, head.center().y),
            Align2::LEFT_CENTER,
            words,
            text::small(),
            palette.muted,
        );
    };
    write_head(0.0, "Part");
    write_head(columns.quantity, "Quantity");
    write_head(columns.value, "Value");
    write_head(columns.band, "Allowed, all at once");
    for number in &worked.numbers {
        row(ui, number, &columns, width, set, making, scene, view, wishes);
    }
    let note = match &worked.no_bands {
        Some(why) => sentence(&format!("no bands: {why}")),
        None => format!("Bands keep the white in: {}.", making.band_region()),
    };
    ui.label(RichText::new(note).font(text::small()).color(palette.muted));
}

struct Columns {
    quantity: f32,
    value: f32,
    lock: f32,
    band: f32,
}

impl Columns {
    fn of(width: f32) -> Self {
        Self { quantity: 0.19 * width, value: 0.42 * width, lock: 0.60 * width, band: 0.65 * width }
    }
}

#[expect(clippy::too_many_arguments, reason = "one line's whole scene")]
fn row(
    ui: &mut Ui,
    number: &Number,
    columns: &Columns,
    width: f32,
    set: &EmitterSet,
    making: &Making,
    scene: &Scene<'_>,
    view: &View,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let (rect, _) = ui.allocate_exact_size(vec2(width, ROW), Sense::hover());
    let y = rect.center().y;
    ui.painter().hline(rect.x_range(), rect.top() + 0.5, Stroke::new(1.0, palette.rule));
    let part = if number.part.is_empty() { "Whole device" } else { &number.part };
    let at = |x: f32| pos2(rect.left() + x, y - 8.0);
    super::super::paint::elided(
        ui.painter(),
        at(0.0),
        columns.quantity - 8.0,
        part,
        text::body(),
        palette.ink,
    );
    let words = &number.quantity;
    let room = columns.value - columns.quantity - 8.0;
    super::super::paint::elided(ui.painter(), at(columns.quantity), room, words, text::body(), palette.muted);
    let field = Rect::from_min_max(
        pos2(rect.left() + columns.value, rect.top()),
        pos2(rect.left() + columns.value + 78.0, rect.bottom()),
    );
    let Some(key) = number.key else {
        let shown = figures(number.value);
        write(
            ui.painter(),
            pos2(field.left() + 4.0, y),
            Align2::LEFT_CENTER,
            &shown,
            text::small_strong(),
            palette.ink,
        );
        unit(ui, field.right(), y, number.unit, scene);
        band(ui, rect, columns.band, width, number, scene);
        return;
    };
    let name = format!("{part}, {words}");
    let digits = if number.value == 0.0 {
        3
    } else {
        (3 - number.value.abs().log10().floor() as i32).clamp(0, 6) as usize
    };
    let typed = Field::new(&name, number.value)
        .decimals(digits)
        .speed(number.value.abs().max(1e-6) * 0.002)
        .range(1e-9, 1e9)
        .style(small_strong_style())
        .hint("Drag or type: the white follows on the ledger")
        .show(ui, field);
    if typed.response.drag_started() {
        wishes.push(Wish::Begin(format!("change {words}")));
    }
    if let Some(value) = typed.value
        && let Ok(plan) = making.with_number(key, value / number.factor)
    {
        wishes.push(replace(set, view.recipe.chosen, plan));
    }
    if typed.response.drag_stopped() {
        wishes.push(Wish::End);
    }
    unit(ui, field.right(), y, number.unit, scene);
    let lock = Rect::from_center_size(pos2(rect.left() + columns.lock + 10.0, y), vec2(24.0, 24.0));
    let (sign, hint) = if number.locked {
        (Icon::Locked, format!("Unlock {name}"))
    } else {
        (Icon::Unlocked, format!("Lock {name}"))
    };
    let colour = if number.locked { palette.accent } else { palette.muted };
    if sign_button(ui, lock, sign, &hint, colour, true).clicked() {
        let mut plan = making.plan.clone();
        if number.locked {
            plan.locked.retain(|other| *other != key);
        } else {
            plan.locked.push(key);
        }
        wishes.push(replace(set, view.recipe.chosen, plan));
    }
    band(ui, rect, columns.band, width, number, scene);
}

fn unit(ui: &Ui, x: f32, y: f32, words: &str, scene: &Scene<'_>) {
    write(ui.painter(), pos2(x + 3.0, y), Align2::LEFT_CENTER, words, text::small(), scene.palette.muted);
}

/// The band as a bar with its ends, the value a tick on it.
fn band(ui: &Ui, rect: Rect, from: f32, width: f32, number: &Number, scene: &Scene<'_>) {
    let (Some(low), Some(high)) = (number.low, number.high) else { return };
    let palette = scene.palette;
    let painter = ui.painter();
    let bar = Rect::from_min_max(
        pos2(rect.left() + from + 62.0, rect.center().y - 2.5),
        pos2(rect.left() + width - 66.0, rect.center().y + 2.5),
    );
    let mark = |open: bool, value: f64| if open { "open".to_owned() } else { short(value, number.value) };
    let (left, right) = (
        mark(number.open_low && wide_open(number.low_alone, number.value), low),
        mark(number.open_high && wide_open(number.high_alone, number.value), high),
    );
    write(
        painter,
        pos2(bar.left() - 6.0, rect.center().y),
        Align2::RIGHT_CENTER,
        &left,
        text::small(),
        palette.muted,
    );
    write(
        painter,
        pos2(bar.right() + 6.0, rect.center().y),
        Align2::LEFT_CENTER,
        &right,
        text::small(),
        palette.muted,
    );
    if bar.width() < 12.0 {
        return;
    }
    painter.rect_filled(bar, CornerRadius::same(2), palette.rule);
    let (Some(far_low), Some(far_high)) = (number.low_alone, number.high_alone) else { return };
    let span = (far_high - far_low).max(1e-12);
    let x = |value: f64| bar.left() + bar.width() * (((value - far_low) / span) as f32).clamp(0.0, 1.0);
    let inside = Rect::from_min_max(pos2(x(low), bar.top()), pos2(x(high), bar.bottom()));
    painter.rect_filled(inside, CornerRadius::same(2), palette.met);
    let at = x(number.value);
    painter.vline(at, (bar.top() - 4.0)..=(bar.bottom() + 4.0), Stroke::new(1.6, palette.ink));
}

/// True when the band alone goes as far as it is searched.
fn wide_open(end: Option<f64>, value: f64) -> bool {
    end.is_some_and(|end| {
        let factor = (end / value).abs();
        factor >= device::bands::FURTHEST_FACTOR * 0.999 || factor <= 1.001 / device::bands::FURTHEST_FACTOR
    })
}

/// The end of a band with as many decimals as its width needs.
fn short(value: f64, centre: f64) -> String {
    let width = (value - centre).abs().max(centre.abs() * 1e-6);
    let digits = (1 - width.log10().floor() as i32).clamp(0, 5) as usize;
    fixed(value, digits)
}
