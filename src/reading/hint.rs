//! Which known word was probably meant: a key without its unit, with another unit, or misspelt.

/// The known word that was probably meant by `word`.
pub fn nearest<'a>(word: &str, known: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    let known: Vec<&str> = known.into_iter().collect();
    let lower = word.to_lowercase();
    let stem = |key: &str| UNITS.iter().find_map(|unit| key.strip_suffix(unit)).unwrap_or(key).trim_end_matches('_').to_string();
    if let Some(key) = known.iter().find(|key| key.to_lowercase() == lower) {
        return Some(key);
    }
    if let Some(key) = known.iter().find(|key| stem(key) == stem(&lower) && stem(key) != **key) {
        return Some(key);
    }
    if let Some(key) = known.iter().find(|key| stem(key) == stem(&lower)) {
        return Some(key);
    }
    let allowed = 1 + lower.chars().count() / 4;
    let distance = |key: &&&str| strsim::osa_distance(&lower, &key.to_lowercase()).min(strsim::osa_distance(&stem(&lower), &stem(key)));
    known.iter().min_by_key(distance).filter(|key| distance(key) <= allowed).copied()
}

/// The known names that were probably meant by `name`: the nearest one, else all of the family whose first word is the nearest to its own.
pub fn family<'a>(name: &str, known: impl IntoIterator<Item = &'a str>) -> Vec<&'a str> {
    let known: Vec<&str> = known.into_iter().collect();
    if let Some(one) = nearest(name, known.iter().copied()) {
        return vec![one];
    }
    fn first_word(name: &str) -> &str {
        name.split(|c: char| !c.is_alphabetic()).next().unwrap_or_default()
    }
    let word = nearest(first_word(name), known.iter().map(|k| first_word(k)));
    known.into_iter().filter(|k| Some(first_word(k)) == word).collect()
}

/// True for the end of a key that names a unit, such as `mm`.
pub fn is_unit(end: &str) -> bool {
    UNITS.iter().any(|unit| unit.strip_prefix('_') == Some(end))
}

/// Ends of keys that name a unit, those used here and those people bring along; longer ones first.
const UNITS: [&str; 35] = [
    "_a_per_mm2",
    "_mohm_mm2",
    "_uohm_cm",
    "_j_kgk",
    "_a_mm2",
    "_g_cm3",
    "_kg_m3",
    "_w_mk",
    "_per_k",
    "_percent",
    "_ohm_m",
    "_mohm",
    "_uohm",
    "_ohm",
    "_inch",
    "_mm2",
    "_mm",
    "_um",
    "_cm",
    "_mil",
    "_in",
    "_mv",
    "_ma",
    "_ka",
    "_m",
    "_v",
    "_a",
    "_c",
    "_k",
    "_f",
    "_amps",
    "_volts",
    "_deg",
    "_celsius",
    "_amp",
];

#[cfg(test)]
mod tests {
    use super::{family, nearest};

    #[test]
    fn units_cases_and_slips() {
        let keys = ["name", "thickness_mm", "outline", "corner_radius_mm", "resistivity_uohm_cm", "current_a"];
        assert_eq!(nearest("thickness", keys), Some("thickness_mm"));
        assert_eq!(nearest("thickness_um", keys), Some("thickness_mm"));
        assert_eq!(nearest("current", keys), Some("current_a"));
        assert_eq!(nearest("thicknes_mm", keys), Some("thickness_mm"));
        assert_eq!(nearest("Outline", keys), Some("outline"));
        assert_eq!(nearest("resistivity_ohm_m", keys), Some("resistivity_uohm_cm"));
        assert_eq!(nearest("colour", keys), None);
        assert_eq!(nearest("", keys), None);
    }

    #[test]
    fn a_name_without_its_grade_gets_the_whole_family() {
        let metals = ["copper-etp", "copper-of", "nickel-200", "nickel-201", "tin", "brass-cuzn30"];
        assert_eq!(family("nikel", metals), ["nickel-200", "nickel-201"]);
        assert_eq!(family("Copper C110", metals), ["copper-etp", "copper-of"]);
        assert_eq!(family("nickel-20l", metals), ["nickel-200"]);
        assert_eq!(family("brass", metals), ["brass-cuzn30"]);
        assert_eq!(family("unobtainium", metals), [""; 0]);
        assert_eq!(family("", metals), [""; 0]);
    }
}
