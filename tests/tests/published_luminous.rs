//! Luminous and hazard weighting: ISO 23539/CIE S 010 (V, V′) and IEC 62471:2006 Table 4.2 (B).

use colour::photobiology::blue_light_efficacy_w_per_lm;
use colour::{Observer, Tensor};

fn line(nm: usize) -> Tensor {
    let mut grid = vec![0.0; 401];
    grid[nm - 380] = 1.0;
    Tensor::of_grid(&grid)
}

/// V(555 nm) = 1 and K_m = 683 lm/W; V′(507 nm) = 1 and K′_m = 1700 lm/W; V(507) = 0.444310, V′(555) = 0.402.
#[test]
fn photopic_and_scotopic_peaks() {
    assert!((line(555).ler_lm_per_w() - 683.0).abs() < 1e-3);
    assert!((line(507).scotopic_flux_lm() - 1700.0).abs() < 1e-9);
    assert!((line(507).luminous_flux_lm() / 683.0 - 0.444310).abs() < 1e-6);
    assert!((line(555).scotopic_flux_lm() / 1700.0 - 0.402).abs() < 1e-3);
}

/// Selected rows of B; from 500 to 600 nm 10^((450 − λ)/50), to 700 nm 0.001.
#[test]
fn blue_light_weights() {
    for (nm, b) in [
        (380, 0.01),
        (400, 0.10),
        (420, 0.90),
        (435, 1.0),
        (440, 1.0),
        (460, 0.80),
        (480, 0.45),
        (500, 0.1),
        (550, 0.01),
        (650, 0.001),
    ] {
        let light = line(nm);
        let y = light.xyz(Observer::Cie1931).y;
        let got = blue_light_efficacy_w_per_lm(&light) * 683.0 * y;
        assert!((got - b).abs() < 1e-9, "{nm} nm: {got}");
    }
}
