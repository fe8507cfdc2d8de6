//! The demo projects, carried inside the program so that it opens on one from any folder.
//!
//! A maker of reading lamps and wall panels for night ferries; every emitter is invented and marked so. Written by
//! `cargo run --release -p whitesmith --example make_demos -- assets`.

use files::project_file::{ProjectFileError, read_project};
use project::Project;

/// The cabin panel, 3000 K: organic, quantum-dot and perovskite emitters; the project the window opens on.
pub const CABIN: &str = include_str!("../../../../assets/night-ferry-cabin.ron");
/// The library lamp, 2200 to 5000 K: inorganic emitters and phosphors.
pub const LIBRARY: &str = include_str!("../../../../assets/night-ferry-library.ron");

/// Both demo projects: the name of the file under `assets/`, and its text.
pub const ALL: [(&str, &str); 2] = [("night-ferry-cabin.ron", CABIN), ("night-ferry-library.ron", LIBRARY)];

/// The project the window opens on when none is named.
///
/// # Errors
/// Never for the text carried in the program: a test opens it.
pub fn cabin() -> Result<Project, ProjectFileError> {
    read_project(CABIN.as_bytes()).map(|opened| opened.project)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::state::derived::{Cache, LineState};
    use std::path::Path;

    #[test]
    fn every_project_under_assets_is_carried_and_opens_within_its_limits() {
        let folder = Path::new(env!("CARGO_MANIFEST_DIR")).join("../../assets");
        let mut found = Vec::new();
        for entry in std::fs::read_dir(folder).unwrap() {
            let path = entry.unwrap().path();
            if path.extension().is_some_and(|extension| extension == "ron") {
                let name = path.file_name().unwrap().to_str().unwrap().to_owned();
                let carried = ALL.iter().find(|(file, _)| *file == name).expect("every demo is carried").1;
                assert_eq!(std::fs::read_to_string(path).unwrap(), carried);
                found.push(name);
            }
        }
        assert_eq!(found.len(), ALL.len());
        for (name, text) in ALL {
            let project = read_project(text.as_bytes()).unwrap().project;
            assert!(project.emitters.len() >= 7, "{name}");
            assert!(project.emitters.iter().all(|e| e.invented && e.note.starts_with("Invented")), "{name}");
            let mut sets = project.sets.clone();
            assert!(project.current().is_some());
            // The current set first of all, and every other one as well.
            for set in sets.drain(..) {
                let chosen = Project { current_set: Some(set.id), ..project.clone() };
                let derived = Cache::new().of_project(&chosen, 0);
                assert!((set.share_sum() - 1.0).abs() < 1e-9, "{name}, {}", set.name);
                for line in derived.ledger.iter().filter(|line| line.limited && line.key != "light") {
                    assert_eq!(line.state, LineState::Met, "{name}, {}: {line:?}", set.name);
                }
                assert!(derived.warnings.is_empty(), "{name}, {}: {:?}", set.name, derived.warnings);
            }
        }
    }

    #[test]
    fn the_demos_are_what_the_program_would_write() {
        for (name, text) in ALL {
            let project = read_project(text.as_bytes()).unwrap().project;
            assert!(files::project_file::project_text(&project).unwrap() == text, "{name}");
        }
    }
}
