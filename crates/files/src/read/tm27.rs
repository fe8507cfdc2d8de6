//! ANSI/IES TM-27-14 XML (element names from public samples and open readers of the format; the document itself was not at
//! hand). Entities are never expanded and nothing is fetched: an unknown entity stays text.

use super::answers::Answers;
use super::number::{Cell, cell};
use super::pairs::{self, Pairs};
use super::reading::Draft;
use super::table::MAX_NUMBERS;
use super::text::Refusal;
use super::units::{OrdinateHint, ordinate_hint};
use super::{Decimal, vocabulary};
use quick_xml::Reader;
use quick_xml::events::{BytesStart, Event};

/// Deeper nesting is refused.
const MAX_DEPTH: usize = 32;

/// Whether the text starts like a TM-27 file.
pub(super) fn recognises(text: &str) -> bool {
    let mut end = text.len().min(4096);
    while !text.is_char_boundary(end) {
        end -= 1;
    }
    text.trim_start_matches(|c: char| c.is_whitespace() || c == '\u{feff}').starts_with('<')
        && text[..end].contains("IESTM27")
}

/// Reads a TM-27 file.
pub(super) fn read(stem: &str, text: &str, answers: &Answers) -> Draft {
    let mut draft = Draft::default();
    draft.facts.format = "TM-27 XML";
    if let Err((line, sentence)) = read_into(&mut draft, stem, text, answers) {
        draft.refuse(line, sentence);
    }
    draft
}

#[derive(Default)]
struct Found {
    description: String,
    quantity: String,
    bandwidth: String,
    axis: Vec<Cell>,
    values: Vec<Cell>,
    first_line: usize,
}

fn read_into(draft: &mut Draft, stem: &str, text: &str, answers: &Answers) -> Result<(), Refusal> {
    let mut description = String::new();
    let mut blocks = walk(text, &mut description)?;
    blocks.retain(|block| !block.axis.is_empty());
    if blocks.is_empty() {
        return Err((Some(1), "expected a SpectralDistribution with SpectralData, found none".into()));
    }
    let many = blocks.len() > 1;
    draft.facts.first_data_line = blocks[0].first_line;
    let mut failures = Vec::new();
    for (index, block) in blocks.into_iter().enumerate() {
        let place = index + 1;
        if !many_wanted(answers, place) {
            continue;
        }
        let base = if description.is_empty() { stem } else { &description };
        let name = match (block.description.is_empty(), many) {
            (false, _) => block.description.clone(),
            (true, true) => format!("{base} {place}"),
            (true, false) => base.to_owned(),
        };
        if let Ok(bandwidth) = block.bandwidth.trim().parse::<f64>()
            && bandwidth > 5.0
        {
            draft
                .warn(format!("The file states a bandwidth of {bandwidth} nm: narrow features are smeared."));
        }
        let hint = quantity(&block.quantity);
        let pairs = Pairs {
            name,
            line: block.first_line,
            axis: block.axis,
            values: block.values,
            unit: Some(super::AxisUnit::Nm),
            hint,
            unit_text: block.quantity.trim().to_owned(),
        };
        if let Err(failure) = pairs::add(draft, &pairs, place, many, answers) {
            failures.push(failure);
        }
    }
    if draft.spectra.is_empty() {
        return Err(failures
            .into_iter()
            .next()
            .unwrap_or((None, "expected a block of that number in --columns, found none".into())));
    }
    for (_, sentence) in failures {
        draft.warn(format!("Left out a block: {sentence}."));
    }
    Ok(())
}

/// Whether a block is among the wanted ones.
pub(super) fn many_wanted(answers: &Answers, place: usize) -> bool {
    answers.columns.as_ref().is_none_or(|wanted| wanted.contains(&place))
}

/// What a SpectralQuantity says; the format has no photon quantities.
fn quantity(text: &str) -> OrdinateHint {
    let folded = vocabulary::fold(text.trim());
    match folded.as_str() {
        "flux" | "intensity" | "irradiance" | "radiance" | "exitance" => pairs::power_per_nm(true),
        "relative" => pairs::power_per_nm(false),
        "absorptance" | "transmittance" | "reflectance" | "r-factor" | "t-factor" => OrdinateHint {
            not_emission: Some(match folded.as_str() {
                "absorptance" => "absorptance",
                "transmittance" => "transmittance",
                "reflectance" => "reflectance",
                "r-factor" => "reflectance factor",
                _ => "transmittance factor",
            }),
            ..OrdinateHint::default()
        },
        _ => ordinate_hint(text),
    }
}

fn walk(text: &str, description: &mut String) -> Result<Vec<Found>, Refusal> {
    let mut reader = Reader::from_str(text);
    let mut path: Vec<String> = Vec::new();
    let mut blocks: Vec<Found> = Vec::new();
    let mut content = String::new();
    let mut numbers = 0;
    let mut lines = LineCounter { text, at: 0, line: 1 };
    loop {
        let before = reader.buffer_position();
        let event = reader.read_event().map_err(|error| {
            (
                Some(lines.line_at(before)),
                format!("expected well-formed XML, found: {}", one_line(&error.to_string())),
            )
        })?;
        match event {
            Event::Start(start) => {
                open(&start, &mut path, &mut blocks, lines.line_at(before))?;
                content.clear();
            }
            Event::Empty(start) => {
                open(&start, &mut path, &mut blocks, lines.line_at(before))?;
                path.pop();
            }
            Event::Text(text) if content.len() < 4096 => content.push_str(&text.xml10_content()),
            Event::CData(text) if content.len() < 4096 => content.push_str(&text.xml10_content()),
            Event::GeneralRef(reference) if content.len() < 4096 => {
                let known = match reference.xml10_content().as_ref() {
                    "amp" => Some('&'),
                    "lt" => Some('<'),
                    "gt" => Some('>'),
                    "quot" => Some('"'),
                    "apos" => Some('\''),
                    _ => reference.resolve_char_ref().ok().flatten(),
                };
                content.extend(known);
            }
            Event::End(_) => {
                let Some(name) = path.pop() else { continue };
                let value = content.trim();
                match (name.as_str(), blocks.last_mut()) {
                    ("Description", None) => *description = value.chars().take(300).collect(),
                    ("Description", Some(block)) => block.description = value.chars().take(300).collect(),
                    ("SpectralQuantity", Some(block)) => block.quantity = value.to_owned(),
                    ("BandwidthFWHM", Some(block)) => block.bandwidth = value.to_owned(),
                    ("SpectralData", Some(block)) => {
                        numbers += 2;
                        if numbers > MAX_NUMBERS {
                            return Err((None, "expected at most 5 million numbers, found more".into()));
                        }
                        block.values.push(cell(value, Decimal::Point, false));
                    }
                    _ => {}
                }
                content.clear();
            }
            Event::Eof => break,
            _ => {}
        }
    }
    if !path.is_empty() {
        return Err((
            Some(lines.line_at(text.len() as u64)),
            format!("expected the end of {}, found the end of the file", path[path.len() - 1]),
        ));
    }
    Ok(blocks)
}

fn open(
    start: &BytesStart<'_>,
    path: &mut Vec<String>,
    blocks: &mut Vec<Found>,
    line: usize,
) -> Result<(), Refusal> {
    let name = start.local_name().into_inner().to_owned();
    let attribute = |wanted: &str| {
        start
            .attributes()
            .flatten()
            .find(|one| one.key.local_name().into_inner() == wanted)
            .map(|one| one.value.trim().to_owned())
    };
    if path.is_empty() {
        if name != "IESTM2714" {
            return Err((
                Some(line),
                format!("expected the root IESTM2714, found {}", name.chars().take(40).collect::<String>()),
            ));
        }
        let version = attribute("version").unwrap_or_else(|| "1.0".into());
        if version != "1.0" && version != "1" {
            return Err((
                Some(line),
                format!(
                    "expected TM-27 version 1.0, found version {}",
                    version.chars().take(20).collect::<String>()
                ),
            ));
        }
    }
    if path.len() >= MAX_DEPTH {
        return Err((Some(line), format!("expected at most {MAX_DEPTH} nested elements, found more")));
    }
    match name.as_str() {
        "SpectralDistribution" => blocks.push(Found::default()),
        "SpectralData" => {
            if let Some(block) = blocks.last_mut() {
                if block.first_line == 0 {
                    block.first_line = line;
                }
                let axis =
                    attribute("wavelength").map_or(Cell::Word, |text| cell(&text, Decimal::Point, false));
                block.axis.push(axis);
            }
        }
        _ => {}
    }
    path.push(name);
    Ok(())
}

/// Lines of growing byte positions, counted once.
struct LineCounter<'a> {
    text: &'a str,
    at: usize,
    line: usize,
}

impl LineCounter<'_> {
    fn line_at(&mut self, position: u64) -> usize {
        let position = usize::try_from(position).unwrap_or(usize::MAX).min(self.text.len());
        if position > self.at {
            self.line +=
                self.text.as_bytes()[self.at..position].iter().filter(|&&byte| byte == b'\n').count();
            self.at = position;
        }
        self.line
    }
}

fn one_line(text: &str) -> String {
    text.chars().take(120).map(|c| if c.is_control() { ' ' } else { c }).collect()
}
