//! The u′v′ neighbourhood of the white: locus, region, steps, what the set can reach, target and blend.

use super::super::paint::{Pattern, fixed, measure, patterned, write};
use super::super::theme::{Palette, text};
use super::super::view::Scene;
use crate::state::derived::reach::reachable_whites;
use colour::tolerance::STEP_RADIUS;
use colour::{UvPrime, locus};
use egui::accesskit::Role;
use egui::{
    Align2, CornerRadius, Painter, Pos2, Rect, Sense, Shape, Stroke, StrokeKind, Ui, WidgetInfo, pos2, vec2,
};

/// Least and greatest half-height of the picture, in v′, and the factor between two zooms.
const ZOOMS: (f64, f64, f64) = (0.004, 0.3, 1.25);

/// A stretch of the u′v′ plane with equal scales.
struct Map {
    rect: Rect,
    centre: UvPrime,
    per_unit: f64,
}

impl Map {
    fn at(&self, point: UvPrime) -> Pos2 {
        let centre = self.rect.center();
        pos2(
            centre.x + ((point.u - self.centre.u) * self.per_unit) as f32,
            centre.y - ((point.v - self.centre.v) * self.per_unit) as f32,
        )
    }
}

pub(in crate::window) fn show(ui: &mut Ui, rect: Rect, scene: &Scene<'_>) {
    let palette = scene.palette;
    let response = ui.interact(rect, ui.scope_id().with("neighbourhood"), Sense::hover());
    ui.painter().rect(
        rect,
        CornerRadius::same(6),
        palette.well,
        Stroke::new(1.0, palette.rule),
        StrokeKind::Inside,
    );
    let Some(blend) = scene.derived.blend.as_deref() else { return };
    let (target, white) = (blend.region.target, blend.uv_prime());
    let aspect = f64::from(rect.width() / rect.height());
    let reach = |point: &UvPrime| {
        let du = (point.u - target.u).abs() / aspect;
        du.max((point.v - target.v).abs())
    };
    let wanted = blend.region.outline.iter().chain([&white]).map(reach).fold(0.0, f64::max) * 1.18;
    let (least, most, factor) = ZOOMS;
    let half = std::iter::successors(Some(least), |z| Some(z * factor))
        .find(|z| *z >= wanted.min(most))
        .unwrap_or(most);
    let map = Map { rect, centre: target, per_unit: f64::from(rect.height()) / 2.0 / half };
    let painter = ui.painter().with_clip_rect(rect.shrink(1.0).intersect(ui.clip_rect()));

    response.widget_info(|| {
        WidgetInfo::labeled(
            Role::GraphicsObject,
            true,
            format!(
                "White in u prime, v prime: blend {:.4}, {:.4}; target {:.4}, {:.4}; {:.4} apart",
                white.u,
                white.v,
                target.u,
                target.v,
                white.distance(target)
            ),
        )
    });

    region(&painter, &map, &blend.region.outline, &palette);
    reachable(
        &painter,
        &map,
        &scene.state.current_set().map_or_else(Vec::new, |set| reachable_whites(set, blend)),
        &palette,
    );
    steps(&painter, &map, target, half, &palette);
    planckian(&painter, &map, half, aspect, &palette);
    let (at_target, at_white) = (map.at(target), map.at(white));
    painter.circle_stroke(at_target, 4.5, Stroke::new(1.4, palette.accent));
    let arm = 7.0;
    for stroke in [Stroke::new(4.0, palette.well), Stroke::new(2.0, palette.ink)] {
        let reach = if stroke.width > 3.0 { arm + 1.0 } else { arm };
        painter.line_segment([at_white - vec2(reach, 0.0), at_white + vec2(reach, 0.0)], stroke);
        painter.line_segment([at_white - vec2(0.0, reach), at_white + vec2(0.0, reach)], stroke);
    }

    let (du, dv) = (half * aspect, half);
    let inset = rect.shrink2(vec2(6.0, 4.0));
    let tick = |at: Pos2, anchor: Align2, words: String| halo(&painter, at, anchor, &words, &palette);
    tick(inset.left_top(), Align2::LEFT_TOP, format!("v\u{2032} {}", fixed(target.v + dv, 4)));
    tick(
        inset.left_bottom(),
        Align2::LEFT_BOTTOM,
        format!("v\u{2032} {}   u\u{2032} {}", fixed(target.v - dv, 4), fixed(target.u - du, 4)),
    );
    tick(inset.right_bottom(), Align2::RIGHT_BOTTOM, format!("u\u{2032} {}", fixed(target.u + du, 4)));
    tick(
        inset.right_top(),
        Align2::RIGHT_TOP,
        format!("\u{394}u\u{2032}v\u{2032} to target {}", fixed(white.distance(target), 4)),
    );
    response.on_hover_text("Cross: the blend. Small ring: the target. Line: the Planckian locus with its CCT. Shaded: where the white may lie. Dashed rings: steps of 0.0011. Dash-dotted: the edge of what the free emitters can reach.");
}

/// Small words that stay legible over lines.
fn halo(painter: &Painter, at: Pos2, anchor: Align2, words: &str, palette: &Palette) {
    let size = measure(painter, words, text::tick());
    let rect = anchor.anchor_size(at, size).expand2(vec2(2.0, 0.0));
    painter.rect_filled(rect, CornerRadius::same(2), palette.well.gamma_multiply(0.86));
    write(painter, at, anchor, words, text::tick(), palette.muted);
}

fn region(painter: &Painter, map: &Map, outline: &[UvPrime], palette: &Palette) {
    if outline.is_empty() {
        return;
    }
    let points: Vec<Pos2> = outline.iter().map(|p| map.at(*p)).collect();
    // The outline may be slightly bent, so the fill is a fan round its middle.
    let n = points.len() as f32;
    let middle = points.iter().fold(Pos2::ZERO, |sum, p| sum + p.to_vec2() / n);
    let fill = palette.accent_wash.gamma_multiply(if palette.is_dark() { 0.75 } else { 0.85 });
    let mut mesh = egui::epaint::Mesh::default();
    mesh.colored_vertex(middle, fill);
    for point in &points {
        mesh.colored_vertex(*point, fill);
    }
    for k in 0..points.len() as u32 {
        mesh.add_triangle(0, k + 1, (k + 1) % points.len() as u32 + 1);
    }
    painter.add(Shape::mesh(mesh));
    painter.add(Shape::closed_line(points, Stroke::new(1.2, palette.accent)));
}

fn reachable(painter: &Painter, map: &Map, hull: &[UvPrime], palette: &Palette) {
    if hull.len() < 2 {
        return;
    }
    let mut points: Vec<Pos2> = hull.iter().map(|p| map.at(*p)).collect();
    points.push(points[0]);
    // Only edges that pass near are drawn: a dash pattern over a far longer line would be wasted.
    let near = map.rect.expand(40.0);
    for pair in points.windows(2) {
        if let Some((a, b)) = clipped(pair[0], pair[1], near) {
            patterned(painter, &[a, b], Stroke::new(1.2, palette.muted), Pattern::DashDot);
        }
    }
}

/// The part of a segment inside a rectangle (Liang–Barsky).
fn clipped(a: Pos2, b: Pos2, rect: Rect) -> Option<(Pos2, Pos2)> {
    let d = b - a;
    let (mut from, mut to) = (0.0_f32, 1.0_f32);
    for (p, q) in [
        (-d.x, a.x - rect.left()),
        (d.x, rect.right() - a.x),
        (-d.y, a.y - rect.top()),
        (d.y, rect.bottom() - a.y),
    ] {
        if p == 0.0 {
            if q < 0.0 {
                return None;
            }
        } else if p < 0.0 {
            from = from.max(q / p);
        } else {
            to = to.min(q / p);
        }
    }
    (from < to).then(|| (a + d * from, a + d * to))
}

fn steps(painter: &Painter, map: &Map, target: UvPrime, half: f64, palette: &Palette) {
    let all: &[u32] = if half < 0.007 { &[1, 2, 3] } else { &[1, 3, 5, 7] };
    let mut outermost = None;
    for step in all {
        let radius = (f64::from(*step) * STEP_RADIUS * map.per_unit) as f32;
        if radius < 7.0 || radius > map.rect.height() * 0.47 {
            continue;
        }
        let centre = map.at(target);
        let points: Vec<Pos2> = (0..=72)
            .map(|k| {
                let (sin, cos) = (k as f32 * std::f32::consts::TAU / 72.0).sin_cos();
                centre + vec2(cos, sin) * radius
            })
            .collect();
        patterned(painter, &points, Stroke::new(1.0, palette.muted.gamma_multiply(0.8)), Pattern::Dotted);
        outermost = Some((*step, radius));
    }
    if let Some((step, radius)) = outermost {
        let words = if step == 1 { "1 step".to_owned() } else { format!("{step} steps") };
        halo(painter, map.at(target) + vec2(0.0, radius + 2.0), Align2::CENTER_TOP, &words, palette);
    }
}

/// Whether a small label has room at a place: inside the picture and clear of the figures in its corners.
fn free(rect: &Rect, place: Pos2) -> bool {
    let corner = |from: Pos2, width: f32| (place.x - from.x).abs() < width && (place.y - from.y).abs() < 26.0;
    rect.shrink2(vec2(18.0, 9.0)).contains(place)
        && !corner(rect.left_top(), 82.0)
        && !corner(rect.right_top(), 150.0)
        && !corner(rect.left_bottom(), 142.0)
        && !corner(rect.right_bottom(), 84.0)
}

fn planckian(painter: &Painter, map: &Map, half: f64, aspect: f64, palette: &Palette) {
    let near = |p: UvPrime| {
        (p.u - map.centre.u).abs() < half * aspect * 1.3 && (p.v - map.centre.v).abs() < half * 1.6
    };
    let locus_at = |cct_k: f64| locus::planckian_uv(cct_k).uv_prime();
    // Evenly in reciprocal CCT, as the locus is nearly even in it.
    let points: Vec<Pos2> = (50..=1000)
        .map(|mired| locus_at(1e6 / f64::from(mired)))
        .filter(|p| near(*p))
        .map(|p| map.at(p))
        .collect();
    painter.add(Shape::line(points, Stroke::new(1.5, palette.ink)));

    let step = [25.0, 50.0, 100.0, 200.0, 250.0, 500.0, 1000.0, 2000.0].into_iter().find(|step| {
        let Some(white) = locus::cct_duv(map.centre.uv()) else { return true };
        let there = map.at(locus_at(white.cct_k + step));
        let on_locus = map.at(locus_at(white.cct_k));
        there.distance(on_locus) >= 46.0
    });
    let Some(step) = step else { return };
    let mut cct_k = 1000.0_f64;
    while cct_k <= 20_000.0 {
        let on = locus_at(cct_k);
        if near(on) {
            let at = map.at(on);
            let off = map.at(locus::uv_at(cct_k, 0.001).uv_prime());
            let across = (off - at).normalized();
            painter.line_segment([at - across * 4.0, at + across * 4.0], Stroke::new(1.3, palette.ink));
            // Below the line, where the region's own lines are fewer.
            let words = format!("{cct_k:.0}");
            let away =
                if (at - across).distance(map.at(map.centre)) > (at + across).distance(map.at(map.centre)) {
                    -1.0
                } else {
                    1.0
                };
            let place = at + across * (13.0 * away);
            if free(&map.rect, place) && at.distance(map.at(map.centre)) > 26.0 {
                halo(painter, place, Align2::CENTER_CENTER, &words, palette);
            }
        }
        cct_k += step;
    }
}
