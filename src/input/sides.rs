//! Whether two labels name the left and the right copy of one thing.

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

#[cfg(test)]
mod tests {
    use super::differ_only_by_side;

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
