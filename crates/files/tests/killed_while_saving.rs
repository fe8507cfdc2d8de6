//! A program killed at any instant while it saves leaves the last project or the one before it.
//!
//! Twenty rounds by default; `KILL_ROUNDS=1000 cargo test -p files --test killed_while_saving` for the long run. The
//! instants come from a fixed sequence, though the machine's own timing adds to them.

#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

use files::journal::{Header, Journal, read_journal};
use files::project_file::{open_project, project_text};
use files::save::{backup_path, save};
use project::Project;
use std::path::Path;
use std::process::{Command, Stdio};
use std::time::{Duration, Instant};

const FOLDER: &str = "KILLED_WHILE_SAVING_FOLDER";

fn generation(number: u64) -> Project {
    let mut project = Project::new(format!("generation {number}"));
    // Long enough for a write to be caught in the middle.
    project.note = number.to_string().repeat(200_000);
    project
}

fn check(project: &Project) -> u64 {
    let number: u64 = project.name.strip_prefix("generation ").unwrap().parse().unwrap();
    assert!(*project == generation(number), "generation {number} is whole");
    number
}

/// Saves and journals for ever; this process is killed.
fn save_for_ever(folder: &Path) -> ! {
    let path = folder.join("cabin.ron");
    let mut journal = Journal::begin(folder, &Header::new("test", None, generation(0))).unwrap();
    let mut number = open_project(&path).map_or(0, |opened| check(&opened.project));
    loop {
        number += 1;
        save(&path, project_text(&generation(number)).unwrap().as_bytes(), None).unwrap();
        journal.append(&[number]).unwrap();
        if journal.entries() > 5 {
            journal.restart(&Header::new("test", Some(path.clone()), generation(number))).unwrap();
        }
    }
}

#[test]
fn the_last_or_the_previous_project_is_there_after_every_kill() {
    if let Some(folder) = std::env::var_os(FOLDER) {
        save_for_ever(Path::new(&folder));
    }
    let rounds: u64 = std::env::var("KILL_ROUNDS").ok().and_then(|text| text.parse().ok()).unwrap_or(20);
    let folder = tempfile::tempdir().unwrap();
    let path = folder.path().join("cabin.ron");
    let mut instant = 12345_u64;
    let mut before = 0;
    for round in 0..rounds {
        let mut child = Command::new(std::env::current_exe().unwrap())
            .args(["--exact", "the_last_or_the_previous_project_is_there_after_every_kill"])
            .env(FOLDER, folder.path())
            .stdout(Stdio::null())
            .spawn()
            .unwrap();
        // The child is at work once a journal of its own is there.
        let started = Instant::now();
        while journals(folder.path()).is_empty() && started.elapsed() < Duration::from_secs(60) {
            std::thread::sleep(Duration::from_millis(1));
        }
        instant = instant.wrapping_mul(6_364_136_223_846_793_005).wrapping_add(1_442_695_040_888_963_407);
        std::thread::sleep(Duration::from_micros((instant >> 33) % 40_000));
        child.kill().unwrap();
        child.wait().unwrap();
        if path.exists() {
            let number = check(&open_project(&path).unwrap().project);
            assert!(number >= before, "round {round}: went back from {before} to {number}");
            before = number;
            if let Ok(backup) = open_project(&backup_path(&path)) {
                let kept = check(&backup.project);
                assert!(kept == number || kept + 1 == number, "round {round}: {kept} beside {number}");
            }
        }
        for journal in journals(folder.path()) {
            if let Ok(found) = read_journal::<u64>(&journal) {
                assert!(found.entries.windows(2).all(|pair| pair[0] + 1 == pair[1]), "{:?}", found.entries);
            }
            std::fs::remove_file(journal).unwrap();
        }
    }
    assert!(rounds < 5 || before > 0, "something was saved in {rounds} rounds");
}

fn journals(folder: &Path) -> Vec<std::path::PathBuf> {
    std::fs::read_dir(folder)
        .unwrap()
        .map(|entry| entry.unwrap().path())
        .filter(|path| path.extension().is_some_and(|extension| extension == "journal"))
        .collect()
}
