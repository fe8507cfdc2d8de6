//! The window as it looks: four pictures, painted without a display and compared with the kept ones.
//!
//! `UPDATE_SNAPSHOTS=1 cargo test -p checks --test window_pictures` writes them anew: look at them before keeping them.

#![allow(clippy::unwrap_used, reason = "a test fails by panicking")]

mod window_support;

use egui::Theme;
use std::path::PathBuf;
use window_support::Driven;

/// Greatest difference of a channel that counts as the same colour: rounding of transcendental functions differs between
/// systems.
const SAME: u8 = 6;
/// Part of the pixels that may differ: the edge of a glyph here and there.
const MAY_DIFFER: f64 = 2e-4;

#[track_caller]
fn check(name: &str, width: f32, height: f32, theme: Theme) {
    let mut driven = Driven::open(width, height, theme);
    let (columns, rows, bytes) = driven.picture();
    assert_eq!((columns, rows), (width as usize, height as usize));
    let again = driven.picture();
    assert!(again.2 == bytes, "the same frame painted twice gives the same bytes");

    let path = PathBuf::from(env!("CARGO_MANIFEST_DIR")).join("snapshots").join(format!("{name}.png"));
    let picture = image::RgbaImage::from_raw(columns as u32, rows as u32, bytes).unwrap();
    if std::env::var_os("UPDATE_SNAPSHOTS").is_some() {
        std::fs::create_dir_all(path.parent().unwrap()).unwrap();
        picture.save(&path).unwrap();
        return;
    }
    let kept = image::open(&path).unwrap_or_else(|error| panic!("{}: {error}", path.display())).to_rgba8();
    assert_eq!(kept.dimensions(), picture.dimensions());
    let differs = kept
        .pixels()
        .zip(picture.pixels())
        .filter(|(a, b)| a.0.iter().zip(&b.0).any(|(a, b)| a.abs_diff(*b) > SAME))
        .count();
    let part = differs as f64 / (columns * rows) as f64;
    if part > MAY_DIFFER {
        let new = path.with_extension("new.png");
        picture.save(&new).unwrap();
        panic!(
            "{name}: {differs} pixels differ ({:.3} %); the new picture is {}",
            part * 100.0,
            new.display()
        );
    }
}

#[test]
fn small_and_light() {
    check("mixing-1280x720-light", 1280.0, 720.0, Theme::Light);
}

#[test]
fn small_and_dark() {
    check("mixing-1280x720-dark", 1280.0, 720.0, Theme::Dark);
}

#[test]
fn large_and_light() {
    check("mixing-2560x1440-light", 2560.0, 1440.0, Theme::Light);
}

#[test]
fn large_and_dark() {
    check("mixing-2560x1440-dark", 2560.0, 1440.0, Theme::Dark);
}
