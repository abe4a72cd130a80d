//! What each axis is worth: the correlation of landmarks in sample, and left out.

use super::scale::Scale;
use super::svg::{n, Anchor, Drawing, FAINT, INK, MUTED};
use super::{Figure, Layout};
use crate::page::model::{Model, Space};

/// Height of a row.
const ROW: f64 = 21.0;
/// Width that the names of axes take.
const NAMES: f64 = 52.0;

/// The figure.
pub fn figure(model: &Model) -> Figure {
    let held: Vec<String> = model
        .spaces
        .iter()
        .map(|space| {
            let held = space
                .axes
                .iter()
                .filter(|a| a.verdict() == "replicates")
                .count();
            format!(
                "{held} of {} {} axes replicate",
                space.axes.len(),
                space.name
            )
        })
        .collect();
    Figure {
        name: "axes",
        title: "Agreement of landmarks on each axis, in sample and left out".to_owned(),
        description: format!(
            "Correlations of the landmarks on each joint axis, in sample (rings) and left out (squares, filled where the axis replicates). {}.",
            held.join(", ")
        ),
        wide: Some(draw(model, Layout::Wide)),
        narrow: draw(model, Layout::Narrow),
    }
}

fn draw(model: &Model, layout: Layout) -> Drawing {
    let rows = |space: &Space| space.axes.len() as f64 * ROW;
    let panel = |space: &Space| rows(space) + 70.0;
    let heights: Vec<f64> = model.spaces.iter().map(panel).collect();
    let (height, width) = match layout {
        Layout::Wide => (heights.iter().copied().fold(0.0, f64::max), 344.0),
        Layout::Narrow => (heights.iter().sum(), layout.width()),
    };
    let mut d = Drawing::new(layout.width(), height + 52.0);
    d.heading("Agreement of landmarks on each axis");
    legend(&mut d);
    let (mut left, mut top) = (0.0, 52.0);
    for (space, height) in model.spaces.iter().zip(heights) {
        one(&mut d, space, (left, top), width);
        match layout {
            Layout::Wide => left += layout.width() - width,
            Layout::Narrow => top += height,
        }
    }
    d
}

fn legend(d: &mut Drawing) {
    ring(d, (6.0, 35.5));
    d.text((16.0, 40.0), Anchor::Start, "in sample", &[]);
    square(d, (102.0, 35.5), true);
    d.text((112.0, 40.0), Anchor::Start, "left out, replicates", &[]);
    square(d, (252.0, 35.5), false);
    d.text((262.0, 40.0), Anchor::Start, "noise", &[]);
}

fn ring(d: &mut Drawing, (x, y): (f64, f64)) {
    d.leaf(
        "circle",
        &[
            ("cx", &n(x)),
            ("cy", &n(y)),
            ("r", &4.2),
            ("fill", &"#fff"),
            ("stroke", &INK),
            ("stroke-width", &1.8),
        ],
    );
}

/// Filled where an axis replicates, else empty.
fn square(d: &mut Drawing, (x, y): (f64, f64), replicates: bool) {
    let fill = if replicates { INK } else { "#fff" };
    d.rect(
        (x - 4.0, y - 4.0),
        (8.0, 8.0),
        &[("fill", &fill), ("stroke", &INK), ("stroke-width", &1.4)],
    );
}

fn one(d: &mut Drawing, space: &Space, (left, top): (f64, f64), width: f64) {
    let bottom = top + 24.0 + space.axes.len() as f64 * ROW;
    let x = Scale::linear((-1.0, 1.0), (left + NAMES, left + width - 12.0));
    d.text(
        (left, top + 12.0),
        Anchor::Start,
        &format!("{} space", space.name),
        &[("font-weight", &"bold")],
    );
    for (value, text) in [
        (-1.0, "−1"),
        (-0.5, "−0.5"),
        (0.0, "0"),
        (0.5, "0.5"),
        (1.0, "1"),
    ] {
        let colour = if value == 0.0 { MUTED } else { FAINT };
        d.line(
            (x.at(value), top + 20.0),
            (x.at(value), bottom),
            &[("stroke", &colour)],
        );
        d.text(
            (x.at(value), bottom + 16.0),
            Anchor::Middle,
            text,
            &[("fill", &MUTED)],
        );
    }
    d.text(
        ((x.at(-1.0) + x.at(1.0)) / 2.0, bottom + 34.0),
        Anchor::Middle,
        "correlation of landmarks",
        &[],
    );
    for (at, axis) in space.axes.iter().enumerate() {
        let y = top + 24.0 + ROW * (at as f64 + 0.5);
        d.text(
            (left, y + 4.5),
            Anchor::Start,
            &format!("axis {}", at + 1),
            &[],
        );
        let Some(left_out) = axis.left_out else {
            ring(d, (x.at(axis.in_sample), y));
            continue;
        };
        d.line(
            (x.at(axis.in_sample), y),
            (x.at(left_out), y),
            &[("stroke", &MUTED), ("stroke-width", &1.4)],
        );
        ring(d, (x.at(axis.in_sample), y));
        square(d, (x.at(left_out), y), axis.replicates == Some(true));
    }
}
