//! Whether two labels name the left and the right copy of one thing.

use crate::domain::Hemisphere;

/// Pairs of words that tell the sides apart.
const SIDES: [(&str, &str); 3] = [("l", "r"), ("left", "right"), ("lh", "rh")];

/// Whether two labels are alike but for the side: one word of several (`lh-V1`, `rh-V1`), or a
/// capital L or R at the start or end of a longer label (`ASHL`, `ASHR`).
pub fn differ_only_by_side(one: &str, other: &str) -> bool {
    differ_by_word(one, other) || differ_by_letter(one, other)
}

fn are_sides(one: &str, other: &str) -> bool {
    SIDES
        .iter()
        .any(|&(l, r)| (one, other) == (l, r) || (one, other) == (r, l))
}

fn differ_by_word(one: &str, other: &str) -> bool {
    let words = |label: &str| -> Vec<String> {
        label
            .split(|c: char| !c.is_alphanumeric())
            .map(str::to_lowercase)
            .collect()
    };
    let (one, other) = (words(one), words(other));
    if one.len() != other.len() || one.len() < 2 {
        return false;
    }
    let mut differing = one.iter().zip(&other).filter(|(x, y)| x != y);
    matches!((differing.next(), differing.next()), (Some((x, y)), None) if are_sides(x, y))
}

fn differ_by_letter(one: &str, other: &str) -> bool {
    let sides = |x: Option<&str>, y: Option<&str>| {
        matches!((x, y), (Some("L"), Some("R")) | (Some("R"), Some("L")))
    };
    let cut = |label: &'_ str, at_end: bool| -> Option<(String, String)> {
        let mut letters: Vec<char> = label.chars().collect();
        if letters.len() < 3 {
            return None;
        }
        let side = if at_end {
            letters.pop()?
        } else {
            letters.remove(0)
        };
        Some((side.to_string(), letters.into_iter().collect()))
    };
    [true, false]
        .into_iter()
        .any(|at_end| match (cut(one, at_end), cut(other, at_end)) {
            (Some((x, rest_x)), Some((y, rest_y))) => rest_x == rest_y && sides(Some(&x), Some(&y)),
            _ => false,
        })
}

/// Where a label says its side, so that copies are found that say it the same way.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash, PartialOrd, Ord)]
pub enum SideMark {
    /// In the n-th of several words.
    Word(usize),
    /// In a capital letter at the end.
    End,
    /// In a capital letter at the start.
    Start,
}

/// Every way to read a label as that of one side of an area: how it says so, the side, and the label
/// without it. Labels of two sides of one area give the same rest by the same mark.
#[must_use]
pub fn without_side(label: &str) -> Vec<(SideMark, Hemisphere, String)> {
    let mut readings = Vec::new();
    let mut words: Vec<(usize, &str)> = Vec::new();
    let mut start = 0;
    for piece in label.split_inclusive(|c: char| !c.is_alphanumeric()) {
        words.push((
            start,
            piece.trim_end_matches(|c: char| !c.is_alphanumeric()),
        ));
        start += piece.len();
    }
    if words.len() > 1 {
        for (at, &(from, word)) in words.iter().enumerate() {
            let Some(side) = of_word(&word.to_lowercase()) else {
                continue;
            };
            // The separator before the word goes with it; of the first word the one after it.
            let before = label[..from]
                .char_indices()
                .next_back()
                .map_or(0, |(i, _)| i);
            let after = &label[from + word.len()..];
            let rest = if at == 0 {
                after.chars().skip(1).collect()
            } else {
                format!("{}{after}", &label[..before])
            };
            if !rest.is_empty() {
                readings.push((SideMark::Word(at), side, rest));
            }
        }
    }
    let letters: Vec<char> = label.chars().collect();
    if letters.len() > 2 {
        let of_letter = |letter: char| match letter {
            'L' => Some(Hemisphere::Left),
            'R' => Some(Hemisphere::Right),
            _ => None,
        };
        let last = letters.len() - 1;
        if let Some(side) = of_letter(letters[last]) {
            readings.push((SideMark::End, side, letters[..last].iter().collect()));
        }
        if let Some(side) = of_letter(letters[0]) {
            readings.push((SideMark::Start, side, letters[1..].iter().collect()));
        }
    }
    readings
}

fn of_word(word: &str) -> Option<Hemisphere> {
    SIDES.iter().find_map(|&(left, right)| {
        if word == left {
            Some(Hemisphere::Left)
        } else if word == right {
            Some(Hemisphere::Right)
        } else {
            None
        }
    })
}

#[cfg(test)]
mod tests {
    use super::{differ_only_by_side, without_side, Hemisphere, SideMark};

    #[test]
    fn labels_of_both_sides_leave_the_same_rest() {
        use Hemisphere::{Left, Right};
        for (one, other, mark, rest) in [
            ("lh-V1", "rh-V1", SideMark::Word(0), "V1"),
            ("ctx_LH_V1", "ctx_rh_V1", SideMark::Word(1), "ctx_V1"),
            (
                "Precentral_L",
                "Precentral_R",
                SideMark::Word(1),
                "Precentral",
            ),
            ("left V1", "right V1", SideMark::Word(0), "V1"),
            ("ASHL", "ASHR", SideMark::End, "ASH"),
            ("LV1", "RV1", SideMark::Start, "V1"),
        ] {
            assert!(differ_only_by_side(one, other));
            let expected = |side| (mark, side, rest.to_owned());
            assert!(without_side(one).contains(&expected(Left)), "{one}");
            assert!(without_side(other).contains(&expected(Right)), "{other}");
        }
        for plain in ["V1", "L", "AL", "", "é", "-"] {
            assert!(without_side(plain).is_empty(), "{plain}");
        }
    }

    #[test]
    fn sides_are_recognised_in_common_spellings() {
        for (one, other) in [
            ("lh-precentral", "rh-precentral"),
            ("Precentral_L", "Precentral_R"),
            ("ASHL", "ASHR"),
            ("left V1", "right V1"),
        ] {
            assert!(differ_only_by_side(one, other), "{one} {other}");
        }
        for (one, other) in [
            ("V1", "V2"),
            ("lh-V1", "rh-V2"),
            ("lh-V1", "lh-V1"),
            ("AL", "AR"),
        ] {
            assert!(!differ_only_by_side(one, other), "{one} {other}");
        }
    }
}
