//! Every colour, typeface and size of the window. No other module names a colour.

use colour::appearance::Srgb;
use egui::{
    Color32, Context, CornerRadius, FontData, FontDefinitions, FontFamily, FontId, Margin, Shadow, Stroke,
    Style, TextStyle, Theme, Visuals, vec2,
};
use std::sync::Arc;

/// The named colours of one of the two appearances.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Palette {
    /// Behind everything.
    pub ground: Color32,
    /// The sheets on the ground.
    pub card: Color32,
    /// Wells and pictures inside a sheet.
    pub well: Color32,
    /// Hairlines between lines of text.
    pub rule: Color32,
    /// Outlines of controls.
    pub outline: Color32,
    /// Gridlines inside plots.
    pub grid: Color32,
    /// Text and curves.
    pub ink: Color32,
    /// Secondary text.
    pub muted: Color32,
    /// The one accent: what can be acted on.
    pub accent: Color32,
    /// Text on the accent.
    pub on_accent: Color32,
    /// The accent as a light wash.
    pub accent_wash: Color32,
    /// A requirement is met.
    pub met: Color32,
    /// A requirement is short.
    pub short: Color32,
    /// Something to be careful with.
    pub caution: Color32,
    /// Bars that compare without judging.
    pub bar: Color32,
    /// The shade under popups.
    pub shade: Color32,
    dark: bool,
}

const fn rgb(hex: u32) -> Color32 {
    Color32::from_rgb((hex >> 16) as u8, (hex >> 8) as u8, hex as u8)
}

impl Palette {
    /// Ink on warm paper.
    pub const LIGHT: Self = Self {
        ground: rgb(0xf1_ee_e6),
        card: rgb(0xfe_fd_fa),
        well: rgb(0xf7_f5_ef),
        rule: rgb(0xe4_df_d4),
        outline: rgb(0x96_90_85),
        grid: rgb(0xeb_e7_dd),
        ink: rgb(0x22_21_1e),
        muted: rgb(0x66_61_58),
        accent: rgb(0x86_53_0f),
        on_accent: rgb(0xff_fd_f8),
        accent_wash: rgb(0xf3_e8_d5),
        met: rgb(0x20_73_44),
        short: rgb(0xae_2b_1d),
        caution: rgb(0x8a_54_00),
        bar: rgb(0xa9_ac_b0),
        shade: Color32::from_black_alpha(34),
        dark: false,
    };

    /// Chalk on warm slate.
    pub const DARK: Self = Self {
        ground: rgb(0x14_13_12),
        card: rgb(0x1e_1d_1b),
        well: rgb(0x17_16_15),
        rule: rgb(0x36_33_2f),
        outline: rgb(0x74_70_68),
        grid: rgb(0x2b_29_26),
        ink: rgb(0xee_e9_df),
        muted: rgb(0xa9_a2_96),
        accent: rgb(0xe3_ab_55),
        on_accent: rgb(0x20_17_06),
        accent_wash: rgb(0x3a_2f_1c),
        met: rgb(0x72_c8_94),
        short: rgb(0xf2_8c_7c),
        caution: rgb(0xe8_b4_5e),
        bar: rgb(0x6c_6e_72),
        shade: Color32::from_black_alpha(120),
        dark: true,
    };

    /// The palette in force.
    pub fn of(context: &Context) -> Self {
        if context.theme() == Theme::Dark { Self::DARK } else { Self::LIGHT }
    }

    /// The colours of an emitter's curve: the hue it emits, at a lightness that can be read on the card and a chroma
    /// calm enough to look at for a day.
    pub fn emitter(&self, emitted: Srgb) -> Emitted {
        let [_, chroma, hue] = oklch(screen(emitted));
        let (line, body) = if self.dark { (0.78, 0.7) } else { (0.56, 0.76) };
        Emitted {
            line: from_oklch(line, chroma.min(0.16), hue),
            body: from_oklch(body, chroma.min(0.15), hue),
        }
    }

    /// True for the dark appearance.
    pub const fn is_dark(&self) -> bool {
        self.dark
    }

    fn visuals(&self) -> Visuals {
        let mut visuals = if self.dark { Visuals::dark() } else { Visuals::light() };
        visuals.override_text_color = None;
        visuals.weak_text_color = Some(self.muted);
        visuals.hyperlink_color = self.accent;
        visuals.faint_bg_color = self.well;
        visuals.extreme_bg_color = self.well;
        visuals.text_edit_bg_color = Some(self.card);
        visuals.code_bg_color = self.well;
        visuals.warn_fg_color = self.caution;
        visuals.error_fg_color = self.short;
        visuals.window_fill = self.card;
        visuals.window_stroke = Stroke::new(1.0, self.rule);
        visuals.window_corner_radius = CornerRadius::same(8);
        visuals.menu_corner_radius = CornerRadius::same(7);
        visuals.window_shadow = Shadow { offset: [0, 8], blur: 28, spread: 0, color: self.shade };
        visuals.popup_shadow = Shadow { offset: [0, 4], blur: 16, spread: 0, color: self.shade };
        visuals.panel_fill = self.ground;
        visuals.selection.bg_fill = self.accent_wash;
        visuals.selection.stroke = Stroke::new(1.5, self.accent);
        visuals.striped = false;
        visuals.button_frame = true;
        visuals.interact_cursor = Some(egui::CursorIcon::PointingHand);
        visuals.disabled_alpha = 0.6;
        let widgets = &mut visuals.widgets;
        for (widget, fill, stroke, text) in [
            (&mut widgets.noninteractive, self.card, self.rule, self.ink),
            (&mut widgets.inactive, self.card, self.outline, self.ink),
            (&mut widgets.hovered, self.well, self.accent, self.ink),
            (&mut widgets.active, self.accent_wash, self.accent, self.ink),
            (&mut widgets.open, self.well, self.accent, self.ink),
        ] {
            widget.bg_fill = fill;
            widget.weak_bg_fill = fill;
            widget.bg_stroke = Stroke::new(1.0, stroke);
            widget.fg_stroke = Stroke::new(1.0, text);
            widget.corner_radius = CornerRadius::same(5);
            widget.expansion = 0.0;
        }
        visuals
    }
}

/// A colour of light as a screen shows it.
pub fn screen(colour: Srgb) -> Color32 {
    Color32::from_rgb(colour.r, colour.g, colour.b)
}

/// The two colours an emitter is drawn in.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Emitted {
    /// The curve: at least 3:1 against the card.
    pub line: Color32,
    /// The area under it: the hue it emits, lighter.
    pub body: Color32,
}

impl Emitted {
    /// The body at an opacity from 0 to 1.
    pub fn tint(&self, opacity: f32) -> Color32 {
        self.body.gamma_multiply(opacity)
    }
}

/// The colour of a hue bin out of `count`, starting at red and going towards yellow: even lightness and chroma.
pub fn hue(bin: usize, count: usize, dark: bool) -> Color32 {
    let (lightness, chroma) = if dark { (0.74, 0.12) } else { (0.66, 0.13) };
    from_oklch(lightness, chroma, std::f32::consts::TAU * (bin as f32 + 0.5) / count.max(1) as f32)
}

/// A colour of the spectrum as a strip shows it, from 0 (the card) to 1.
pub fn spectral(palette: &Palette, emitted: Srgb, strength: f32) -> Color32 {
    let [_, chroma, hue] = oklch(screen(emitted));
    let lightness = if palette.dark { 0.68 } else { 0.74 };
    palette.card.lerp_to_gamma(from_oklch(lightness, chroma.min(0.15), hue), strength)
}

/// Lightness, chroma and hue in radians (Oklab, matrices published 2020 in the public domain).
fn oklch(colour: Color32) -> [f32; 3] {
    let [r, g, b] = [colour.r(), colour.g(), colour.b()].map(linear);
    let l = (0.412_221_46 * r + 0.536_332_55 * g + 0.051_445_995 * b).cbrt();
    let m = (0.211_903_5 * r + 0.680_699_5 * g + 0.107_396_96 * b).cbrt();
    let s = (0.088_302_46 * r + 0.281_718_85 * g + 0.629_978_7 * b).cbrt();
    let a = 1.977_998_5 * l - 2.428_592_2 * m + 0.450_593_7 * s;
    let b = 0.025_904_037 * l + 0.782_771_77 * m - 0.808_675_77 * s;
    [0.210_454_26 * l + 0.793_617_8 * m - 0.004_072_047 * s, a.hypot(b), b.atan2(a)]
}

/// The nearest colour a screen has, chroma giving way.
fn from_oklch(lightness: f32, chroma: f32, hue: f32) -> Color32 {
    let mut chroma = chroma;
    loop {
        let (a, b) = (chroma * hue.cos(), chroma * hue.sin());
        let l = (lightness + 0.396_337_78 * a + 0.215_803_76 * b).powi(3);
        let m = (lightness - 0.105_561_346 * a - 0.063_854_17 * b).powi(3);
        let s = (lightness - 0.089_484_18 * a - 1.291_485_5 * b).powi(3);
        let rgb = [
            4.076_741_7 * l - 3.307_711_6 * m + 0.230_969_94 * s,
            -1.268_438 * l + 2.609_757_4 * m - 0.341_319_4 * s,
            -0.004_196_086_3 * l - 0.703_418_6 * m + 1.707_614_7 * s,
        ];
        if chroma < 0.01 || rgb.iter().all(|c| (-0.002..=1.002).contains(c)) {
            let [r, g, b] = rgb.map(|c| {
                let c = c.clamp(0.0, 1.0);
                let c = if c <= 0.003_130_8 { 12.92 * c } else { 1.055 * c.powf(1.0 / 2.4) - 0.055 };
                (c * 255.0).round() as u8
            });
            return Color32::from_rgb(r, g, b);
        }
        chroma -= 0.005;
    }
}

fn linear(c: u8) -> f32 {
    let c = f32::from(c) / 255.0;
    if c <= 0.040_45 { c / 12.92 } else { ((c + 0.055) / 1.055).powf(2.4) }
}

/// WCAG 2 relative luminance of an sRGB colour.
pub fn relative_luminance(colour: Color32) -> f32 {
    0.2126 * linear(colour.r()) + 0.7152 * linear(colour.g()) + 0.0722 * linear(colour.b())
}

/// WCAG 2 contrast ratio of two relative luminances.
pub fn contrast(a: f32, b: f32) -> f32 {
    (a.max(b) + 0.05) / (a.min(b) + 0.05)
}

/// Name of the semibold family.
const STRONG: &str = "strong";

/// The semibold family.
pub fn strong_family() -> FontFamily {
    FontFamily::Name(STRONG.into())
}

/// The sizes of text, in points.
pub mod text {
    use egui::{FontFamily, FontId};

    /// Figures on axes.
    pub fn tick() -> FontId {
        FontId::new(10.5, FontFamily::Proportional)
    }
    /// Secondary lines.
    pub fn small() -> FontId {
        FontId::new(11.5, FontFamily::Proportional)
    }
    /// Running text.
    pub fn body() -> FontId {
        FontId::new(13.0, FontFamily::Proportional)
    }
    /// Secondary lines that matter.
    pub fn small_strong() -> FontId {
        FontId::new(11.5, super::strong_family())
    }
    /// Names.
    pub fn strong() -> FontId {
        FontId::new(13.0, super::strong_family())
    }
    /// Headings of sheets.
    pub fn title() -> FontId {
        FontId::new(15.0, super::strong_family())
    }
    /// Values.
    pub fn value() -> FontId {
        FontId::new(17.0, super::strong_family())
    }
}

/// The text style of values, for widgets that take a style by name.
pub fn value_style() -> TextStyle {
    TextStyle::Name("value".into())
}

/// The text style of secondary numbers, for widgets that take a style by name.
pub fn small_strong_style() -> TextStyle {
    TextStyle::Name("small strong".into())
}

fn fonts() -> FontDefinitions {
    let mut fonts = FontDefinitions::default();
    let regular: &[u8] = include_bytes!("../../../../assets/fonts/inter-regular.otf");
    let strong: &[u8] = include_bytes!("../../../../assets/fonts/inter-semibold.otf");
    fonts.font_data.insert("inter".to_owned(), Arc::new(FontData::from_static(regular)));
    fonts.font_data.insert("inter-semibold".to_owned(), Arc::new(FontData::from_static(strong)));
    let fallback = fonts.families.get(&FontFamily::Proportional).cloned().unwrap_or_default();
    let with =
        |first: &str| std::iter::once(first.to_owned()).chain(fallback.iter().cloned()).collect::<Vec<_>>();
    fonts.families.insert(strong_family(), with("inter-semibold"));
    fonts.families.insert(FontFamily::Proportional, with("inter"));
    fonts
}

fn style(palette: &Palette, style: &mut Style) {
    style.visuals = palette.visuals();
    style.text_styles = [
        (TextStyle::Heading, text::title()),
        (TextStyle::Body, text::body()),
        (TextStyle::Button, text::body()),
        (TextStyle::Small, text::small()),
        (TextStyle::Monospace, FontId::new(12.0, FontFamily::Monospace)),
        (value_style(), text::value()),
        (small_strong_style(), text::small_strong()),
    ]
    .into();
    style.drag_value_text_style = TextStyle::Button;
    style.explanation_tooltips = false;
    style.animation_time = 0.0;
    style.compact_menu_style = false;
    style.interaction.selectable_labels = false;
    style.interaction.tooltip_delay = 0.35;
    style.visuals.text_cursor.blink = false;
    let spacing = &mut style.spacing;
    spacing.item_spacing = vec2(8.0, 6.0);
    spacing.button_padding = vec2(10.0, 4.0);
    spacing.interact_size = vec2(28.0, 24.0);
    spacing.menu_margin = Margin::same(6);
    spacing.window_margin = Margin::same(16);
    spacing.combo_width = 60.0;
    spacing.icon_width = 15.0;
    spacing.tooltip_width = 360.0;
    spacing.scroll.floating = true;
    spacing.scroll.bar_width = 8.0;
    spacing.scroll.floating_width = 4.0;
}

/// Gives a context the window's typefaces and both appearances; call once, before the first frame.
pub fn install(context: &Context) {
    context.set_fonts(fonts());
    // Paper where the system states no preference.
    context.options_mut(|options| options.fallback_theme = Theme::Light);
    context.style_mut_of(Theme::Light, |s| style(&Palette::LIGHT, s));
    context.style_mut_of(Theme::Dark, |s| style(&Palette::DARK, s));
}

/// The scale at which a window of that many points is comfortable: 1 up to a small notebook, more on a large screen.
pub fn comfortable_zoom(width_points: f32, height_points: f32) -> f32 {
    let room = (width_points / 1280.0).min(height_points / 720.0);
    // Half of the extra room goes into size, half into content; steps keep text from shimmering while resizing.
    let zoom = room.max(1.0).sqrt();
    ((zoom * 20.0).floor() / 20.0).clamp(1.0, 2.0)
}

#[cfg(test)]
mod tests {
    use super::*;

    /// WCAG 2.2, success criterion 1.4.3: text needs 4.5:1; 1.4.11: graphics need 3:1.
    #[test]
    fn text_and_marks_have_the_contrast_the_accessibility_guideline_asks() {
        for palette in [Palette::LIGHT, Palette::DARK] {
            for ground in [palette.ground, palette.card, palette.well] {
                for text in
                    [palette.ink, palette.muted, palette.accent, palette.met, palette.short, palette.caution]
                {
                    let ratio = contrast(relative_luminance(text), relative_luminance(ground));
                    assert!(ratio >= 4.5, "{text:?} on {ground:?}: {ratio}");
                }
            }
            let ratio = contrast(relative_luminance(palette.outline), relative_luminance(palette.card));
            assert!(ratio >= 3.0, "outlines of controls: {ratio}");
            let ratio = contrast(relative_luminance(palette.on_accent), relative_luminance(palette.accent));
            assert!(ratio >= 4.5, "text on the accent: {ratio}");
        }
    }

    #[test]
    fn every_emitter_colour_can_be_told_from_the_card() {
        for palette in [Palette::LIGHT, Palette::DARK] {
            for [r, g, b] in
                [[0, 0, 255], [255, 255, 0], [255, 255, 255], [0, 0, 0], [0, 255, 120], [255, 60, 0]]
            {
                let line = palette.emitter(Srgb { r, g, b }).line;
                let ratio = contrast(relative_luminance(line), relative_luminance(palette.card));
                assert!(ratio >= 3.0, "{r} {g} {b}: {ratio}");
            }
        }
    }

    #[test]
    fn scale_grows_with_the_window_and_never_falls_below_one() {
        assert_eq!(comfortable_zoom(900.0, 600.0), 1.0);
        assert_eq!(comfortable_zoom(1280.0, 720.0), 1.0);
        assert!((comfortable_zoom(2560.0, 1440.0) - 1.4).abs() < 0.011);
        assert_eq!(comfortable_zoom(20_000.0, 9_000.0), 2.0);
    }
}
