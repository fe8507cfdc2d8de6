//! The blend's own picture: what its emitters add up to, beside the reference of the same white.

use super::super::controls::{Number, value_style};
use super::super::paint::Pattern;
use super::super::paint::{Words, band, fixed, measure, patterned, write};
use super::super::theme::{screen, text};
use super::super::view::Scene;
use super::super::wish::Wish;
use super::{Axis, EDGE_GAP};
use crate::state::Edit;
use crate::state::derived::BlendView;
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Rect, Sense, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2};
use project::EmitterSet;

pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    axis: &Axis,
    scene: &Scene<'_>,
    set: &EmitterSet,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let plot = Rect::from_min_max(rect.min, pos2(axis.right, rect.bottom()));
    let response = ui.interact(plot, ui.scope_id().with("blend plot"), Sense::hover());
    let Some(blend) = scene.derived.blend.as_deref() else {
        let words = "The blend has no light: give an emitter a share.";
        ui.painter().text(plot.center(), Align2::CENTER_CENTER, words, text::body(), palette.muted);
        return;
    };
    response.widget_info(|| WidgetInfo::labeled(Role::GraphicsObject, true, in_words(blend)));
    picture(ui, plot, axis, scene, set, blend);
    let edge = Rect::from_min_max(pos2(axis.right + EDGE_GAP, rect.top()), rect.max);
    figures(ui, edge, scene, set, blend, wishes);
}

/// The plot's key figures, for those who cannot see it.
fn in_words(blend: &BlendView) -> String {
    let numbers = blend.measurement();
    let white = numbers.cct_k.map_or_else(|| "no CCT".to_owned(), |cct| format!("{cct:.0} K"));
    format!(
        "Blend spectrum: {white}, {:.0} lumens per optical watt, greatest power at {:.0} nm",
        numbers.ler_lm_per_w, blend.peak_nm
    )
}

fn picture(ui: &Ui, plot: Rect, axis: &Axis, scene: &Scene<'_>, set: &EmitterSet, blend: &BlendView) {
    let palette = scene.palette;
    let painter = ui.painter().with_clip_rect(plot.intersect(ui.clip_rect()));
    let base = plot.bottom() - 8.0;
    let room = f64::from(base - plot.top() - 8.0);
    let greatest = blend.curve().iter().copied().fold(0.0, f64::max);
    let reference = blend.reference();
    let highest = reference.map_or(0.0, |r| r.curve.iter().copied().fold(0.0, f64::max));
    let full = (greatest * 1.08).max((highest * 1.04).min(greatest * 1.45));
    let height = room / full.max(f64::MIN_POSITIVE);

    // Every emitter's part, one upon the other: together they are the blend.
    let mut below = vec![0.0; colour::GRID_POINTS];
    for (row, member) in blend.rows.iter().zip(&set.members) {
        let Some(light) = row.light.as_ref().filter(|_| member.on && row.radiant > 0.0) else { continue };
        let above: Vec<f64> = below.iter().zip(&light.curve).map(|(b, v)| b + row.radiant * v).collect();
        let emitted = palette.emitter(light.srgb);
        band(
            &painter,
            &axis.points(above.iter().copied(), base, height),
            &axis.points(below.iter().copied(), base, height),
            emitted.tint(0.42),
        );
        below = above;
    }
    painter.hline(plot.x_range(), base, Stroke::new(1.0, palette.rule));
    if let Some(reference) = reference {
        let points = axis.points(reference.curve.iter().copied(), base, height);
        patterned(&painter, &points, Stroke::new(1.3, palette.muted), Pattern::Dotted);
    }
    let total = axis.points(blend.curve().iter().copied(), base, height);
    painter.add(egui::Shape::line(total.clone(), Stroke::new(2.2, palette.ink)));

    if let Some(reference) = reference {
        label_reference(
            &painter,
            plot,
            axis,
            reference.words.as_str(),
            |nm| {
                let k = (nm - colour::FIRST_NM).round().clamp(0.0, 400.0) as usize;
                let over = f64::from(base) - reference.curve[k] * height;
                (over as f32, total[k].y)
            },
            scene,
        );
    }
    write(
        &painter,
        pos2(plot.left(), plot.top()),
        Align2::LEFT_TOP,
        "power per nm",
        text::tick(),
        palette.muted,
    );
}

/// Puts the reference's name where its line is farthest from the blend's.
fn label_reference(
    painter: &egui::Painter,
    plot: Rect,
    axis: &Axis,
    words: &str,
    heights: impl Fn(f64) -> (f32, f32),
    scene: &Scene<'_>,
) {
    let size = measure(painter, words, text::small());
    let half_nm = axis.nm(axis.left + size.x / 2.0 + 8.0) - colour::FIRST_NM;
    let mut best: Option<(f32, f32, f32)> = None;
    let mut nm = colour::FIRST_NM + half_nm;
    while nm <= colour::LAST_NM - half_nm {
        let (line, _) = heights(nm);
        // Above the line, clear of the blend and of the plot's top over the label's whole width.
        let stretch = [-1.0, -0.66, -0.33, 0.0, 0.33, 0.66, 1.0].map(|part| heights(nm + part * half_nm));
        for (y, above) in [
            (stretch.iter().map(|h| h.0).fold(f32::INFINITY, f32::min) - size.y / 2.0 - 3.0, true),
            (stretch.iter().map(|h| h.0).fold(f32::NEG_INFINITY, f32::max) + size.y / 2.0 + 3.0, false),
        ] {
            let inside = y - size.y / 2.0 > plot.top() + 2.0 && y + size.y / 2.0 < plot.bottom() - 10.0;
            let clear = stretch
                .iter()
                .map(|h| if h.1 < y { y - size.y / 2.0 - h.1 } else { h.1 - y - size.y / 2.0 })
                .fold(f32::INFINITY, f32::min);
            // A label over the curves of the blend is hard to read: below its outline does not count.
            let over_fill = stretch.iter().any(|h| h.1 < y);
            if inside && clear > 2.0 && !over_fill {
                let score = -(y - line).abs() + if above { 2.0 } else { 0.0 } + (clear * 0.2).min(6.0);
                if best.is_none_or(|(s, _, _)| score > s) {
                    best = Some((score, axis.x(nm), y));
                }
            }
        }
        nm += 4.0;
    }
    let (_, x, y) = best.unwrap_or((0.0, plot.right() - size.x / 2.0, plot.top() + size.y / 2.0 + 2.0));
    write(painter, pos2(x, y), Align2::CENTER_CENTER, words, text::small(), scene.palette.muted);
}

/// What the blend looks like and amounts to.
fn figures(
    ui: &mut Ui,
    edge: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    blend: &BlendView,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let painter = ui.painter().clone();
    let mut y = edge.top() + 4.0;
    write(&painter, pos2(edge.left(), y), Align2::LEFT_TOP, "The blend", text::strong(), palette.ink);
    let note = "as far as a screen can show";
    write(&painter, pos2(edge.right(), y + 4.0), Align2::RIGHT_TOP, note, text::tick(), palette.muted);
    y += 24.0;
    // Blend and target side by side, touching, as an eye would compare them.
    let height = if edge.height() > 190.0 { 40.0 } else { 28.0 };
    let half = edge.width() / 2.0;
    let left = Rect::from_min_size(pos2(edge.left(), y), vec2(half, height));
    let right = left.translate(vec2(half, 0.0));
    painter.rect_filled(left, CornerRadius { nw: 5, sw: 5, ne: 0, se: 0 }, screen(blend.srgb));
    painter.rect_filled(right, CornerRadius { ne: 5, se: 5, nw: 0, sw: 0 }, screen(blend.target_srgb));
    painter.rect_stroke(
        left.union(right),
        CornerRadius::same(5),
        Stroke::new(1.0, palette.rule),
        StrokeKind::Outside,
    );
    let swatch = ui.interact(left.union(right), ui.scope_id().with("swatches"), Sense::hover());
    swatch.widget_info(|| {
        WidgetInfo::labeled(
            Role::Image,
            true,
            "The blend's white beside the target's, as far as a screen can show",
        )
    });
    swatch.on_hover_text("Left the blend, right the target, as far as a screen can show. A screen cannot show small differences reliably: trust the figures.");
    y += height + 4.0;
    write(&painter, pos2(edge.left(), y), Align2::LEFT_TOP, "blend", text::tick(), palette.muted);
    write(&painter, pos2(edge.right(), y), Align2::RIGHT_TOP, "target", text::tick(), palette.muted);
    y += 20.0;

    let numbers = blend.measurement();
    let room = ((edge.bottom() - y - 8.0) / 21.0).floor() as usize;
    let mut lines: Vec<(&str, String, &str)> = vec![
        ("LER", fixed(numbers.ler_lm_per_w, 1), "lm/W optical"),
        ("greatest power at", fixed(blend.peak_nm, 0), "nm"),
        ("chromaticity x, y", format!("{}, {}", fixed(numbers.x, 4), fixed(numbers.y, 4)), ""),
    ];
    lines.truncate(room.saturating_sub(1));
    for (label, value, unit) in lines {
        write(&painter, pos2(edge.left(), y + 9.0), Align2::LEFT_CENTER, label, text::small(), palette.muted);
        let mut words = Words::default().with(&value, text::strong(), palette.ink);
        if !unit.is_empty() {
            words = words.with(&format!(" {unit}"), text::small(), palette.muted);
        }
        words.write(&painter, pos2(edge.right(), y + 9.0), Align2::RIGHT_CENTER);
        y += 21.0;
    }
    wanted(
        ui,
        Rect::from_min_max(pos2(edge.left(), y), pos2(edge.right(), y + 24.0)),
        set,
        blend,
        scene,
        wishes,
    );
}

/// The lumens wanted, from which every row gets its watts.
fn wanted(
    ui: &mut Ui,
    rect: Rect,
    set: &EmitterSet,
    blend: &BlendView,
    scene: &Scene<'_>,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let painter = ui.painter().clone();
    let middle = rect.center().y;
    write(
        &painter,
        pos2(rect.left(), middle),
        Align2::LEFT_CENTER,
        "lumens wanted",
        text::small(),
        palette.muted,
    );
    let lumens = set.white.lumens;
    let unit = match blend.watts {
        Some(watts) if lumens.is_some() => {
            format!(" lm from {} W", fixed(watts, if watts < 10.0 { 2 } else { 1 }))
        }
        _ => " lm".to_owned(),
    };
    let unit =
        write(&painter, pos2(rect.right(), middle), Align2::RIGHT_CENTER, unit, text::small(), palette.muted);
    let field =
        Rect::from_min_max(pos2(unit.left() - 90.0, rect.top()), pos2(unit.left() - 1.0, rect.bottom()));
    let typed = Number::new("lumens wanted", lumens.unwrap_or(0.0))
        .decimals(0)
        .speed(10.0)
        .range(0.0, 1e7)
        .style(value_style())
        .right()
        .hint("Gives every emitter's optical watts; 0 for none.")
        .show(ui, field);
    if typed.response.drag_started() {
        wishes.push(Wish::Begin("change the lumens wanted".to_owned()));
    }
    if let Some(value) = typed.value {
        let mut white = set.white.clone();
        white.lumens = (value > 0.0).then_some(value);
        wishes.push(Wish::Edit(Edit::White { set: set.id, white: Box::new(white) }));
    }
    if typed.response.drag_stopped() {
        wishes.push(Wish::End);
    }
}
