//! The correspondence matrix: which candidates each parcel has, both species ordered along the first
//! joint axis, so that agreement shows as a diagonal.

use std::collections::HashMap;

use super::labels::{self, cut};
use super::svg::{n, Anchor, Drawing, INK, MUTED, SPECIES};
use super::{Figure, Layout};
use crate::domain::{Pair, Side};
use crate::page::model::Model;

/// Cells smaller than this are drawn at this size, and the lowest class is left out.
const LEAST: f64 = 1.3;

/// Colour of the crosses on landmarks, whose pairs were given.
const GIVEN: &str = "#00705a";

/// How a pair stands in the matrix. Size and darkness say the same.
#[derive(Debug, Clone, Copy, PartialEq, Eq, PartialOrd, Ord)]
enum Class {
    /// Among those listed, from either side.
    Listed,
    /// Second or third from either side.
    Near,
    /// First from one side.
    First,
    /// Each the other's first.
    Mutual,
}

impl Class {
    const ALL: [Class; 4] = [Class::Listed, Class::Near, Class::First, Class::Mutual];

    fn of(ranks: Ranks) -> Class {
        let best = ranks.into_iter().flatten().min().unwrap_or(usize::MAX);
        match (ranks, best) {
            ([Some(1), Some(1)], _) => Class::Mutual,
            (_, 1) => Class::First,
            (_, 2 | 3) => Class::Near,
            _ => Class::Listed,
        }
    }

    /// Share of the side of a cell.
    fn size(self) -> f64 {
        match self {
            Class::Listed => 0.42,
            Class::Near => 0.66,
            Class::First => 0.9,
            Class::Mutual => 1.25,
        }
    }

    fn colour(self) -> &'static str {
        match self {
            Class::Listed => "#b7bdc4",
            Class::Near => "#8b96a1",
            Class::First => "#55637a",
            Class::Mutual => "#12263f",
        }
    }

    fn word(self) -> &'static str {
        match self {
            Class::Listed => "ranks 4 to 10",
            Class::Near => "ranks 2, 3",
            Class::First => "first one way",
            Class::Mutual => "first both ways",
        }
    }
}

/// What the matrix shows, for the page.
pub struct Shown {
    /// Parcels of a from the left, of b from below, as indices.
    pub order: Pair<Vec<usize>>,
    /// Whether pairs of the lowest class are left out.
    pub thinned: bool,
}

impl Shown {
    /// How the matrix of a model is laid out.
    #[must_use]
    pub fn of(model: &Model) -> Shown {
        let order = Pair::from_fn(|side| model.along_first_axis(side));
        let most = order.a.len().max(order.b.len());
        let cell = (Layout::Wide.width() - 130.0) / most.max(1) as f64;
        Shown {
            thinned: cell < LEAST,
            order,
        }
    }
}

/// The figure.
pub fn figure(model: &Model) -> Figure {
    Figure {
        name: "matrix",
        title: "Correspondence matrix along the first joint axis".to_owned(),
        description: format!(
            "Matrix of candidates: parcels of {} across, of {} upwards, both ordered along {} axis 1. Dark \
             large squares are pairs that are each other's first.",
            model.species.a, model.species.b, model.spaces[model.shown].name
        ),
        wide: Some(draw(model, Layout::Wide)),
        narrow: draw(model, Layout::Narrow),
    }
}

/// A parcel of a and one of b.
type Couple = (usize, usize);
/// A rank from a and one from b, where they are listed.
type Ranks = [Option<usize>; 2];

/// Ranks of every listed pair, in order.
fn pairs(model: &Model) -> Vec<(Couple, Ranks)> {
    let mut found: HashMap<Couple, Ranks> = HashMap::new();
    for (at, parcel) in model.parcels.iter().enumerate() {
        for candidate in &parcel.candidates {
            let (pair, which) = match parcel.side {
                Side::A => ((at, candidate.parcel), 0),
                Side::B => ((candidate.parcel, at), 1),
            };
            found.entry(pair).or_default()[which] = Some(candidate.rank);
        }
    }
    let mut found: Vec<_> = found.into_iter().collect();
    found.sort_unstable();
    found
}

fn draw(model: &Model, layout: Layout) -> Drawing {
    let shown = Shown::of(model);
    let width = layout.width();
    let letters = match layout {
        Layout::Wide => 12,
        Layout::Narrow => 8,
    };
    let longest = |side: Side| {
        let widths = model
            .of_side(side)
            .map(|(_, parcel)| labels::width(&cut(&parcel.label, letters)));
        widths.fold(30.0, f64::max)
    };
    // Names of a are turned by 60 degrees.
    let (left, below) = (26.0 + longest(Side::B), 38.0 + 0.87 * longest(Side::A));
    let top = match layout {
        Layout::Wide => 56.0,
        Layout::Narrow => 74.0,
    };
    let right = width - 8.0;
    let columns = shown.order.a.len().max(1) as f64;
    let rows = shown.order.b.len().max(1) as f64;
    // Cells are square where that gives a figure that fits a screen.
    let across = (right - left) / columns;
    let up = across.min(1.15 * (right - left) / rows);
    let bottom = top + up * rows;
    let mut d = Drawing::new(width, bottom + below);
    d.data = format!(
        " data-figure=\"matrix\" data-left=\"{left}\" data-bottom=\"{}\" data-across=\"{across}\" \
         data-up=\"{up}\"",
        n(bottom)
    );
    d.heading("Correspondence matrix");
    legend(&mut d, layout, shown.thinned);
    d.rect(
        (left, top),
        (right - left, bottom - top),
        &[("fill", &"none"), ("stroke", &MUTED)],
    );

    let place: HashMap<usize, usize> = Side::BOTH
        .into_iter()
        .flat_map(|side| shown.order[side].iter().enumerate())
        .map(|(at, &parcel)| (parcel, at))
        .collect();
    let centre = |a: usize, b: usize| {
        (
            left + across * (place[&a] as f64 + 0.5),
            bottom - up * (place[&b] as f64 + 0.5),
        )
    };
    // Lines that the script moves to the parcel that is picked.
    d.open("g", &[("class", &"guides"), ("display", &"none")]);
    d.rect(
        (left, top),
        (right - left, up.max(LEAST)),
        &[("fill", &SPECIES[1]), ("opacity", &0.25)],
    );
    d.rect(
        (left, top),
        (across.max(LEAST), bottom - top),
        &[("fill", &SPECIES[0]), ("opacity", &0.25)],
    );
    d.close("g");
    let mut paths = Class::ALL.map(|_| String::new());
    for ((a, b), ranks) in pairs(model) {
        let class = Class::of(ranks);
        if shown.thinned && class == Class::Listed {
            continue;
        }
        let (x, y) = centre(a, b);
        let side = (class.size() * across.min(up)).max(LEAST * class.size().max(0.8));
        let (corner, length) = ((x - side / 2.0, y - side / 2.0), n(side));
        paths[class as usize] += &format!(
            "M{} {}h{length}v{length}h-{length}z",
            tenth(corner.0),
            tenth(corner.1)
        );
    }
    for (class, path) in Class::ALL.into_iter().zip(paths) {
        d.leaf("path", &[("d", &path), ("fill", &class.colour())]);
    }
    let mut crosses = String::new();
    for landmark in &model.landmarks {
        for &a in &landmark.parcels.a {
            for &b in &landmark.parcels.b {
                let (x, y) = centre(a, b);
                crosses += &format!("M{} {}l7 7m0 -7l-7 7", tenth(x - 3.5), tenth(y - 3.5));
            }
        }
    }
    d.leaf(
        "path",
        &[("d", &crosses), ("stroke", &GIVEN), ("stroke-width", &2)],
    );
    names(
        &mut d,
        model,
        &shown,
        (left, right, top, bottom),
        (across, up),
        letters,
    );
    d
}

fn tenth(x: f64) -> String {
    n((x * 10.0).round() / 10.0)
}

fn legend(d: &mut Drawing, layout: Layout, thinned: bool) {
    let mut x = 0.0;
    let mut y = 40.0;
    for class in Class::ALL.into_iter().rev() {
        if thinned && class == Class::Listed {
            continue;
        }
        let side = 10.0 * class.size();
        d.rect(
            (x + 7.0 - side / 2.0, y - 4.5 - side / 2.0),
            (side, side),
            &[("fill", &class.colour())],
        );
        d.text((x + 18.0, y), Anchor::Start, class.word(), &[]);
        x += labels::width(class.word()) + 30.0;
        if layout == Layout::Narrow && class == Class::First {
            (x, y) = (0.0, 60.0);
        }
    }
    let cross = format!("M{} {}l7 7m0 -7l-7 7", n(x + 3.5), n(y - 8.0));
    d.leaf(
        "path",
        &[("d", &cross), ("stroke", &GIVEN), ("stroke-width", &2)],
    );
    d.text((x + 18.0, y), Anchor::Start, "landmark", &[]);
}

/// Names of some parcels at the edge, as many as can be read, and what the edges are.
fn names(
    d: &mut Drawing,
    model: &Model,
    shown: &Shown,
    (left, right, top, bottom): (f64, f64, f64, f64),
    (across, up): (f64, f64),
    letters: usize,
) {
    const APART: f64 = 16.0;
    let label = |parcel: usize| cut(&model.parcels[parcel].label, letters);
    let every = |cell: f64| (APART / cell).ceil().max(1.0) as usize;
    let axis = |side: Side, letters: usize| {
        let name = cut(&model.species[side], letters);
        let step = every(if side == Side::A { across } else { up });
        let some = match step {
            1 => String::new(),
            step => format!(", 1 in {step} named"),
        };
        format!("{name} along axis 1{some}")
    };
    for at in (0..shown.order.a.len()).step_by(every(across)) {
        let x = left + across * (at as f64 + 0.5);
        d.line((x, bottom), (x, bottom + 4.0), &[("stroke", &MUTED)]);
        let turned = format!("rotate(-60 {} {})", n(x + 4.0), n(bottom + 12.0));
        d.text(
            (x + 4.0, bottom + 12.0),
            Anchor::End,
            &label(shown.order.a[at]),
            &[("fill", &MUTED), ("transform", &turned)],
        );
    }
    for at in (0..shown.order.b.len()).step_by(every(up)) {
        let y = bottom - up * (at as f64 + 0.5);
        d.line((left - 4.0, y), (left, y), &[("stroke", &MUTED)]);
        d.text(
            (left - 6.0, y + 4.0),
            Anchor::End,
            &label(shown.order.b[at]),
            &[("fill", &MUTED)],
        );
    }
    let width = d.width;
    let height = d.height;
    d.text(
        ((left + right).min(width) / 2.0, height - 6.0),
        Anchor::Middle,
        &axis(Side::A, 16),
        &[("fill", &INK)],
    );
    let turned = format!("rotate(-90 11 {})", n((top + bottom) / 2.0));
    d.text(
        (11.0, (top + bottom) / 2.0),
        Anchor::Middle,
        &axis(Side::B, 16),
        &[("fill", &INK), ("transform", &turned)],
    );
}
