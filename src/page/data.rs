//! What the script of the page knows, as JSON inside the page.

use serde_json::{json, Value};

use super::figures::{self, MatrixShown};
use super::model::{Answer, Model, Parcel, DOUBTFUL};
use crate::domain::Side;

/// The data of a page, written so that no label can end the element it stands in.
pub fn island(model: &Model) -> String {
    let text = data(model).to_string();
    let mut safe = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '<' | '>' | '&' | '\u{2028}' | '\u{2029}' => {
                safe += &format!("\\u{:04x}", c as u32);
            }
            c => safe.push(c),
        }
    }
    safe
}

fn data(model: &Model) -> Value {
    let each = |of: fn(&Parcel) -> Value| model.parcels.iter().map(of).collect::<Vec<_>>();
    let mut kinds: Vec<&str> = model
        .parcels
        .iter()
        .flat_map(|parcel| &parcel.candidates)
        .flat_map(|candidate| candidate.kinds.iter().map(String::as_str))
        .collect();
    kinds.sort_unstable();
    kinds.dedup();
    let matrix = MatrixShown::of(model);
    json!({
        "species": [model.species.a, model.species.b],
        "firstOfB": model.of_side(Side::A).count(),
        "parcels": {
            "label": each(|p| json!(p.label)),
            "landmark": each(|p| json!(p.landmark)),
            "beyond": each(|p| json!(p.beyond)),
            "hemisphere": each(|p| json!(p.attributes[0])),
            "group": each(|p| json!(p.attributes[1])),
            "longName": each(|p| json!(p.attributes[2])),
            "doubt": each(|p| json!(p.doubt)),
            "tooLittle": each(|p| json!(p.too_little)),
            "standing": each(|p| json!(p.standing().word())),
        },
        "kinds": kinds,
        "candidates": model.parcels.iter().map(|p| candidates(p, &kinds)).collect::<Vec<_>>(),
        "landmarks": model
            .landmarks
            .iter()
            .map(|l| json!({
                "name": l.name,
                "block": l.block,
                "parcels": [l.parcels.a, l.parcels.b],
                "leftOut": [[l.left_out.a.0, l.left_out.a.1], [l.left_out.b.0, l.left_out.b.1]],
                "contradicted": l.contradicted,
            }))
            .collect::<Vec<_>>(),
        "influence": influence(model),
        "checks": model.checks.as_ref().map(answer),
        "rank": model.rank.as_ref().map(answer),
        "joint": figures::joint_space_data(model),
        "doubtful": DOUBTFUL,
        "matrix": [matrix.order.a, matrix.order.b],
    })
}

/// The candidates of a parcel as short rows: candidate, rank, ends of its interval, distance, support,
/// mutual, kinds, chance, in the candidate set.
fn candidates(parcel: &Parcel, kinds: &[&str]) -> Vec<Value> {
    parcel
        .candidates
        .iter()
        .map(|c| {
            let agreeing: Vec<usize> = c
                .kinds
                .iter()
                .filter_map(|kind| kinds.iter().position(|k| k == kind))
                .collect();
            json!([
                c.parcel,
                c.rank,
                c.interval.0,
                c.interval.1,
                c.distance,
                c.support,
                u8::from(c.mutual),
                agreeing,
                c.chance,
                u8::from(c.in_set)
            ])
        })
        .collect()
}

/// For each set, what became of each parcel: how far it moved to four digits, its first candidate then,
/// and the rank of its first with all landmarks.
fn influence(model: &Model) -> Value {
    let Some(influence) = &model.influence else {
        return Value::Null;
    };
    let moved: Vec<Vec<Value>> = influence
        .moved
        .iter()
        .map(|set| {
            set.iter()
                .map(|moved| match moved {
                    None => json!(0),
                    Some(moved) => {
                        let by = figures::digits(moved.by);
                        match moved.first {
                            None => json!([by]),
                            Some((first, rank)) => json!([by, first, rank]),
                        }
                    }
                })
                .collect()
        })
        .collect();
    json!({"sets": influence.sets, "moved": moved})
}

fn answer(answer: &Answer) -> Value {
    json!({"header": answer.header, "rows": answer.rows})
}
