//! Conversions to power per nm over nm. Formulas: docs/methods/reading.md.

use super::answers::{AxisUnit, Ordinate, Per};

/// Planck's constant times the speed of light, eV nm (CODATA 2018, exact in the revised SI: 1239.841 984 332…).
pub(super) const HC_EV_NM: f64 = 1_239.841_984_332_002_6;

/// Whether a wavelength takes part in colour sums.
pub(super) fn visible(nm: f64) -> bool {
    (380.0..=780.0).contains(&nm)
}

/// Wavelength in nm of an axis value; λ = hc/E = 10⁷/ν̄. Not finite for values ≤ 0 of energy and wavenumber.
pub(super) fn nm_from(value: f64, unit: AxisUnit) -> f64 {
    match unit {
        AxisUnit::Nm => value,
        AxisUnit::Um => value * 1e3,
        AxisUnit::Angstrom => value * 0.1,
        AxisUnit::M => value * 1e9,
        AxisUnit::Cm1 if value > 0.0 => 1e7 / value,
        AxisUnit::Ev if value > 0.0 => HC_EV_NM / value,
        AxisUnit::Cm1 | AxisUnit::Ev => f64::NAN,
    }
}

/// What to multiply an ordinate by to get power per nm, up to a constant: |dE/dλ| = E²/hc, |dν̄/dλ| = ν̄²/10⁷, and E for photons.
pub(super) fn factor(nm: f64, ordinate: Ordinate, per: Per) -> f64 {
    let energy = HC_EV_NM / nm;
    let interval = match per {
        Per::Nm => 1.0,
        Per::Ev => energy * energy / HC_EV_NM,
        Per::Cm1 => 1e7 / (nm * nm),
    };
    match ordinate {
        Ordinate::Power => interval,
        Ordinate::Photons => interval * energy,
    }
}

/// The sentence for an axis conversion; `None` for nm.
pub(super) fn axis_sentence(unit: AxisUnit, scale: f64) -> Option<String> {
    let how = match unit {
        AxisUnit::Nm if scale == 1.0 => return None,
        AxisUnit::Nm => format!("Axis converted to nm (multiplied by {scale})."),
        AxisUnit::Um => "Axis converted from µm to nm (multiplied by 1000).".to_owned(),
        AxisUnit::Angstrom => "Axis converted from Å to nm (multiplied by 0.1).".to_owned(),
        AxisUnit::M => "Axis converted from m to nm (multiplied by 10⁹).".to_owned(),
        AxisUnit::Cm1 => "Axis converted from wavenumber in cm⁻¹ to wavelength in nm (10⁷/ν̄).".to_owned(),
        AxisUnit::Ev => {
            "Axis converted from photon energy in eV to wavelength in nm (1239.842/E).".to_owned()
        }
    };
    Some(how)
}

/// The sentences for ordinate conversions.
pub(super) fn ordinate_sentences(ordinate: Ordinate, per: Per) -> Vec<String> {
    let mut sentences = Vec::new();
    if ordinate == Ordinate::Photons {
        sentences.push(
            "Values converted from photons to power (multiplied by the photon energy hc/λ).".to_owned(),
        );
    }
    match per {
        Per::Nm => {}
        Per::Ev => sentences.push("Values converted from per eV to per nm (multiplied by E²/hc).".to_owned()),
        Per::Cm1 => {
            sentences.push("Values converted from per cm⁻¹ to per nm (multiplied by 10⁷/λ²).".to_owned());
        }
    }
    sentences
}

#[cfg(test)]
mod tests {
    use super::*;

    /// CODATA 2018: h = 6.626 070 15e-34 J s, c = 299 792 458 m/s, e = 1.602 176 634e-19 C, all exact.
    #[test]
    fn hc_follows_from_the_defining_constants() {
        let hc = 6.626_070_15e-34 * 299_792_458.0 / 1.602_176_634e-19 * 1e9;
        assert!((hc - HC_EV_NM).abs() < 1e-9);
    }

    /// A Gaussian in photons per eV at 2.25 eV, FWHM 0.30 eV, peaks at 545.84 nm in W/nm (computed from |dE/dλ|, from memory of
    /// no table: the stationary point of E³·exp(−4 ln 2 ((E−2.25)/0.3)²)).
    #[test]
    fn photons_per_ev_peak_moves_to_the_blue() {
        let power = |nm: f64| {
            let energy = HC_EV_NM / nm;
            factor(nm, Ordinate::Photons, Per::Ev)
                * (-4.0 * 2f64.ln() * ((energy - 2.25) / 0.3).powi(2)).exp()
        };
        let peak = (54_000..56_000)
            .map(|step| f64::from(step) / 100.0)
            .max_by(|a, b| power(*a).total_cmp(&power(*b)))
            .unwrap();
        assert!((peak - 545.84).abs() < 0.011, "{peak}");
    }

    /// Area is kept: equal power per cm⁻¹ between two wavenumbers gives the same total per nm.
    #[test]
    fn densities_keep_their_area() {
        for (per, from, to, span) in [
            (Per::Cm1, 1e7 / 700.0, 1e7 / 400.0, 1e7 / 400.0 - 1e7 / 700.0),
            (Per::Ev, HC_EV_NM / 700.0, HC_EV_NM / 400.0, HC_EV_NM / 400.0 - HC_EV_NM / 700.0),
        ] {
            let area: f64 = (0..30_000)
                .map(|step| factor(400.005 + 0.01 * f64::from(step), Ordinate::Power, per) * 0.01)
                .sum();
            assert!((area / span - 1.0).abs() < 1e-6, "{per:?} {from} {to}");
        }
    }
}
