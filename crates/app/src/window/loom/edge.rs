//! The numbers at a row's edge.

use super::super::controls::{Number, sign_button, value_style};
use super::super::paint::{Icon, Pattern, Words, elided, fixed, patterned, write};
use super::super::theme::{Emitted, text};
use super::super::view::View;
use super::super::wish::Wish;
use super::{Pull, RowScene, kind_words, row};
use crate::state::Edit;
use crate::state::derived::RowView;
use egui::{Align2, Rect, Sense, Stroke, Ui, UiBuilder, pos2, vec2};
use project::Emitter;

#[expect(clippy::too_many_arguments, reason = "one row's whole scene")]
pub(super) fn show(
    ui: &mut Ui,
    rect: Rect,
    k: usize,
    emitter: &Emitter,
    row: Option<&RowView>,
    (emitted, pattern): (Emitted, Pattern),
    rows: &RowScene<'_>,
    view: &mut View,
    wishes: &mut Vec<Wish>,
) {
    let palette = rows.scene.palette;
    let member = rows.set.members[k];
    let (set, id) = (rows.set.id, member.emitter);
    // Three lines, spread over the row's height.
    let middle = rect.center().y;
    let spread = ((rect.height() - 56.0) / 2.0).clamp(4.0, 12.0) * 0.25 + 19.0;
    let lines = [middle - spread, middle + 2.0, middle + spread + 0.5];

    let share = row.map_or(0.0, |row| row.share(rows.kind)) * 100.0;
    let ink = if member.on { palette.ink } else { palette.muted };
    let painter = ui.painter().clone();
    let key = rect.left();
    patterned(
        &painter,
        &[pos2(key, lines[0]), pos2(key + 22.0, lines[0])],
        Stroke::new(2.2, if member.on { emitted.line } else { palette.bar }),
        pattern,
    );
    let name_at = pos2(key + 30.0, lines[0] - 8.0);
    let name_rect = elided(&painter, name_at, rect.width() - 132.0, &emitter.name, text::strong(), ink);
    let name_hover = ui.interact(name_rect, ui.scope_id().with(("name", id.0)), Sense::hover());
    name_hover.on_hover_ui(|ui| about(ui, emitter, row));

    // The share: big number, small unit.
    let percent = write(
        &painter,
        pos2(rect.right(), lines[0] + 1.5),
        Align2::RIGHT_CENTER,
        "%",
        text::body(),
        palette.muted,
    );
    let field = Rect::from_min_max(
        pos2(rect.right() - 102.0, lines[0] - 12.0),
        pos2(percent.left() - 1.0, lines[0] + 12.0),
    );
    let name = format!("{}: share of {} in percent", emitter.name, kind_words(rows.kind));
    let mut child = ui.new_child(UiBuilder::new().max_rect(rect).id_salt(("share", id.0)));
    {
        let ui = &mut child;
        let typed = Number::new(&name, share)
            .decimals(1)
            .speed(0.1)
            .range(0.0, 100.0)
            .style(value_style())
            .colour(ink)
            .right()
            .show(ui, field);
        if view.focus_share == Some(id) {
            view.focus_share = None;
            typed.response.request_focus();
        }
        if typed.response.drag_started()
            && let Some(blend) = rows.blend
        {
            view.pull = Pull::begin(rows.set, blend, k, rows.kind, view.hold_white);
            wishes.push(Wish::Begin(format!("change {}", emitter.name)));
        }
        if let Some(value) = typed.value {
            match view.pull.as_mut().filter(|pull| pull.emitter == id && typed.response.dragged()) {
                Some(pull) => pull.to(value / 100.0, rows.set, wishes),
                None => row::set_share(k, value / 100.0, rows, view, wishes),
            }
        }
        if typed.response.drag_stopped() {
            view.pull = None;
            wishes.push(Wish::End);
        }
    }

    let features = row.and_then(|row| row.light.as_ref()).map(|light| light.features);
    let peak = features.map_or_else(String::new, |f| match f.fwhm_nm {
        Some(width) => format!("{:.0} nm, {width:.0} nm wide", f.peak_nm),
        None => format!("{:.0} nm, width not measured", f.peak_nm),
    });
    let mut lumens =
        row.map_or_else(String::new, |row| format!("{} % of lumens", fixed(row.luminous * 100.0, 1)));
    if let Some(watts) = row.and_then(|row| row.watts).filter(|_| member.on) {
        lumens = row.map_or_else(String::new, |row| {
            format!(
                "{} % lm  {} W",
                fixed(row.luminous * 100.0, 1),
                fixed(watts, if watts < 10.0 { 2 } else { 1 })
            )
        });
    }
    let right = write(
        &painter,
        pos2(rect.right(), lines[1]),
        Align2::RIGHT_CENTER,
        lumens,
        text::small(),
        palette.muted,
    );
    elided(
        &painter,
        pos2(key, lines[1] - 7.0),
        right.left() - key - 8.0,
        &peak,
        text::small(),
        palette.muted,
    );

    // What a little more of it would do to the white.
    let held = row
        .and_then(|row| row.held_span.as_ref().err())
        .filter(|_| view.hold_white && member.on && !member.locked);
    let signs = rect.right() - 3.0 * 24.0 - 4.0;
    if let (Some(stuck), true) = (held, view.hold_white) {
        let words = format!("held: {stuck}");
        let shown = elided(
            &painter,
            pos2(key, lines[2] - 7.0),
            signs - key - 4.0,
            &words,
            text::small(),
            palette.caution,
        );
        ui.interact(shown, ui.scope_id().with(("stuck", id.0)), Sense::hover()).on_hover_text(words);
    } else if let Some(row) = row.filter(|_| member.on) {
        let number = |value: f64| fixed(value, 4);
        let shown = Words::default()
            .with("\u{394}u\u{2032}v\u{2032}  +1 % ", text::small(), palette.muted)
            .with(&number(row.plus_one_percent.distance()), text::small(), palette.ink)
            .with("  +1 nm ", text::small(), palette.muted)
            .with(&number(row.plus_one_nm.distance()), text::small(), palette.ink)
            .write(&painter, pos2(key, lines[2]), Align2::LEFT_CENTER);
        let (a, b) = (row.plus_one_percent, row.plus_one_nm);
        let number = |v: f64| super::super::paint::signed(v, 5);
        ui.interact(shown, ui.scope_id().with(("moves", id.0)), Sense::hover()).on_hover_text(format!(
            "How far the white moves in u\u{2032}v\u{2032} when this emitter gives 1 % more of its own power: {}, {}.\nWhen its curve moves by +1 nm: {}, {}.\nA step of 0.0011 can just be seen side by side.",
            number(a.du), number(a.dv), number(b.du), number(b.dv)
        ));
    } else {
        write(&painter, pos2(key, lines[2]), Align2::LEFT_CENTER, "off", text::small_strong(), palette.muted);
    }

    let sign = |slot: f32| {
        Rect::from_center_size(pos2(rect.right() - 12.0 - slot * 24.0, lines[2]), vec2(23.0, 22.0))
    };
    let mut child = ui.new_child(UiBuilder::new().max_rect(rect).id_salt(("signs", id.0)));
    {
        let ui = &mut child;
        let (icon, words, colour) = if member.locked {
            (Icon::Locked, format!("Unlock {}", emitter.name), palette.accent)
        } else {
            (Icon::Unlocked, format!("Lock {}", emitter.name), palette.muted)
        };
        if sign_button(ui, sign(2.0), icon, &words, colour, true).clicked() {
            wishes.push(Wish::Edit(Edit::Lock { set, emitter: id, locked: !member.locked }));
        }
        let (icon, words, colour) = if member.on {
            (Icon::On, format!("Switch {} off", emitter.name), palette.muted)
        } else {
            (Icon::Off, format!("Switch {} on", emitter.name), palette.accent)
        };
        if sign_button(ui, sign(1.0), icon, &words, colour, true).clicked() {
            wishes.push(Wish::Edit(Edit::Switch { set, emitter: id, on: !member.on }));
        }
        let more = sign_button(
            ui,
            sign(0.0),
            Icon::More,
            &format!("More about {}", emitter.name),
            palette.muted,
            true,
        );
        super::super::dialogs::emitter::menu(&more, emitter, k, rows.set, view, wishes);
    }
}

/// What is known of an emitter, in a few lines.
fn about(ui: &mut Ui, emitter: &Emitter, row: Option<&RowView>) {
    ui.strong(&emitter.name);
    if emitter.invented {
        ui.label("Invented for demonstration; never measured.");
    }
    if !emitter.note.is_empty() {
        ui.label(&emitter.note);
    }
    if let Some(source) = &emitter.import.source {
        ui.label(format!("From {}", source.name));
    }
    if let Some(light) = row.and_then(|row| row.light.as_ref()) {
        ui.label(format!(
            "{:.0} lm of each optical watt; mean wavelength {:.1} nm",
            light.weights.lm_per_w, light.weights.mean_wavelength_nm
        ));
        for caution in &light.cautions {
            ui.label(caution);
        }
    }
}
