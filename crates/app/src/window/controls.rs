//! The window's own controls: typed numbers, switches, sign buttons and the one primary button.

use super::paint::{Icon, icon, measure};
use super::theme::{self, Palette, text};
use egui::accesskit::Role;
use egui::{
    Align, Align2, Color32, CornerRadius, DragValue, Layout, Margin, Rect, Response, Sense, Stroke,
    StrokeKind, TextStyle, Ui, UiBuilder, WidgetInfo, pos2, vec2,
};

/// A number that is typed, dragged sideways, or stepped with the arrow keys.
pub(super) struct Number<'a> {
    value: f64,
    name: &'a str,
    decimals: usize,
    plus: bool,
    speed: f64,
    range: (f64, f64),
    style: TextStyle,
    colour: Option<Color32>,
    right: bool,
    hint: Option<&'a str>,
}

/// What happened to a [`Number`].
pub(super) struct Typed {
    /// The new value, when it changed.
    pub(super) value: Option<f64>,
    pub(super) response: Response,
}

impl<'a> Number<'a> {
    /// A number with an accessible name.
    pub(super) fn new(name: &'a str, value: f64) -> Self {
        Self {
            value,
            name,
            decimals: 0,
            plus: false,
            speed: 1.0,
            range: (f64::NEG_INFINITY, f64::INFINITY),
            style: TextStyle::Button,
            colour: None,
            right: false,
            hint: None,
        }
    }

    pub(super) fn decimals(mut self, decimals: usize) -> Self {
        self.decimals = decimals;
        self
    }

    /// Shows a plus sign on positive numbers.
    pub(super) fn plus(mut self) -> Self {
        self.plus = true;
        self
    }

    /// Change for each point of dragging and each arrow key.
    pub(super) fn speed(mut self, speed: f64) -> Self {
        self.speed = speed;
        self
    }

    pub(super) fn range(mut self, low: f64, high: f64) -> Self {
        self.range = (low, high);
        self
    }

    pub(super) fn style(mut self, style: TextStyle) -> Self {
        self.style = style;
        self
    }

    pub(super) fn colour(mut self, colour: Color32) -> Self {
        self.colour = Some(colour);
        self
    }

    /// Stands at the right end of its room instead of the left.
    pub(super) fn right(mut self) -> Self {
        self.right = true;
        self
    }

    pub(super) fn hint(mut self, hint: &'a str) -> Self {
        self.hint = Some(hint);
        self
    }

    /// Puts the number into a rectangle.
    pub(super) fn show(self, ui: &mut Ui, rect: Rect) -> Typed {
        let palette = Palette::of(ui.ctx());
        let layout = if self.right {
            Layout::right_to_left(Align::Center)
        } else {
            Layout::left_to_right(Align::Center)
        };
        let mut new = self.value;
        // A child that takes no room of its parent: the number stands in a line laid out already.
        let mut child = ui.new_child(UiBuilder::new().max_rect(rect).layout(layout).id_salt(self.name));
        let response = {
            let ui = &mut child;
            {
                let style = ui.style_mut();
                style.drag_value_text_style = self.style.clone();
                style.spacing.button_padding = vec2(4.0, 1.0);
                style.spacing.interact_size = vec2(24.0, rect.height().min(24.0));
                let widgets = &mut style.visuals.widgets;
                widgets.inactive.weak_bg_fill = Color32::TRANSPARENT;
                widgets.inactive.bg_fill = Color32::TRANSPARENT;
                widgets.inactive.bg_stroke = Stroke::NONE;
                if let Some(colour) = self.colour {
                    widgets.inactive.fg_stroke.color = colour;
                    widgets.hovered.fg_stroke.color = colour;
                }
                let (decimals, plus) = (self.decimals, self.plus);
                let field = DragValue::new(&mut new)
                    .speed(self.speed)
                    .range(self.range.0..=self.range.1)
                    .clamp_existing_to_range(false)
                    .fixed_decimals(decimals)
                    .update_while_editing(false)
                    .custom_formatter(move |value, _| {
                        if plus {
                            super::paint::signed(value, decimals)
                        } else {
                            super::paint::fixed(value, decimals)
                        }
                    })
                    .custom_parser(parse_number);
                ui.add(field)
            }
        }
        .accessible_name(self.name);
        underline(ui, &response, &palette);
        let response = match self.hint {
            Some(hint) => response.on_hover_text(hint),
            None => response,
        };
        // Same bits: the number was not touched.
        let changed = new.to_bits() != self.value.to_bits();
        Typed { value: (changed && new.is_finite()).then_some(new), response }
    }
}

/// A faint line under a number says that it can be typed.
fn underline(ui: &Ui, response: &Response, palette: &Palette) {
    if !response.has_focus() && !response.hovered() {
        let rect = response.rect.shrink2(vec2(4.0, 0.0));
        let dots = egui::Shape::dotted_line(
            &[pos2(rect.left(), rect.bottom() - 0.5), pos2(rect.right(), rect.bottom() - 0.5)],
            palette.bar,
            3.0,
            0.6,
        );
        ui.painter().extend(dots);
    }
}

/// Reads a typed number: decimal point or comma, true or typewriter minus, spaces between thousands, a unit after it.
pub(super) fn parse_number(typed: &str) -> Option<f64> {
    let plain: String =
        typed.chars().filter(|c| !c.is_whitespace()).map(|c| if c == '\u{2212}' { '-' } else { c }).collect();
    let plain = if plain.contains('.') { plain.replace(',', "") } else { plain.replace(',', ".") };
    let end = plain
        .char_indices()
        .find(|(_, c)| !(c.is_ascii_digit() || matches!(c, '.' | '-' | '+' | 'e' | 'E')))
        .map_or(plain.len(), |(k, _)| k);
    plain[..end].trim_end_matches(['e', 'E']).parse::<f64>().ok().filter(|v| v.is_finite())
}

/// A switch with its words before it; true when it was operated.
pub(super) fn switch(
    ui: &mut Ui,
    right_centre: egui::Pos2,
    on: bool,
    words: &str,
    hint: &str,
) -> (bool, Rect) {
    let palette = Palette::of(ui.ctx());
    let size = measure(ui.painter(), words, text::small_strong());
    let rect = Rect::from_min_max(
        pos2(right_centre.x - size.x - 60.0, right_centre.y - 12.0),
        pos2(right_centre.x, right_centre.y + 12.0),
    );
    let response = ui.interact(rect, ui.scope_id().with(words), Sense::click()).on_hover_text(hint);
    response.widget_info(|| WidgetInfo::selected(Role::CheckBox, true, on, words));
    let painter = ui.painter();
    let ring = if response.hovered() { palette.accent } else { palette.rule };
    painter.rect(rect, CornerRadius::same(12), palette.well, Stroke::new(1.0, ring), StrokeKind::Inside);
    let ink = if on { palette.ink } else { palette.muted };
    painter.text(
        pos2(rect.left() + 12.0, rect.center().y),
        Align2::LEFT_CENTER,
        words,
        text::small_strong(),
        ink,
    );
    let track = Rect::from_center_size(pos2(rect.right() - 24.0, rect.center().y), vec2(28.0, 15.0));
    if on {
        painter.rect_filled(track, CornerRadius::same(8), palette.accent);
        painter.circle_filled(pos2(track.right() - 7.5, track.center().y), 5.5, palette.on_accent);
    } else {
        let stroke = Stroke::new(1.2, palette.muted);
        painter.rect_stroke(track, CornerRadius::same(8), stroke, StrokeKind::Inside);
        painter.circle_filled(pos2(track.left() + 7.5, track.center().y), 4.0, palette.muted);
    }
    focus_ring(ui, &response, 12);
    (response.clicked(), rect)
}

/// A button that is a sign; the name is read aloud and shown on hover.
pub(super) fn sign_button(
    ui: &mut Ui,
    rect: Rect,
    sign: Icon,
    name: &str,
    colour: Color32,
    enabled: bool,
) -> Response {
    let palette = Palette::of(ui.ctx());
    let sense = if enabled { Sense::click() } else { Sense::hover() };
    let response = ui.interact(rect, ui.scope_id().with(("sign", name)), sense);
    response.widget_info(|| WidgetInfo::labeled(Role::Button, enabled, name));
    if response.hovered() && enabled {
        ui.painter().rect_filled(rect, CornerRadius::same(5), palette.accent_wash);
    }
    let colour = if enabled { colour } else { palette.bar };
    icon(ui.painter(), sign, rect.center(), rect.height().min(rect.width()) * 0.54, colour);
    focus_ring(ui, &response, 5);
    response.on_hover_text(name)
}

/// The one button that stands out.
pub(super) fn primary_button(ui: &mut Ui, rect: Rect, words: &str, enabled: bool, hint: &str) -> Response {
    let palette = Palette::of(ui.ctx());
    let sense = if enabled { Sense::click() } else { Sense::hover() };
    let response = ui.interact(rect, ui.scope_id().with(("primary", words)), sense).on_hover_text(hint);
    response.widget_info(|| WidgetInfo::labeled(Role::Button, enabled, words));
    let fill = match (enabled, response.hovered()) {
        (false, _) => palette.bar,
        (true, false) => palette.accent,
        (true, true) => palette.accent.lerp_to_gamma(palette.ink, 0.18),
    };
    ui.painter().rect_filled(rect, CornerRadius::same(6), fill);
    ui.painter().text(rect.center(), Align2::CENTER_CENTER, words, text::strong(), palette.on_accent);
    focus_ring(ui, &response, 6);
    response
}

/// Shows which control the keyboard acts on.
pub(super) fn focus_ring(ui: &Ui, response: &Response, radius: u8) {
    if response.has_focus() {
        let palette = Palette::of(ui.ctx());
        let stroke = Stroke::new(1.6, palette.accent);
        ui.painter().rect_stroke(response.rect, CornerRadius::same(radius), stroke, StrokeKind::Outside);
    }
}

/// The frame of sheets that open over the benches.
pub(super) fn sheet_frame(ui: &Ui) -> egui::Frame {
    egui::Frame::popup(ui.style()).inner_margin(Margin::same(16))
}

/// A sheet on the ground: returns the room inside its margin.
pub(super) fn card(ui: &Ui, rect: Rect) -> Rect {
    let palette = Palette::of(ui.ctx());
    let stroke = Stroke::new(1.0, palette.rule);
    ui.painter().rect(rect, CornerRadius::same(8), palette.card, stroke, StrokeKind::Inside);
    rect - Margin::symmetric(16, 12)
}

/// The style of the numbers of a row's edge and of the ledger.
pub(super) fn value_style() -> TextStyle {
    theme::value_style()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn typed_numbers_are_read_as_people_write_them() {
        for (typed, value) in [
            ("12.5", 12.5),
            ("12,5", 12.5),
            (" 3 000 K", 3000.0),
            ("\u{2212}0.002", -0.002),
            ("95 %", 95.0),
            ("1,234.5", 1234.5),
            ("1e-3", 1e-3),
        ] {
            assert_eq!(parse_number(typed), Some(value), "{typed}");
        }
        for nonsense in ["", "warm", "-", "e5"] {
            assert_eq!(parse_number(nonsense), None, "{nonsense}");
        }
    }
}
