//! The loom: the blend and its emitters on one wavelength axis. A row's height is its share; pulling it changes it.

mod axis;
mod blend;
mod edge;
mod heading;
mod pull;
mod row;

pub(super) use pull::Pull;

use super::controls::card;
use super::theme::{Palette, text};
use super::view::{Scene, View};
use super::wish::Wish;
use crate::state::derived::{BlendView, RowView};
use axis::Axis;
use egui::scroll_area::ScrollSource;
use egui::{Align2, Rect, ScrollArea, Sense, Ui, UiBuilder, pos2, vec2};
use project::{EmitterSet, ShareKind};

/// Width of the column of numbers beside the curves.
const EDGE_WIDTH: f32 = 274.0;
/// Room between the curves and the numbers.
const EDGE_GAP: f32 = 22.0;
/// Least and greatest height of a row.
const ROW_HEIGHT: (f32, f32) = (68.0, 112.0);
const HEADING_HEIGHT: f32 = 34.0;
const AXIS_HEIGHT: f32 = 30.0;

/// Everything a row needs to be drawn and pulled.
struct RowScene<'a> {
    scene: &'a Scene<'a>,
    set: &'a EmitterSet,
    blend: Option<&'a BlendView>,
    axis: Axis,
    kind: ShareKind,
    /// The share at which a curve fills its row.
    scale: f64,
}

/// The words for a kind of share.
pub(super) const fn kind_words(kind: ShareKind) -> &'static str {
    match kind {
        ShareKind::Radiant => "radiant power",
        ShareKind::Luminous => "luminous flux",
        ShareKind::Photon => "photons",
    }
}

/// Draws the loom into a rectangle.
pub(super) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let inner = card(ui, rect);
    let Some(set) = scene.state.current_set() else {
        empty(ui, inner, scene, "No emitter set yet", wishes);
        return;
    };
    let blend = scene.derived.blend.as_deref();
    let heading = Rect::from_min_size(inner.min, vec2(inner.width(), HEADING_HEIGHT));
    heading::show(ui, heading, scene, set, view, wishes);
    if set.members.is_empty() {
        let room = Rect::from_min_max(pos2(inner.left(), heading.bottom()), inner.max);
        empty(ui, room, scene, "This set has no emitters yet", wishes);
        return;
    }

    let curves_right = inner.right() - EDGE_WIDTH - EDGE_GAP;
    let axis = Axis { left: inner.left(), right: curves_right };
    let body = Rect::from_min_max(pos2(inner.left(), heading.bottom() + 6.0), inner.max);
    let rows = set.members.len() as f32;
    // The blend takes what the rows leave, within reason.
    let room = body.height() - AXIS_HEIGHT;
    let blend_height =
        (room - rows * ROW_HEIGHT.1).clamp(room * 0.32, room * 0.46).max(150.0).min(room * 0.6);
    let row_height = ((room - blend_height) / rows).clamp(ROW_HEIGHT.0, ROW_HEIGHT.1);
    let rows_room = Rect::from_min_max(
        pos2(body.left(), body.top() + blend_height),
        pos2(body.right(), body.bottom() - AXIS_HEIGHT),
    );
    let top = Rect::from_min_size(body.min, vec2(body.width(), blend_height));

    let used = (rows * row_height).min(rows_room.height());
    axis.grid(ui.painter(), body.top(), rows_room.top() + used, &scene.palette);
    blend::show(ui, top, &axis, scene, set, wishes);

    let kind = scene.state.project().share_kind;
    let scale = shared_scale(blend, kind, view);
    let rows_scene = RowScene { scene, set, blend, axis, kind, scale };
    ui.scope_builder(UiBuilder::new().max_rect(rows_room).id_salt("loom rows"), |ui| {
        ui.set_clip_rect(rows_room.expand2(vec2(4.0, 0.0)).intersect(ui.clip_rect()));
        ScrollArea::vertical()
            .id_salt("loom rows")
            .scroll_source(ScrollSource::MOUSE_WHEEL | ScrollSource::SCROLL_BAR)
            .auto_shrink([false, false])
            .show(ui, |ui| {
                ui.spacing_mut().item_spacing.y = 0.0;
                for k in 0..set.members.len() {
                    let (rect, _) =
                        ui.allocate_exact_size(vec2(rows_room.width(), row_height), Sense::hover());
                    row::show(ui, rect, k, &rows_scene, view, wishes);
                }
            });
    });
    let strip = Rect::from_min_size(
        pos2(axis.left, rows_room.top() + used),
        vec2(axis.right - axis.left, AXIS_HEIGHT),
    );
    axis.labels(ui.painter(), strip, &scene.palette);
    cursor(
        ui,
        &axis,
        Rect::from_min_max(pos2(axis.left, body.top()), pos2(axis.right, strip.top())),
        scene,
        view,
    );
}

/// The share at which a row is full: the next round step above the greatest share, held while a row is pulled.
fn shared_scale(blend: Option<&BlendView>, kind: ShareKind, view: &mut View) -> f64 {
    const STEPS: [f64; 8] = [0.1, 0.15, 0.2, 0.3, 0.4, 0.6, 0.8, 1.0];
    let greatest = blend.map_or(0.0, |b| b.rows.iter().map(|row| row.share(kind)).fold(0.0, f64::max));
    let step = |wanted: f64| STEPS.iter().copied().find(|s| *s >= wanted).unwrap_or(1.0);
    let fitting = step(greatest * 1.12);
    if view.pull.is_some() {
        view.scale = view.scale.max(step(greatest));
    } else {
        view.scale = fitting;
    }
    view.scale
}

/// A hairline through all curves under the pointer, with its wavelength.
fn cursor(ui: &Ui, axis: &Axis, area: Rect, scene: &Scene<'_>, view: &View) {
    let Some(at) = ui.ctx().pointer_hover_pos().filter(|p| area.contains(*p)) else { return };
    if view.pull.is_some() || ui.ctx().any_popup_open() || view.dialog_open {
        return;
    }
    let palette: &Palette = &scene.palette;
    let painter = ui.painter();
    painter.vline(at.x, area.y_range(), egui::Stroke::new(1.0, palette.bar));
    let words = format!("{:.0} nm", axis.nm(at.x));
    let size = super::paint::measure(painter, &words, text::tick());
    let centre = pos2(
        at.x.clamp(area.left() + size.x / 2.0 + 5.0, area.right() - size.x / 2.0 - 5.0),
        area.bottom() - 8.0,
    );
    painter.rect_filled(Rect::from_center_size(centre, size + vec2(10.0, 4.0)), 4.0, palette.ink);
    painter.text(centre, Align2::CENTER_CENTER, words, text::tick(), palette.card);
}

fn empty(ui: &mut Ui, room: Rect, scene: &Scene<'_>, headline: &str, wishes: &mut Vec<Wish>) {
    let palette = scene.palette;
    let centre = room.center();
    let painter = ui.painter();
    painter.text(centre - vec2(0.0, 54.0), Align2::CENTER_CENTER, headline, text::title(), palette.ink);
    painter.text(
        centre - vec2(0.0, 28.0),
        Align2::CENTER_CENTER,
        "Drop spectra files here, paste a table from a spreadsheet, or import files.",
        text::body(),
        palette.muted,
    );
    let button = Rect::from_center_size(centre + vec2(0.0, 12.0), vec2(170.0, 32.0));
    if super::controls::primary_button(ui, button, "Import spectra", true, "Read measured spectra from files")
        .clicked()
    {
        wishes.push(Wish::Command(super::command::Command::Import));
    }
}

/// The row of the blend that belongs to a member, when the blend has light.
fn row_view(blend: Option<&BlendView>, k: usize) -> Option<&RowView> {
    blend.and_then(|b| b.rows.get(k))
}
