//! The rules of the house, checked over the files of the project itself.

use serde_json::Value;
use std::collections::BTreeSet;
use std::path::{Path, PathBuf};
use std::process::Command;

fn root() -> PathBuf {
    Path::new(env!("CARGO_MANIFEST_DIR")).parent().expect("the workspace").to_owned()
}

/// Every file of the project with one of these endings, build products aside.
fn files(endings: &[&str]) -> Vec<PathBuf> {
    fn walk(folder: &Path, endings: &[&str], found: &mut Vec<PathBuf>) {
        for entry in std::fs::read_dir(folder).expect("a folder of the project").flatten() {
            let path = entry.path();
            let name = entry.file_name().to_string_lossy().into_owned();
            if path.is_dir() {
                if !matches!(name.as_str(), "target" | ".git") {
                    walk(&path, endings, found);
                }
            } else if endings.iter().any(|e| name.ends_with(e)) {
                found.push(path);
            }
        }
    }
    let mut found = Vec::new();
    walk(&root(), endings, &mut found);
    found.sort();
    assert!(!found.is_empty(), "files ending in {endings:?}");
    found
}

fn text(path: &Path) -> String {
    String::from_utf8_lossy(&std::fs::read(path).expect("a file of the project")).into_owned()
}

fn shown(path: &Path) -> String {
    path.strip_prefix(root()).unwrap_or(path).display().to_string()
}

/// Fails with every breach at once.
#[track_caller]
fn none(rule: &str, breaches: &[String]) {
    assert!(breaches.is_empty(), "{rule}:\n{}", breaches.join("\n"));
}

#[test]
fn modules_stay_short_enough_to_read() {
    // The aim is 100 to 400 lines; this is the ceiling.
    const MOST_LINES: usize = 750;
    let breaches: Vec<String> = files(&[".rs"])
        .iter()
        .filter_map(|path| {
            let text = text(path);
            let code = text.lines().take_while(|line| !line.starts_with("#[cfg(test)]")).count();
            (code > MOST_LINES).then(|| format!("{}: {code} lines before its tests", shown(path)))
        })
        .collect();
    none("a module holds one subject and stays below the ceiling, tests aside", &breaches);
}

#[test]
fn nothing_is_left_half_done_and_no_machine_is_named() {
    // Written in two parts each, so that this file does not hold what it looks for.
    let words: Vec<String> = [
        ("TO", "DO"),
        ("FIX", "ME"),
        ("HA", "CK"),
        ("#[ign", "ore"),
        ("unimpl", "emented!"),
        ("/ho", "me/"),
        ("/ro", "ot/"),
        ("/wo", "rk/"),
        ("/tm", "p/"),
        ("crates", ".io"),
        ("py", "pi"),
        ("npm", "js"),
    ]
    .iter()
    .map(|(a, b)| format!("{a}{b}"))
    .collect();
    let mut breaches = Vec::new();
    for path in files(&[".rs", ".md", ".toml", ".ron", ".csv", ".py", ".sh", ".bib", "run", "smoke"]) {
        for (number, line) in text(&path).lines().enumerate() {
            for word in words.iter().filter(|w| line.contains(w.as_str())) {
                breaches.push(format!("{}:{}: {word}", shown(&path), number + 1));
            }
        }
    }
    none("no unfinished work, no path of one machine, no registry host", &breaches);
}

#[test]
fn prose_is_british() {
    let words = [
        "behavior",
        "neighbor",
        "optimize",
        "normalize",
        "minimize",
        "maximize",
        "analyze",
        "center ",
        "gray ",
    ];
    let mut breaches = Vec::new();
    for path in files(&[".md"]) {
        for (number, line) in text(&path).lines().enumerate() {
            let line = line.to_lowercase();
            for word in words.iter().filter(|w| line.contains(**w)) {
                breaches.push(format!("{}:{}: {word}", shown(&path), number + 1));
            }
        }
    }
    none("British spelling in prose", &breaches);
}

#[test]
fn every_table_names_its_source_and_licence() {
    let mut breaches = Vec::new();
    for path in files(&[".csv"]).iter().filter(|p| p.starts_with(root().join("assets/tables"))) {
        let text = text(path);
        for tag in ["# what:", "# source:", "# licence"] {
            if !text.lines().take(4).any(|line| line.starts_with(tag)) {
                breaches.push(format!("{}: no line `{tag}` on top", shown(path)));
            }
        }
        let name = path.file_name().expect("a name").to_string_lossy().into_owned();
        let attribution = text_of("ATTRIBUTION.md");
        let covered = attribution.contains(&name)
            || (name.starts_with("illuminants_") && attribution.contains("illuminants_*"));
        if !covered {
            breaches.push(format!("{}: not in ATTRIBUTION.md", shown(path)));
        }
    }
    none("published tables carry their source and licence", &breaches);
}

fn text_of(name: &str) -> String {
    text(&root().join(name))
}

#[test]
fn every_citation_has_an_entry_and_every_entry_is_cited() {
    let bib = text_of("docs/references.bib");
    let entries: BTreeSet<String> = bib
        .lines()
        .filter(|line| line.starts_with('@'))
        .filter_map(|line| line.split_once('{'))
        .map(|(_, rest)| rest.trim_end_matches(',').trim().to_owned())
        .collect();
    assert!(!entries.is_empty(), "entries in docs/references.bib");
    let mut cited = BTreeSet::new();
    for path in files(&[".md", ".rs"]) {
        let text = text(&path);
        let mut rest = text.as_str();
        while let Some(at) = rest.find("[@") {
            rest = &rest[at + 2..];
            let Some(end) = rest.find(']') else { break };
            for key in rest[..end].split(';') {
                let key = key.trim().trim_start_matches('@');
                let key = key.split([',', ' ']).next().unwrap_or_default();
                if !key.is_empty() && key.chars().all(|c| c.is_ascii_alphanumeric() || "_-:".contains(c)) {
                    cited.insert(key.to_owned());
                }
            }
        }
    }
    let missing: Vec<String> = cited.difference(&entries).cloned().collect();
    none("cited but not in docs/references.bib", &missing);
    let idle: Vec<String> = entries.difference(&cited).cloned().collect();
    none("in docs/references.bib but cited nowhere", &idle);
}

fn metadata() -> Value {
    let cargo = env!("CARGO");
    let version = Command::new(cargo).arg("-vV").output().expect("cargo runs").stdout;
    let version = String::from_utf8(version).expect("UTF-8");
    let host = version.lines().find_map(|l| l.strip_prefix("host: ")).expect("a host line").to_owned();
    let output = Command::new(cargo)
        .current_dir(root())
        .args(["metadata", "--format-version", "1", "--offline", "--locked", "--filter-platform", &host])
        .output()
        .expect("cargo runs");
    assert!(output.status.success(), "{}", String::from_utf8_lossy(&output.stderr));
    serde_json::from_slice(&output.stdout).expect("JSON from cargo metadata")
}

/// True when an SPDX expression (or an old one with `/` for OR) can be fulfilled by the allowed licences.
fn is_allowed(expression: &str, allowed: &BTreeSet<String>) -> bool {
    // OR binds weaker than AND; parentheses are taken apart from the inside.
    let mut text = expression.replace('/', " OR ");
    while let Some(close) = text.find(')') {
        let Some(open) = text[..close].rfind('(') else { return false };
        let inner = if is_allowed(&text[open + 1..close], allowed) { "\u{1}" } else { "\u{2}" };
        text = format!("{}{inner}{}", &text[..open], &text[close + 1..]);
    }
    text.split(" OR ").any(|alternative| {
        alternative.split(" AND ").all(|one| {
            let one = one.trim();
            one == "\u{1}" || allowed.contains(one)
        })
    })
}

#[test]
fn licence_expressions_are_judged_rightly() {
    let allowed: BTreeSet<String> = ["MIT", "Apache-2.0", "Unicode-3.0"].map(str::to_owned).into();
    for good in [
        "MIT",
        "MIT OR GPL-3.0-only",
        "MIT/Apache-2.0",
        "(MIT OR GPL-3.0-only) AND Unicode-3.0",
        "Apache-2.0 AND MIT",
    ] {
        assert!(is_allowed(good, &allowed), "{good}");
    }
    for bad in [
        "GPL-3.0-only",
        "MIT AND GPL-3.0-only",
        "(GPL-3.0-only OR LGPL-3.0) AND MIT",
        "",
        "MIT AND (GPL-2.0)",
    ] {
        assert!(!is_allowed(bad, &allowed), "{bad}");
    }
}

#[test]
fn dependencies_keep_to_the_licence_list() {
    let deny = text_of("deny.toml");
    let list =
        deny.split_once("allow = [").and_then(|(_, rest)| rest.split_once(']')).expect("the allow list").0;
    let allowed: BTreeSet<String> = list
        .lines()
        .filter_map(|line| line.trim().strip_prefix('"'))
        .filter_map(|line| line.split_once('"'))
        .map(|(licence, _)| licence.to_owned())
        .collect();
    assert!(allowed.contains("MIT") && !allowed.iter().any(|l| l.contains("GPL")), "{allowed:?}");
    let breaches: Vec<String> = metadata()["packages"]
        .as_array()
        .expect("packages")
        .iter()
        .filter(|package| !package["source"].is_null())
        .filter_map(|package| {
            let licence = package["license"].as_str().unwrap_or_default();
            (!is_allowed(licence, &allowed)).then(|| format!("{}: `{licence}`", package["name"]))
        })
        .collect();
    none("licences allowed in deny.toml", &breaches);
}

#[test]
fn dependencies_between_the_crates_point_one_way() {
    let ours = ["colour", "optimiser", "device", "project", "files", "whitesmith"];
    let allowed: [(&str, &[&str]); 5] = [
        ("colour", &[]),
        ("optimiser", &["colour"]),
        ("device", &["colour"]),
        ("project", &["colour", "device"]),
        ("files", &["colour", "device", "project"]),
    ];
    let metadata = metadata();
    let packages = metadata["packages"].as_array().expect("packages");
    let mut breaches = Vec::new();
    for (name, may_use) in allowed {
        let package =
            packages.iter().find(|p| p["name"] == name).unwrap_or_else(|| panic!("the crate {name}"));
        for dependency in package["dependencies"].as_array().expect("dependencies") {
            // Checks may look further than the code they check.
            if dependency["kind"] == "dev" {
                continue;
            }
            let used = dependency["name"].as_str().expect("a name");
            if ours.contains(&used) && !may_use.contains(&used) {
                breaches.push(format!("{name} uses {used}"));
            }
            if ["egui", "eframe", "winit", "rfd", "clap", "softbuffer"].iter().any(|w| used.starts_with(w)) {
                breaches.push(format!("{name} uses {used}, which belongs to the application"));
            }
        }
    }
    none(
        "colour ← optimiser; colour ← device ← project ← files; the window only in the application",
        &breaches,
    );
}
