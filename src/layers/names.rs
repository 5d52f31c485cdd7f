//! Names of columns: ours where the user's layer has one of that name already, and the user's in a shapefile.

use std::collections::HashSet;

/// Longest name of a shapefile's column, in bytes.
pub(super) const LONGEST: usize = 10;

/// Names that formats keep for themselves.
const TAKEN: [&str; 2] = ["fid", "geom"];

/// The names our columns get beside the user's, compared without case: the name wanted, else its stem cut to fit and a
/// number. Ten characters at most, so that they are the same in every format.
pub fn settle_names<T: AsRef<str>, O: AsRef<str>>(theirs: &[T], ours: &[O]) -> Vec<String> {
    let mut taken: HashSet<String> = theirs.iter().map(|name| name.as_ref().trim().to_lowercase()).collect();
    taken.extend(TAKEN.map(String::from));
    let free: Vec<bool> = ours
        .iter()
        .map(|name| !taken.contains(&name.as_ref().to_lowercase()))
        .collect();
    // A name that is free goes to the column that wants it before any number is given.
    let mut all = taken;
    all.extend(
        ours.iter()
            .zip(&free)
            .filter(|(_, free)| **free)
            .map(|(name, _)| name.as_ref().to_lowercase()),
    );
    ours.iter()
        .zip(free)
        .map(|(name, free)| match free {
            true => name.as_ref().to_string(),
            false => numbered(name.as_ref(), &mut all),
        })
        .collect()
}

/// The user's names as a shapefile can hold them, ours being taken: those that fit stay, others are cut and numbered.
pub(super) fn cut_names<T: AsRef<str>, O: AsRef<str>>(theirs: &[T], ours: &[O]) -> Vec<String> {
    let mut taken: HashSet<String> = ours.iter().map(|name| name.as_ref().to_lowercase()).collect();
    let stays: Vec<bool> = theirs
        .iter()
        .map(|name| {
            let name = name.as_ref();
            !name.is_empty() && name.len() <= LONGEST && taken.insert(name.to_lowercase())
        })
        .collect();
    theirs
        .iter()
        .zip(stays)
        .map(|(name, stays)| {
            let name = name.as_ref();
            let cut = cut(name, LONGEST);
            if stays {
                name.to_string()
            } else if !cut.is_empty() && taken.insert(cut.to_lowercase()) {
                cut.to_string()
            } else {
                numbered(name, &mut taken)
            }
        })
        .collect()
}

/// Names of one table made different where the table has one twice (case counts): the second gets a number.
pub(super) fn numbered_apart(names: &[String]) -> Vec<String> {
    let mut taken = HashSet::new();
    names
        .iter()
        .map(|name| {
            let mut candidate = name.clone();
            let mut number = 2_u32;
            while taken.contains(&candidate) || candidate != *name && names.contains(&candidate) {
                candidate = format!("{name}{number}");
                number += 1;
            }
            taken.insert(candidate.clone());
            candidate
        })
        .collect()
}

/// The stem cut to fit, with the first number from 2 that is free.
fn numbered(name: &str, taken: &mut HashSet<String>) -> String {
    let name = if name.is_empty() { "column" } else { name };
    let mut number = 2_u32;
    loop {
        let suffix = number.to_string();
        let candidate = format!("{}{suffix}", cut(name, LONGEST - suffix.len()));
        if taken.insert(candidate.to_lowercase()) {
            return candidate;
        }
        number += 1;
    }
}

/// As much of a text as fits a number of bytes, no letter cut in two.
pub(super) fn cut(text: &str, most: usize) -> &str {
    if text.len() <= most {
        return text;
    }
    let end = (0..=most).rev().find(|end| text.is_char_boundary(*end)).unwrap_or(0);
    &text[..end]
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn theirs_stay_and_ours_get_a_number() {
        let theirs = ["ID", "VEL_MPS", "vel_mps2", "Diam_Basis", "x"];
        let ours = ["flow_lps", "vel_mps", "diam_basis", "fid", "geom"];
        assert_eq!(
            settle_names(&theirs, &ours),
            ["flow_lps", "vel_mps3", "diam_basi2", "fid2", "geom2"]
        );
        // A third run on its own results.
        let theirs = ["vel_mps", "vel_mps2", "vel_mps3"];
        assert_eq!(
            settle_names(&theirs, &["vel_mps", "vel_mps4"]),
            ["vel_mps5", "vel_mps4"]
        );
        let none: [&str; 0] = [];
        assert_eq!(settle_names(&none, &["a"]), ["a"]);
    }

    #[test]
    fn long_names_are_cut_without_clash() {
        let theirs = [
            "facility_identifier",
            "facility_i",
            "FACILITY_ID",
            "flow_lps_measured",
            "Straßenname",
            "",
            "vel_mps2b",
        ];
        let cut = cut_names(&theirs, &["flow_lps_m", "flow_lps"]);
        let expected = [
            "facility_2",
            "facility_i",
            "FACILITY_3",
            "flow_lps_2",
            "Straßenna",
            "column2",
            "vel_mps2b",
        ];
        assert_eq!(cut, expected);
        assert!(cut.iter().all(|name| name.len() <= LONGEST));
    }
}
