//! Materials: their spellings, their C-factor and roughness height by age, and the bore from a nominal or outside diameter.
//!
//! Everything that comes from these tables has the basis `assumed`: a real main may lie far off, an unlined metal one by 15
//! on C in either direction (95 % band, Sharp & Walski 1988).

/// What a main is made of.
#[derive(Clone, Copy, Debug, PartialEq, Eq, Hash)]
pub(super) enum Material {
    CastIronUnlined,
    CastIronLined,
    DuctileIron,
    Pvc,
    Polyethylene,
    AsbestosCement,
    Steel,
    SteelLined,
    SteelRiveted,
    Concrete,
    CopperOrLead,
    GalvanisedIron,
    Clay,
    WoodStave,
    GlassFibre,
}

/// Spellings of each material: capital letters and digits alone, as [`Material::parse`] compares them. Abbreviations are
/// common practice, no source.
const SPELLINGS: &[(Material, &[&str])] = &[
    (
        Material::CastIronUnlined,
        &[
            "CI",
            "CIP",
            "CIU",
            "UCI",
            "CASTIRON",
            "CASTIRONUNLINED",
            "UNLINEDCASTIRON",
            "GREYIRON",
            "GRAYIRON",
            "GREYCASTIRON",
            "GRAYCASTIRON",
            "SPUNIRON",
            "PITCASTIRON",
            "SCI",
            "VCI",
            "PCI",
        ],
    ),
    (
        Material::CastIronLined,
        &[
            "CICL",
            "CLCI",
            "CILINED",
            "CASTIRONLINED",
            "LINEDCASTIRON",
            "CASTIRONCEMENTLINED",
            "CEMENTLINEDCASTIRON",
            "CLCIP",
        ],
    ),
    (
        Material::DuctileIron,
        &[
            "DI",
            "DIP",
            "DICL",
            "DCI",
            "DUCTILE",
            "DUCTILEIRON",
            "DUCTILEIRONPIPE",
            "DUCTILECASTIRON",
            "DUCTILEIRONCEMENTLINED",
            "CEMENTLINEDDUCTILEIRON",
            "CLDI",
            "SGI",
            "SGIRON",
            "GGG",
        ],
    ),
    (
        Material::Pvc,
        &[
            "PVC",
            "UPVC",
            "PVCU",
            "PVCO",
            "OPVC",
            "MPVC",
            "PVCM",
            "CPVC",
            "PVCC900",
            "C900",
            "C905",
            "PVCC905",
            "PV",
            "POLYVINYLCHLORIDE",
            "MOPVC",
            "PVCPIPE",
        ],
    ),
    (
        Material::Polyethylene,
        &[
            "PE",
            "HDPE",
            "MDPE",
            "LDPE",
            "PEHD",
            "PEAD",
            "PE63",
            "PE80",
            "PE100",
            "HPPE",
            "HDPEPE100",
            "POLYETHYLENE",
            "POLYETHENE",
            "POLY",
            "HDPE100",
            "HDPEPIPE",
        ],
    ),
    (
        Material::AsbestosCement,
        &[
            "AC",
            "ACP",
            "ASBESTOS",
            "ASBESTOSCEMENT",
            "ASBESTOSCEMENTPIPE",
            "CEMENTASBESTOS",
            "FC",
            "FIBRECEMENT",
            "FIBERCEMENT",
            "ETERNIT",
        ],
    ),
    (
        Material::Steel,
        &[
            "ST",
            "STL",
            "STEEL",
            "MS",
            "MILDSTEEL",
            "WS",
            "WSP",
            "WELDEDSTEEL",
            "STEELUNLINED",
            "STEELPIPE",
        ],
    ),
    (
        Material::SteelLined,
        &[
            "MSCL",
            "CLS",
            "CMLS",
            "SCL",
            "STEELLINED",
            "LINEDSTEEL",
            "STEELCEMENTLINED",
            "CEMENTLINEDSTEEL",
            "STCL",
            "STEELEPOXY",
            "STEELCOATED",
            "STEELENAMELLED",
        ],
    ),
    (Material::SteelRiveted, &["RS", "RIVETEDSTEEL", "STEELRIVETED"]),
    (
        Material::Concrete,
        &[
            "CON",
            "CONC",
            "CONCRETE",
            "RC",
            "RCP",
            "RCCP",
            "PCCP",
            "PSC",
            "PSCP",
            "REINFORCEDCONCRETE",
            "PRESTRESSEDCONCRETE",
            "CONCRETECYLINDER",
            "CCP",
            "CYLINDERCONCRETE",
        ],
    ),
    (Material::CopperOrLead, &["CU", "COP", "COPPER", "BRASS", "LEAD", "PB"]),
    (
        Material::GalvanisedIron,
        &[
            "GI",
            "GS",
            "GIP",
            "GALV",
            "GALVANISED",
            "GALVANIZED",
            "GALVANISEDIRON",
            "GALVANIZEDIRON",
            "GALVANISEDSTEEL",
            "GALVANIZEDSTEEL",
            "GALVSTEEL",
        ],
    ),
    (Material::Clay, &["VC", "VCP", "CLAY", "VITRIFIEDCLAY", "EARTHENWARE"]),
    (Material::WoodStave, &["WOOD", "WOODSTAVE", "WOODEN", "WD"]),
    (
        Material::GlassFibre,
        &[
            "GRP",
            "FRP",
            "GRE",
            "FIBREGLASS",
            "FIBERGLASS",
            "GLASSFIBRE",
            "GLASSFIBER",
            "FG",
        ],
    ),
];

/// C-factor by age in years: between two ages in proportion, beyond the last one as there.
///
/// Typical values of published C tables (LMNO Engineering; The Engineering ToolBox d_798; Boesch Engineering).
fn c_factors(material: Material) -> &'static [(f64, f64)] {
    match material {
        Material::CastIronUnlined => &[
            (0.0, 130.0),
            (10.0, 110.0),
            (20.0, 95.0),
            (30.0, 83.0),
            (40.0, 74.0),
            (50.0, 60.0),
        ],
        Material::CastIronLined | Material::DuctileIron => &[(0.0, 140.0), (10.0, 138.0), (30.0, 130.0), (50.0, 120.0)],
        Material::Pvc | Material::GlassFibre => &[(0.0, 150.0)],
        Material::Polyethylene | Material::Steel => &[(0.0, 145.0)],
        Material::AsbestosCement => &[(0.0, 140.0)],
        Material::SteelLined => &[(0.0, 148.0)],
        Material::SteelRiveted | Material::Clay => &[(0.0, 110.0)],
        Material::Concrete | Material::GalvanisedIron | Material::WoodStave => &[(0.0, 120.0)],
        Material::CopperOrLead => &[(0.0, 135.0)],
    }
}

/// Roughness height in mm by age in years, read as [`c_factors`] are.
///
/// New metal, concrete, wood and riveted steel: Moody 1944 and the surface tables of LMNO Engineering. Cast iron at 30 years
/// (moderate tuberculation), ductile iron, plastic in service, asbestos cement, lined steel and glass fibre: handbook values,
/// from memory. Clay as asbestos cement: common practice, no source.
fn roughness_heights_mm(material: Material) -> &'static [(f64, f64)] {
    match material {
        Material::CastIronUnlined => &[(0.0, 0.26), (30.0, 1.5)],
        Material::CastIronLined | Material::DuctileIron => &[(0.0, 0.1)],
        Material::Pvc | Material::Polyethylene => &[(0.0, 0.01)],
        Material::AsbestosCement | Material::SteelLined | Material::GlassFibre | Material::Clay => &[(0.0, 0.03)],
        Material::Steel => &[(0.0, 0.045)],
        Material::SteelRiveted => &[(0.0, 3.0)],
        Material::Concrete => &[(0.0, 1.0)],
        Material::CopperOrLead => &[(0.0, 0.0015)],
        Material::GalvanisedIron => &[(0.0, 0.15)],
        Material::WoodStave => &[(0.0, 0.5)],
    }
}

/// The age that a main of unknown age is taken to have where age matters, years. Common practice, no source: the middle of
/// the published tables for unlined cast iron.
pub(super) const USUAL_AGE_YEARS: f64 = 30.0;

/// Outside diameters of plastic in mm that are no nominal sizes of other mains (ISO 4065 against EN 545): a plastic main of
/// such a size is named by its outside.
const PLASTIC_OUTSIDE_MM: &[u32] = &[63, 75, 90, 110, 140, 160, 180, 225, 280, 315, 355, 560, 630, 710];

impl Material {
    /// The material that a text names, however it is spelt; `None` if it is not in the table.
    pub fn parse(text: &str) -> Option<Material> {
        let wanted: String = text
            .to_uppercase()
            .chars()
            .filter(|letter| letter.is_ascii_alphanumeric())
            .collect();
        let listed = SPELLINGS
            .iter()
            .find(|(_, spellings)| spellings.contains(&wanted.as_str()));
        listed.map(|(material, _)| *material)
    }

    /// C-factor at an age in years.
    pub fn c_factor(self, age_years: Option<f64>) -> f64 {
        between(c_factors(self), age_years.unwrap_or(USUAL_AGE_YEARS))
    }

    /// Roughness height at an age in years, m.
    pub fn roughness_m(self, age_years: Option<f64>) -> f64 {
        between(roughness_heights_mm(self), age_years.unwrap_or(USUAL_AGE_YEARS)) * MM
    }

    /// Ratio of outside diameter to wall of plastic, where it can be assumed: polyethylene SDR 11, PVC SDR 21 (the usual
    /// series for 10 to 16 bar by ISO 4427 and EN ISO 1452; that they are the usual ones is common practice, no source).
    fn diameter_to_wall(self) -> Option<f64> {
        match self {
            Material::Polyethylene => Some(11.0),
            Material::Pvc => Some(21.0),
            _ => None,
        }
    }

    /// The bore of a main of this outside diameter, m; `None` where the wall cannot be told from the material.
    pub fn bore_from_outside_m(self, outside_m: f64) -> Option<f64> {
        self.diameter_to_wall().map(|ratio| outside_m * (1.0 - 2.0 / ratio))
    }
}

/// The bore that is assumed for a nominal size, m: the size itself, which iron, steel, asbestos cement and concrete are named
/// by (common practice); of plastic in sizes that are outside diameters alone, what the wall leaves.
pub(super) fn bore_from_nominal_m(material: Option<Material>, nominal_m: f64) -> f64 {
    let mm = (nominal_m / MM).round();
    let named_by_outside =
        (mm - nominal_m / MM).abs() < 1e-6 && PLASTIC_OUTSIDE_MM.iter().any(|size| f64::from(*size) == mm);
    let plastic = material.filter(|_| named_by_outside);
    plastic
        .and_then(|material| material.bore_from_outside_m(nominal_m))
        .unwrap_or(nominal_m)
}

/// One millimetre, m.
const MM: f64 = crate::units::M_PER_MM;

/// The value at an age, between the two rows that it falls between.
fn between(rows: &[(f64, f64)], age: f64) -> f64 {
    let after = rows.partition_point(|(row, _)| *row <= age);
    match (after.checked_sub(1).map(|before| rows[before]), rows.get(after)) {
        (Some((from, low)), Some((to, high))) => low + (high - low) * (age - from) / (to - from),
        (Some((_, last)), None) => last,
        (None, first) => first.map_or(0.0, |(_, value)| *value),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn common_spellings_name_their_material() {
        for (text, material) in [
            ("CI", Material::CastIronUnlined),
            ("Cast Iron", Material::CastIronUnlined),
            ("D.I.", Material::DuctileIron),
            ("PVC-U", Material::Pvc),
            ("hdpe", Material::Polyethylene),
            ("Asbestos-Cement", Material::AsbestosCement),
            ("steel", Material::Steel),
        ] {
            assert_eq!(Material::parse(text), Some(material), "{text}");
        }
        assert_eq!(Material::parse("kryptonite"), None);
    }

    #[test]
    fn no_spelling_names_two_materials() {
        let mut all: Vec<&str> = SPELLINGS
            .iter()
            .flat_map(|(_, spellings)| spellings.iter().copied())
            .collect();
        let count = all.len();
        all.sort_unstable();
        all.dedup();
        assert_eq!(all.len(), count);
    }

    #[test]
    fn c_factor_falls_with_age_by_the_published_table() {
        let iron = Material::CastIronUnlined;
        assert_eq!(iron.c_factor(Some(0.0)), 130.0);
        assert_eq!(iron.c_factor(Some(25.0)), 89.0);
        assert_eq!(iron.c_factor(Some(120.0)), 60.0);
        assert_eq!(iron.c_factor(None), 83.0);
        assert_eq!(Material::Pvc.c_factor(Some(40.0)), 150.0);
        assert!((iron.roughness_m(Some(15.0)) - 0.88e-3).abs() < 1e-12);
    }

    #[test]
    fn plastic_named_by_its_outside_has_a_smaller_bore() {
        let bore = |material, mm: f64| bore_from_nominal_m(material, mm * MM) / MM;
        assert!((bore(Some(Material::Polyethylene), 110.0) - 90.0).abs() < 1e-9);
        assert_eq!(bore(Some(Material::Polyethylene), 150.0), 150.0);
        assert_eq!(bore(Some(Material::DuctileIron), 225.0), 225.0);
        assert_eq!(bore(None, 110.0), 110.0);
    }
}
