//! The model as a list of blocks that every back end prints in the same order.

use super::model::{LedgerLine, MeasuredValue, RecipeSheet, ReportModel};
use super::number::{self, fixed, percent, significant};
use crate::drawing::Drawing;

/// What stands in every report about the effect of light on eyes and skin.
pub const PHOTOBIOLOGY_CAUTION: &str = "Any photobiological figure here is indicative: it comes from a modelled \
     spectrum, not from the finished product. It is no risk-group classification, and nothing in this report says \
     that a device is safe. Classification needs measurement of the finished product by a competent (accredited) \
     laboratory to IEC 62471 and IEC TR 62778, and the codes in force where the product is used apply.";

/// Width of a figure across the page, mm.
pub(crate) const WIDE_MM: f64 = 174.0;
/// Width of one of two figures side by side, mm.
pub(crate) const HALF_MM: f64 = 84.0;

/// One piece of the report.
pub(crate) enum Block {
    Heading(String),
    Paragraph(String),
    /// A paragraph that stays with what follows.
    Lead(String),
    Table(Table),
    /// One figure, or two side by side.
    Figures(Vec<Figure>),
    Caution(String),
    Signatures(Vec<String>),
}

pub(crate) struct Figure {
    pub(crate) drawing: Drawing,
    pub(crate) caption: String,
}

pub(crate) struct Column {
    pub(crate) title: &'static str,
    /// Part of the width, relative to the other columns.
    pub(crate) weight: f64,
    /// True for numbers, which stand at the right.
    pub(crate) right: bool,
}

pub(crate) struct Row {
    pub(crate) cells: Vec<String>,
    /// Set in bold, such as a requirement that is short.
    pub(crate) strong: bool,
}

pub(crate) struct Table {
    pub(crate) columns: Vec<Column>,
    pub(crate) rows: Vec<Row>,
}

const fn left(title: &'static str, weight: f64) -> Column {
    Column { title, weight, right: false }
}

const fn right(title: &'static str, weight: f64) -> Column {
    Column { title, weight, right: true }
}

fn row(cells: impl IntoIterator<Item = String>) -> Row {
    Row { cells: cells.into_iter().collect(), strong: false }
}

impl Table {
    /// Without its last column when that says nothing in any row.
    fn without_silent_end(mut self) -> Table {
        let silent = |row: &Row| row.cells.last().is_none_or(String::is_empty);
        if self.rows.iter().all(silent) {
            self.columns.pop();
            for row in &mut self.rows {
                row.cells.pop();
            }
        }
        self
    }
}

/// The facts under the title: name and value.
pub(crate) fn facts(model: &ReportModel) -> Vec<(&'static str, String)> {
    [
        ("Project", &model.project),
        ("Emitter set", &model.set),
        ("White asked for", &model.white),
        ("Computed by", &model.program),
        ("Date", &model.date),
        ("Data", &model.data_note),
    ]
    .into_iter()
    .filter(|(_, value)| !value.is_empty())
    .map(|(name, value)| (name, value.clone()))
    .collect()
}

/// Every block of the report in order.
pub(crate) fn blocks(model: &ReportModel) -> Vec<Block> {
    let mut out = Vec::new();
    white(model, &mut out);
    if let Some(recipe) = &model.recipe {
        recipe_blocks(recipe, &mut out);
    }
    colour(model, &mut out);
    rest(model, &mut out);
    out
}

fn heading(words: &str) -> Block {
    Block::Heading(words.to_owned())
}

fn white(model: &ReportModel, out: &mut Vec<Block>) {
    if !model.ledger.is_empty() {
        out.push(heading("The white against its spec"));
        let table = Table {
            columns: vec![
                left("requirement", 1.5),
                right("value", 1.1),
                right("asked for", 1.6),
                right("margin", 1.5),
                left("", 1.0),
                left("remark", 3.0),
            ],
            rows: model.ledger.iter().map(ledger_row).collect(),
        };
        out.push(Block::Table(table.without_silent_end()));
    }
    if !model.proof.is_empty() {
        out.push(Block::Paragraph(model.proof.clone()));
    }
    if let Some(spectrum) = &model.spectrum {
        out.push(heading("Spectrum"));
        out.push(Block::Figures(vec![Figure { drawing: spectrum.draw(WIDE_MM), caption: String::new() }]));
    }
    if !model.shares.is_empty() {
        out.push(heading("Shares, by kind"));
        out.push(Block::Lead(
            "The same blend, counted three ways. A share of one kind must never be set as a share of another.".to_owned(),
        ));
        let kind = |share: Option<f64>| share.map_or_else(|| "unknown".to_owned(), percent);
        out.push(Block::Table(Table {
            columns: vec![
                right("no.", 0.4),
                left("emitter", 2.4),
                right("of radiant power", 1.4),
                right("of lumens", 1.2),
                right("of photons", 1.2),
                right("mean wavelength", 1.4),
            ],
            rows: model
                .shares
                .iter()
                .enumerate()
                .map(|(index, share)| {
                    row([
                        (index + 1).to_string(),
                        share.look.name.clone(),
                        kind(share.radiant),
                        kind(share.luminous),
                        kind(share.photon),
                        share
                            .mean_wavelength_nm
                            .map_or_else(|| "unknown".to_owned(), |nm| format!("{} nm", fixed(nm, 1))),
                    ])
                })
                .collect(),
        }));
    }
}

fn ledger_row(line: &LedgerLine) -> Row {
    let with_unit = |text: String| if line.unit.is_empty() { text } else { format!("{text} {}", line.unit) };
    let number = |value: f64| fixed(value, line.decimals);
    let asked = match (line.low, line.high) {
        (Some(low), Some(high)) => with_unit(format!("{} to {}", number(low), number(high))),
        (Some(low), None) => with_unit(format!("at least {}", number(low))),
        (None, Some(high)) => with_unit(format!("at most {}", number(high))),
        (None, None) => String::new(),
    };
    let margin = line.margin().map_or_else(String::new, |margin| {
        if margin < 0.0 {
            format!("short by {}", number(-margin))
        } else {
            format!("{} to spare", number(margin))
        }
    });
    let state = match line.met {
        Some(true) => "met",
        Some(false) => "short",
        None => "not known",
    };
    Row {
        cells: vec![
            line.name.clone(),
            line.value.map_or_else(|| "unknown".to_owned(), |v| with_unit(number(v))),
            asked,
            margin,
            state.to_owned(),
            line.note.clone(),
        ],
        strong: line.met == Some(false),
    }
}

fn recipe_blocks(recipe: &RecipeSheet, out: &mut Vec<Block>) {
    let name = if recipe.build_form.is_empty() {
        "Recipe".to_owned()
    } else {
        format!("Recipe: {}", recipe.build_form)
    };
    out.push(Block::Heading(name));
    if !recipe.summary.is_empty() {
        out.push(Block::Lead(recipe.summary.clone()));
    }
    if let Some(picture) = &recipe.picture {
        out.push(Block::Figures(vec![Figure { drawing: picture.draw(WIDE_MM), caption: String::new() }]));
    }
    if !recipe.rows.is_empty() {
        let end = |value: Option<f64>| value.map(|v| significant(v, 5));
        let table = Table {
            columns: vec![
                left("part", 1.8),
                left("quantity", 1.7),
                right("target", 1.0),
                right("allowed band", 1.6),
                left("unit", 0.9),
                left("calibration runs", 1.4),
                left("remark", 1.6),
            ],
            rows: recipe
                .rows
                .iter()
                .map(|r| {
                    let band = match number::band(r.allowed_low, r.allowed_high, 4) {
                        (Some(low), Some(high)) => format!("{low} to {high}"),
                        (Some(low), None) => format!("at least {low}"),
                        (None, Some(high)) => format!("at most {high}"),
                        (None, None) => "not known".to_owned(),
                    };
                    row([
                        r.part.clone(),
                        r.quantity.clone(),
                        end(r.target).unwrap_or_else(|| "unknown".to_owned()),
                        band,
                        r.unit.clone(),
                        if r.calibration_runs.is_empty() {
                            "none".to_owned()
                        } else {
                            r.calibration_runs.join(", ")
                        },
                        r.remark.clone(),
                    ])
                })
                .collect(),
        };
        out.push(Block::Table(table.without_silent_end()));
    }
    if !recipe.predicted.is_empty() {
        out.push(Block::Lead("Predicted of the device built to this recipe:".to_owned()));
        out.push(Block::Table(values(&recipe.predicted)));
    }
}

fn values(list: &[MeasuredValue]) -> Table {
    Table {
        columns: vec![left("quantity", 2.2), right("value", 1.2), left("unit", 1.0), left("source", 3.2)],
        rows: list
            .iter()
            .map(|v| {
                row([
                    v.name.clone(),
                    v.value.map_or_else(|| "unknown".to_owned(), |value| fixed(value, v.decimals)),
                    v.unit.clone(),
                    v.source.clone(),
                ])
            })
            .collect(),
    }
}

fn colour(model: &ReportModel, out: &mut Vec<Block>) {
    if !model.measured.is_empty() {
        out.push(heading("Measured values of the blend"));
        out.push(Block::Table(values(&model.measured)));
    }
    let mut pair = Vec::new();
    if let Some(place) = &model.chromaticity {
        pair.push(Figure {
            drawing: place.draw(HALF_MM),
            caption: "Chromaticity, CIE 1976 u′v′ of the 1931 observer, with the Planckian locus".to_owned(),
        });
    }
    if let Some(hue) = &model.hue {
        let caption = format!("Shift in each hue bin of ANSI/IES TM-30. {}", hue.sentence());
        pair.push(Figure { drawing: hue.draw(HALF_MM), caption: caption.trim_end().to_owned() });
    }
    if !pair.is_empty() || model.rendering.is_some() || model.fidelity.is_some() {
        out.push(heading("Chromaticity and rendering"));
    }
    if !pair.is_empty() {
        out.push(Block::Figures(pair));
    }
    if let Some(bars) = &model.rendering {
        let caption = "Special indices R1 to R15, CIE 13.3-1995".to_owned();
        out.push(Block::Figures(vec![Figure { drawing: bars.draw(WIDE_MM), caption }]));
    }
    if let Some(bars) = &model.fidelity {
        let caption = "Local fidelity Rf,h of hue bins 1 to 16, ANSI/IES TM-30, CIE 224:2017".to_owned();
        out.push(Block::Figures(vec![Figure { drawing: bars.draw(WIDE_MM), caption }]));
    }
}

fn rest(model: &ReportModel, out: &mut Vec<Block>) {
    out.push(heading("Photobiological caution"));
    if !model.photobiology.is_empty() {
        out.push(Block::Table(values(&model.photobiology)));
    }
    out.push(Block::Caution(PHOTOBIOLOGY_CAUTION.to_owned()));
    if !model.assumptions.is_empty() {
        out.push(heading("Assumptions and untouched defaults"));
        out.push(Block::Table(Table {
            columns: vec![left("assumed", 6.0), left("", 1.6)],
            rows: model
                .assumptions
                .iter()
                .map(|a| {
                    let kind = if a.untouched_default { "untouched default" } else { "chosen" };
                    row([a.statement.clone(), kind.to_owned()])
                })
                .collect(),
        }));
    }
    if !model.sources.is_empty() {
        out.push(heading("Source files"));
        let table = Table {
            columns: vec![left("emitter", 1.4), left("file", 1.6), left("SHA-256", 2.6), left("remark", 1.8)],
            rows: model
                .sources
                .iter()
                .map(|s| row([s.emitter.clone(), s.file.clone(), s.sha256.clone(), s.remark.clone()]))
                .collect(),
        };
        out.push(Block::Table(table.without_silent_end()));
    }
    if !model.methods.is_empty() {
        out.push(heading("Methods and sources"));
        out.push(Block::Table(Table {
            columns: vec![left("quantity", 1.6), left("source", 4.4)],
            rows: model.methods.iter().map(|m| row([m.quantity.clone(), m.source.clone()])).collect(),
        }));
    }
    if !model.signatures.is_empty() {
        out.push(heading("Signatures"));
        out.push(Block::Signatures(model.signatures.clone()));
    }
}
