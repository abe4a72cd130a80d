//! The command line: what every option means, its unit and its default.

use std::path::PathBuf;

use clap::{Args, Parser, Subcommand};
use kinmark::input::{read_pairs, InputError, Source};
use kinmark::paint::PaintRequest;
use kinmark::questions::{CheckRequest, PlanRequest};
use kinmark::settings::Request;

/// Map homologous brain parcels between two species.
///
/// From a connectivity matrix for each species and a table of landmark parcels assumed homologous:
/// where every other parcel falls in the other species' space, which parcels there correspond, and
/// how well landmarks fare when they are left out.
#[derive(Debug, Parser)]
#[command(
    name = "kinmark",
    version,
    help_expected = true,
    arg_required_else_help = true,
    after_help = kinmark::report::CAUTION
)]
pub struct Cli {
    /// What to do.
    #[command(subcommand)]
    pub command: Command,
}

/// The commands.
#[derive(Debug, Subcommand)]
pub enum Command {
    /// Write a first study file for the matrices and the landmark table of a folder
    New(New),
    /// Show what is understood of a study, before a run: weights, networks, landmarks, suggestions
    Inspect(Inspect),
    /// Place every parcel of either species in the other's space and write the tables
    Locate(Locate),
    /// Check whether a named candidate's position is conserved: conserved, displaced, or neither can be said
    Check(Check),
    /// Hold landmarks out: what they are worth, whether the pairing matters, how much each moves the rest
    Holdout(Holdout),
    /// Rank all parcels by how surely they correspond, with their candidate sets
    Rank(Rank),
    /// Write the page of a finished run, to look at in a browser, and its figures
    Report(Report),
    /// Paint a finished run onto a species' surfaces: maps over vertices for a viewer
    Paint(Paint),
}

/// Options of `locate`. Each is also a key in the study file's [settings]; the command line wins.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Locate {
    /// Study file (TOML): both species, their matrices, the landmark table
    pub study: PathBuf,

    /// Folder for the tables; must be absent, empty, or an unfinished run of the same study
    #[arg(long, value_name = "DIR")]
    pub out: PathBuf,

    #[command(flatten)]
    settings: SettingOptions,
}

/// Options of `new`.
#[derive(Debug, Args)]
pub struct New {
    /// Folder with the matrices and the landmark table; study.toml is written to it, never over
    /// another
    pub folder: PathBuf,
}

/// Options of `report`.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Report {
    /// Folder of a finished run, as locate wrote it; gets report.html and figures/
    pub run: PathBuf,

    /// Replace a page and figures that were changed by hand; others are always written anew
    #[arg(long)]
    pub replace: bool,
}

/// Options of `paint`.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Paint {
    /// Folder of a finished run, as locate wrote it
    pub run: PathBuf,

    /// Species whose surfaces the label files describe: its name, or a or b
    #[arg(long, value_name = "NAME")]
    species: String,

    /// GIFTI label file (.label.gii) of the species' parcellation; once for each hemisphere
    #[arg(long, value_name = "FILE", required = true)]
    labels: Vec<PathBuf>,

    /// Parcel of the other species: paint where it falls; may be given several times
    #[arg(long, value_name = "LABEL")]
    parcel: Vec<String>,

    /// Alignment whose axes are painted [default: the one whose distances the run shows]
    #[arg(long, value_name = "procrustes|canonical")]
    alignment: Option<String>,

    /// Folder for the maps; not inside RUN [default: RUN with -maps behind its name]
    #[arg(long, value_name = "DIR")]
    out: Option<PathBuf>,

    /// Replace maps that are there already and differ
    #[arg(long)]
    replace: bool,
}

impl Paint {
    /// What is asked for.
    pub fn request(self) -> PaintRequest {
        PaintRequest {
            run: self.run,
            species: self.species,
            labels: self.labels,
            parcels: self.parcel,
            alignment: self.alignment,
            out: self.out,
            replace: self.replace,
        }
    }
}

/// Options of `inspect`. It takes the settings of `locate`, so that a command line can be tried.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Inspect {
    /// Study file (TOML): both species, their matrices, the landmark table
    pub study: PathBuf,

    /// Write everything as JSON, for other programs
    #[arg(long)]
    pub json: bool,

    #[command(flatten)]
    settings: SettingOptions,
}

/// Options of `check`. On a finished run the settings are those of the run.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Check {
    /// Study file, or folder of a finished run, whose inputs are then read again and must not have
    /// changed
    #[arg(value_name = "STUDY|RUN")]
    pub asked: PathBuf,

    /// The parcel in question; without --against: where it falls, and no verdict
    #[arg(long, value_name = "LABEL", required_unless_present = "pairs")]
    parcel: Option<String>,

    /// Its candidates in the other species, named before looking, separated by commas; may be repeated
    #[arg(long, value_name = "LABELS", requires = "parcel")]
    against: Vec<String>,

    /// Species of the parcel: its name, or a or b [default: a]
    #[arg(long, value_name = "NAME", requires = "parcel")]
    species: Option<String>,

    /// Table of pairs to check, with the columns a and b
    #[arg(long, value_name = "FILE")]
    pairs: Option<PathBuf>,

    /// Write the answer as JSON, for other programs
    #[arg(long)]
    pub json: bool,

    /// Folder for checks.csv and a record, as for locate [default: RUN gets the table; for a STUDY
    /// nothing is written]
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,

    #[command(flatten)]
    settings: SettingOptions,
}

impl Check {
    /// The settings asked for.
    pub fn request(&self) -> Request {
        self.settings.request()
    }

    /// What is to be checked.
    ///
    /// # Errors
    /// A table of pairs that cannot be read.
    pub fn what(&self) -> Result<CheckRequest, InputError> {
        let pairs = match &self.pairs {
            Some(file) => read_pairs(&Source::read(file)?)?,
            None => Vec::new(),
        };
        let against = self.against.iter().flat_map(|list| list.split(','));
        let against = against.map(|name| name.trim().to_owned());
        Ok(CheckRequest {
            species: self.species.clone(),
            parcel: self.parcel.clone(),
            against: against.filter(|name| !name.is_empty()).collect(),
            pairs,
            file: self.pairs.clone(),
        })
    }
}

/// Options of `rank`. On a finished run the settings are those of the run.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Rank {
    /// Study file, or folder of a finished run, whose inputs are then read again and must not have
    /// changed
    #[arg(value_name = "STUDY|RUN")]
    pub asked: PathBuf,

    /// Folder for rank.csv and a record, as for locate [default: nothing is written]
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,

    #[command(flatten)]
    settings: SettingOptions,
}

impl Rank {
    /// The settings asked for.
    pub fn request(&self) -> Request {
        self.settings.request()
    }
}

/// Options of `holdout`. On a finished run the settings are those of the run.
#[derive(Debug, Args)]
#[command(after_help = kinmark::report::CAUTION)]
pub struct Holdout {
    /// Study file, or folder of a finished run, whose inputs are then read again and must not have
    /// changed
    #[arg(value_name = "STUDY|RUN")]
    pub asked: PathBuf,

    /// Hold out every landmark block by itself [the default]
    #[arg(long, conflicts_with_all = ["leave", "leave_file", "subsets"])]
    each: bool,

    /// Hold out these landmarks or blocks together, separated by commas; whole blocks go
    #[arg(long, value_name = "NAMES", conflicts_with = "subsets")]
    leave: Vec<String>,

    /// Hold out the landmarks or blocks named in a file, one a line
    #[arg(long, value_name = "FILE", conflicts_with = "subsets")]
    leave_file: Option<PathBuf>,

    /// Hold out sets of K blocks in turn: all of them, or as many as --budget allows
    #[arg(long, value_name = "K")]
    subsets: Option<usize>,

    /// Most sets of --subsets; each is a rerun. Drawn by the seed where there are more [default: 20]
    #[arg(long, value_name = "N", requires = "subsets", value_parser = clap::value_parser!(u32).range(1..=100_000))]
    budget: Option<u32>,

    /// Permuted landmark pairings to compare with; 0 for none [default: 999]
    #[arg(long, value_name = "N", value_parser = clap::value_parser!(u32).range(0..=1_000_000))]
    permutations: Option<u32>,

    /// Folder for the tables and a record, as for locate [default: RUN gets the tables; for a STUDY
    /// nothing is written]
    #[arg(long, value_name = "DIR")]
    pub out: Option<PathBuf>,

    #[command(flatten)]
    settings: SettingOptions,
}

/// Sets that are held out unless asked otherwise.
const BUDGET: u32 = 20;
/// Permutations unless asked otherwise: p-values go down to 0.001.
const PERMUTATIONS: u32 = 999;

impl Holdout {
    /// The settings asked for.
    pub fn request(&self) -> Request {
        self.settings.request()
    }

    /// What is to be held out.
    ///
    /// # Errors
    /// A file of names that cannot be read.
    pub fn plan(&self) -> Result<PlanRequest, InputError> {
        if let Some(size) = self.subsets {
            let budget = self.budget.unwrap_or(BUDGET) as usize;
            return Ok(PlanRequest::Subsets { size, budget });
        }
        if self.leave.is_empty() && self.leave_file.is_none() {
            return Ok(PlanRequest::Each);
        }
        let mut names: Vec<String> = Vec::new();
        let given = self.leave.iter().flat_map(|list| list.split(','));
        names.extend(given.map(str::to_owned));
        if let Some(file) = &self.leave_file {
            let source = Source::read(file)?;
            names.extend(source.text.lines().map(str::to_owned));
        }
        let names = names.iter().map(|name| name.trim().to_owned());
        Ok(PlanRequest::Named(
            names.filter(|n| !n.is_empty()).collect(),
        ))
    }

    /// Permuted pairings.
    pub fn permutations(&self) -> usize {
        self.permutations.unwrap_or(PERMUTATIONS) as usize
    }
}

/// Settings as text, checked by the same rules as in a study file.
#[derive(Debug, Args)]
struct SettingOptions {
    /// Bootstrap replicates: more make support and standard errors smoother [default: 1000]
    #[arg(long, value_name = "N", value_parser = checked("replicates"))]
    replicates: Option<String>,

    /// How many of them also rank, for the rank intervals [default: 200]
    #[arg(long, value_name = "N", value_parser = checked("rank-replicates"))]
    rank_replicates: Option<String>,

    /// How many of them also draw subjects again, where there are any [default: 200]
    #[arg(long, value_name = "N", value_parser = checked("subject-replicates"))]
    subject_replicates: Option<String>,

    /// Seed of every random draw; the same seed gives the same tables [default: 1]
    #[arg(long, value_name = "N", value_parser = checked("seed"))]
    seed: Option<String>,

    /// Worker threads; changes no number [default: one for each processor]
    #[arg(long, value_name = "N", value_parser = checked("threads"))]
    threads: Option<String>,

    /// Axes of the joint spaces: auto lets left-out landmarks choose [default: auto]
    #[arg(long, value_name = "auto|N", value_parser = checked("axes"))]
    axes: Option<String>,

    /// How connectivity becomes coordinates: diffusion map, or principal components of profiles; auto
    /// lets left-out landmarks choose [default: diffusion]
    #[arg(long, value_name = "diffusion|components|auto", value_parser = checked("embedding"))]
    embedding: Option<String>,

    /// Density exponent of the diffusion map, 0 to 1: 1 removes the density of parcels from it
    /// [default: 0.5]
    #[arg(long, value_name = "X", value_parser = checked("density-exponent"))]
    density_exponent: Option<String>,

    /// Diffusion time in steps: larger keeps coarser structure, 0 weighs all times together
    /// [default: 1]
    #[arg(long, value_name = "T", value_parser = checked("diffusion-time"))]
    diffusion_time: Option<String>,

    /// What ranks counterparts: one kind of evidence, or all of them weighed by left-out landmarks
    /// [default: mixture]
    #[arg(
        long,
        value_name = "mixture|procrustes|canonical|fingerprint|grown|transport",
        value_parser = checked("evidence")
    )]
    evidence: Option<String>,

    /// Mass of parcels in transport: the same for all, in proportion to areas, or free on the side
    /// of the candidates [default: uniform]
    #[arg(long, value_name = "uniform|area|free", value_parser = checked("mass"))]
    mass: Option<String>,

    /// Replicates of transport to average; large species get fewer, down to 24 [default: 120]
    #[arg(long, value_name = "N", value_parser = checked("transport-replicates"))]
    transport_replicates: Option<String>,

    /// Ridge of the canonical correlation in units of the landmarks' mean variance; 0 is classical
    /// [default: 0.4]
    #[arg(long, value_name = "X", value_parser = checked("ridge"))]
    ridge: Option<String>,

    /// How landmark blocks are drawn in a replicate; bayesian never drops one quite
    /// [default: bayesian]
    #[arg(long, value_name = "bayesian|ordinary", value_parser = checked("resampling"))]
    resampling: Option<String>,

    /// What hemispheres mean: match allows only counterparts on the same side, fold makes one parcel
    /// of the left and the right copy of an area [default: ignore]
    #[arg(long, value_name = "ignore|match|fold", value_parser = checked("hemispheres"))]
    hemispheres: Option<String>,

    /// Counterparts listed for each parcel [default: 10]
    #[arg(long, value_name = "N|all", value_parser = checked("top"))]
    top: Option<String>,

    /// Level of candidate sets, 0.5 to 0.99: the share of parcels whose set is to hold the counterpart
    /// [default: 0.9]
    #[arg(long, value_name = "X", value_parser = checked("level"))]
    level: Option<String>,

    /// Show no progress and no warnings on the terminal; the warnings stay in run.json
    #[arg(long)]
    quiet: bool,

    /// Replace a finished run in DIR, once the new one is complete
    #[arg(long)]
    replace: bool,

    /// Write no page and no figures (locate); kinmark report writes them later
    #[arg(long)]
    no_report: bool,
}

impl Locate {
    /// The settings asked for.
    pub fn request(&self) -> Request {
        self.settings.request()
    }
}

impl Inspect {
    /// The settings asked for.
    pub fn request(&self) -> Request {
        self.settings.request()
    }
}

impl SettingOptions {
    fn request(&self) -> Request {
        let given = self;
        let flag = |on: bool| on.then(|| "true".to_owned());
        let (quiet, replace, no_report) = (
            flag(given.quiet),
            flag(given.replace),
            flag(given.no_report),
        );
        let mut request = Request::default();
        for (key, value) in [
            ("replicates", &given.replicates),
            ("rank-replicates", &given.rank_replicates),
            ("subject-replicates", &given.subject_replicates),
            ("seed", &given.seed),
            ("threads", &given.threads),
            ("axes", &given.axes),
            ("embedding", &given.embedding),
            ("density-exponent", &given.density_exponent),
            ("diffusion-time", &given.diffusion_time),
            ("evidence", &given.evidence),
            ("mass", &given.mass),
            ("transport-replicates", &given.transport_replicates),
            ("ridge", &given.ridge),
            ("resampling", &given.resampling),
            ("hemispheres", &given.hemispheres),
            ("top", &given.top),
            ("level", &given.level),
            ("quiet", &quiet),
            ("replace", &replace),
            ("no-report", &no_report),
        ] {
            if let Some(text) = value {
                request
                    .set(key, text)
                    .expect("values were checked when they were parsed");
            }
        }
        request
    }
}

/// A parser that lets a setting's own rules judge the text.
fn checked(key: &'static str) -> impl Fn(&str) -> Result<String, String> + Clone {
    move |text| {
        Request::default()
            .set(key, text)
            .map(|()| text.to_owned())
            .map_err(|e| e.to_string())
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use clap::CommandFactory;

    #[test]
    fn every_option_is_explained() {
        Cli::command().debug_assert();
    }

    #[test]
    fn every_setting_has_an_option() {
        let command = Cli::command();
        for name in ["locate", "inspect", "holdout", "rank"] {
            let command = command.find_subcommand(name).unwrap();
            for key in Request::KEYS {
                assert!(
                    command.get_arguments().any(|a| a.get_long() == Some(key)),
                    "{name} --{key}"
                );
            }
        }
    }
}
