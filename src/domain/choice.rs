//! Settings that take one of a few names: one list gives the type, its spelling and its meaning.

use thiserror::Error;

/// A word that is none of the known ones.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
#[error("expected one of {known}, found {found:?}")]
pub struct UnknownChoice {
    /// The word.
    pub found: String,
    /// All known words, comma-separated.
    pub known: String,
}

/// A fixed list of named choices.
pub trait Choice: Sized + Copy + 'static {
    /// Every choice with its spelling and a sentence on its meaning.
    const CHOICES: &'static [(Self, &'static str, &'static str)];

    /// The choice spelled so.
    ///
    /// # Errors
    /// [`UnknownChoice`] for any other word.
    fn from_name(name: &str) -> Result<Self, UnknownChoice> {
        Self::CHOICES
            .iter()
            .find(|(_, known, _)| *known == name)
            .map(|(choice, _, _)| *choice)
            .ok_or_else(|| UnknownChoice {
                found: name.to_owned(),
                known: Self::names().collect::<Vec<_>>().join(", "),
            })
    }

    /// All spellings.
    fn names() -> impl Iterator<Item = &'static str> {
        Self::CHOICES.iter().map(|(_, name, _)| *name)
    }
}

/// Declares an enum of named choices.
macro_rules! choices {
    ($(#[$meta:meta])* $vis:vis enum $name:ident { $($(#[doc = $doc:literal])+ $variant:ident = $word:literal),+ $(,)? }) => {
        $(#[$meta])*
        #[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
        $vis enum $name { $($(#[doc = $doc])+ $variant),+ }

        impl $crate::domain::Choice for $name {
            const CHOICES: &'static [(Self, &'static str, &'static str)] =
                &[$(($name::$variant, $word, concat!($($doc),+))),+];
        }

        impl std::str::FromStr for $name {
            type Err = $crate::domain::UnknownChoice;
            fn from_str(word: &str) -> Result<Self, Self::Err> {
                <$name as $crate::domain::Choice>::from_name(word)
            }
        }

        impl std::fmt::Display for $name {
            fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
                f.pad(match self { $($name::$variant => $word),+ })
            }
        }

        impl serde::Serialize for $name {
            fn serialize<S: serde::Serializer>(&self, to: S) -> Result<S::Ok, S::Error> {
                to.collect_str(self)
            }
        }
    };
}
pub(crate) use choices;
