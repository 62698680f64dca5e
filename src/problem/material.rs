//! Metals: resistivity over temperature, density, and the built-in table with its sources.

/// Name of a metal whose figures stand in the sheet itself.
pub const OWN_FIGURES: &str = "own figures";

/// A metal as the solver needs it.
#[derive(Debug, Clone, PartialEq)]
pub struct Material {
    /// Name of the table's row, or [`OWN_FIGURES`].
    pub name: String,
    /// Resistivity and its law.
    pub resistivity: Resistivity,
    /// Density in g/cm³, for the mass; `None` where it is not known.
    pub density_g_cm3: Option<f64>,
}

/// Resistivity over temperature.
#[derive(Debug, Clone, PartialEq)]
pub enum Resistivity {
    /// rho20 (1 + alpha (T - 20 °C)).
    Linear {
        /// At 20 °C, ohm mm.
        at_20: f64,
        /// Per kelvin, referred to 20 °C.
        alpha: f64,
    },
    /// Straight lines between (°C, ohm mm), rising in temperature; the end pieces go on beyond the ends.
    Table(Vec<(f64, f64)>),
}

impl Resistivity {
    /// Resistivity in ohm mm at a temperature in °C.
    pub fn at(&self, celsius: f64) -> f64 {
        match self {
            Self::Linear { at_20, alpha } => at_20 * (1.0 + alpha * (celsius - 20.0)),
            Self::Table(rows) => {
                let upper = rows.iter().position(|r| r.0 >= celsius).unwrap_or(rows.len() - 1).clamp(1, rows.len() - 1);
                let ((t0, r0), (t1, r1)) = (rows[upper - 1], rows[upper]);
                r0 + (r1 - r0) * (celsius - t0) / (t1 - t0)
            }
        }
    }
}

/// How well a figure is founded.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Evidence {
    /// Read in the source named.
    Published,
    /// Worked out from a published figure.
    Computed,
    /// From memory: check before use.
    FromMemory,
}

impl Evidence {
    /// The mark in plain words.
    pub fn words(self) -> &'static str {
        match self {
            Self::Published => "published",
            Self::Computed => "computed",
            Self::FromMemory => "from memory, check before use",
        }
    }
}

/// One figure of the table with where it comes from.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Figure {
    /// In the unit of its column.
    pub value: f64,
    /// How well it is founded.
    pub evidence: Evidence,
    /// Author or body and document, in our own words.
    pub source: &'static str,
}

/// Resistivity of a metal in the table, in microohm centimetre.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum TabledResistivity {
    /// At 20 °C, and its rise per kelvin referred to 20 °C.
    Linear {
        /// Microohm centimetre.
        at_20: Figure,
        /// Per kelvin.
        alpha: Figure,
    },
    /// Rows of (°C, microohm centimetre), where one straight line would be poor.
    Table {
        /// The rows, rising in temperature.
        rows: &'static [(f64, f64)],
        /// How well they are founded.
        evidence: Evidence,
        /// Where they come from.
        source: &'static str,
    },
}

/// A row of the metals table.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Metal {
    /// The name used in a sheet.
    pub name: &'static str,
    /// What it is.
    pub description: &'static str,
    /// Resistivity and its law.
    pub resistivity: TabledResistivity,
    /// Heat conductivity at 20 °C, W/(m K).
    pub conductivity_w_mk: Figure,
    /// Density, g/cm³.
    pub density_g_cm3: Figure,
    /// Specific heat, J/(kg K).
    pub heat_capacity_j_kgk: Figure,
    /// Where melting begins, °C.
    pub melting_c: Figure,
}

impl Metal {
    /// The metal in the units used inside.
    pub fn material(&self) -> Material {
        // 1 microohm centimetre is 1e-5 ohm millimetre.
        let resistivity = match self.resistivity {
            TabledResistivity::Linear { at_20, alpha } => Resistivity::Linear { at_20: at_20.value * 1e-5, alpha: alpha.value },
            TabledResistivity::Table { rows, .. } => Resistivity::Table(rows.iter().map(|&(t, r)| (t, r * 1e-5)).collect()),
        };
        Material { name: self.name.into(), resistivity, density_g_cm3: Some(self.density_g_cm3.value) }
    }
}

/// The row of this name.
pub fn metal(name: &str) -> Option<&'static Metal> {
    METALS.iter().find(|m| m.name == name)
}

const fn published(value: f64, source: &'static str) -> Figure {
    Figure { value, evidence: Evidence::Published, source }
}
const fn computed(value: f64, source: &'static str) -> Figure {
    Figure { value, evidence: Evidence::Computed, source }
}
const fn from_memory(value: f64) -> Figure {
    Figure { value, evidence: Evidence::FromMemory, source: "no source at hand" }
}

const IEC_28: &str = "IEC 60028 (1925), annealed copper standard";
const COPPER_FACTS: &str = "Calcutt, Introduction to Copper: Fact Sheets (2001), table 5";
const AGRAWAL: &str = "Agrawal, Industrial Power Engineering and Applications Handbook, table 30.1";
const DELLINGER: &str = "alpha in proportion to conductivity, after Dellinger, Bulletin of the Bureau of Standards 7 (1911)";
const CRC: &str = "CRC Handbook of Chemistry and Physics, wire tables";
const ALUMINIUM: &str = "Aluminum Association, typical values";
const MAKER: &str = "maker's data sheet for this alloy";
const NICKEL_200: &str = "maker's data sheet for nickel 200 and 201, table of resistivity";
const SUPPLIER: &str = "supplier's table";

/// Nickel 200 and 201: 58, 76 and 113 ohm circular mil per foot at 70, 200 and 400 °F; one of these units is 0.166243 microohm centimetre.
const NICKEL_200_ROWS: &[(f64, f64)] =
    &[(190.0 / 9.0, 58.0 * 0.166_242_6), (840.0 / 9.0, 76.0 * 0.166_242_6), (1840.0 / 9.0, 113.0 * 0.166_242_6)];

/// The built-in metals. Values between makers and lots differ by some per cent; the commercial nickels and plated steel by more.
pub static METALS: &[Metal] = &[
    Metal {
        name: "copper-iacs",
        description: "copper, 100 % IACS by definition",
        resistivity: TabledResistivity::Linear { at_20: published(1.7241, IEC_28), alpha: published(0.00393, IEC_28) },
        conductivity_w_mk: published(394.0, COPPER_FACTS),
        density_g_cm3: published(8.89, IEC_28),
        heat_capacity_j_kgk: published(386.0, COPPER_FACTS),
        melting_c: published(1083.0, COPPER_FACTS),
    },
    Metal {
        name: "copper-etp",
        description: "electrolytic tough pitch copper, annealed",
        resistivity: TabledResistivity::Linear { at_20: published(1.7241, COPPER_FACTS), alpha: published(0.00393, AGRAWAL) },
        conductivity_w_mk: published(390.0, COPPER_FACTS),
        density_g_cm3: published(8.89, COPPER_FACTS),
        heat_capacity_j_kgk: published(386.0, COPPER_FACTS),
        melting_c: from_memory(1065.0),
    },
    Metal {
        name: "copper-of",
        description: "oxygen-free copper, annealed, 101 % IACS",
        resistivity: TabledResistivity::Linear { at_20: computed(1.707, "101 % IACS: 1.7241 / 1.01"), alpha: computed(0.00397, DELLINGER) },
        conductivity_w_mk: published(391.0, COPPER_FACTS),
        density_g_cm3: published(8.94, COPPER_FACTS),
        heat_capacity_j_kgk: published(386.0, COPPER_FACTS),
        melting_c: published(1083.0, COPPER_FACTS),
    },
    Metal {
        name: "copper-hard",
        description: "copper, fully cold worked, 97 % IACS",
        resistivity: TabledResistivity::Linear {
            at_20: computed(1.7774, "97 % IACS of Calcutt, table 5: 1.7241 / 0.97"),
            alpha: computed(0.00381, DELLINGER),
        },
        conductivity_w_mk: from_memory(380.0),
        density_g_cm3: published(8.89, COPPER_FACTS),
        heat_capacity_j_kgk: published(386.0, COPPER_FACTS),
        melting_c: published(1083.0, COPPER_FACTS),
    },
    Metal {
        name: "nickel-200",
        description: "nickel 99.0 %, commercial",
        resistivity: TabledResistivity::Table { rows: NICKEL_200_ROWS, evidence: Evidence::Computed, source: NICKEL_200 },
        conductivity_w_mk: published(70.2, NICKEL_200),
        density_g_cm3: from_memory(8.89),
        heat_capacity_j_kgk: from_memory(456.0),
        melting_c: from_memory(1435.0),
    },
    Metal {
        name: "nickel-201",
        description: "nickel 99.0 %, commercial, low carbon",
        resistivity: TabledResistivity::Table { rows: NICKEL_200_ROWS, evidence: Evidence::Computed, source: NICKEL_200 },
        conductivity_w_mk: published(70.2, NICKEL_200),
        density_g_cm3: from_memory(8.89),
        heat_capacity_j_kgk: from_memory(456.0),
        melting_c: from_memory(1435.0),
    },
    Metal {
        name: "nickel-pure",
        description: "nickel 99.98 %; 10 % either way",
        resistivity: TabledResistivity::Table {
            rows: &[(20.0, 7.0), (100.0, 11.0), (200.0, 17.0)],
            evidence: Evidence::Published,
            source: MAKER,
        },
        conductivity_w_mk: from_memory(91.0),
        density_g_cm3: published(8.9, MAKER),
        heat_capacity_j_kgk: from_memory(444.0),
        melting_c: published(1453.0, MAKER),
    },
    Metal {
        name: "steel-nickel-plated",
        description: "low-carbon steel strip with a few micrometres of nickel: the steel's figures",
        resistivity: TabledResistivity::Linear { at_20: published(14.3, "data sheet of steel SAE 1010"), alpha: from_memory(0.0045) },
        conductivity_w_mk: published(51.9, "data sheet of steel SAE 1010"),
        density_g_cm3: published(7.872, "data sheet of steel SAE 1010"),
        heat_capacity_j_kgk: published(448.0, "data sheet of steel SAE 1010"),
        melting_c: from_memory(1500.0),
    },
    Metal {
        name: "aluminium-1350",
        description: "conductor aluminium, 61 % IACS",
        resistivity: TabledResistivity::Linear { at_20: computed(2.8264, "61 % IACS: 1.7241 / 0.61"), alpha: published(0.00403, AGRAWAL) },
        conductivity_w_mk: published(234.0, ALUMINIUM),
        density_g_cm3: published(2.7, ALUMINIUM),
        heat_capacity_j_kgk: from_memory(900.0),
        melting_c: published(646.0, ALUMINIUM),
    },
    Metal {
        name: "aluminium-1350-o",
        description: "conductor aluminium, soft, 62 % IACS",
        resistivity: TabledResistivity::Linear { at_20: computed(2.7808, "62 % IACS: 1.7241 / 0.62"), alpha: computed(0.0041, DELLINGER) },
        conductivity_w_mk: published(234.0, ALUMINIUM),
        density_g_cm3: published(2.7, ALUMINIUM),
        heat_capacity_j_kgk: from_memory(900.0),
        melting_c: published(646.0, ALUMINIUM),
    },
    Metal {
        name: "aluminium-1050",
        description: "aluminium 99.5 %",
        resistivity: TabledResistivity::Linear { at_20: published(2.82, MAKER), alpha: from_memory(0.004) },
        conductivity_w_mk: published(222.0, MAKER),
        density_g_cm3: published(2.71, MAKER),
        heat_capacity_j_kgk: published(920.0, MAKER),
        melting_c: published(650.0, MAKER),
    },
    Metal {
        name: "aluminium-6101-t6",
        description: "conductor alloy 6101 T6, 57 % IACS",
        resistivity: TabledResistivity::Linear { at_20: computed(3.0247, "57 % IACS: 1.7241 / 0.57"), alpha: computed(0.00377, DELLINGER) },
        conductivity_w_mk: published(218.0, ALUMINIUM),
        density_g_cm3: published(2.7, ALUMINIUM),
        heat_capacity_j_kgk: published(895.0, ALUMINIUM),
        melting_c: published(621.0, ALUMINIUM),
    },
    Metal {
        name: "brass-cuzn30",
        description: "brass CuZn30",
        resistivity: TabledResistivity::Linear { at_20: published(6.08, CRC), alpha: published(0.00171, CRC) },
        conductivity_w_mk: from_memory(120.0),
        density_g_cm3: from_memory(8.53),
        heat_capacity_j_kgk: published(377.0, MAKER),
        melting_c: from_memory(915.0),
    },
    Metal {
        name: "brass-cuzn37",
        description: "brass CuZn37, 15.5 MS/m; makers give 14 to 15.5",
        resistivity: TabledResistivity::Linear {
            at_20: from_memory(6.45),
            alpha: published(0.0017, "data sheets of the neighbours CuZn33 and CuZn40"),
        },
        conductivity_w_mk: published(119.0, "data sheets of the neighbours CuZn33 and CuZn40"),
        density_g_cm3: published(8.44, MAKER),
        heat_capacity_j_kgk: published(377.0, MAKER),
        melting_c: from_memory(885.0),
    },
    Metal {
        name: "bronze-cusn6",
        description: "phosphor bronze CuSn6; makers give 11.1 to 13.3",
        resistivity: TabledResistivity::Linear {
            at_20: published(12.0, "middle of three makers' data sheets"),
            alpha: published(0.00065, MAKER),
        },
        conductivity_w_mk: published(75.0, MAKER),
        density_g_cm3: published(8.8, MAKER),
        heat_capacity_j_kgk: published(377.0, MAKER),
        melting_c: published(1040.0, MAKER),
    },
    Metal {
        name: "bronze-cusn5",
        description: "phosphor bronze CuSn5, 15 % IACS",
        resistivity: TabledResistivity::Linear { at_20: published(11.5, MAKER), alpha: from_memory(0.0007) },
        conductivity_w_mk: published(69.0, MAKER),
        density_g_cm3: published(8.86, MAKER),
        heat_capacity_j_kgk: published(377.0, MAKER),
        melting_c: from_memory(950.0),
    },
    Metal {
        name: "cuni44",
        description: "copper-nickel CuNi44, resistance alloy",
        resistivity: TabledResistivity::Linear {
            at_20: published(49.0, MAKER),
            alpha: published(0.0, "maker's data sheet for this alloy: below 6e-5 either way"),
        },
        conductivity_w_mk: published(21.0, MAKER),
        density_g_cm3: published(8.9, MAKER),
        heat_capacity_j_kgk: published(410.0, MAKER),
        melting_c: published(1280.0, MAKER),
    },
    Metal {
        name: "silver",
        description: "silver",
        resistivity: TabledResistivity::Linear { at_20: published(1.587, CRC), alpha: published(0.0038, CRC) },
        conductivity_w_mk: from_memory(429.0),
        density_g_cm3: published(10.49, SUPPLIER),
        heat_capacity_j_kgk: published(235.0, SUPPLIER),
        melting_c: published(961.8, SUPPLIER),
    },
    Metal {
        name: "tin",
        description: "tin, white; tables differ by 8 %",
        resistivity: TabledResistivity::Linear {
            at_20: computed(11.99, "11.0 at 0 C of a supplier's table, raised to 20 C"),
            alpha: published(0.0045, SUPPLIER),
        },
        conductivity_w_mk: published(66.6, SUPPLIER),
        density_g_cm3: published(7.29, SUPPLIER),
        heat_capacity_j_kgk: published(230.0, SUPPLIER),
        melting_c: published(231.9, SUPPLIER),
    },
    Metal {
        name: "stainless-304",
        description: "stainless steel 304",
        resistivity: TabledResistivity::Linear {
            at_20: published(72.0, "ASM data sheet for 304"),
            alpha: published(0.00097, "secant from 20 to 650 C of the ASM data sheet for 304"),
        },
        conductivity_w_mk: published(16.2, "ASM data sheet for 304"),
        density_g_cm3: published(8.0, "ASM data sheet for 304"),
        heat_capacity_j_kgk: published(500.0, "ASM data sheet for 304"),
        melting_c: published(1400.0, "ASM data sheet for 304"),
    },
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_copper_standard_is_exact_and_nickel_follows_its_table() {
        let copper = metal("copper-iacs").expect("a row").material();
        assert!((copper.resistivity.at(20.0) - 1.7241e-5).abs() < 1e-20);
        assert!((copper.resistivity.at(120.0) / 1.7241e-5 - 1.393).abs() < 1e-12);
        let nickel = metal("nickel-201").expect("a row").material();
        // Computed from 58 ohm circular mil per foot: 9.642 microohm centimetre at 70 °F.
        assert!((nickel.resistivity.at(190.0 / 9.0) - 9.642e-5).abs() < 1e-8);
        assert!((nickel.resistivity.at(93.333) - 12.634e-5).abs() < 1e-8);
        assert!(nickel.resistivity.at(20.0) < nickel.resistivity.at(21.0));
        assert!(metal("unobtainium").is_none());
    }

    #[test]
    fn rows_have_names_of_their_own_and_sensible_figures() {
        for (i, m) in METALS.iter().enumerate() {
            assert!(METALS[..i].iter().all(|other| other.name != m.name), "{}", m.name);
            let rho = m.material().resistivity;
            for t in [-40.0, 20.0, 150.0] {
                assert!((1e-5..1e-3).contains(&rho.at(t)), "{} at {t}", m.name);
            }
            for f in [m.conductivity_w_mk, m.density_g_cm3, m.heat_capacity_j_kgk, m.melting_c] {
                assert!(f.value > 0.0 && !f.source.is_empty());
            }
            // Wiedemann and Franz: k rho / T is near 2.4e-8 W ohm / K² for metals, higher for alloys that scatter electrons.
            let lorenz = m.conductivity_w_mk.value * rho.at(20.0) * 1e-3 / 293.15;
            assert!((1.9e-8..4.2e-8).contains(&lorenz), "{}: {lorenz:e}", m.name);
        }
    }
}
