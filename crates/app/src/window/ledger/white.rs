//! Where the white may lie.

use super::super::paint::{Icon, elided, icon, measure};
use super::super::theme::text;
use super::super::view::Scene;
use super::super::wish::Wish;
use super::limits::white;
use colour::tolerance::{Ellipse, IEC_60081, NOMINAL_CCTS_K};
use egui::accesskit::Role;
use egui::{
    CornerRadius, DragValue, Popup, PopupCloseBehavior, Rect, RichText, Sense, Ui, WidgetInfo, pos2, vec2,
};
use project::{EmitterSet, Region};

/// The line that names the region and opens the choice of it.
pub(super) fn region(ui: &mut Ui, width: f32, scene: &Scene<'_>, set: &EmitterSet, wishes: &mut Vec<Wish>) {
    let palette = scene.palette;
    let (row, _) = ui.allocate_exact_size(vec2(width, 26.0), Sense::hover());
    let words =
        scene.derived.blend.as_ref().map_or_else(|| set.white.region.to_string(), |b| b.region.words.clone());
    let lead = "white allowed:";
    let painter = ui.painter().clone();
    let y = row.top() + 10.0;
    let lead = elided(&painter, pos2(row.left(), y - 7.0), 100.0, lead, text::small(), palette.muted);
    let room = width - lead.width() - 30.0;
    let size = measure(&painter, &words, text::small_strong()).x.min(room);
    let area = Rect::from_min_size(pos2(lead.right() + 2.0, y - 10.0), vec2(size + 26.0, 20.0));
    let response = ui.interact(area, ui.scope_id().with("region"), Sense::click());
    response.widget_info(|| WidgetInfo::labeled(Role::Button, true, format!("White allowed: {words}")));
    if response.hovered() || response.has_focus() {
        painter.rect_filled(area, CornerRadius::same(4), palette.accent_wash);
    }
    elided(
        &painter,
        pos2(area.left() + 4.0, y - 7.0),
        size + 2.0,
        &words,
        text::small_strong(),
        palette.accent,
    );
    icon(&painter, Icon::Open, pos2(area.right() - 9.0, y), 8.0, palette.accent);
    super::super::controls::focus_ring(ui, &response, 4);
    Popup::from_toggle_button_response(&response)
        .close_behavior(PopupCloseBehavior::CloseOnClickOutside)
        .frame(super::super::controls::sheet_frame(ui))
        .show(|ui| choices(ui, set, wishes));
}

fn choices(ui: &mut Ui, set: &EmitterSet, wishes: &mut Vec<Wish>) {
    ui.set_width(330.0);
    let now = &set.white.region;
    let target_k = set.white.cct_k;
    let mut choose = |region: Region| {
        if region != *now {
            wishes.push(white(set, |w| w.region = region));
        }
    };
    if ui.radio(matches!(now, Region::Point), "exactly on target").clicked() {
        choose(Region::Point);
    }

    let (mut half_k, mut half_duv) = match now {
        Region::Box { cct_k, duv } => (*cct_k, *duv),
        _ => (175.0, 0.006),
    };
    let boxed = matches!(now, Region::Box { .. });
    ui.horizontal(|ui| {
        let mut chosen = ui.radio(boxed, "box \u{b1}").clicked();
        let k = DragValue::new(&mut half_k)
            .range(0.0..=5000.0)
            .speed(5.0)
            .suffix(" K")
            .update_while_editing(false);
        chosen |= ui.add(k).accessible_name("box half-width in kelvin").changed();
        let duv = DragValue::new(&mut half_duv)
            .range(0.0..=0.05)
            .speed(0.0001)
            .fixed_decimals(4)
            .suffix(" Duv")
            .update_while_editing(false);
        chosen |= ui.add(duv).accessible_name("box half-width in Duv").changed();
        if chosen {
            choose(Region::Box { cct_k: half_k, duv: half_duv });
        }
    });

    let all = NOMINAL_CCTS_K.map(|cct_k| cct_k as u32);
    let off_target = |cct_k: u32| (f64::from(cct_k) - target_k).abs();
    let nominal = match now {
        Region::Quadrangle { nominal_k } => Some(*nominal_k),
        _ => all.into_iter().min_by(|a, b| off_target(*a).total_cmp(&off_target(*b))),
    };
    if let Some(nominal) = nominal {
        ui.horizontal(|ui| {
            if ui.radio(matches!(now, Region::Quadrangle { .. }), "ANSI C78.377 quadrangle").clicked() {
                choose(Region::Quadrangle { nominal_k: nominal });
            }
            combo(ui, "nominal CCT of the quadrangle", &format!("{nominal} K"), |ui| {
                for other in all {
                    if ui.selectable_label(other == nominal, format!("{other} K")).clicked() {
                        choose(Region::Quadrangle { nominal_k: other });
                    }
                }
            });
        });
    }

    let mut steps = match now {
        Region::Circle { steps } => *steps,
        _ => 3.0,
    };
    ui.horizontal(|ui| {
        let mut chosen = ui.radio(matches!(now, Region::Circle { .. }), "circle of").clicked();
        let field = DragValue::new(&mut steps)
            .range(0.1..=20.0)
            .speed(0.1)
            .suffix(" steps")
            .update_while_editing(false);
        chosen |= ui.add(field).accessible_name("steps of the circle").changed();
        ui.weak("of 0.0011 u\u{2032}v\u{2032}");
        if chosen {
            choose(Region::Circle { steps });
        }
    });

    let (mut ellipse_steps, centre) = match now {
        Region::Sdcm { steps, centre } => (*steps, centre.clone()),
        _ => {
            // The centres are named by their nominal CCT: F3000.
            let nominal =
                |e: &Ellipse| e.name.trim_start_matches('F').parse::<f64>().unwrap_or(f64::INFINITY);
            let near = IEC_60081
                .iter()
                .min_by(|a, b| (nominal(a) - target_k).abs().total_cmp(&(nominal(b) - target_k).abs()));
            (3.0, near.map_or_else(|| "F3000".to_owned(), |e| e.name.to_owned()))
        }
    };
    ui.horizontal(|ui| {
        let mut chosen = ui.radio(matches!(now, Region::Sdcm { .. }), "ellipse of").clicked();
        let field = DragValue::new(&mut ellipse_steps)
            .range(0.1..=20.0)
            .speed(0.1)
            .suffix(" SDCM")
            .update_while_editing(false);
        chosen |= ui.add(field).accessible_name("steps of the ellipse").changed();
        if chosen {
            choose(Region::Sdcm { steps: ellipse_steps, centre: centre.clone() });
        }
        combo(ui, "centre of the ellipse", &centre, |ui| {
            for other in &IEC_60081 {
                if ui.selectable_label(other.name == centre, other.name).clicked() {
                    choose(Region::Sdcm { steps: ellipse_steps, centre: other.name.to_owned() });
                }
            }
        });
    });
    let note = "Quadrangles and ellipses lie round the centres of their standards, not round the target.";
    ui.add(egui::Label::new(RichText::new(note).font(text::small()).weak()).wrap());
}

fn combo(ui: &mut Ui, name: &str, shown: &str, choices: impl FnOnce(&mut Ui)) {
    let response = egui::ComboBox::from_id_salt(name).selected_text(shown).show_ui(ui, choices).response;
    response.accessible_name(name);
}
