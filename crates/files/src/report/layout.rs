//! The report's blocks set on A4 pages.

use super::content::{self, Block, Figure, HALF_MM, Row, Table, WIDE_MM};
use super::model::ReportModel;
use crate::drawing::{Anchor, Frame, MM_PER_PT, Mark, Path, Pen, Text, at, font, theme};

/// A4, mm.
pub(crate) const PAGE_WIDTH: f64 = 210.0;
/// A4, mm.
pub(crate) const PAGE_HEIGHT: f64 = 297.0;
const LEFT: f64 = 18.0;
const TOP: f64 = 22.0;
const BOTTOM: f64 = PAGE_HEIGHT - 20.0;
const BODY_PT: f64 = 9.0;
const TABLE_PT: f64 = 8.2;
const BODY_LINE: f64 = 4.7;
const TABLE_LINE: f64 = 4.0;
const ROW_PAD: f64 = 0.9;
const CELL_GAP: f64 = 2.4;
const CAPTION_LINE: f64 = 3.8;
/// Distance of the caution's words from its frame.
const INSET: f64 = 6.0;

/// What is painted on a page: marks, moved right and down by mm.
pub(crate) struct Placed {
    pub(crate) right: f64,
    pub(crate) down: f64,
    pub(crate) marks: Vec<Mark>,
}

/// A heading and where it stands.
pub(crate) struct Landmark {
    pub(crate) words: String,
    pub(crate) page: usize,
    pub(crate) y: f64,
}

/// Every page, with its landmarks.
pub(crate) struct Pages {
    pub(crate) pages: Vec<Vec<Placed>>,
    pub(crate) landmarks: Vec<Landmark>,
}

/// Set a whole report.
pub(crate) fn pages(model: &ReportModel) -> Pages {
    let mut sheet = Sheet { pages: vec![Vec::new()], landmarks: Vec::new(), y: TOP };
    sheet.title(model);
    let blocks = content::blocks(model);
    for (index, block) in blocks.iter().enumerate() {
        sheet.need(keep(&blocks[index..]));
        sheet.block(block);
    }
    sheet.run_heads(model);
    Pages { pages: sheet.pages, landmarks: sheet.landmarks }
}

/// Height that the first of these blocks wants to stay together with, mm: a heading with what it heads, a short table
/// whole, the beginning of a long one.
fn keep(blocks: &[Block]) -> f64 {
    /// Tables up to this height are kept whole.
    const SHORT_TABLE: f64 = 70.0;
    let Some((first, rest)) = blocks.split_first() else { return 0.0 };
    let lines = |words: &str, width: f64| font::wrap(words, BODY_PT, false, width / MM_PER_PT).len() as f64;
    match first {
        Block::Heading(_) => 12.5 + keep(rest),
        Block::Lead(words) => lines(words, WIDE_MM) * BODY_LINE + 1.0 + keep(rest),
        Block::Paragraph(_) => 2.0 * BODY_LINE,
        Block::Table(table) => {
            let spans = spans(table);
            let head = TABLE_LINE + 1.6;
            let rows: Vec<f64> = table
                .rows
                .iter()
                .map(|row| {
                    let lines = wrapped(row, &spans).iter().map(Vec::len).max().unwrap_or(1).max(1);
                    lines as f64 * TABLE_LINE + 2.0 * ROW_PAD
                })
                .collect();
            let whole = head + rows.iter().sum::<f64>();
            if whole <= SHORT_TABLE { whole } else { head + rows.iter().take(3).sum::<f64>().min(40.0) }
        }
        Block::Figures(list) => figures_height(list).0,
        Block::Caution(words) => (lines(words, WIDE_MM - INSET - 5.0) + 1.0) * BODY_LINE + 5.0,
        Block::Signatures(roles) => (roles.len() as f64 * 18.0).min(120.0),
    }
}

/// Left edge and width of each column, mm.
fn spans(table: &Table) -> Vec<(f64, f64)> {
    let whole: f64 = table.columns.iter().map(|c| c.weight).sum();
    let mut x = LEFT;
    table
        .columns
        .iter()
        .map(|column| {
            let span = (x, WIDE_MM * column.weight / whole);
            x += span.1;
            span
        })
        .collect()
}

/// The lines of every cell of a row.
fn wrapped(row: &Row, spans: &[(f64, f64)]) -> Vec<Vec<String>> {
    row.cells
        .iter()
        .zip(spans)
        .map(|(cell, (_, width))| font::wrap(cell, TABLE_PT, row.strong, (width - CELL_GAP) / MM_PER_PT))
        .collect()
}

/// Height of a row of figures with captions, and the lines of each caption.
fn figures_height(list: &[Figure]) -> (f64, Vec<Vec<String>>) {
    let width = if list.len() > 1 { HALF_MM } else { WIDE_MM };
    let captions: Vec<Vec<String>> = list
        .iter()
        .map(|f| match f.caption.as_str() {
            "" => Vec::new(),
            words => font::wrap(words, theme::LABEL_PT, false, width / MM_PER_PT),
        })
        .collect();
    let under = captions.iter().map(|c| c.len() as f64 * CAPTION_LINE).fold(0.0f64, f64::max);
    (tallest(list) + under + 3.0, captions)
}

fn tallest(list: &[Figure]) -> f64 {
    list.iter().map(|f| f.drawing.height_mm).fold(0.0f64, f64::max)
}

struct Sheet {
    pages: Vec<Vec<Placed>>,
    landmarks: Vec<Landmark>,
    y: f64,
}

impl Sheet {
    fn put(&mut self, mark: Mark) {
        self.place(0.0, 0.0, vec![mark]);
    }

    fn place(&mut self, right: f64, down: f64, marks: Vec<Mark>) {
        if let Some(page) = self.pages.last_mut() {
            page.push(Placed { right, down, marks });
        }
    }

    fn text(&mut self, text: Text) {
        self.put(Mark::Text(text));
    }

    fn rule(&mut self, y: f64, pen: Pen) {
        let path = Path::line(at(LEFT, y), at(LEFT + WIDE_MM, y));
        self.put(Mark::Shape { path, fill: None, pen: Some(pen) });
    }

    fn new_page(&mut self) {
        self.pages.push(Vec::new());
        self.y = TOP;
    }

    /// Make sure that `height` mm fit below; anything higher than a page starts at its top.
    fn need(&mut self, height: f64) {
        if self.y + height > BOTTOM && self.y > TOP {
            self.new_page();
        }
    }

    fn title(&mut self, model: &ReportModel) {
        for line in font::wrap(&model.title, 20.0, true, WIDE_MM / MM_PER_PT) {
            self.need(9.0);
            self.text(Text::new(at(LEFT, self.y + 3.0), line, 20.0, theme::INK).bold());
            self.y += 9.0;
        }
        self.rule(self.y - 1.0, Pen::solid(theme::ACCENT, 0.9));
        self.y += 5.0;
        for (name, value) in content::facts(model) {
            let mut name = Some(name);
            for line in font::wrap(&value, BODY_PT, false, (WIDE_MM - 34.0) / MM_PER_PT) {
                self.need(BODY_LINE);
                if let Some(name) = name.take() {
                    self.text(Text::new(at(LEFT, self.y), name, BODY_PT, theme::QUIET));
                }
                self.text(Text::new(at(LEFT + 34.0, self.y), line, BODY_PT, theme::INK));
                self.y += BODY_LINE;
            }
        }
        self.y += 1.0;
    }

    fn block(&mut self, block: &Block) {
        match block {
            Block::Heading(words) => self.heading(words),
            Block::Paragraph(words) | Block::Lead(words) => self.paragraph(words, LEFT, WIDE_MM, false),
            Block::Table(table) => self.table(table),
            Block::Figures(list) => self.figures(list),
            Block::Caution(words) => self.caution(words),
            Block::Signatures(roles) => self.signatures(roles),
        }
    }

    fn heading(&mut self, words: &str) {
        if self.y > TOP {
            self.y += 6.5;
        }
        let page = self.pages.len() - 1;
        self.landmarks.push(Landmark { words: words.to_owned(), page, y: self.y - 5.0 });
        for line in font::wrap(words, 12.0, true, WIDE_MM / MM_PER_PT) {
            self.need(6.0);
            self.text(Text::new(at(LEFT, self.y), line, 12.0, theme::INK).bold());
            self.y += 6.0;
        }
    }

    fn paragraph(&mut self, words: &str, x: f64, width: f64, bold: bool) {
        for line in font::wrap(words, BODY_PT, bold, width / MM_PER_PT) {
            self.need(BODY_LINE);
            let mut text = Text::new(at(x, self.y), line, BODY_PT, theme::INK);
            text.bold = bold;
            self.text(text);
            self.y += BODY_LINE;
        }
        self.y += 1.0;
    }

    fn figures(&mut self, list: &[Figure]) {
        let step = if list.len() > 1 { HALF_MM + (WIDE_MM - 2.0 * HALF_MM) } else { 0.0 };
        let (height, captions) = figures_height(list);
        let tallest = tallest(list);
        self.need(height);
        let top = self.y - 3.0;
        for (index, (figure, caption)) in list.iter().zip(&captions).enumerate() {
            let x = LEFT + index as f64 * step;
            self.place(x, top, figure.drawing.marks.clone());
            for (n, line) in caption.iter().enumerate() {
                let y = top + tallest + 3.0 + n as f64 * CAPTION_LINE;
                self.text(Text::new(at(x, y), line.clone(), theme::LABEL_PT, theme::QUIET));
            }
        }
        self.y = top + height + 2.0;
    }

    fn caution(&mut self, words: &str) {
        let (inset, bar) = (INSET, 2.2);
        let lines = font::wrap(words, BODY_PT, false, (WIDE_MM - inset - 5.0) / MM_PER_PT);
        let height = (lines.len() as f64 + 1.0) * BODY_LINE + 5.0;
        self.need(height);
        let frame = Frame { x: LEFT, y: self.y - 3.0, width: WIDE_MM, height };
        self.put(Mark::Shape { path: frame.path(), fill: None, pen: Some(Pen::solid(theme::INK, 0.35)) });
        self.put(Mark::Shape {
            path: Frame { width: bar, ..frame }.path(),
            fill: Some(theme::INK),
            pen: None,
        });
        self.y += 2.4;
        self.text(Text::new(at(LEFT + inset, self.y), "Caution", BODY_PT, theme::INK).bold());
        self.y += BODY_LINE;
        for line in lines {
            self.text(Text::new(at(LEFT + inset, self.y), line, BODY_PT, theme::INK));
            self.y += BODY_LINE;
        }
        self.y += 3.0;
    }

    fn signatures(&mut self, roles: &[String]) {
        for role in roles {
            self.need(19.0);
            let line = self.y + 11.0;
            for (x, width, words) in
                [(LEFT, 62.0, role.as_str()), (LEFT + 68.0, 36.0, "date"), (LEFT + 110.0, 64.0, "signature")]
            {
                let path = Path::line(at(x, line), at(x + width, line));
                self.put(Mark::Shape { path, fill: None, pen: Some(Pen::solid(theme::INK, 0.25)) });
                let said = font::shortened(words, TABLE_PT, false, width / MM_PER_PT);
                self.text(Text::new(at(x, line + 3.8), said, TABLE_PT, theme::QUIET));
            }
            self.y += 18.0;
        }
    }

    fn table(&mut self, table: &Table) {
        let spans = spans(table);
        self.table_head(table, &spans);
        for row in &table.rows {
            let cells = wrapped(row, &spans);
            self.table_row(table, &spans, &cells, row.strong);
        }
        self.y += 3.0;
    }

    fn table_head(&mut self, table: &Table, spans: &[(f64, f64)]) {
        for (column, span) in table.columns.iter().zip(spans) {
            self.cell(column.title, *span, column.right, false, theme::QUIET);
        }
        self.y += 1.6;
        self.rule(self.y, Pen::solid(theme::INK, 0.3));
        self.y += TABLE_LINE;
    }

    /// A row moves to the next page whole; one higher than a page is split between lines.
    fn table_row(&mut self, table: &Table, spans: &[(f64, f64)], cells: &[Vec<String>], strong: bool) {
        let lines = cells.iter().map(Vec::len).max().unwrap_or(0).max(1);
        let height = lines as f64 * TABLE_LINE + 2.0 * ROW_PAD;
        let page_room = BOTTOM - TOP - 2.0 * TABLE_LINE - 2.0;
        if self.y + height - TABLE_LINE > BOTTOM && height <= page_room {
            self.new_page();
            self.table_head(table, spans);
        }
        for line in 0..lines {
            if self.y > BOTTOM {
                self.new_page();
                self.table_head(table, spans);
            }
            for ((words, span), column) in cells.iter().zip(spans).zip(&table.columns) {
                if let Some(words) = words.get(line) {
                    self.cell(words, *span, column.right, strong, theme::INK);
                }
            }
            self.y += TABLE_LINE;
        }
        self.rule(self.y - TABLE_LINE + ROW_PAD + 0.6, Pen::solid(theme::RULE, 0.15));
        self.y += 2.0 * ROW_PAD;
    }

    fn cell(
        &mut self,
        words: &str,
        (x, width): (f64, f64),
        right: bool,
        strong: bool,
        ink: crate::drawing::Ink,
    ) {
        if words.is_empty() {
            return;
        }
        let place = if right { at(x + width - CELL_GAP, self.y) } else { at(x, self.y) };
        let mut text = Text::new(place, words, TABLE_PT, ink);
        text.bold = strong;
        if right {
            text.anchor = Anchor::End;
        }
        self.text(text);
    }

    /// Head and foot of every page, once their number is known.
    fn run_heads(&mut self, model: &ReportModel) {
        let count = self.pages.len();
        for (index, page) in self.pages.iter_mut().enumerate() {
            let small = |x: f64, y: f64, words: String, anchor: Anchor| {
                Mark::Text(Text::new(at(x, y), words, 7.5, theme::QUIET).anchored(anchor))
            };
            let room = |mm: f64, words: &str| font::shortened(words, 7.5, false, mm / MM_PER_PT);
            let foot = PAGE_HEIGHT - 11.0;
            let rule = Path::line(at(LEFT, foot - 4.0), at(LEFT + WIDE_MM, foot - 4.0));
            let mut marks =
                vec![Mark::Shape { path: rule, fill: None, pen: Some(Pen::solid(theme::RULE, 0.2)) }];
            if index > 0 {
                marks.push(small(LEFT, 13.0, room(110.0, &model.title), Anchor::Start));
                marks.push(small(LEFT + WIDE_MM, 13.0, room(60.0, &model.project), Anchor::End));
            }
            let program = [&model.program, &model.date]
                .into_iter()
                .filter(|part| !part.is_empty())
                .cloned()
                .collect::<Vec<_>>()
                .join(" · ");
            marks.push(small(LEFT, foot, room(130.0, &program), Anchor::Start));
            marks.push(small(LEFT + WIDE_MM, foot, format!("page {} of {count}", index + 1), Anchor::End));
            page.push(Placed { right: 0.0, down: 0.0, marks });
        }
    }
}
