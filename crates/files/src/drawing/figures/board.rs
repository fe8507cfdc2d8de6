//! Packages on a board, with their counts.

use super::{KEY_STEP, KeyLine, Look, Sample, key, scale_bar, shown};
use crate::drawing::{Anchor, Drawing, Frame, MM_PER_PT, Path, Pen, Text, at, font, theme};
use serde::{Deserialize, Serialize};

/// One kind of package.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct BoardPackage {
    /// How it is told apart.
    pub look: Look,
    /// How many.
    pub count: u32,
    /// A remark beside it, such as its flux bin or string.
    pub remark: String,
}

/// Packages in rows on a pitch. The order interleaves the kinds evenly; it is a picture, not a layout.
#[derive(Debug, Clone, PartialEq, Serialize, Deserialize)]
pub struct Board {
    /// The kinds.
    pub packages: Vec<BoardPackage>,
    /// Side of a package, mm.
    pub package_mm: f64,
    /// Distance between centres, mm.
    pub pitch_mm: f64,
    /// Packages in a row; at least 1.
    pub columns: u32,
}

/// Most packages drawn one by one.
const MOST_DRAWN: usize = 400;

impl Board {
    /// Packages in all.
    pub fn total(&self) -> usize {
        self.packages.iter().map(|p| p.count as usize).sum()
    }

    /// Which kind stands where: each kind spread as evenly as whole numbers allow.
    ///
    /// The next place goes to the kind furthest behind its fair share; ties go to the earlier kind.
    pub fn order(&self) -> Vec<usize> {
        let total = self.total().min(MOST_DRAWN);
        let whole = self.total().max(1) as f64;
        let mut placed = vec![0.0; self.packages.len()];
        let mut out = Vec::with_capacity(total);
        for position in 1..=total {
            let behind =
                |kind: usize| f64::from(self.packages[kind].count) * position as f64 / whole - placed[kind];
            let next = (0..self.packages.len())
                .filter(|kind| placed[*kind] < f64::from(self.packages[*kind].count))
                .fold(None, |best: Option<usize>, kind| match best {
                    Some(b) if behind(b) >= behind(kind) - 1e-12 => Some(b),
                    _ => Some(kind),
                });
            let Some(next) = next else { break };
            placed[next] += 1.0;
            out.push(next);
        }
        out
    }

    /// The drawing at a width in mm.
    pub fn draw(&self, width_mm: f64) -> Drawing {
        let order = self.order();
        let columns = (self.columns.max(1) as usize).min(order.len().max(1));
        let rows = order.len().div_ceil(columns).max(1);
        let key_width = (0.42 * width_mm).clamp(50.0, 75.0);
        let pitch = if (0.01..=1e4).contains(&self.pitch_mm) { self.pitch_mm } else { 5.0 };
        let room = Frame { x: 3.0, y: 3.0, width: width_mm - key_width - 12.0, height: 90.0 };
        let scale = (room.width / (columns as f64 * pitch)).min(room.height / (rows as f64 * pitch));
        let board =
            Frame { width: columns as f64 * pitch * scale, height: rows as f64 * pitch * scale, ..room };
        let height = (board.height + 14.0).max(KEY_STEP * (self.packages.len() as f64 + 1.0) + 8.0);
        let mut drawing = Drawing::new(
            width_mm,
            height,
            "Packages on the board",
            format!("{} packages of {} kinds, drawn to scale.", self.total(), self.packages.len()),
        );
        drawing.shape(board.path(), theme::PANEL, Pen::solid(theme::EDGE, 0.25));
        let side = (self.package_mm.max(0.0) * scale).min(pitch * scale * 0.92).max(0.4);
        let size_pt = (0.5 * side / MM_PER_PT).clamp(3.0, 8.0);
        for (position, kind) in order.iter().enumerate() {
            let look = &self.packages[*kind].look;
            let (row, column) = (position / columns, position % columns);
            let centre = at(
                board.x + (column as f64 + 0.5) * pitch * scale,
                board.y + (row as f64 + 0.5) * pitch * scale,
            );
            let area =
                Frame { x: centre.x - side / 2.0, y: centre.y - side / 2.0, width: side, height: side };
            drawing.hatched(area, look.ink, look.pattern);
            if side > 2.6 {
                let drop = font::CAPITAL_HEIGHT_EM * size_pt * MM_PER_PT / 2.0;
                drawing.fill(Path::circle(centre, 0.36 * side), theme::PAPER);
                drawing.text(
                    Text::new(at(centre.x, centre.y + drop), (kind + 1).to_string(), size_pt, theme::INK)
                        .bold()
                        .anchored(Anchor::Middle),
                );
            }
        }
        scale_bar(&mut drawing, at(board.x, board.bottom() + 4.5), scale, "mm", board.width * 0.6);
        if order.len() < self.total() {
            drawing.text(Text::new(
                at(board.x, board.bottom() + 9.5),
                format!("first {} of {} drawn", order.len(), self.total()),
                theme::TICK_PT,
                theme::QUIET,
            ));
        }
        let column = Frame { x: width_mm - key_width - 2.0, y: 3.0, width: key_width, height };
        key(&mut drawing, column, &self.key_lines());
        drawing
    }

    fn key_lines(&self) -> Vec<KeyLine> {
        let mut lines: Vec<KeyLine> = self
            .packages
            .iter()
            .enumerate()
            .map(|(index, package)| KeyLine {
                number: Some((index + 1, package.look.ink)),
                sample: Sample::Area(package.look.ink, package.look.pattern),
                name: if package.remark.is_empty() {
                    package.look.name.clone()
                } else {
                    format!("{}, {}", package.look.name, package.remark)
                },
                value: format!("× {}", package.count),
                bold: false,
            })
            .collect();
        lines.push(KeyLine {
            number: None,
            sample: Sample::None,
            name: format!("in all, on a pitch of {} mm", shown(self.pitch_mm)),
            value: format!("× {}", self.total()),
            bold: true,
        });
        lines
    }
}
