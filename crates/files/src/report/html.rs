//! The report as one HTML file: no scripts, nothing fetched, every word escaped, print rules for A4.

use super::content::{self, Block, Figure, Table};
use super::model::ReportModel;
use crate::drawing::svg::{escaped, inline};
use std::fmt::Write;

/// Screen and print rules. Nothing here refers to anything outside the file.
const STYLE: &str = "
:root { --ink: #202328; --quiet: #5d6269; --rule: #dcd8ce; --accent: #8a5a14; --paper: #fffefa; --ground: #f1efe9; }
* { box-sizing: border-box; }
html { background: var(--ground); }
body { margin: 2rem auto; padding: 2.4rem 2.6rem; max-width: 60rem; background: var(--paper); color: var(--ink);
  font: 15px/1.5 'Noto Sans', system-ui, sans-serif; font-variant-numeric: tabular-nums; overflow-wrap: break-word; }
h1 { font-size: 1.9em; line-height: 1.2; margin: 0 0 .5em; padding-bottom: .35em; border-bottom: 3px solid var(--accent); }
h2 { font-size: 1.1em; margin: 2em 0 .5em; break-after: avoid; }
p { margin: .5em 0 .8em; max-width: 46em; }
.lead { break-after: avoid; }
dl { display: grid; grid-template-columns: max-content 1fr; gap: .15rem 1.4rem; margin: 0; }
dt, th, figcaption, footer { color: var(--quiet); }
dd { margin: 0; }
table { border-collapse: collapse; width: 100%; table-layout: fixed; font-size: .88em; }
th { font-weight: 400; text-align: left; border-bottom: 1.5px solid var(--ink); vertical-align: bottom; }
th, td { padding: .3em .9em .3em 0; }
td { border-bottom: 1px solid var(--rule); vertical-align: top; }
th.n, td.n { text-align: right; }
tr.strong td { font-weight: 700; }
thead { display: table-header-group; }
tr, figure { break-inside: avoid; }
figure { margin: .8rem 0; flex: 1 1 0; min-width: 0; }
figure svg { display: block; width: 100%; height: auto; }
figcaption { font-size: .82em; }
.pair { display: flex; gap: 1.5em; break-inside: avoid; }
.caution { border: 1.5px solid var(--ink); border-left: 8px solid var(--ink); padding: .7rem 1rem; break-inside: avoid; }
.sign { display: grid; grid-template-columns: repeat(auto-fit, minmax(14rem, 1fr)); gap: 1.5rem; break-inside: avoid; }
.sign div { border-bottom: 1px solid var(--ink); height: 4.6em; color: var(--quiet); font-size: .85em; }
footer { margin-top: 2.5rem; font-size: .82em; border-top: 1px solid var(--rule); padding-top: .5em; }
@media (max-width: 40rem) { body { margin: 0; padding: 1.2rem; } .pair { display: block; } }
@page { size: A4; margin: 18mm; }
@media print { html, body { background: none; } body { margin: 0; padding: 0; max-width: none; font-size: 9.5pt; } }
";

/// Writing to a `String` cannot fail.
macro_rules! put {
    ($out:expr, $($rest:tt)*) => { let _ = write!($out, $($rest)*); };
}

/// The whole file.
pub fn page(model: &ReportModel) -> String {
    let title = escaped(&model.title);
    let mut out = format!(
        "<!DOCTYPE html>\n<html lang=\"en-GB\">\n<head>\n<meta charset=\"utf-8\">\n\
         <meta http-equiv=\"Content-Security-Policy\" content=\"default-src 'none'; style-src 'unsafe-inline'\">\n\
         <meta name=\"viewport\" content=\"width=device-width\">\n\
         <title>{title}</title>\n<style>{STYLE}</style>\n</head>\n<body>\n<header>\n<h1>{title}</h1>\n<dl>\n"
    );
    for (name, value) in content::facts(model) {
        put!(out, "<dt>{}</dt><dd>{}</dd>\n", escaped(name), escaped(&value));
    }
    out.push_str("</dl>\n</header>\n<main>\n");
    let mut figures = 0;
    for block in content::blocks(model) {
        print(&block, &mut figures, &mut out);
    }
    put!(out, "</main>\n<footer>{}</footer>\n</body>\n</html>\n", escaped(&footer(model)));
    out
}

fn footer(model: &ReportModel) -> String {
    [&model.project, &model.program, &model.date]
        .into_iter()
        .filter(|part| !part.is_empty())
        .cloned()
        .collect::<Vec<_>>()
        .join(" · ")
}

fn print(block: &Block, figures: &mut usize, out: &mut String) {
    match block {
        Block::Heading(words) => {
            put!(out, "<h2>{}</h2>\n", escaped(words));
        }
        Block::Paragraph(words) => {
            put!(out, "<p>{}</p>\n", escaped(words));
        }
        Block::Lead(words) => {
            put!(out, "<p class=\"lead\">{}</p>\n", escaped(words));
        }
        Block::Table(table) => self::table(table, out),
        Block::Figures(list) => {
            let pair = list.len() > 1;
            if pair {
                out.push_str("<div class=\"pair\">\n");
            }
            for Figure { drawing, caption } in list {
                *figures += 1;
                put!(out, "<figure>\n{}", inline(drawing, &format!("f{figures}")));
                if !caption.is_empty() {
                    put!(out, "<figcaption>{}</figcaption>\n", escaped(caption));
                }
                out.push_str("</figure>\n");
            }
            if pair {
                out.push_str("</div>\n");
            }
        }
        Block::Caution(words) => {
            put!(out, "<p class=\"caution\"><strong>Caution.</strong> {}</p>\n", escaped(words));
        }
        Block::Signatures(roles) => {
            out.push_str("<div class=\"sign\">\n");
            for role in roles {
                put!(out, "<div>{}: name, date, signature</div>\n", escaped(role));
            }
            out.push_str("</div>\n");
        }
    }
}

fn table(table: &Table, out: &mut String) {
    let class = |right: bool| if right { " class=\"n\"" } else { "" };
    let whole: f64 = table.columns.iter().map(|c| c.weight).sum();
    out.push_str("<table>\n<colgroup>");
    for column in &table.columns {
        put!(out, "<col style=\"width: {:.2}%\"/>", 100.0 * column.weight / whole);
    }
    out.push_str("</colgroup>\n<thead><tr>");
    for column in &table.columns {
        put!(out, "<th{}>{}</th>", class(column.right), escaped(column.title));
    }
    out.push_str("</tr></thead>\n<tbody>\n");
    for row in &table.rows {
        out.push_str(if row.strong { "<tr class=\"strong\">" } else { "<tr>" });
        for (column, cell) in table.columns.iter().zip(&row.cells) {
            put!(out, "<td{}>{}</td>", class(column.right), escaped(cell));
        }
        out.push_str("</tr>\n");
    }
    out.push_str("</tbody>\n</table>\n");
}
