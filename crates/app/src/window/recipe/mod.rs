//! The Recipe bench: the blend as a device, with its numbers, its drawing and the way back to the white.
//!
//! * [`worked`]: what is shown, worked out once a change.
//! * [`drawing`]: the device to scale, painted from the same figure as the report's.
//! * [`numbers`]: the fabrication numbers, their bands and locks.
//! * [`settings`]: the build form and its settings.
//! * [`sheet`]: the sheets of the emitters.

mod drawing;
mod numbers;
mod settings;
mod sheet;
mod worked;

pub(super) use worked::{RecipeView, device_shares};

use super::command::Command;
use super::controls::{card, primary_button};
use super::paint::{Pattern, elided, fixed, patterned, write};
use super::theme::{Palette, text};
use super::view::{Scene, View};
use super::wish::Wish;
use crate::making::{Making, plan_of};
use crate::state::Edit;
use device::BuildForm;
use egui::accesskit::Role;
use egui::{
    Align2, CornerRadius, Popup, Rect, RichText, ScrollArea, Sense, Stroke, StrokeKind, Ui, UiBuilder,
    WidgetInfo, pos2, vec2,
};
use project::{EmitterSet, RecipePlan};
use worked::Worked;

/// The build forms in words, in the order of the choice.
const FORMS: [(BuildForm, &str); 4] = [
    (BuildForm::SideBySide, "Side by side"),
    (BuildForm::SeriesStack, "Series stack"),
    (BuildForm::SharedZone, "Shared zone"),
    (BuildForm::Packages, "Packages"),
];

/// Draws the bench.
pub(super) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let room = card(ui, rect);
    let Some(set) = scene.state.current_set() else {
        write(
            ui.painter(),
            room.center(),
            Align2::CENTER_CENTER,
            "There is no set to build.",
            text::body(),
            scene.palette.muted,
        );
        return;
    };
    let worked = view.recipe.work(scene.state);
    let head = Rect::from_min_size(room.min, vec2(room.width(), 30.0));
    heading(ui, head, set, scene, view, wishes);
    let body = Rect::from_min_max(pos2(room.left(), head.bottom() + 10.0), room.max);
    let mut child = ui.new_child(UiBuilder::new().max_rect(body).id_salt("recipe body"));
    ScrollArea::vertical().auto_shrink(false).show(&mut child, |ui| {
        let Some(worked) = worked else { return };
        match &worked.making {
            Ok(making) => whole(ui, set, making, &worked, scene, view, wishes),
            Err(why) => refused(ui, why, set, scene, view, wishes),
        }
        ui.add_space(10.0);
        sheet::list(ui, set, scene, view);
    });
    sheet::show(ui, scene, view, wishes);
}

/// The plan on the bench: the chosen one, or the one taken where the set has none.
pub(super) fn plan_on_bench(set: &EmitterSet, chosen: usize) -> RecipePlan {
    set.recipes
        .get(chosen)
        .or(set.recipes.first())
        .cloned()
        .unwrap_or_else(|| crate::making::default_plan(set))
}

/// The edit that puts a plan in place of the one on the bench.
fn replace(set: &EmitterSet, chosen: usize, plan: RecipePlan) -> Wish {
    let mut recipes = set.recipes.clone();
    let place = chosen.min(recipes.len().saturating_sub(1));
    match recipes.get_mut(place) {
        Some(old) => *old = plan,
        None => recipes.push(plan),
    }
    Wish::Edit(Edit::Recipes { set: set.id, recipes })
}

fn heading(
    ui: &mut Ui,
    rect: Rect,
    set: &EmitterSet,
    scene: &Scene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let plan = plan_on_bench(set, view.recipe.chosen);
    let palette = scene.palette;
    let mut x = rect.left();
    for (form, words) in FORMS {
        let wide = super::paint::measure(ui.painter(), words, text::strong()).x + 24.0;
        let place = Rect::from_min_size(pos2(x, rect.top()), vec2(wide, 28.0));
        let on = plan.build.build_form() == form;
        if pill(ui, place, words, on, &palette) && !on {
            let known = set.recipes.iter().position(|other| other.build.build_form() == form);
            if let Some(known) = known {
                view.recipe.chosen = known;
            } else {
                let mut recipes = set.recipes.clone();
                recipes.push(plan_of(set, form));
                view.recipe.chosen = recipes.len() - 1;
                wishes.push(Wish::Edit(Edit::Recipes { set: set.id, recipes }));
            }
        }
        x = place.right() + 6.0;
    }
    let out =
        Rect::from_min_max(pos2(rect.right() - 92.0, rect.top()), pos2(rect.right(), rect.top() + 28.0));
    let give = pill_response(ui, out, "Give out\u{2026}", false, &palette);
    Popup::menu(&give).show(|ui| {
        for command in [
            Command::ExportReportPdf,
            Command::ExportReportHtml,
            Command::ExportRecipeRon,
            Command::ExportRecipeCsv,
            Command::ExportRecipeSpectrum,
            Command::ExportRecipeTm27,
        ] {
            if ui.button(command.words()).clicked() {
                wishes.push(Wish::Command(command));
            }
        }
    });
    let name = Rect::from_min_max(pos2(x + 8.0, rect.top()), pos2(out.left() - 10.0, rect.top() + 28.0));
    if name.width() > 40.0 {
        let choose = ui.interact(name, ui.scope_id().with("recipe name"), Sense::click());
        choose.widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("Recipe: {}", plan.name)));
        elided(
            ui.painter(),
            pos2(name.left(), name.center().y - 8.0),
            name.width(),
            &plan.name,
            text::body(),
            palette.muted,
        );
        super::controls::focus_ring(ui, &choose, 5);
        Popup::menu(&choose).show(|ui| {
            for (k, other) in set.recipes.iter().enumerate() {
                if ui.selectable_label(k == view.recipe.chosen, &other.name).clicked() {
                    view.recipe.chosen = k;
                }
            }
            ui.separator();
            if !set.recipes.is_empty() && ui.button("Remove this recipe").clicked() {
                let mut recipes = set.recipes.clone();
                recipes.remove(view.recipe.chosen.min(recipes.len() - 1));
                view.recipe.chosen = 0;
                wishes.push(Wish::Edit(Edit::Recipes { set: set.id, recipes }));
            }
        });
    }
}

fn pill(ui: &mut Ui, rect: Rect, words: &str, on: bool, palette: &Palette) -> bool {
    pill_response(ui, rect, words, on, palette).clicked()
}

fn pill_response(ui: &mut Ui, rect: Rect, words: &str, on: bool, palette: &Palette) -> egui::Response {
    let response = ui.interact(rect, ui.scope_id().with(("pill", words)), Sense::click());
    response.widget_info(|| WidgetInfo::selected(Role::Button, true, on, words));
    let fill = if on { palette.accent_wash } else { palette.well };
    let edge = if on || response.hovered() { palette.accent } else { palette.rule };
    ui.painter().rect(rect, CornerRadius::same(6), fill, Stroke::new(1.0, edge), StrokeKind::Inside);
    let ink = if on { palette.ink } else { palette.muted };
    write(ui.painter(), rect.center(), Align2::CENTER_CENTER, words, text::strong(), ink);
    super::controls::focus_ring(ui, &response, 6);
    response
}

/// What the sheets lack, and what else stands in the way.
fn refused(
    ui: &mut Ui,
    why: &str,
    set: &EmitterSet,
    scene: &Scene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    ui.label(
        RichText::new("This device cannot be made as asked").font(text::title()).color(scene.palette.short),
    );
    ui.label(RichText::new(sentence(why)).font(text::body()));
    ui.add_space(8.0);
    settings::show(ui, set, scene, view, wishes);
}

fn whole(
    ui: &mut Ui,
    set: &EmitterSet,
    making: &Making,
    worked: &Worked,
    scene: &Scene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let width = ui.available_width();
    let figure = (0.56 * width).min(width - 260.0).max(200.0);
    let (rect, _) = ui.allocate_exact_size(vec2(width, 250.0), Sense::hover());
    let left = Rect::from_min_size(rect.min, vec2(figure, rect.height()));
    let right = Rect::from_min_max(pos2(left.right() + 16.0, rect.top()), rect.max);
    match worked.picture.as_ref() {
        Some(picture) => drawing::show(ui, left, picture, &scene.palette),
        None => {
            let words = making
                .recipe
                .missing
                .first()
                .map_or("The sheets say too little for a drawing.", String::as_str);
            let mut child = ui.new_child(UiBuilder::new().max_rect(left.shrink(8.0)).id_salt("no drawing"));
            child.label(RichText::new(sentence(words)).font(text::body()).color(scene.palette.muted));
        }
    }
    light(ui, right, making, worked, scene);
    ui.add_space(6.0);
    back(ui, set, making, worked, scene, view, wishes);
    numbers::show(ui, set, making, worked, scene, view, wishes);
    ui.add_space(8.0);
    settings::show(ui, set, scene, view, wishes);
    ui.add_space(8.0);
    said(ui, making, worked, scene);
}

/// The light of the numbers as they stand: a small loom, and what the device gives.
fn light(ui: &Ui, rect: Rect, making: &Making, worked: &Worked, scene: &Scene<'_>) {
    let palette = scene.palette;
    let painter = ui.painter();
    let plot = Rect::from_min_max(rect.min, pos2(rect.right(), rect.bottom() - 86.0));
    painter.rect(
        plot,
        CornerRadius::same(5),
        palette.well,
        Stroke::new(1.0, palette.rule),
        StrokeKind::Inside,
    );
    let inner = Rect::from_min_max(plot.min + vec2(8.0, 8.0), plot.max - vec2(8.0, 20.0));
    let peak = worked.curve.iter().copied().fold(1e-12, f64::max);
    let at = |nm: usize, power: f64| {
        pos2(
            inner.left() + inner.width() * nm as f32 / 400.0,
            inner.bottom() - inner.height() * (power / peak) as f32,
        )
    };
    for (row, (grid, emitter)) in making.devices.grids.iter().zip(&making.recipe.emitters).enumerate() {
        if emitter.share_radiant <= 0.0 {
            continue;
        }
        let colours = palette.emitter(worked.inks[row]);
        let line: Vec<_> = grid.iter().enumerate().map(|(k, p)| at(k, p * emitter.share_radiant)).collect();
        patterned(painter, &line, Stroke::new(1.3, colours.line), Pattern::of_row(row));
    }
    let total: Vec<_> = worked.curve.iter().enumerate().map(|(k, p)| at(k, *p)).collect();
    painter.line(total, Stroke::new(1.8, palette.ink));
    for nm in [400, 500, 600, 700] {
        let x = at(nm - 380, 0.0).x;
        write(
            painter,
            pos2(x, plot.bottom() - 3.0),
            Align2::CENTER_BOTTOM,
            nm.to_string(),
            text::tick(),
            palette.muted,
        );
    }
    let recipe = &making.recipe;
    let entry = |value: Option<f64>, decimals: usize| {
        value.map_or_else(|| "\u{2013}".to_owned(), |v| fixed(v, decimals))
    };
    let lines = [
        ("Luminance", entry(recipe.luminance_cd_per_m2, 0), "cd/m\u{b2}"),
        ("Flux", entry(recipe.luminous_flux_lm, 1), "lm"),
        ("Device", entry(recipe.efficacy_lm_per_w, 1), "lm/W"),
        ("Power", entry(recipe.electrical_power_w, 2), "W"),
    ];
    for (k, (name, value, unit)) in lines.iter().enumerate() {
        let x = rect.left() + rect.width() * 0.5 * (k % 2) as f32;
        let y = plot.bottom() + 22.0 + 38.0 * (k / 2) as f32;
        write(painter, pos2(x, y - 9.0), Align2::LEFT_CENTER, name, text::small(), palette.muted);
        let shown = write(painter, pos2(x, y + 8.0), Align2::LEFT_CENTER, value, text::value(), palette.ink);
        write(
            painter,
            pos2(shown.right() + 4.0, y + 9.0),
            Align2::LEFT_CENTER,
            unit,
            text::small(),
            palette.muted,
        );
    }
}

/// How far the white has moved, and what brings it back.
fn back(
    ui: &mut Ui,
    set: &EmitterSet,
    making: &Making,
    worked: &Worked,
    scene: &Scene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let moved = making.recipe.delta_uv_prime.filter(|d| d.is_finite()).unwrap_or(0.0);
    ui.horizontal_wrapped(|ui| {
        let by_hand = making.plan.made.is_some();
        let words = if moved < 5e-6 {
            "The numbers make the white of the blend.".to_owned()
        } else {
            format!(
                "The white is \u{394}u\u{2032}v\u{2032} {} from the blend ({} steps).",
                fixed(moved, 4),
                fixed(moved / colour::tolerance::STEP_RADIUS, 1)
            )
        };
        let colour = if making.white_met() { palette.ink } else { palette.short };
        ui.label(RichText::new(words).font(text::strong()).color(colour));
        if by_hand && ui.button("Follow the blend again").on_hover_text("Drop every number set by hand").clicked() {
            let plan = RecipePlan { made: None, ..making.plan.clone() };
            wishes.push(replace(set, view.recipe.chosen, plan));
        }
        let solving = scene.device_job;
        let able = worked.power_known && !solving;
        let words = if solving { "Searching\u{2026}" } else { "Best for this device" };
        let hint = "Find the blend with the most lumens per electrical watt of this device, currents and areas included";
        if ui.add_enabled(able, egui::Button::new(words)).on_hover_text(hint).clicked() {
            wishes.push(Wish::Command(Command::SolveDevice));
        }
    });
    if moved < 5e-6 || making.plan.made.is_none() {
        return;
    }
    match &worked.way_back {
        Some(Ok(way)) if !way.changes.is_empty() => {
            let changes: Vec<String> = way
                .changes
                .iter()
                .map(|change| {
                    let (unit, factor) = crate::making::numbers::line_unit(change.quantity.kind);
                    let part = making.part_of(change.quantity);
                    let name = if part.is_empty() { String::new() } else { format!("{part}, ") };
                    format!(
                        "{name}{} {} \u{2192} {} {unit}",
                        change.quantity.kind.label(),
                        figures(change.from * factor),
                        figures(change.to * factor)
                    )
                })
                .collect();
            ui.label(RichText::new(format!("To bring it back: {}.", changes.join("; "))).font(text::small()));
            let (rect, _) = ui.allocate_exact_size(vec2(170.0, 28.0), Sense::hover());
            if primary_button(ui, rect, "Bring the white back", true, "Change these numbers").clicked() {
                let plan = RecipePlan { made: way.recipe.made.clone(), ..making.plan.clone() };
                wishes.push(replace(set, view.recipe.chosen, plan));
            }
        }
        Some(Err(why)) => {
            ui.label(RichText::new(sentence(why)).font(text::small()).color(palette.short));
        }
        _ => {}
    }
}

/// What was assumed, left at its default, missing, and free.
fn said(ui: &mut Ui, making: &Making, worked: &Worked, scene: &Scene<'_>) {
    let palette = scene.palette;
    let mut list = |title: &str, sentences: &[String], colour| {
        if sentences.is_empty() {
            return;
        }
        ui.label(RichText::new(title).font(text::small_strong()).color(palette.muted));
        for one in sentences {
            ui.label(RichText::new(sentence(one)).font(text::small()).color(colour));
        }
        ui.add_space(4.0);
    };
    list("Missing", &making.recipe.missing, palette.caution);
    list("Still free", &making.recipe.freedoms, palette.ink);
    list("Remarks", &making.recipe.notices, palette.ink);
    list("Assumed", &making.assumptions, palette.ink);
    list("Defaults left as they are", &making.defaults, palette.ink);
    let _ = worked;
}

/// A number with about four figures.
fn figures(value: f64) -> String {
    let digits = if value == 0.0 { 0 } else { value.abs().log10().floor() as i32 };
    fixed(value, (3 - digits).clamp(0, 6) as usize)
}

/// Words as a sentence: a capital first and a full stop last.
fn sentence(words: &str) -> String {
    let mut chars = words.chars();
    let mut out: String = chars.next().map(|c| c.to_uppercase().collect::<String>()).unwrap_or_default();
    out.push_str(chars.as_str());
    if !out.ends_with(['.', '?', '!']) {
        out.push('.');
    }
    out
}
