//! Wien's displacement and the Stefan–Boltzmann law (CODATA 2018 constants), for the Planckian of the references.

use colour::illuminant::{planckian_exitance_w_per_m2_nm, planckian_relative};

/// c₂ here is 1.4388e-2 m·K, 1.6e-5 above CODATA's 1.438776877e-2.
const C2_RELATIVE: f64 = 1.7e-5;

/// λ_max·T = 2.897771955e-3 m·K.
#[test]
fn wien() {
    for temperature_k in [1500.0, 2856.0, 6504.0, 12_000.0] {
        let curve = |nm: f64| planckian_exitance_w_per_m2_nm(nm, temperature_k);
        let (mut low, mut high) = (100.0, 4000.0);
        while high - low > 1e-7 {
            let (a, b) = (low + (high - low) / 3.0, high - (high - low) / 3.0);
            if curve(a) < curve(b) {
                low = a;
            } else {
                high = b;
            }
        }
        let product_m_k = 0.5e-9 * (low + high) * temperature_k;
        assert!((product_m_k / 2.897_771_955e-3 - 1.0).abs() < 2.0 * C2_RELATIVE, "{product_m_k}");
    }
}

/// M = σT⁴, σ = 5.670374419e-8 W·m⁻²·K⁻⁴.
#[test]
fn stefan_boltzmann() {
    for temperature_k in [1000.0, 2856.0, 6504.0] {
        // Trapezium over ln λ from 0.05 to 10 000 times the peak.
        let peak_nm: f64 = 2.898e6 / temperature_k;
        let steps = 20_000;
        let (first, last) = ((0.05 * peak_nm).ln(), (1e4 * peak_nm).ln());
        let h = (last - first) / f64::from(steps);
        let exitance: f64 = (0..=steps)
            .map(|i| {
                let nm = (first + h * f64::from(i)).exp();
                planckian_exitance_w_per_m2_nm(nm, temperature_k) * nm * h
            })
            .sum();
        let law = 5.670_374_419e-8 * temperature_k.powi(4);
        assert!((exitance / law - 1.0).abs() < 4.5 * C2_RELATIVE, "{temperature_k} K: {exitance}, law {law}");
    }
}

#[test]
fn the_relative_curve_has_the_same_form() {
    let ratio = planckian_exitance_w_per_m2_nm(450.0, 3000.0) / planckian_exitance_w_per_m2_nm(560.0, 3000.0);
    assert!((planckian_relative(450.0, 3000.0) / ratio - 1.0).abs() < 1e-12);
}
