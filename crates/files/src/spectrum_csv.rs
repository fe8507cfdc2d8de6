//! The predicted spectrum of a blend, 380 to 780 nm in steps of 1 nm.

use crate::blend_sheet::{SheetError, Used};
use crate::cells::safe_cell;
use colour::Tensor;
use project::{Project, SetId};
use std::fmt::Write as _;

/// Two columns: wavelength in nm, and power per nm of a blend of one optical watt inside 380–780 nm (so the column
/// sums to 1). Numbers are the shortest that read back the same.
///
/// # Errors
/// When there is no blend.
pub fn predicted_spectrum_csv(project: &Project, set: SetId) -> Result<String, SheetError> {
    let curve = predicted_curve(project, set)?;
    let name = project.set(set).map_or("blend", |set| set.name.as_str());
    let title = format!("{} (W/nm)", safe_cell(name)).replace('"', "\"\"");
    let mut text = format!("Wavelength (nm),\"{title}\"\n");
    for (nm, power) in (380..).zip(curve) {
        // Writing to a String cannot fail.
        let _ = writeln!(text, "{nm},{power:e}");
    }
    Ok(text)
}

/// Power per nm at 380, 381 … 780 nm of a blend of one optical watt.
///
/// # Errors
/// When there is no blend.
pub fn predicted_curve(project: &Project, set: SetId) -> Result<Vec<f64>, SheetError> {
    let used = Used::of(project, set)?;
    let mut curve = vec![0.0; colour::GRID_POINTS];
    for (spectrum, share) in used.spectra.iter().zip(&used.shares) {
        let grid = spectrum.on_colour_grid();
        let watts = Tensor::of_grid(&grid).radiant_power();
        curve.iter_mut().zip(grid).for_each(|(sum, power)| *sum += share * power / watts);
    }
    Ok(curve)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::blend_sheet::tests::demo;

    #[test]
    fn the_predicted_spectrum_measures_as_the_blend_does() {
        let project = demo();
        let set = project.sets[0].id;
        let text = predicted_spectrum_csv(&project, set).unwrap();
        let rows: Vec<(f64, f64)> = text
            .lines()
            .skip(1)
            .map(|line| line.split_once(',').map(|(a, b)| (a.parse().unwrap(), b.parse().unwrap())).unwrap())
            .collect();
        assert_eq!((rows.len(), rows[0].0, rows[400].0), (401, 380.0, 780.0));
        let curve: Vec<f64> = rows.iter().map(|r| r.1).collect();
        assert!((curve.iter().sum::<f64>() - 1.0).abs() < 1e-12);
        let sheet = crate::blend_sheet::BlendSheet::of(&project, set, "test", None).unwrap();
        let measured = colour::measure::measure(&Tensor::of_grid(&curve));
        let predicted = &sheet.predicted.colour;
        assert!((measured.x - predicted.x).abs() < 1e-12);
        assert!((measured.ra.unwrap() - predicted.ra.unwrap()).abs() < 1e-8);
    }

    #[test]
    fn a_name_that_would_run_is_defused() {
        let mut project = demo();
        project.sets[0].name = "=HYPERLINK(\"x\")".into();
        let text = predicted_spectrum_csv(&project, project.sets[0].id).unwrap();
        assert!(text.starts_with("Wavelength (nm),\"'=HYPERLINK(\"\"x\"\") (W/nm)\"\n"), "{}", &text[..60]);
    }
}
