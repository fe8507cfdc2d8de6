//! Which few of all emitters: the choices in order, and the blend of the one looked at.

use super::super::controls::focus_ring;
use super::super::paint::{elided, fixed, signed, write};
use super::super::theme::text;
use super::super::view::Scene;
use super::super::wish::Wish;
use super::pieces::{Segment, button, button_size, segmented, sentence};
use super::{Frontier, Tool, plot};
use crate::frontier::{Aim, Choice, Pick, set_edit};
use egui::accesskit::Role;
use egui::{Align2, CornerRadius, Rect, ScrollArea, Sense, Stroke, Ui, UiBuilder, WidgetInfo, pos2, vec2};

const ROW: f32 = 40.0;

pub(super) fn show(
    ui: &mut Ui,
    body: Rect,
    scene: &Scene<'_>,
    bench: &mut Frontier,
    (aim, fresh): (Aim, bool),
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let all = scene.state.project().emitters.len();
    let y = body.top() + 14.0;
    let lead =
        write(ui.painter(), pos2(body.left(), y), Align2::LEFT_CENTER, "The best", text::body(), palette.ink);
    let counts = [(3, "3"), (4, "4"), (5, "5"), (6, "6")].map(|(value, words)| Segment {
        value,
        words,
        hint: if value > all { "More than there are" } else { "" },
        enabled: value <= all,
    });
    let (asked, shown) =
        segmented(ui, pos2(lead.right() + 10.0, y), "How many emitters", &counts, bench.count);
    if let Some(count) = asked {
        bench.count = count;
    }
    let words = format!("of {all} candidates: every emitter of this project");
    let at = pos2(shown.right() + 10.0, y - 8.0);
    elided(ui.painter(), at, body.right() - at.x, &words, text::body(), palette.ink);

    let rest = Rect::from_min_max(pos2(body.left(), body.top() + 40.0), body.max);
    let working = scene.jobs.iter().any(|job| job.key == Tool::Choose.key());
    let Some(choice) = bench.choice.as_ref() else {
        let words =
            if working { "Choosing." } else { "Nothing chosen yet: Choose looks at every combination." };
        plot::nothing(ui, rest, words);
        return;
    };
    let mut summary = choice.words();
    if !choice.dark.is_empty() {
        summary.push_str(&format!(" Left out, without light: {}.", choice.dark.join(", ")));
    }
    let ink = if choice.refusal.is_some() { palette.short } else { palette.ink };
    let y = sentence(ui, rest.min, rest.width(), &summary, text::small(), ink) + 10.0;
    if choice.picks.is_empty() {
        return;
    }
    let split = body.right() - (body.width() * 0.36).clamp(270.0, 440.0);
    let list = Rect::from_min_max(pos2(rest.left(), y), pos2(split - 18.0, rest.bottom()));
    let detail = Rect::from_min_max(pos2(split, y), rest.max);
    ui.painter().vline(split - 9.0, detail.y_range(), Stroke::new(1.0, palette.rule));
    let asked = picks(ui, list, scene, choice, bench.pick);
    if let Some(pick) = choice.picks.get(bench.pick) {
        looked_at(ui, detail, scene, choice, pick, (aim, fresh), wishes);
    }
    if let Some(k) = asked {
        bench.pick = k;
    }
}

fn picks(ui: &mut Ui, rect: Rect, scene: &Scene<'_>, choice: &Choice, current: usize) -> Option<usize> {
    let palette = scene.palette;
    let best = choice.picks[0].objective;
    let mut asked = None;
    ui.scope_builder(UiBuilder::new().max_rect(rect).id_salt("choices"), |ui| {
        ui.spacing_mut().item_spacing.y = 0.0;
        ScrollArea::vertical().id_salt("choices").auto_shrink(false).show_rows(
            ui,
            ROW,
            choice.picks.len(),
            |ui, rows| {
                for k in rows {
                    let pick = &choice.picks[k];
                    let (row, response) =
                        ui.allocate_exact_size(vec2(ui.available_width(), ROW), Sense::click());
                    let names: Vec<&str> = pick.rows.iter().map(|row| row.name.as_str()).collect();
                    let names = names.join(", ");
                    let spoken = format!("Choice {}: {names}, {} lm/W", k + 1, fixed(pick.objective, 1));
                    let chosen = k == current;
                    response.widget_info(|| WidgetInfo::selected(Role::ListBoxOption, true, chosen, &spoken));
                    let painter = ui.painter().clone();
                    if chosen {
                        painter.rect_filled(row, CornerRadius::same(4), palette.accent_wash);
                        let mark = Rect::from_min_size(row.min, vec2(3.0, row.height()));
                        painter.rect_filled(mark, CornerRadius::ZERO, palette.accent);
                    } else if response.hovered() {
                        painter.rect_filled(row, CornerRadius::same(4), palette.well);
                    }
                    painter.hline(row.x_range(), row.bottom() - 0.5, Stroke::new(1.0, palette.grid));
                    let y = row.center().y;
                    let rank = format!("{}", k + 1);
                    write(
                        &painter,
                        pos2(row.left() + 30.0, y),
                        Align2::RIGHT_CENTER,
                        rank,
                        text::strong(),
                        palette.muted,
                    );
                    let right = row.right() - 12.0;
                    write(
                        &painter,
                        pos2(right, y - 8.0),
                        Align2::RIGHT_CENTER,
                        format!("{} lm/W", fixed(pick.objective, 1)),
                        text::small_strong(),
                        palette.ink,
                    );
                    let behind = if k == 0 {
                        "best".to_owned()
                    } else {
                        let behind = signed(pick.objective - best, 1);
                        if behind == "0.0" { "as good".to_owned() } else { behind }
                    };
                    write(
                        &painter,
                        pos2(right, y + 9.0),
                        Align2::RIGHT_CENTER,
                        behind,
                        text::small(),
                        palette.muted,
                    );
                    let left = row.left() + 42.0;
                    let galley =
                        painter.layout(names, text::small(), palette.ink, (right - 84.0 - left).max(60.0));
                    let top = y - galley.size().y.min(ROW - 4.0) / 2.0;
                    painter.with_clip_rect(row.intersect(ui.clip_rect())).galley(
                        pos2(left, top),
                        galley,
                        palette.ink,
                    );
                    focus_ring(ui, &response, 4);
                    if response.clicked() {
                        asked = Some(k);
                    }
                }
            },
        );
    });
    asked
}

fn looked_at(
    ui: &mut Ui,
    rect: Rect,
    scene: &Scene<'_>,
    choice: &Choice,
    pick: &Pick,
    (aim, fresh): (Aim, bool),
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let painter = ui.painter().clone();
    let value = fixed(pick.objective, 1);
    let shown = write(&painter, rect.min, Align2::LEFT_TOP, value, text::value(), palette.ink);
    let beside = pos2(shown.right() + 6.0, shown.bottom() - 2.0);
    write(&painter, beside, Align2::LEFT_BOTTOM, choice.aim.words(), text::small(), palette.muted);
    let mut y = shown.bottom() + 14.0;
    let width = rect.width();
    for row in &pick.rows {
        let percent = format!("{}\u{2009}%", fixed(row.share * 100.0, 1));
        let line = Rect::from_min_size(pos2(rect.left(), y - 10.0), vec2(width, 20.0));
        let spoken = format!("{} {percent}", row.name);
        ui.interact(line, ui.scope_id().with(("picked", row.emitter)), Sense::hover())
            .widget_info(|| WidgetInfo::labeled(Role::Label, true, &spoken));
        let at = pos2(rect.left(), y - 7.5);
        elided(&painter, at, width * 0.44, &row.name, text::small(), palette.ink);
        let track =
            Rect::from_min_max(pos2(rect.left() + width * 0.46, y - 3.5), pos2(rect.right() - 52.0, y + 3.5));
        painter.rect_filled(track, CornerRadius::same(3), palette.grid);
        let part = row.share.clamp(0.0, 1.0) as f32;
        let filled = Rect::from_min_size(track.min, vec2(track.width() * part, track.height()));
        let colour =
            scene.derived.light(row.emitter).map_or(palette.bar, |light| palette.emitter(light.srgb).line);
        painter.rect_filled(filled, CornerRadius::same(3), colour);
        write(&painter, pos2(rect.right(), y), Align2::RIGHT_CENTER, percent, text::small(), palette.ink);
        y += 24.0;
    }
    let size = button_size(ui, "Make a set of these");
    let at = Rect::from_min_size(pos2(rect.left(), y + 4.0), size);
    let hint = if fresh {
        "Adds a set with these emitters and shares and this white; undo takes it back"
    } else {
        "Out of date: work it out again first"
    };
    if button(ui, at, "Make a set of these", fresh, hint)
        && let Some(edit) = set_edit(scene.state, pick)
    {
        wishes.push(Wish::Edit(edit));
    }
    let note = format!(
        "Shares of radiant power that give the most {} within the limits. A share of 0 means that fewer emitters do.",
        aim.words()
    );
    sentence(ui, pos2(rect.left(), at.bottom() + 12.0), width, &note, text::small(), palette.muted);
}
