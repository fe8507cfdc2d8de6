//! The ledger: every requirement with value, limit, margin and whether it is met; targets are edited on it.

mod limits;
mod line;
mod white;

use super::command::Command;
use super::controls::card;
use super::paint::{Icon, icon, measure, write};
use super::plots;
use super::theme::text;
use super::view::{Scene, Section, View};
use super::wish::Wish;
use egui::accesskit::Role;
use egui::scroll_area::ScrollSource;
use egui::{Align2, CornerRadius, Rect, ScrollArea, Sense, Stroke, Ui, UiBuilder, WidgetInfo, pos2, vec2};

/// Height of the heading.
const HEADING: f32 = 32.0;

/// Draws the ledger into a rectangle.
pub(super) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let inner = card(ui, rect);
    heading(ui, inner, scene);
    if view.open_by_room {
        // A tall window has room for the rendering samples too.
        if inner.height() > 800.0 {
            view.open.insert(Section::Ra);
        } else {
            view.open.remove(&Section::Ra);
        }
    }
    let proof = Proof::of(ui, inner.width(), scene);
    let bottom = Rect::from_min_max(pos2(inner.left(), inner.bottom() - proof.height), inner.max);
    let room =
        Rect::from_min_max(pos2(inner.left(), inner.top() + HEADING), pos2(inner.right(), bottom.top()));
    ui.scope_builder(UiBuilder::new().max_rect(room).id_salt("ledger lines"), |ui| {
        ScrollArea::vertical()
            .id_salt("ledger lines")
            .scroll_source(ScrollSource::MOUSE_WHEEL | ScrollSource::SCROLL_BAR)
            .auto_shrink([false, false])
            .show(ui, |ui| {
                ui.spacing_mut().item_spacing.y = 0.0;
                lines(ui, room.width(), scene, view, wishes);
            });
    });
    proof.show(ui, bottom, scene, wishes);
}

fn heading(ui: &Ui, inner: Rect, scene: &Scene<'_>) {
    let palette = scene.palette;
    let painter = ui.painter();
    let y = inner.top() + 12.0;
    write(painter, pos2(inner.left(), y), Align2::LEFT_CENTER, "Ledger", text::title(), palette.ink);
    let (met, limited) = scene.derived.met_of_limited();
    let (words, colour, sign) = match (met, limited) {
        (_, 0) => ("no limits yet".to_owned(), palette.muted, None),
        (met, limited) if met == limited => (format!("all {limited} met"), palette.met, Some(Icon::Check)),
        (met, limited) => (format!("{met} of {limited} met"), palette.short, Some(Icon::Cross)),
    };
    let shown =
        write(painter, pos2(inner.right(), y), Align2::RIGHT_CENTER, words, text::small_strong(), colour);
    if let Some(sign) = sign {
        icon(painter, sign, pos2(shown.left() - 11.0, y), 11.0, colour);
    }
}

/// The section a line's picture is in.
fn section(key: &str) -> Option<Section> {
    match key {
        "cct" => Some(Section::White),
        "ra" => Some(Section::Ra),
        "rf" => Some(Section::Rf),
        _ => None,
    }
}

fn lines(ui: &mut Ui, width: f32, scene: &Scene<'_>, view: &mut View, wishes: &mut Vec<Wish>) {
    let Some(set) = scene.state.current_set() else { return };
    let mut others = Vec::new();
    for entry in &scene.derived.ledger {
        if matches!(entry.key, "sp_ratio" | "melanopic_der" | "blue_light") {
            others.push(entry);
            continue;
        }
        line::show(ui, width, entry, section(entry.key), scene, set, view, wishes);
        match entry.key {
            "duv" if view.open.contains(&Section::White) => {
                white::region(ui, width, scene, set, wishes);
                picture(ui, width, 168.0, |ui, rect| plots::neighbourhood(ui, rect, scene));
            }
            "r9" if view.open.contains(&Section::Ra) => {
                picture(ui, width, 92.0, |ui, rect| plots::samples(ui, rect, scene));
            }
            "rg" if view.open.contains(&Section::Rf) => {
                picture(ui, width, 176.0, |ui, rect| plots::hues(ui, rect, scene));
            }
            _ => {}
        }
    }
    line::others(ui, width, &others, scene, view);
    for warning in &scene.derived.warnings {
        caution(ui, width, warning, scene);
    }
    ui.add_space(6.0);
}

/// Gives a picture its room inside the ledger.
fn picture(ui: &mut Ui, width: f32, height: f32, draw: impl FnOnce(&mut Ui, Rect)) {
    let (rect, _) = ui.allocate_exact_size(vec2(width, height + 8.0), Sense::hover());
    draw(ui, Rect::from_min_size(rect.min, vec2(width, height)));
}

fn caution(ui: &mut Ui, width: f32, words: &str, scene: &Scene<'_>) {
    let palette = scene.palette;
    let galley = ui.painter().layout(words.to_owned(), text::small(), palette.caution, width - 22.0);
    let (rect, response) = ui.allocate_exact_size(vec2(width, galley.size().y + 12.0), Sense::hover());
    icon(ui.painter(), Icon::Caution, pos2(rect.left() + 7.0, rect.top() + 13.0), 12.0, palette.caution);
    ui.painter().galley(pos2(rect.left() + 22.0, rect.top() + 6.0), galley, palette.caution);
    response.widget_info(|| egui::WidgetInfo::labeled(egui::accesskit::Role::Label, true, words));
}

/// The ledger's last line.
struct Proof {
    words: std::sync::Arc<egui::Galley>,
    height: f32,
}

const PROOF_LABEL: f32 = 50.0;
const WAY_HEIGHT: f32 = 24.0;

impl Proof {
    fn of(ui: &Ui, width: f32, scene: &Scene<'_>) -> Self {
        let palette = scene.palette;
        let (words, colour) = match (scene.proof, scene.solving) {
            (_, Some(_)) => ("Solving\u{2026}".to_owned(), palette.muted),
            (Some(proof), _) => (proof.words.clone(), if proof.met { palette.ink } else { palette.short }),
            (None, None) => (
                scene.state.current_set().map_or_else(String::new, |set| {
                    format!(
                        "Not solved as it stands. Solve finds the blend with the {} within these limits.",
                        super::top_bar::maximised(set.white.maximise)
                    )
                }),
                palette.muted,
            ),
        };
        let words = ui.painter().layout(words, text::small(), colour, width - PROOF_LABEL);
        let ways = scene.proof.filter(|_| scene.solving.is_none()).map_or(0, |p| p.ways_out.len());
        let height = words.size().y + ways as f32 * WAY_HEIGHT + 16.0;
        Self { words, height }
    }

    fn show(self, ui: &Ui, rect: Rect, scene: &Scene<'_>, wishes: &mut Vec<Wish>) {
        let palette = scene.palette;
        let painter = ui.painter();
        painter.hline(rect.x_range(), rect.top() + 0.5, Stroke::new(1.0, palette.rule));
        write(
            painter,
            pos2(rect.left(), rect.top() + 10.0),
            Align2::LEFT_TOP,
            "Proof",
            text::small(),
            palette.muted,
        );
        let at = pos2(rect.left() + PROOF_LABEL, rect.top() + 10.0);
        let spoken = format!("Proof: {}", self.words.text());
        let mut y = at.y + self.words.size().y + 4.0 + WAY_HEIGHT / 2.0;
        let response = ui.interact(
            Rect::from_min_size(at, self.words.size()),
            ui.scope_id().with("proof"),
            Sense::hover(),
        );
        response.widget_info(|| WidgetInfo::labeled(Role::Label, true, &spoken));
        painter.galley(at, self.words, palette.ink);
        let Some(proof) = scene.proof.filter(|_| scene.solving.is_none()) else { return };
        for (k, way) in proof.ways_out.iter().enumerate() {
            let size = measure(painter, &way.words, text::small_strong());
            let area = Rect::from_min_size(pos2(at.x - 5.0, y - 10.0), vec2(size.x + 26.0, 20.0));
            let response = ui.interact(area, ui.scope_id().with(("way out", k)), Sense::click());
            response.widget_info(|| WidgetInfo::labeled(Role::Button, true, &way.words));
            if response.hovered() || response.has_focus() {
                painter.rect_filled(area, CornerRadius::same(4), palette.accent_wash);
            }
            write(
                painter,
                pos2(at.x, y),
                Align2::LEFT_CENTER,
                &way.words,
                text::small_strong(),
                palette.accent,
            );
            icon(painter, Icon::Closed, pos2(area.right() - 9.0, y), 8.0, palette.accent);
            super::controls::focus_ring(ui, &response, 4);
            if response.clicked() {
                wishes.push(Wish::Edit(way.edit.clone()));
                if way.solve {
                    wishes.push(Wish::Command(Command::Solve));
                }
            }
            y += WAY_HEIGHT;
        }
    }
}
