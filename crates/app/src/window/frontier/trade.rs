//! The trade-off: the curve or its table at the left, what things cost at the right.

use super::super::paint::fixed;
use super::super::theme::text;
use super::super::view::Scene;
use super::super::wish::Wish;
use super::pieces::{Segment, button, button_size, segmented, segmented_width, sentence};
use super::{Frontier, Tool, plot, prices, table};
use crate::frontier::{Aim, RENDERING, Trade, title};
use crate::state::Edit;
use egui::{Rect, Stroke, Ui, pos2};
use project::{EmitterSet, Metric};

/// Height of the lines about the point looked at.
const DETAIL: f32 = 84.0;

pub(super) fn show(
    ui: &mut Ui,
    body: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    bench: &mut Frontier,
    (aim, fresh): (Aim, bool),
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let split = body.right() - (body.width() * 0.37).clamp(270.0, 460.0);
    let left = Rect::from_min_max(body.min, pos2(split - 18.0, body.bottom()));
    let right = Rect::from_min_max(pos2(split, body.top()), body.max);
    ui.painter().vline(split - 9.0, body.y_range(), Stroke::new(1.0, palette.rule));

    controls(ui, left, scene, set, bench, aim, wishes);
    let picture =
        Rect::from_min_max(pos2(left.left(), left.top() + 38.0), pos2(left.right(), left.bottom() - DETAIL));
    let detail = Rect::from_min_max(pos2(left.left(), picture.bottom() + 8.0), left.max);
    let working = scene.jobs.iter().any(|job| job.key == Tool::Trade.key());
    let Some(trade) = bench.trade.take() else {
        let words = if working { "The curve is being drawn." } else { "No curve has been drawn yet." };
        plot::nothing(ui, picture, words);
        return;
    };
    // Another metric's or another set's curve would be misread under these axes: it is not shown.
    if trade.metric != bench.metric || trade.aim != aim || trade.basis.set() != set.id {
        plot::nothing(ui, picture, if working { "The curve is being drawn." } else { "Not drawn yet." });
        bench.trade = Some(trade);
        return;
    }
    if trade.curve.is_empty() {
        plot::nothing(ui, picture, "There is no curve: the other limits already leave no blend.");
    } else if bench.as_table {
        if let Some(k) = table::show(ui, picture, &trade, bench.point) {
            bench.point = Some(k);
        }
    } else {
        let asked = plot::show(ui, picture, &trade, present(scene, trade.metric, aim), bench.point);
        bench.point = asked.point.or(bench.point);
        if asked.load && fresh {
            wishes.extend(load(set, &trade, bench.point));
        }
    }
    if !trade.curve.is_empty() {
        point_detail(ui, detail, scene, set, &trade, (bench.point, fresh), wishes);
    }
    prices::show(ui, right, scene, set, &trade, fresh, wishes);
    bench.trade = Some(trade);
}

fn controls(
    ui: &mut Ui,
    left: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    bench: &mut Frontier,
    aim: Aim,
    wishes: &mut Vec<Wish>,
) {
    let y = left.top() + 14.0;
    let metrics = RENDERING.map(|m| Segment { value: m, words: title(m), hint: "", enabled: true });
    let (asked, shown) = segmented(ui, pos2(left.left(), y), "Against", &metrics, bench.metric);
    if let Some(metric) = asked {
        bench.metric = metric;
        bench.metric_by_hand = true;
        bench.point = None;
        if bench.answer(aim) != Some(true) {
            wishes.push(Wish::Frontier(bench.ask(set.id, aim)));
        }
    }
    let views = [(false, "Curve"), (true, "Table")].map(|(value, words)| Segment {
        value,
        words,
        hint: "",
        enabled: true,
    });
    let size = button_size(ui, "Copy table");
    let copy = Rect::from_min_size(pos2(left.right() - size.x, y - size.y / 2.0), size);
    let width = segmented_width(ui, &views);
    let x = (copy.left() - 8.0 - width).max(shown.right() + 12.0);
    if let (Some(as_table), _) = segmented(ui, pos2(x, y), "Shown as", &views, bench.as_table) {
        bench.as_table = as_table;
    }
    let able = bench.trade.as_ref().is_some_and(|trade| !trade.curve.is_empty());
    let hint = "Copies every point with its bound and shares, for a spreadsheet";
    if button(ui, copy, "Copy table", able, hint)
        && let Some(trade) = &bench.trade
    {
        ui.ctx().copy_text(trade.table(&names(scene, set)));
        wishes.push(Wish::Say("The table was copied: paste it into a spreadsheet.".to_owned()));
    }
}

fn names(scene: &Scene<'_>, set: &EmitterSet) -> Vec<String> {
    let name = |id| scene.state.project().emitter(id).map_or_else(String::new, |e| e.name.clone());
    set.members.iter().map(|member| name(member.emitter)).collect()
}

/// Where the present blend stands on the axes.
fn present(scene: &Scene<'_>, metric: Metric, aim: Aim) -> Option<(f64, f64)> {
    let blend = scene.derived.blend.as_ref()?;
    let measured = blend.measurement();
    let x = match metric {
        Metric::Ra => measured.ra,
        Metric::R9 => measured.r9(),
        Metric::Rf => measured.rf,
        Metric::Rg => measured.rg,
        Metric::Ler | Metric::Efficacy => None,
    }?;
    let y = match aim {
        Aim::Ler => Some(measured.ler_lm_per_w),
        Aim::Efficacy => blend.efficacy_lm_per_w,
    }?;
    Some((x, y))
}

/// The edit that gives the set the blend of a point.
fn load(set: &EmitterSet, trade: &Trade, point: Option<usize>) -> Option<Wish> {
    let point = trade.curve.get(point?)?;
    let label = format!("load the blend at {} {}", title(trade.metric), fixed(point.level, 1));
    let edits = vec![Edit::Shares { set: set.id, shares: point.shares.clone() }];
    Some(Wish::Edit(Edit::Together { label, edits }))
}

fn point_detail(
    ui: &mut Ui,
    rect: Rect,
    scene: &Scene<'_>,
    set: &EmitterSet,
    trade: &Trade,
    (point, fresh): (Option<usize>, bool),
    wishes: &mut Vec<Wish>,
) {
    let palette = scene.palette;
    let size = button_size(ui, "Load this blend");
    let at = pos2(rect.right() - size.x, rect.top() + 4.0);
    let chosen = point.and_then(|k| trade.curve.get(k));
    let hint = if fresh {
        "Gives the set the shares of the point looked at; undo takes it back"
    } else {
        "Out of date: work it out again first"
    };
    let able = chosen.is_some() && fresh;
    if button(ui, Rect::from_min_size(at, size), "Load this blend", able, hint) {
        wishes.extend(load(set, trade, point));
    }
    let width = at.x - 14.0 - rect.left();
    let top = pos2(rect.left(), rect.top() + 2.0);
    let Some(point) = chosen else {
        let words = "Click a point, or step through them with the arrow keys, to see its blend.";
        sentence(ui, top, width, words, text::small(), palette.muted);
        return;
    };
    let words = format!("{}.", plot::point_words(trade, point));
    let y = sentence(ui, top, width, &words, text::small_strong(), palette.ink) + 3.0;
    let v = &point.values;
    let numbers = format!(
        "Ra {}  R9 {}  Rf {}  Rg {}  {} lm per optical watt",
        fixed(v.ra, 1),
        fixed(v.r9, 1),
        fixed(v.rf, 1),
        fixed(v.rg, 1),
        fixed(v.ler, 1)
    );
    let y = sentence(ui, pos2(rect.left(), y), width, &numbers, text::small(), palette.ink) + 3.0;
    let shares: Vec<String> = names(scene, set)
        .iter()
        .zip(&point.shares)
        .filter(|(_, share)| **share > 5e-5)
        .map(|(name, share)| format!("{name} {}\u{2009}%", fixed(share * 100.0, 1)))
        .collect();
    sentence(ui, pos2(rect.left(), y), rect.width(), &shares.join(", "), text::small(), palette.muted);
}
