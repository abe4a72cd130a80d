//! Sides of the brain, and what a run makes of them.

use super::choice::choices;

choices! {
    /// The side of the brain a parcel lies on.
    pub enum Hemisphere {
        /// The left side.
        Left = "left",
        /// The right side.
        Right = "right",
        /// On the midline, or on both sides taken together.
        Midline = "midline",
    }
}

choices! {
    /// What hemispheres mean for a run.
    pub enum Hemispheres {
        /// Every parcel of the other species is a candidate, whatever its side.
        Ignore = "ignore",
        /// Candidates lie on the parcel's own side; the midline matches any.
        Match = "match",
        /// Left and right copies of an area become one parcel before anything else.
        Fold = "fold",
    }
}

/// Spellings of each side, in lower case: common practice, no source.
const SPELLINGS: [(Hemisphere, &[&str]); 3] = [
    (Hemisphere::Left, &["left", "l", "lh"]),
    (Hemisphere::Right, &["right", "r", "rh"]),
    (
        Hemisphere::Midline,
        &["midline", "mid", "m", "both", "bilateral"],
    ),
];

impl Hemisphere {
    /// The side spelled so, in capitals or not; `None` for any other word.
    ///
    /// ```
    /// use kinmark::domain::Hemisphere;
    /// assert_eq!(Hemisphere::spelled("LH"), Some(Hemisphere::Left));
    /// assert_eq!(Hemisphere::spelled("bilateral"), Some(Hemisphere::Midline));
    /// assert_eq!(Hemisphere::spelled("dorsal"), None);
    /// ```
    #[must_use]
    pub fn spelled(word: &str) -> Option<Hemisphere> {
        let word = word.to_lowercase();
        SPELLINGS
            .iter()
            .find(|(_, known)| known.contains(&word.as_str()))
            .map(|(side, _)| *side)
    }

    /// Every spelling that is understood, for messages.
    #[must_use]
    pub fn spellings() -> String {
        let of_side = |(_, words): &(Hemisphere, &[&str])| words.join(", ");
        SPELLINGS.iter().map(of_side).collect::<Vec<_>>().join("; ")
    }

    /// Whether parcels of two sides may be counterparts where sides are matched.
    #[must_use]
    pub fn matches(self, other: Hemisphere) -> bool {
        self == other || self == Hemisphere::Midline || other == Hemisphere::Midline
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_midline_matches_any_side() {
        use Hemisphere::{Left, Midline, Right};
        assert!(Left.matches(Left) && Left.matches(Midline) && Midline.matches(Right));
        assert!(!Left.matches(Right) && !Right.matches(Left));
    }

    #[test]
    fn no_spelling_stands_for_two_sides() {
        let all: Vec<&str> = SPELLINGS
            .iter()
            .flat_map(|(_, w)| w.iter().copied())
            .collect();
        for word in &all {
            assert_eq!(all.iter().filter(|w| *w == word).count(), 1, "{word}");
        }
    }
}
