//! The ledger as data: every requirement with its value, limit, margin, and whether it is met.

use super::{BlendView, EmitterView};
use colour::photobiology::BLUE_LIGHT_CAUTION;
use project::{EmitterSet, Geometry, Limit, Metric, Mounting, Origin, Project};

/// How a requirement stands.
#[derive(Debug, Clone, PartialEq)]
pub enum LineState {
    /// The limit is kept.
    Met,
    /// The limit is not kept.
    Short,
    /// Something is missing before it can be told: what.
    Needs(String),
    /// No limit is set.
    NotLimited,
}

/// One line of the ledger.
#[derive(Debug, Clone, PartialEq)]
pub struct LedgerLine {
    /// Stable name: `cct`, `duv`, `ra`, `r9`, `rf`, `rg`, `ler`, `efficacy`, `light`, `sp_ratio`, `melanopic_der`,
    /// `blue_light`.
    pub key: &'static str,
    /// Name on the page.
    pub label: &'static str,
    /// The value as computed; `None` when it has no meaning here.
    pub value: Option<f64>,
    /// The value as shown, without its unit; a dash when there is none.
    pub text: String,
    /// The unit; empty for pure numbers.
    pub unit: &'static str,
    /// The limit in words.
    pub limit: String,
    /// True when a limit is set.
    pub limited: bool,
    /// How far inside the limit the value is, in the line's unit; negative when short.
    pub margin: Option<f64>,
    /// The margin as a bar from -1 (far short) to 1 (ample).
    pub bar: Option<f64>,
    /// The margin in words.
    pub remark: String,
    /// How it stands.
    pub state: LineState,
    /// What it is, its source, and what moves it.
    pub hover: &'static str,
}

/// What a line is, before any value.
struct Kind {
    key: &'static str,
    label: &'static str,
    unit: &'static str,
    digits: usize,
    /// Margin that fills the bar.
    full_bar: f64,
    hover: &'static str,
}

const CCT: Kind = Kind {
    key: "cct",
    label: "CCT",
    unit: "K",
    digits: 0,
    full_bar: 200.0,
    hover: "Correlated colour temperature: the Planckian radiator nearest in CIE 1960 u, v (CIE 15). Blue and teal raise it, amber and red lower it.",
};
const DUV: Kind = Kind {
    key: "duv",
    label: "Duv",
    unit: "",
    digits: 4,
    full_bar: 0.006,
    hover: "Signed distance from the Planckian locus in CIE 1960 u, v, positive above it (Ohno, Leukos 10:47, 2014). Green and lime raise it, blue with red lowers it.",
};
const RA: Kind = Kind {
    key: "ra",
    label: "Ra",
    unit: "",
    digits: 1,
    full_bar: 10.0,
    hover: "General colour rendering index: mean of R1 to R8 (CIE 13.3-1995). Light spread over more of the spectrum raises it.",
};
const R9: Kind = Kind {
    key: "r9",
    label: "R9",
    unit: "",
    digits: 0,
    full_bar: 30.0,
    hover: "Special index of the saturated red sample (CIE 13.3-1995). More light beyond 620 nm raises it, at a cost in lumens.",
};
const RF: Kind = Kind {
    key: "rf",
    label: "Rf",
    unit: "",
    digits: 1,
    full_bar: 10.0,
    hover: "Colour fidelity over 99 samples (CIE 224:2017, ANSI/IES TM-30). Filling gaps between the emitters raises it.",
};
const RG: Kind = Kind {
    key: "rg",
    label: "Rg",
    unit: "",
    digits: 1,
    full_bar: 5.0,
    hover: "Gamut index: how saturated colours look on the whole, 100 as under the reference (ANSI/IES TM-30). Narrow red and green raise it, amber lowers it.",
};
const LER: Kind = Kind {
    key: "ler",
    label: "LER",
    unit: "lm/W optical",
    digits: 1,
    full_bar: 20.0,
    hover: "Luminous efficacy of radiation: lumens per optical watt inside 380 to 780 nm, 683 \u{222b}S\u{b7}V / \u{222b}S (CIE S 010). Light near 555 nm raises it, deep red and deep blue lower it.",
};
const EFFICACY: Kind = Kind {
    key: "efficacy",
    label: "Device",
    unit: "lm/W",
    digits: 1,
    full_bar: 10.0,
    hover: "Lumens per electrical watt: LER / \u{3a3}(share / wall-plug efficiency), driver not counted. Power moved to the emitters with the better wall-plug efficiency raises it.",
};
const LIGHT: Kind = Kind {
    key: "light",
    label: "Light",
    unit: "W optical",
    digits: 2,
    full_bar: 1.0,
    hover: "Optical watts for the lumens wanted: lumens / LER. Each row shows its part.",
};
const SP: Kind = Kind {
    key: "sp_ratio",
    label: "S/P",
    unit: "",
    digits: 2,
    full_bar: 1.0,
    hover: "Scotopic over photopic lumens, 1700 \u{222b}S\u{b7}V\u{2032} / 683 \u{222b}S\u{b7}V (CIE S 010, CIE 1951 V\u{2032}). Teal and blue raise it.",
};
const DER: Kind = Kind {
    key: "melanopic_der",
    label: "melanopic DER",
    unit: "",
    digits: 2,
    full_bar: 1.0,
    hover: "Melanopic daylight (D65) efficacy ratio: 1 is as melanopic per lumen as daylight D65 (CIE S 026:2018). Light near 490 nm raises it. No statement about health.",
};
const BLUE: Kind = Kind {
    key: "blue_light",
    label: "Blue-light efficacy",
    unit: "mW/lm",
    digits: 3,
    full_bar: 1.0,
    hover: BLUE_LIGHT_CAUTION,
};

impl Kind {
    fn line(&self, value: Option<f64>) -> LedgerLine {
        let digits = self.digits;
        let text = match value {
            Some(value) if self.key == "duv" => format!("{value:+.digits$}"),
            Some(value) => format!("{value:.digits$}"),
            None => "\u{2013}".to_owned(),
        };
        LedgerLine {
            key: self.key,
            label: self.label,
            value,
            text,
            unit: self.unit,
            limit: "no limit".to_owned(),
            limited: false,
            margin: None,
            bar: None,
            remark: String::new(),
            state: LineState::NotLimited,
            hover: self.hover,
        }
    }

    fn limited(&self, value: Option<f64>, limit: &Limit, missing: &str) -> LedgerLine {
        let mut line = self.line(value);
        if limit.is_open() {
            if value.is_none() {
                line.state = LineState::Needs(missing.to_owned());
                line.remark = missing.to_owned();
            }
            return line;
        }
        line.limited = true;
        line.limit = limit_in_words(limit);
        match value {
            Some(value) => self.judge(&mut line, limit.margin(value).unwrap_or_default()),
            None => {
                line.state = LineState::Needs(missing.to_owned());
                line.remark = missing.to_owned();
            }
        }
        line
    }

    fn judge(&self, line: &mut LedgerLine, margin: f64) {
        // A solved blend sits on its limits; the last bits of rounding are not a shortfall.
        let met = margin >= -1e-9 * self.full_bar.max(1.0);
        let digits = self.digits.max(1);
        let size = format!("{:.digits$}", margin.abs());
        let nothing = size.bytes().all(|b| b == b'0' || b == b'.');
        line.margin = Some(margin);
        line.bar = Some((margin / self.full_bar).clamp(-1.0, 1.0));
        line.state = if met { LineState::Met } else { LineState::Short };
        line.remark = match (met, nothing) {
            (true, true) => "at the limit".to_owned(),
            (true, false) => format!("{size} to spare"),
            (false, true) => "just short".to_owned(),
            (false, false) => format!("{size} short"),
        };
    }
}

/// "at least 95", "at most 30", "95 to 105".
pub fn limit_in_words(limit: &Limit) -> String {
    match (limit.low, limit.high) {
        (Some(low), Some(high)) => format!("{low} to {high}"),
        (Some(low), None) => format!("at least {low}"),
        (None, Some(high)) => format!("at most {high}"),
        (None, None) => "no limit".to_owned(),
    }
}

/// Every line of the ledger, in order.
pub(crate) fn lines(project: &Project, set: &EmitterSet, blend: Option<&BlendView>) -> Vec<LedgerLine> {
    let limits = &set.white.limits;
    let measured = blend.map(BlendView::measurement);
    let no_light = "needs a blend with light";
    let missing = if blend.is_some() { "has no meaning this far from the Planckian locus" } else { no_light };
    let mut lines = white_lines(set, blend);
    for (kind, metric, value) in [
        (&RA, Metric::Ra, measured.and_then(|m| m.ra)),
        (&R9, Metric::R9, measured.and_then(colour::Measurement::r9)),
        (&RF, Metric::Rf, measured.and_then(|m| m.rf)),
        (&RG, Metric::Rg, measured.and_then(|m| m.rg)),
    ] {
        let mut line = kind.limited(value, limits.of(metric), missing);
        if value.is_none() && metric == Metric::Rg && measured.is_some_and(|m| m.rf.is_some()) {
            line.state = LineState::Needs("a hue bin is empty under this reference".to_owned());
        }
        lines.push(line);
    }
    lines.push(LER.limited(measured.map(|m| m.ler_lm_per_w), &limits.ler, no_light));
    let without = blend.map_or(&[][..], |b| &b.without_wall_plug);
    let needs = match without {
        [] => no_light.to_owned(),
        names => format!("needs the wall-plug efficiency of {}", listed(names)),
    };
    lines.push(EFFICACY.limited(blend.and_then(|b| b.efficacy_lm_per_w), &limits.efficacy, &needs));
    lines.push(light_line(project, set, blend));
    lines.push(SP.line(measured.map(|m| m.sp_ratio)));
    lines.push(DER.line(measured.map(|m| m.melanopic_der)));
    let mut blue = BLUE.line(measured.map(|m| 1000.0 * m.kbv_w_per_lm));
    if let (Some(measured), Some(luminance)) = (measured, set.white.luminance_cd_per_m2) {
        blue.remark = format!(
            "{:.2} W\u{b7}m\u{207b}\u{b2}\u{b7}sr\u{207b}\u{b9} at {luminance} cd/m\u{b2}, indicative only",
            measured.kbv_w_per_lm * luminance
        );
    }
    lines.push(blue);
    lines
}

/// CCT and Duv: a box is two limits, any other region is one that both lines share.
fn white_lines(set: &EmitterSet, blend: Option<&BlendView>) -> Vec<LedgerLine> {
    let white = &set.white;
    let at = blend.and_then(|b| b.measurement().cct_duv());
    let mut cct = CCT.line(at.map(|at| at.cct_k));
    let mut duv = DUV.line(at.map(|at| at.duv));
    for line in [&mut cct, &mut duv] {
        line.limited = true;
    }
    let target = (format!("target {:.0} K", white.cct_k), format!("target {:+.4}", white.duv));
    (cct.limit, duv.limit) = target.clone();
    let needs = |line: &mut LedgerLine, what: &str| {
        line.state = LineState::Needs(what.to_owned());
        line.remark = what.to_owned();
    };
    let Some(blend) = blend else {
        [&mut cct, &mut duv].into_iter().for_each(|line| needs(line, "needs a blend with light"));
        return vec![cct, duv];
    };
    let region = &blend.region;
    if let Some(problem) = &region.problem {
        [&mut cct, &mut duv].into_iter().for_each(|line| needs(line, problem));
        return vec![cct, duv];
    }
    if let Some((half_cct, half_duv)) = region.box_half_widths() {
        cct.limit = format!("{} \u{b1}{half_cct}", target.0);
        duv.limit = format!("{} \u{b1}{half_duv}", target.1);
        match at {
            Some(at) => {
                CCT.judge(&mut cct, half_cct - (at.cct_k - white.cct_k).abs());
                DUV.judge(&mut duv, half_duv - (at.duv - white.duv).abs());
            }
            None => [&mut cct, &mut duv].into_iter().for_each(|line| {
                line.state = LineState::Short;
                line.remark = "too far from the Planckian locus".to_owned();
            }),
        }
        return vec![cct, duv];
    }
    let uv_prime = blend.uv_prime();
    let margin = region.margin_uv_prime(uv_prime, at);
    let met = margin >= -1e-9;
    let off = uv_prime.distance(region.target);
    let remark = if region.outline.is_empty() {
        if met { "on target".to_owned() } else { format!("{off:.4} u\u{2032}v\u{2032} from the target") }
    } else {
        let side = if met { "inside" } else { "outside" };
        format!("{:.4} u\u{2032}v\u{2032} {side} the {}", margin.abs(), region.words)
    };
    for (line, kind) in [(&mut cct, &CCT), (&mut duv, &DUV)] {
        line.state = if met { LineState::Met } else { LineState::Short };
        line.bar = Some((margin / (6.0 * colour::tolerance::STEP_RADIUS)).clamp(-1.0, 1.0));
        line.remark.clone_from(&remark);
        let target = if kind.key == "cct" { white.cct_k } else { white.duv };
        line.margin = line.value.map(|value| -(value - target).abs());
    }
    vec![cct, duv]
}

fn light_line(project: &Project, set: &EmitterSet, blend: Option<&BlendView>) -> LedgerLine {
    let mut line = LIGHT.line(blend.and_then(|b| b.watts));
    line.limit = match (set.white.lumens, set.white.luminance_cd_per_m2) {
        (Some(lumens), _) => format!("{lumens} lm wanted"),
        (None, Some(luminance)) => format!("{luminance} cd/m\u{b2} wanted"),
        (None, None) => "no lumens wanted yet".to_owned(),
    };
    let used =
        || set.members.iter().filter(|m| m.on && m.share > 0.0).filter_map(|m| project.emitter(m.emitter));
    if let (Some(blend), Some(lumens)) = (blend, set.white.lumens) {
        line.remark = match blend.efficacy_lm_per_w {
            Some(efficacy) => format!("{:.2} W electrical, driver not counted", lumens / efficacy),
            None => "electrical watts need every wall-plug efficiency".to_owned(),
        };
    } else if set.white.luminance_cd_per_m2.is_some() {
        let without: Vec<String> =
            used().filter(|e| !e.sheet.missing().is_empty()).map(|e| e.name.clone()).collect();
        line.limited = true;
        line.state = LineState::Needs(if without.is_empty() {
            "luminance follows from the recipe".to_owned()
        } else {
            format!("needs the emitter sheet of {}", listed(&without))
        });
        if let LineState::Needs(what) = &line.state {
            line.remark.clone_from(what);
        }
    }
    line
}

/// What makes the numbers doubtful: spectra that do not belong together, shares that are no whole, and the like.
pub(crate) fn warnings(
    project: &Project,
    set: &EmitterSet,
    emitters: &[EmitterView],
    blend: Option<&BlendView>,
) -> Vec<String> {
    let mut out = Vec::new();
    let used: Vec<_> = set
        .members
        .iter()
        .filter(|m| m.on && m.share > 0.0)
        .filter_map(|m| project.emitter(m.emitter))
        .collect();
    let any_on = set.members.iter().any(|m| m.on);
    if any_on && (set.share_sum() - 1.0).abs() > 1e-6 {
        out.push(format!(
            "The shares sum to {:.4}, not to 1; the blend is computed as if they were scaled.",
            set.share_sum()
        ));
    }
    for view in emitters.iter().filter(|v| set.members.iter().any(|m| m.emitter == v.id)) {
        if let Err(problem) = &view.light {
            out.push(problem.clone());
        }
    }
    let mut kinds: Vec<(&str, String)> = Vec::new();
    for emitter in &used {
        let kind = match emitter.geometry {
            Geometry::Sphere => "in a sphere".to_owned(),
            Geometry::Normal => "along the normal".to_owned(),
            Geometry::Angle(degrees) => format!("at {degrees}\u{b0}"),
            Geometry::Unknown => continue,
        };
        if kinds.iter().all(|(_, known)| *known != kind) {
            kinds.push((emitter.name.as_str(), kind));
        }
    }
    if let [first, second, ..] = kinds.as_slice() {
        out.push(format!(
            "Geometries are mixed: {} was measured {}, {} {}. The colour of the device will differ from this blend.",
            first.0, first.1, second.0, second.1
        ));
    }
    let films: Vec<String> =
        used.iter().filter(|e| e.origin == Origin::FilmPhotoluminescence).map(|e| e.name.clone()).collect();
    if !films.is_empty() {
        out.push(format!("Photoluminescence of a film is not what a device emits: {}.", listed(&films)));
    }
    let mounted = |wanted| used.iter().find(|e| e.mounting == wanted);
    if let (Some(single), Some(stacked)) = (mounted(Mounting::SingleDevice), mounted(Mounting::InStack)) {
        out.push(format!(
            "Mountings are mixed: {} was measured as a single device, {} inside the stack, whose optics change the curve.",
            single.name, stacked.name
        ));
    }
    if let Some(blend) = blend {
        for (row, member) in blend.rows.iter().zip(&set.members) {
            let Some(light) = row.light.as_ref().filter(|_| member.on && row.radiant > 0.0) else { continue };
            let name = project.emitter(member.emitter).map_or("?", |e| e.name.as_str());
            if light.outside > 1e-3 {
                out.push(format!(
                    "{name}: {:.1} % of the measured power lies outside 380 to 780 nm and is not counted in LER and shares.",
                    100.0 * light.outside
                ));
            }
            out.extend(light.cautions.iter().map(|caution| format!("{name}: {caution}")));
        }
        out.extend(blend.measurement().warnings.iter().cloned());
    }
    out
}

/// "A", "A and B", "A, B and C".
fn listed(names: &[String]) -> String {
    match names {
        [] => String::new(),
        [one] => one.clone(),
        [rest @ .., last] => format!("{} and {last}", rest.join(", ")),
    }
}
