//! What a study file or a command line asks for, before defaults.

use std::ops::RangeInclusive;

use thiserror::Error;

use super::{Axes, Conduct, EmbeddingChoice, EvidenceChoice, Settings, Top};
use crate::bootstrap::Resampling;
use crate::domain::{Choice, Hemispheres, Seed};
use crate::embed::Method;
use crate::transport::Mass;

/// A setting that cannot be used.
#[derive(Debug, Clone, PartialEq, Eq, Error)]
pub enum BadSetting {
    /// No setting of that name.
    #[error("unknown setting {0:?}")]
    UnknownKey(String),
    /// A value outside its range.
    #[error("{key} must be {expected}, found {found:?}")]
    Value {
        /// The setting.
        key: &'static str,
        /// What it must be.
        expected: &'static str,
        /// What came.
        found: String,
    },
    /// A word outside a fixed list.
    #[error("unknown value {found:?} for {key}; known: {}", known.join(", "))]
    Choice {
        /// The setting.
        key: &'static str,
        /// The word.
        found: String,
        /// All known words.
        known: Vec<&'static str>,
    },
}

/// Declares the request: one line for each setting gives its field, its key, its parser and what it
/// must be, so that study file and command line cannot drift apart.
macro_rules! request {
    ($($(#[doc = $doc:literal])+ $field:ident : $type:ty = $key:literal, $parse:expr;)+) => {
        /// Settings asked for; `None` where nothing was said.
        #[derive(Debug, Clone, Default, PartialEq)]
        pub struct Request { $($(#[doc = $doc])+ pub $field: Option<$type>),+ }

        impl Request {
            /// Every key, as in `[settings]` of a study file and (behind `--`) on the command line.
            pub const KEYS: &'static [&'static str] = &[$($key),+];

            /// Every key with a sentence on its meaning.
            pub const MEANINGS: &'static [(&'static str, &'static str)] =
                &[$(($key, concat!($($doc),+))),+];

            /// Sets one key from its text.
            ///
            /// # Errors
            /// [`BadSetting`] for an unknown key or a value it cannot take.
            pub fn set(&mut self, key: &str, text: &str) -> Result<(), BadSetting> {
                match key {
                    $($key => {
                        let parse: fn(&'static str, &str) -> Result<$type, BadSetting> = $parse;
                        self.$field = Some(parse($key, text)?);
                        Ok(())
                    })+
                    _ => Err(BadSetting::UnknownKey(key.to_owned())),
                }
            }

            /// What this request says, and where it is silent what `fallback` says.
            #[must_use]
            pub fn or(self, fallback: Request) -> Request {
                Request { $($field: self.$field.or(fallback.$field)),+ }
            }
        }
    };
}

// Upper ends keep a slip of the keyboard from asking for more memory or threads than there are.
request! {
    /// Bootstrap replicates: more make support and standard errors smoother.
    replicates: usize = "replicates", |key, text| whole(key, text, 2..=10_000_000, "a whole number from 2 to 10000000");
    /// How many of them also rank, for the rank intervals.
    rank_replicates: usize = "rank-replicates", |key, text| whole(key, text, 1..=100_000, "a whole number from 1 to 100000");
    /// Seed of every random draw; the same seed gives the same tables.
    seed: u64 = "seed", |key, text| text.parse().map_err(|_| bad(key, "a whole number of 0 or more", text));
    /// Worker threads, which change no number; without this line one for each processor.
    threads: usize = "threads", |key, text| whole(key, text, 1..=1024, "a whole number from 1 to 1024");
    /// Axes of the joint spaces, or "auto": left-out landmarks choose.
    axes: Axes = "axes", |key, text| match text {
        "auto" => Ok(Axes::Auto),
        _ => whole(key, text, 1..=usize::MAX, "auto or a whole number of 1 or more").map(Axes::Number),
    };
    /// Replicates that also draw subjects again, where there are any.
    subject_replicates: usize = "subject-replicates", |key, text| whole(key, text, 2..=100_000, "a whole number from 2 to 100000");
    /// How connectivity becomes coordinates, or "auto": left-out landmarks choose.
    embedding: EmbeddingChoice = "embedding", choice;
    /// Density exponent of the diffusion map, 0 to 1: 1 removes the density of parcels from it.
    density_exponent: f64 = "density-exponent", |key, text| number(key, text, 0.0..=1.0, "a number from 0 to 1");
    /// Diffusion time in steps: larger keeps coarser structure, 0 weighs all times together.
    diffusion_time: f64 = "diffusion-time", |key, text| number(key, text, 0.0..=1e3, "a number from 0 to 1000");
    /// What ranks the counterparts.
    evidence: EvidenceChoice = "evidence", choice;
    /// Mass of parcels in transport.
    mass: Mass = "mass", choice;
    /// Replicates of transport to average; large species get fewer.
    transport_replicates: usize = "transport-replicates", |key, text| whole(key, text, 24..=10_000, "a whole number from 24 to 10000");
    /// Ridge of the canonical correlation in units of the landmarks' mean variance; 0 is classical.
    ridge: f64 = "ridge", |key, text| number(key, text, 0.0..=1e6, "a number of 0 or more");
    /// How landmark blocks are drawn.
    resampling: Resampling = "resampling", choice;
    /// What hemispheres mean; match and fold need to know them.
    hemispheres: Hemispheres = "hemispheres", choice;
    /// Counterparts listed for each parcel, or "all".
    top: Top = "top", |key, text| match text {
        "all" => Ok(Top::All),
        _ => whole(key, text, 1..=usize::MAX, "all or a whole number of 1 or more").map(Top::Number),
    };
    /// Level of candidate sets, 0.5 to 0.99: the share of parcels whose set is to hold the counterpart.
    level: f64 = "level", |key, text| number(key, text, 0.5..=0.99, "a number from 0.5 to 0.99");
    /// No progress and no warnings on the terminal; the warnings are in run.json all the same.
    quiet: bool = "quiet", flag;
    /// Replace a finished run in the output folder, once the new one is complete.
    replace: bool = "replace", flag;
    /// Write no report page (there is none in this version).
    no_report: bool = "no-report", flag;
}

/// Replicates unless asked otherwise.
const REPLICATES: usize = 1000;
/// Replicates that also rank, unless asked otherwise.
const RANK_REPLICATES: usize = 200;
/// Replicates that also draw subjects, unless asked otherwise: each embeds both species again.
const SUBJECT_REPLICATES: usize = 200;
/// Seed unless asked otherwise: any fixed number would do.
const SEED: u64 = 1;
/// Density exponent unless asked otherwise: half-way between ignoring and removing the density of
/// parcels (Coifman & Lafon 2006 treat 0, 1/2 and 1).
const DENSITY_EXPONENT: f64 = 0.5;
/// Diffusion time unless asked otherwise.
const DIFFUSION_TIME: f64 = 1.0;
/// Ridge unless asked otherwise; docs/method.md has the figures it was chosen by.
const RIDGE: f64 = 0.4;
/// Replicates of transport unless asked otherwise: every landmark block is left out of 40 of them.
const TRANSPORT_REPLICATES: usize = 120;
/// Counterparts listed unless asked otherwise.
const TOP: usize = 10;
/// Level of candidate sets unless asked otherwise: nine landmark blocks reach it.
const LEVEL: f64 = 0.9;

impl Request {
    /// The default of a key, as it is written in a study file; of `threads`, which has none, a value
    /// that does no harm.
    #[must_use]
    pub fn default_of(key: &str) -> String {
        let (settings, conduct) = Request::default().settle();
        match key {
            "threads" => "1".to_owned(),
            "quiet" => conduct.quiet.to_string(),
            "replace" => conduct.replace.to_string(),
            _ => serde_json::to_value(settings)
                .ok()
                .and_then(|all| all.get(key).map(ToString::to_string))
                .unwrap_or_else(|| "false".to_owned()),
        }
    }

    /// Fills in the defaults.
    #[must_use]
    pub fn settle(self) -> (Settings, Conduct) {
        let replicates = self.replicates.unwrap_or(REPLICATES);
        let settings = Settings {
            replicates,
            rank_replicates: self
                .rank_replicates
                .unwrap_or(RANK_REPLICATES)
                .min(replicates),
            subject_replicates: self
                .subject_replicates
                .unwrap_or(SUBJECT_REPLICATES)
                .min(replicates),
            seed: Seed(self.seed.unwrap_or(SEED)),
            axes: self.axes.unwrap_or(Axes::Auto),
            embedding: self.embedding.unwrap_or(Method::OF_SQUARE.into()),
            density_exponent: self.density_exponent.unwrap_or(DENSITY_EXPONENT),
            diffusion_time: self.diffusion_time.unwrap_or(DIFFUSION_TIME),
            evidence: self.evidence.unwrap_or(EvidenceChoice::Mixture),
            mass: self.mass.unwrap_or(Mass::Uniform),
            transport_replicates: self.transport_replicates.unwrap_or(TRANSPORT_REPLICATES),
            ridge: self.ridge.unwrap_or(RIDGE),
            resampling: self.resampling.unwrap_or(Resampling::Bayesian),
            hemispheres: self.hemispheres.unwrap_or(Hemispheres::Ignore),
            top: self.top.unwrap_or(Top::Number(TOP)),
            level: self.level.unwrap_or(LEVEL),
        };
        let conduct = Conduct {
            threads: self.threads.unwrap_or(0),
            quiet: self.quiet.unwrap_or(false),
            no_report: self.no_report.unwrap_or(false),
            replace: self.replace.unwrap_or(false),
        };
        (settings, conduct)
    }
}

fn bad(key: &'static str, expected: &'static str, found: &str) -> BadSetting {
    BadSetting::Value {
        key,
        expected,
        found: found.to_owned(),
    }
}

fn whole(
    key: &'static str,
    text: &str,
    range: RangeInclusive<usize>,
    expected: &'static str,
) -> Result<usize, BadSetting> {
    text.parse()
        .ok()
        .filter(|n| range.contains(n))
        .ok_or_else(|| bad(key, expected, text))
}

fn number(
    key: &'static str,
    text: &str,
    range: RangeInclusive<f64>,
    expected: &'static str,
) -> Result<f64, BadSetting> {
    text.parse()
        .ok()
        .filter(|x| range.contains(x))
        .ok_or_else(|| bad(key, expected, text))
}

fn flag(key: &'static str, text: &str) -> Result<bool, BadSetting> {
    text.parse().map_err(|_| bad(key, "true or false", text))
}

fn choice<C: Choice>(key: &'static str, text: &str) -> Result<C, BadSetting> {
    C::from_name(text).map_err(|e| BadSetting::Choice {
        key,
        found: e.found,
        known: C::names().collect(),
    })
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_command_line_wins_and_defaults_fill_in() {
        let mut file = Request::default();
        file.set("replicates", "50").unwrap();
        file.set("axes", "6").unwrap();
        let mut line = Request::default();
        line.set("axes", "auto").unwrap();
        let (settings, conduct) = line.or(file).settle();
        assert_eq!(settings.axes, Axes::Auto);
        assert_eq!((settings.replicates, settings.rank_replicates), (50, 50));
        assert_eq!(settings.top, Top::Number(10));
        assert!(!conduct.replace);
    }

    #[test]
    fn values_out_of_range_are_refused() {
        for (key, text) in [
            ("replicates", "1"),
            ("replicates", "many"),
            ("replicates", "10000001"),
            ("rank-replicates", "100001"),
            ("threads", "1025"),
            ("axes", "0"),
            ("density-exponent", "1.5"),
            ("diffusion-time", "-1"),
            ("mass", "weight"),
            ("transport-replicates", "23"),
            ("ridge", "NaN"),
            ("evidence", "guess"),
            ("hemispheres", "mirror"),
            ("top", "0"),
            ("level", "0.4"),
            ("level", "1"),
            ("quiet", "yes"),
        ] {
            let mut request = Request::default();
            assert!(request.set(key, text).is_err(), "{key} = {text}");
        }
    }
}
