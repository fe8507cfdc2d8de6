//! CIE 15: chromaticities and nominal CCTs of the CIE sources, as 5 nm sums.
//!
//! A spectrum that is zero between its 5 nm samples turns the 1 nm sums of the colour crate into 5 nm sums.

use checks::table::Table;
use colour::illuminant::{cie_source, cie_source_names};
use colour::locus::cct_duv;
use colour::{Observer, Tensor, Xyz};

/// The published chromaticities are printed to four or five digits.
const XY: f64 = 1e-4;

/// The source summed at its own 5 nm steps.
fn five_nanometre_tensor(name: &str) -> Tensor {
    let source = cie_source(name).unwrap_or_else(|| panic!("{name} is an embedded source"));
    let mut grid = vec![0.0; 401];
    for (nm, value) in source.wavelengths_nm().iter().zip(source.values()) {
        if (380.0..=780.0).contains(nm) {
            grid[(nm - 380.0).round() as usize] = *value;
        }
    }
    Tensor::of_grid(&grid)
}

fn five_nanometre_sums(name: &str) -> Xyz {
    five_nanometre_tensor(name).xyz(Observer::Cie1931)
}

/// Published rows of one quantity: source, value, where it was read.
fn rows(quantity: &str, from: &str) -> Vec<(String, f64, String)> {
    let table = Table::read("golden/published.csv");
    (0..table.len())
        .filter(|row| table.text(*row, "quantity") == quantity && table.text(*row, "source").contains(from))
        .map(|row| {
            let value = table.number(row, "published").expect("a published value");
            (table.text(row, "name").to_owned(), value, table.text(row, "source").to_owned())
        })
        .collect()
}

#[test]
fn chromaticities_of_the_47_sources() {
    for (quantity, of) in [("x", 0), ("y", 1)] {
        let rows = rows(quantity, "CIE 15:2004 (LED series: CIE 15:2018)");
        assert_eq!(rows.len(), 47);
        assert_eq!(cie_source_names().len(), 47);
        for (name, published, source) in rows {
            let xy = five_nanometre_sums(&name).xy();
            let got = [xy.x, xy.y][of];
            assert!((got - published).abs() <= XY, "{name} {quantity}: {got}, {source} has {published}");
        }
    }
}

/// CIE 15 nominal values, from memory: D illuminants and A to 1 K, fluorescent ones to 10 K, LED ones to 1 K.
#[test]
fn nominal_ccts() {
    let rows = rows("CCT", "from memory");
    assert_eq!(rows.len(), 27);
    for (name, published, source) in rows {
        let found = cct_duv(five_nanometre_sums(&name).uv()).expect("a CCT").cct_k;
        // c₂ was 1.4380e-2 when these were fixed, and sums at 5 nm leave a few kelvin.
        let tolerance = if name.starts_with("FL") { 10.0 } else { 1e-3 * published };
        assert!((found - published).abs() <= tolerance, "{name}: {found} K, {source} has {published}");
    }
}

/// CIE 15, 10° observer, from memory: A .45117 .40594, C .31039 .31905, D50 .34773 .35952, D65 .31382 .33100.
#[test]
fn chromaticities_for_the_10_degree_observer() {
    for (name, x, y) in [
        ("A", 0.45117, 0.40594),
        ("C", 0.31039, 0.31905),
        ("D50", 0.34773, 0.35952),
        ("D65", 0.31382, 0.33100),
    ] {
        let xy = five_nanometre_tensor(name).xyz(Observer::Cie1964).xy();
        assert!((xy.x - x).abs() <= XY && (xy.y - y).abs() <= XY, "{name}: {xy:?}");
    }
}
