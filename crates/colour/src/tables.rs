//! The published tables, parsed once from the text embedded at build time.

use crate::{FIRST_NM, GRID_POINTS};
use std::sync::LazyLock;

/// One published table: ascending wavelengths and named columns. Blank cells are zero (CIE S 026 leaves cells
/// blank where an action spectrum is not defined).
#[derive(Debug)]
pub(crate) struct Table {
    pub(crate) wavelengths_nm: Vec<f64>,
    pub(crate) names: Vec<String>,
    pub(crate) columns: Vec<Vec<f64>>,
}

impl Table {
    fn parse(text: &str) -> Table {
        let mut lines = text.lines().filter(|line| !line.starts_with('#') && !line.trim().is_empty());
        let header = lines.next().expect("an embedded table has a header row");
        let names: Vec<String> = header.split(',').skip(1).map(|name| name.trim().to_owned()).collect();
        let mut wavelengths_nm = Vec::new();
        let mut columns = vec![Vec::new(); names.len()];
        for line in lines {
            let mut cells = line.split(',').map(|cell| match cell.trim() {
                "" => 0.0,
                number => number.parse().expect("a cell of an embedded table is a number"),
            });
            wavelengths_nm.push(cells.next().expect("a row of an embedded table has a wavelength"));
            for column in &mut columns {
                column.push(cells.next().unwrap_or(0.0));
            }
        }
        Table { wavelengths_nm, names, columns }
    }

    /// Column `index` on the colour grid: tabulated values where they exist, linear between them, zero outside.
    pub(crate) fn on_grid(&self, index: usize) -> Vec<f64> {
        let wavelengths = &self.wavelengths_nm;
        let values = &self.columns[index];
        (0..GRID_POINTS)
            .map(|i| {
                let nm = FIRST_NM + i as f64;
                let after = wavelengths.partition_point(|w| *w <= nm);
                if after == 0 || (after == wavelengths.len() && wavelengths[after - 1] < nm) {
                    return 0.0;
                }
                if wavelengths[after - 1] == nm {
                    return values[after - 1];
                }
                let t = (nm - wavelengths[after - 1]) / (wavelengths[after] - wavelengths[after - 1]);
                values[after - 1] + t * (values[after] - values[after - 1])
            })
            .collect()
    }
}

macro_rules! embedded {
    ($($(#[$doc:meta])* $name:ident = $file:literal;)*) => {
        $($(#[$doc])* pub(crate) static $name: LazyLock<Table> =
            LazyLock::new(|| Table::parse(include_str!(concat!("../../../assets/tables/", $file))));)*

        /// File name and text of every embedded table, for the tests of their hygiene.
        #[cfg(test)]
        const TEXTS: &[(&str, &str)] =
            &[$(($file, include_str!(concat!("../../../assets/tables/", $file)))),*];
    };
}

embedded! {
    /// CIE 1931 2° colour-matching functions, 360–830 nm, 1 nm.
    CMF_1931 = "cie1931_2deg_cmf_1nm.csv";
    /// CIE 1964 10° colour-matching functions, 360–830 nm, 1 nm.
    CMF_1964 = "cie1964_10deg_cmf_1nm.csv";
    /// CIE 170-2:2015 2° cone-fundamental-based functions, 390–830 nm, 1 nm.
    CMF_2015_2 = "cie2015_2deg_cmf_1nm.csv";
    /// CIE 170-2:2015 10° cone-fundamental-based functions, 390–830 nm, 1 nm.
    CMF_2015_10 = "cie2015_10deg_cmf_1nm.csv";
    /// CIE 13.3-1995 test-colour samples 1–14, 360–830 nm, 5 nm.
    TCS_1_TO_14 = "cie13_3_tcs01_14_5nm.csv";
    /// Test-colour sample 15 (Japanese complexion), 380–780 nm, 5 nm.
    TCS_15 = "cie13_3_tcs15_5nm.csv";
    /// CIE 224:2017 colour evaluation samples 1–99, 380–780 nm, 1 nm.
    CES = "cie224_ces01_99_1nm.csv";
    /// CIE daylight components S0, S1, S2, 5 nm.
    DAYLIGHT = "cie_daylight_s0_s1_s2_5nm.csv";
    /// CIE S 026 α-opic action spectra: S, M, L cone, rhodopic, melanopic; 1 nm.
    ALPHA_OPIC = "cie_s026_alpha_opic_1nm.csv";
    /// IEC 62471 blue-light hazard weighting, 300–780 nm, 1 nm.
    BLUE_LIGHT = "iec62471_blue_light_hazard_1nm.csv";
    /// CIE 1951 scotopic luminous efficiency, 380–780 nm, 1 nm.
    SCOTOPIC = "v_prime_1951_1nm.csv";
    /// CIE illuminants A, C, D50, D55, D65, D75, 5 nm.
    SOURCES_A_C_D = "illuminants_a_c_d_5nm.csv";
    /// CIE fluorescent sources FL1–FL12, 5 nm.
    SOURCES_FL = "illuminants_fl1_12_5nm.csv";
    /// CIE fluorescent sources FL3.1–FL3.15, 5 nm.
    SOURCES_FL3 = "illuminants_fl3_1_15_5nm.csv";
    /// CIE high-pressure discharge sources HP1–HP5, 5 nm.
    SOURCES_HP = "illuminants_hp1_5_5nm.csv";
    /// CIE typical LED sources, 5 nm.
    SOURCES_LED = "illuminants_led_5nm.csv";
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn every_table_names_its_content_source_and_licence() {
        for (file, text) in TEXTS {
            let head: Vec<&str> = text.lines().take(3).collect();
            assert!(head[0].starts_with("# what: "), "{file}: {}", head[0]);
            assert!(head[1].starts_with("# source: "), "{file}: {}", head[1]);
            assert!(head[2].starts_with("# licence/provenance: "), "{file}: {}", head[2]);
        }
    }

    #[track_caller]
    fn check_ends(table: &Table, first_nm: f64, last_nm: f64, step_nm: f64, columns: usize) {
        assert_eq!(table.columns.len(), columns);
        assert_eq!(table.names.len(), columns);
        let rows = ((last_nm - first_nm) / step_nm).round() as usize + 1;
        assert_eq!(table.wavelengths_nm.len(), rows);
        for (i, nm) in table.wavelengths_nm.iter().enumerate() {
            assert_eq!(*nm, first_nm + step_nm * i as f64);
        }
        for column in &table.columns {
            assert!(column.len() == rows && column.iter().all(|value| value.is_finite()));
        }
    }

    #[test]
    fn tables_have_their_published_range_step_and_columns() {
        check_ends(&CMF_1931, 360.0, 830.0, 1.0, 3);
        check_ends(&CMF_1964, 360.0, 830.0, 1.0, 3);
        check_ends(&CMF_2015_2, 390.0, 830.0, 1.0, 3);
        check_ends(&CMF_2015_10, 390.0, 830.0, 1.0, 3);
        check_ends(&TCS_1_TO_14, 360.0, 830.0, 5.0, 14);
        check_ends(&TCS_15, 380.0, 780.0, 5.0, 1);
        check_ends(&CES, 380.0, 780.0, 1.0, 99);
        check_ends(&DAYLIGHT, 300.0, 830.0, 5.0, 3);
        check_ends(&ALPHA_OPIC, 380.0, 780.0, 1.0, 5);
        check_ends(&BLUE_LIGHT, 300.0, 780.0, 1.0, 1);
        check_ends(&SCOTOPIC, 380.0, 780.0, 1.0, 1);
        check_ends(&SOURCES_A_C_D, 300.0, 780.0, 5.0, 6);
        check_ends(&SOURCES_FL, 380.0, 780.0, 5.0, 12);
        check_ends(&SOURCES_FL3, 380.0, 780.0, 5.0, 15);
        check_ends(&SOURCES_HP, 380.0, 780.0, 5.0, 5);
        check_ends(&SOURCES_LED, 380.0, 780.0, 5.0, 9);
    }

    #[test]
    fn reflectances_lie_between_zero_and_one() {
        for table in [&*TCS_1_TO_14, &*TCS_15, &*CES] {
            for column in &table.columns {
                assert!(column.iter().all(|value| (0.0..=1.0).contains(value)));
            }
        }
    }

    #[test]
    fn linear_interpolation_keeps_the_tabulated_values() {
        let column = TCS_1_TO_14.on_grid(8);
        let row = TCS_1_TO_14.wavelengths_nm.iter().position(|nm| *nm == 600.0).expect("600 nm is tabulated");
        assert_eq!(column[220], TCS_1_TO_14.columns[8][row]);
        let halfway = 0.6 * TCS_1_TO_14.columns[8][row] + 0.4 * TCS_1_TO_14.columns[8][row + 1];
        assert!((column[222] - halfway).abs() < 1e-15);
    }
}
