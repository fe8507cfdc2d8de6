//! The words by which instruments of many languages name axes, quantities and columns. All lists are common knowledge of the
//! trade (from memory), folded by [`fold`]: lower case, no accents, micro sign as `u`.

/// Lower case without accents; super- and subscripts as plain digits; multiplication dots as blanks.
pub(super) fn fold(text: &str) -> String {
    let mut folded = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            'µ' | 'μ' => folded.push('u'),
            'Å' | '\u{212b}' => folded.push('å'),
            '²' | '₂' => folded.push('2'),
            '³' => folded.push('3'),
            '¹' => folded.push('1'),
            '⁻' | '−' | '–' => folded.push('-'),
            '·' | '•' | '⋅' | '∙' | '*' | '×' | '\u{a0}' | '\u{202f}' => folded.push(' '),
            '^' => {}
            '’' | '‘' | '`' | '´' => folded.push('\''),
            'ß' => folded.push_str("ss"),
            'æ' | 'Æ' => folded.push_str("ae"),
            'œ' | 'Œ' => folded.push_str("oe"),
            _ => folded.extend(c.to_lowercase().filter_map(|c| match c {
                'à' | 'á' | 'â' | 'ã' | 'ä' | 'ā' | 'ă' | 'ą' => Some('a'),
                'è' | 'é' | 'ê' | 'ë' | 'ě' | 'ę' | 'ė' => Some('e'),
                'ì' | 'í' | 'î' | 'ï' | 'ı' | 'ī' => Some('i'),
                'ò' | 'ó' | 'ô' | 'õ' | 'ö' | 'ø' | 'ő' => Some('o'),
                'ù' | 'ú' | 'û' | 'ü' | 'ů' | 'ű' => Some('u'),
                'ý' | 'ÿ' => Some('y'),
                'ç' | 'č' | 'ć' => Some('c'),
                'ñ' | 'ń' | 'ň' => Some('n'),
                'ř' => Some('r'),
                'š' | 'ś' | 'ş' | 'ș' => Some('s'),
                'ž' | 'ź' | 'ż' => Some('z'),
                'ł' | 'ľ' => Some('l'),
                'ğ' => Some('g'),
                'ť' | 'ț' | 'ţ' => Some('t'),
                'ď' | 'đ' => Some('d'),
                '\u{300}'..='\u{36f}' => None,
                other => Some(other),
            })),
        }
    }
    folded
}

/// Words in a folded text: runs of letters and digits, with the sign of an exponent kept (`cm-1`).
pub(super) fn words(folded: &str) -> Vec<&str> {
    folded.split(|c: char| !(c.is_alphanumeric() || c == '%')).filter(|word| !word.is_empty()).collect()
}

fn any_in(folded: &str, list: &[&str]) -> bool {
    list.iter().any(|&word| {
        if word.is_ascii() && word.len() <= 4 { words(folded).contains(&word) } else { folded.contains(word) }
    })
}

/// Wavelength, in the languages of the makers of instruments.
pub(super) fn names_wavelength(folded: &str) -> bool {
    const WORDS: [&str; 34] = [
        "wavelength",
        "wave length",
        "wave-length",
        "wellenlange",
        "wellenlaenge",
        "longueur d'onde",
        "longueur d onde",
        "longueurs d'onde",
        "longueur_d_onde",
        "lunghezza d'onda",
        "lunghezza onda",
        "lunghezze d'onda",
        "longitud de onda",
        "longitud onda",
        "comprimento de onda",
        "golflengte",
        "vaglangd",
        "bolgelengde",
        "bolgelaengde",
        "aallonpituus",
        "dlugosc fali",
        "vlnova delka",
        "vlnova dlzka",
        "hullamhossz",
        "dalga boyu",
        "lungime de unda",
        "valovna dolzina",
        "talasna duzina",
        "valna duljina",
        "длина волны",
        "波長",
        "波长",
        "파장",
        "μηκος κυματος",
    ];
    any_in(folded, &WORDS)
        || folded.contains("dalgaboyu")
        || folded.contains("μήκος κύματος")
        || words(folded)
            .iter()
            .any(|&word| matches!(word, "wl" | "wvl" | "lambda" | "λ" | "wlen" | "wave" | "wavelen" | "lam"))
}

/// Wavenumber.
pub(super) fn names_wavenumber(folded: &str) -> bool {
    const WORDS: [&str; 16] = [
        "wavenumber",
        "wave number",
        "wave-number",
        "wellenzahl",
        "nombre d'onde",
        "numero d'onda",
        "numero de onda",
        "golfgetal",
        "vagtal",
        "bolgetal",
        "aaltoluku",
        "liczba falowa",
        "vlnocet",
        "волновое число",
        "波数",
        "파수",
    ];
    any_in(folded, &WORDS)
}

/// Photon energy as an axis.
pub(super) fn names_energy(folded: &str) -> bool {
    const WORDS: [&str; 11] = [
        "energy",
        "energie",
        "energia",
        "energi",
        "energija",
        "enerji",
        "энергия",
        "エネルギー",
        "能量",
        "에너지",
        "ενεργεια",
    ];
    any_in(folded, &WORDS) || words(folded).iter().any(|&word| matches!(word, "hv" | "hν"))
}

/// A count of rows or detector elements, which is no spectral axis.
pub(super) fn names_index(folded: &str) -> bool {
    let list = words(folded);
    !list.is_empty()
        && list.iter().all(|&word| {
            matches!(
                word,
                "index"
                    | "idx"
                    | "pixel"
                    | "pixels"
                    | "px"
                    | "no"
                    | "nr"
                    | "num"
                    | "number"
                    | "row"
                    | "line"
                    | "point"
                    | "points"
                    | "channel"
                    | "ch"
                    | "sample"
                    | "count"
                    | "i"
                    | "n"
                    | "id"
                    | "zeile"
                    | "kanal"
                    | "punkt"
                    | "ligne"
                    | "canal"
                    | "indice"
            )
        })
        && !(list.len() == 1
            && matches!(list[0], "sample" | "count" | "n" | "i" | "ch" | "channel" | "id" | "num"))
}

/// Quantities of light as power.
pub(super) fn names_power(folded: &str) -> bool {
    const WORDS: [&str; 25] = [
        "power",
        "leistung",
        "puissance",
        "potenza",
        "potencia",
        "moc",
        "vermogen",
        "effekt",
        "teho",
        "мощность",
        "irradiance",
        "radiance",
        "exitance",
        "radiant",
        "strahldichte",
        "bestrahlungsstarke",
        "strahlstarke",
        "eclairement energetique",
        "irradianza",
        "irradiancia",
        "radianza",
        "spd",
        "放射照度",
        "放射輝度",
        "spectral flux",
    ];
    any_in(folded, &WORDS)
}

/// Photons.
pub(super) fn names_photons(folded: &str) -> bool {
    words(folded).iter().any(|&word| {
        matches!(
            word,
            "photon"
                | "photons"
                | "photonen"
                | "photonenfluss"
                | "photonenstrom"
                | "fotoni"
                | "fotone"
                | "fotones"
                | "foton"
                | "fotonen"
                | "fotons"
                | "fotony"
                | "fotonov"
                | "fotoner"
                | "fotos"
                | "quanta"
                | "quanten"
                | "ppfd"
                | "ppf"
                | "einstein"
                | "einsteins"
                | "фотонов"
                | "фотоны"
        ) || (word.starts_with("photonen") || word.starts_with("fotonen"))
    }) || folded.contains("光子")
        || folded.contains("фотон")
}

/// Uncorrected detector readings.
pub(super) fn names_counts(folded: &str) -> bool {
    words(folded).iter().any(|&word| {
        matches!(
            word,
            "counts"
                | "count"
                | "cts"
                | "cps"
                | "adc"
                | "adu"
                | "dn"
                | "zahlwerte"
                | "zahlrate"
                | "zahler"
                | "impulse"
                | "imp"
                | "coups"
                | "cuentas"
                | "conteggi"
                | "contagens"
                | "tellingen"
                | "counts/s"
                | "zliczenia"
                | "отсчеты"
                | "отсчёты"
                | "имп"
        )
    }) || ["カウント", "计数", "計数", "отсчет"].iter().any(|word| folded.contains(word))
}

/// The quantity named when it is no emission: what a sample does to light, or what a detector makes of it.
pub(super) fn not_emission(folded: &str) -> Option<&'static str> {
    const STEMS: [(&str, &str); 27] = [
        ("absorb", "absorbance"),
        ("absorpt", "absorption"),
        ("assorb", "absorbance"),
        ("absorv", "absorbance"),
        ("absorc", "absorption"),
        ("吸光", "absorbance"),
        ("吸収", "absorption"),
        ("extinct", "extinction"),
        ("extinkt", "extinction"),
        ("optical density", "optical density"),
        ("transmitt", "transmittance"),
        ("transmiss", "transmission"),
        ("transmis", "transmission"),
        ("transmit", "transmittance"),
        ("trasmitt", "transmittance"),
        ("trasmiss", "transmission"),
        ("透過", "transmittance"),
        ("透射", "transmittance"),
        ("reflect", "reflectance"),
        ("reflex", "reflectance"),
        ("reflekt", "reflectance"),
        ("riflett", "reflectance"),
        ("remission", "reflectance"),
        ("反射", "reflectance"),
        ("responsiv", "responsivity"),
        ("quantum efficiency", "quantum efficiency"),
        ("refractive", "refractive index"),
    ];
    if let Some(&(_, name)) = STEMS.iter().find(|(stem, _)| folded.contains(stem)) {
        return Some(name);
    }
    words(folded).iter().find_map(|&word| match word {
        "db" | "dbm" | "log" | "log10" | "ln" | "lg" | "logarithmic" | "logarithm" => Some("a logarithm"),
        "lm" | "lumen" | "lumens" | "lx" | "lux" => Some("a quantity weighted by the eye"),
        "abs" => Some("absorbance"),
        "%t" => Some("transmittance"),
        "%r" => Some("reflectance"),
        "od" => Some("optical density"),
        "eqe" | "iqe" | "ipce" => Some("quantum efficiency"),
        "excitation" | "anregung" | "ple" => Some("excitation"),
        "temperature" | "temperatur" => Some("temperature"),
        _ => None,
    })
}

/// Uncertainty of another column.
pub(super) fn names_uncertainty(folded: &str) -> bool {
    words(folded).iter().any(|&word| {
        matches!(
            word,
            "std"
                | "stdev"
                | "stddev"
                | "sigma"
                | "uncertainty"
                | "uncert"
                | "unsicherheit"
                | "incertitude"
                | "error"
                | "err"
                | "fehler"
                | "sd"
                | "sem"
        )
    }) || folded.contains("standard deviation")
}

/// Why a column is set aside where others remain.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Aside {
    Dark,
    Reference,
    Raw,
    Uncertainty,
    NotEmission(&'static str),
}

impl Aside {
    pub(super) const fn word(self) -> &'static str {
        match self {
            Self::Dark => "dark",
            Self::Reference => "reference",
            Self::Raw => "raw",
            Self::Uncertainty => "uncertainty",
            Self::NotEmission(what) => what,
        }
    }
}

/// Whether a column's name says it is dark, reference or raw. "Dark red" is a colour; "ref" inside a longer word is a name.
pub(super) fn aside(folded: &str) -> Option<Aside> {
    let list = words(folded);
    let colour = |word: &str| {
        matches!(
            word,
            "red"
                | "blue"
                | "green"
                | "amber"
                | "cyan"
                | "teal"
                | "yellow"
                | "orange"
                | "violet"
                | "purple"
                | "magenta"
                | "pink"
                | "white"
                | "brown"
                | "rot"
                | "blau"
                | "grun"
                | "rouge"
                | "bleu"
                | "vert"
                | "lime"
                | "indigo"
                | "gold"
                | "grey"
                | "gray"
                | "mint"
                | "turquoise"
                | "crimson"
                | "skin"
        )
    };
    for (index, &word) in list.iter().enumerate() {
        let next = list.get(index + 1).copied().unwrap_or("");
        match word {
            "dark" if !colour(next) => return Some(Aside::Dark),
            "background" | "bkg" | "bkgd" | "bgd" | "baseline" | "dunkel" | "dunkelstrom"
            | "dunkelspektrum" | "dunkelsignal" | "hintergrund" | "obscurite" | "obscur" | "oscuro"
            | "oscuridad" | "buio" | "fondo" | "fond" | "sfondo" | "donker" | "morke" | "暗" => {
                return Some(Aside::Dark);
            }
            "reference" | "ref" | "referenz" | "referenzspektrum" | "riferimento" | "referencia"
            | "referens" | "referentie" => {
                return Some(Aside::Reference);
            }
            "raw" | "rohdaten" | "rohsignal" | "roh" | "rohwerte" | "brut" | "brute" | "grezzo" | "crudo"
            | "scope" => return Some(Aside::Raw),
            _ => {}
        }
    }
    None
}

/// How many words of a spectrum's header a decoded text holds that only a right decoding shows.
pub(super) fn foreign_score(text: &str) -> usize {
    let folded = fold(text);
    [
        "波長",
        "波长",
        "파장",
        "光",
        "強度",
        "强度",
        "длина",
        "волны",
        "нм",
        "강도",
        "相対",
        "相对",
        "интенсивность",
        "測定",
        "测量",
    ]
    .iter()
    .filter(|word| folded.contains(*word))
    .count()
}
