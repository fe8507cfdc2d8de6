//! The viewing condition of CIE 224 as the numbers a colour-appearance kernel needs.

/// CAT02 of CIE 159:2004.
pub(crate) const CAT02: [[f64; 3]; 3] =
    [[0.7328, 0.4296, -0.1624], [-0.7036, 1.6975, 0.0061], [0.0030, 0.0136, 0.9834]];

/// The viewing condition of CIE 224: L_A = 100 cd/m², Y_b = 20, average surround, D = 1.
#[derive(Clone, Copy, Debug)]
pub(crate) struct Viewing {
    /// F_L · HPE · CAT02⁻¹.
    pub(crate) cones: [[f64; 3]; 3],
    /// N_bb/A_w · (2, 1, 1/20).
    pub(crate) achromatic: [f64; 3],
    /// What is taken off: N_bb/A_w · 0.305.
    pub(crate) offset: f64,
    /// c·z.
    pub(crate) cz: f64,
    /// 50000/13 · N_cb.
    pub(crate) chroma: f64,
    /// (1.64 − 0.29ⁿ)^0.73 F_L^¼.
    pub(crate) colourfulness: f64,
    pub(crate) cos2: f64,
    pub(crate) sin2: f64,
}

impl Viewing {
    pub(crate) fn of_cie_224() -> Viewing {
        let k = 1.0f64 / 501.0;
        let k4 = k.powi(4);
        let fl = 0.2 * k4 * 500.0 + 0.1 * (1.0 - k4).powi(2) * 500f64.cbrt();
        let n = 0.2f64;
        let nbb = 0.725 * 5f64.powf(0.2);
        let hpe =
            nalgebra::Matrix3::new(0.38971, 0.68898, -0.07868, -0.22981, 1.18340, 0.04641, 0.0, 0.0, 1.0);
        let cat = nalgebra::Matrix3::from_fn(|i, j| CAT02[i][j]);
        let h = hpe * cat.try_inverse().expect("CAT02 is invertible") * fl;
        let cones: [[f64; 3]; 3] = std::array::from_fn(|i| std::array::from_fn(|j| h[(i, j)]));
        let white: [f64; 3] = std::array::from_fn(|i| {
            let p = cones[i].iter().sum::<f64>().powf(0.42);
            400.0 * p / (27.13 + p) + 0.1
        });
        let aw = (2.0 * white[0] + white[1] + white[2] / 20.0 - 0.305) * nbb;
        let s = nbb / aw;
        Viewing {
            cones,
            achromatic: [2.0 * s, s, s / 20.0],
            offset: 0.305 * s,
            cz: 0.69 * (1.48 + n.sqrt()),
            chroma: 50_000.0 / 13.0 * nbb,
            colourfulness: (1.64 - 0.29f64.powf(n)).powf(0.73) * fl.powf(0.25),
            cos2: 2f64.cos(),
            sin2: 2f64.sin(),
        }
    }
}
