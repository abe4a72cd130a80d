//! How often verdicts and tests err, at length. Each regime is kept in a file as soon as it is done, so
//! that the study can be stopped and continued; the table of all that is there is printed at the end.
//!
//! `cargo run --release --example validity_study -- --trials 200 --evidence mixture FOLDER`

#![allow(clippy::print_stdout)]

#[path = "../planted/mod.rs"]
mod planted;

use std::fs;
use std::path::PathBuf;

use clap::Parser;
use planted::trials::{judge, unit, Count, TRUTHS};
use planted::world::World;
use rayon::prelude::*;
use serde_json::{json, Value};

#[derive(Parser)]
struct Asked {
    /// Folder for the results; regimes that stand there already are not run again
    folder: PathBuf,
    /// Trials of each regime; trial t has seed t
    #[arg(long, default_value_t = 100)]
    trials: u64,
    /// What ranks
    #[arg(long, default_value = "canonical")]
    evidence: String,
}

/// Name, landmarks, wrong ones among them, drift, noise.
const REGIMES: [(&str, usize, usize, f64, f64); 7] = [
    ("low noise, 8 landmarks", 8, 0, 0.1, 0.2),
    ("low noise, 12 landmarks", 12, 0, 0.1, 0.2),
    ("low noise, 24 landmarks", 24, 0, 0.1, 0.2),
    ("low noise, 13 landmarks and a wrong one", 14, 1, 0.1, 0.2),
    ("medium noise, 12 landmarks", 12, 0, 0.2, 0.5),
    ("high noise, 12 landmarks", 12, 0, 0.4, 0.5),
    ("high noise, 24 landmarks", 24, 0, 0.4, 0.5),
];

fn main() {
    let asked = Asked::parse();
    fs::create_dir_all(&asked.folder).expect("the folder can be made");
    println!("| regime | truth | pairs | conserved | displaced | undetermined | cannot show | further p <= .05, .1 | nearer p <= .05, .1 |");
    println!("|---|---|---|---|---|---|---|---|---|");
    for (number, (name, landmarks, wrong, drift, noise)) in REGIMES.into_iter().enumerate() {
        let file = asked
            .folder
            .join(format!("{}-{}-{number}.json", asked.evidence, asked.trials));
        let counts = match fs::read(&file) {
            Ok(bytes) => read(&serde_json::from_slice(&bytes).expect("a kept regime")),
            Err(_) => {
                let mut world = World {
                    parcels: 80,
                    landmarks,
                    wrong,
                    drift,
                    noise,
                    unit: 0.0,
                };
                world.unit = unit(&World { wrong: 0, ..world });
                let each: Vec<[Count; TRUTHS.len()]> = (0..asked.trials)
                    .into_par_iter()
                    .map(|seed| judge(&world, seed, &asked.evidence))
                    .collect();
                let mut sum = [Count::default(); TRUTHS.len()];
                for counts in &each {
                    for (total, own) in sum.iter_mut().zip(counts) {
                        total.plus(own);
                    }
                }
                fs::write(&file, kept(&sum).to_string()).expect("the folder takes a file");
                sum
            }
        };
        for (truth, count) in TRUTHS.iter().zip(counts) {
            let share = |x: f64| format!("{:.3}", x / count.pairs);
            let [conserved, displaced, undetermined, cannot] = count.verdicts.map(share);
            let [f5, f10] = count.further.map(share);
            let [n5, n10] = count.nearer.map(share);
            println!("| {name} | {truth} | {} | {conserved} | {displaced} | {undetermined} | {cannot} | {f5}, {f10} | {n5}, {n10} |", count.pairs);
        }
    }
}

fn kept(counts: &[Count; TRUTHS.len()]) -> Value {
    counts
        .iter()
        .map(|c| json!([[c.pairs], c.verdicts, c.further, c.nearer]))
        .collect()
}

fn read(kept: &Value) -> [Count; TRUTHS.len()] {
    let mut counts = [Count::default(); TRUTHS.len()];
    for (count, kept) in counts.iter_mut().zip(kept.as_array().expect("a list")) {
        let number = |i: usize, j: usize| kept[i][j].as_f64().expect("a number");
        count.pairs = number(0, 0);
        count.verdicts = std::array::from_fn(|j| number(1, j));
        count.further = std::array::from_fn(|j| number(2, j));
        count.nearer = std::array::from_fn(|j| number(3, j));
    }
    counts
}
