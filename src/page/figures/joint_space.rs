//! The joint space: both species on two of its axes, landmarks tied to each other.

use serde_json::{json, Value};

use super::labels::{self, cut, Wanted};
use super::scale::{self, Scale};
use super::svg::{
    mark_path, n, triangle, Anchor, Drawing, ALARM, FAINT, INK, MUTED, SIZE, SPECIES,
};
use super::{Figure, Layout};
use crate::domain::Side;
use crate::page::model::{Model, Space};

/// Half axes of a 90 % ellipse of a normal distribution in two dimensions, in standard errors: the root
/// of the 0.9 quantile of chi-squared with 2 degrees of freedom, -2 ln 0.1.
pub const ELLIPSE: f64 = 2.145_966_026_289_347;
/// Characters of a label on the figure.
const LABEL: usize = 20;
/// Ticks that an axis can have.
const TICKS: usize = 9;
/// Axes whose labels are placed beforehand for every pair; labels of further pairs name landmarks only
/// where the script finds room. Twelve axes give 132 pairs, which takes a fraction of a second.
const PAIRED: usize = 12;

/// Sizes of one layout.
struct Plot {
    width: f64,
    height: f64,
    left: f64,
    right: f64,
    top: f64,
    bottom: f64,
    labels: usize,
    ticks: usize,
}

impl Plot {
    fn of(layout: Layout) -> Plot {
        let width = layout.width();
        match layout {
            Layout::Wide => Plot {
                width,
                height: 640.0,
                left: 58.0,
                right: width - 12.0,
                top: 58.0,
                bottom: 590.0,
                labels: 40,
                ticks: 7,
            },
            Layout::Narrow => Plot {
                width,
                height: 430.0,
                left: 46.0,
                right: width - 6.0,
                top: 78.0,
                bottom: 382.0,
                labels: 14,
                ticks: 4,
            },
        }
    }

    fn scales(&self, x: (f64, f64), y: (f64, f64)) -> (Scale, Scale) {
        (
            Scale::linear(x, (self.left, self.right)),
            Scale::linear(y, (self.bottom, self.top)),
        )
    }

    fn frame(&self) -> (f64, f64, f64, f64) {
        (
            self.left + 2.0,
            self.top + 2.0,
            self.right - 2.0,
            self.bottom - 2.0,
        )
    }
}

/// Radius of an open parcel's mark: less where there are many.
fn radius(parcels: usize) -> f64 {
    match parcels {
        0..=120 => 4.2,
        121..=320 => 3.6,
        321..=900 => 2.8,
        _ => 2.2,
    }
}

/// The figure on the first two axes of the space that is shown.
pub fn figure(model: &Model) -> Figure {
    let (a, b) = (&model.species.a, &model.species.b);
    let space = &model.spaces[model.shown];
    Figure {
        name: "joint-space",
        title: "Joint space".to_owned(),
        description: format!(
            "Scatter plot of the joint space of {a} and {b} on {} axes 1 and 2: discs are parcels of {a}, \
             diamonds those of {b}; outlined marks belong to landmarks, lines tie the partners of a landmark.",
            space.name
        ),
        wide: Some(draw(model, Layout::Wide)),
        narrow: draw(model, Layout::Narrow),
    }
}

fn draw(model: &Model, layout: Layout) -> Drawing {
    let plot = Plot::of(layout);
    let space = &model.spaces[model.shown];
    let pair = (0, usize::from(space.axes.len() > 1));
    let (xs, ys) = (&space.coordinates[pair.0], &space.coordinates[pair.1]);
    let ranges = (scale::range(xs), scale::range(ys));
    let (x, y) = plot.scales(ranges.0, ranges.1);
    let radius = radius(model.parcels.len());

    let mut d = Drawing::new(plot.width, plot.height);
    d.data = format!(
        " data-figure=\"joint-space\" data-left=\"{}\" data-right=\"{}\" data-top=\"{}\" \
         data-bottom=\"{}\" data-radius=\"{radius}\" data-ticks=\"{}\"",
        plot.left, plot.right, plot.top, plot.bottom, plot.ticks
    );
    d.heading("Joint space: where parcels of both species fall");
    legend(&mut d, model, layout, &plot);
    d.rect(
        (plot.left, plot.top),
        (plot.right - plot.left, plot.bottom - plot.top),
        &[("fill", &"none"), ("stroke", &MUTED)],
    );
    ticks(&mut d, &plot, &x, scale::ticks(ranges.0, plot.ticks), true);
    ticks(&mut d, &plot, &y, scale::ticks(ranges.1, plot.ticks), false);
    let names = |axis: usize| axis_name(space, axis);
    let middle = (
        (plot.left + plot.right) / 2.0,
        (plot.top + plot.bottom) / 2.0,
    );
    d.text(
        (middle.0, plot.height - 8.0),
        Anchor::Middle,
        &names(pair.0),
        &[("class", &"x-name")],
    );
    let turned = format!("rotate(-90 13 {})", n(middle.1));
    d.text(
        (13.0, middle.1),
        Anchor::Middle,
        &names(pair.1),
        &[("class", &"y-name"), ("transform", &turned)],
    );

    let at = |parcel: usize| (x.at(xs[parcel]), y.at(ys[parcel]));
    ellipses(&mut d, model, space, pair, &at, (&x, &y));
    ties(&mut d, model, &at);
    d.open("g", &[("class", &"marks")]);
    for (parcel, of) in model.parcels.iter().enumerate() {
        let (px, py) = at(parcel);
        let side = usize::from(of.side == Side::B);
        let place = format!("translate({} {})", n(px), n(py));
        let (mut r, mut stroke, mut width) = (radius, "#fff", 0.8);
        if of.landmark.is_some() {
            (r, stroke, width) = (radius + 1.4, INK, 1.6);
        }
        let path = mark_path(side, (0.0, 0.0), r);
        d.leaf(
            "path",
            &[
                ("d", &path),
                ("transform", &place),
                ("fill", &SPECIES[side]),
                ("stroke", &stroke),
                ("stroke-width", &width),
            ],
        );
    }
    d.close("g");
    d.open("g", &[("class", &"names")]);
    let points = points(model, &at);
    for (id, place) in placed(model, &points, &plot, radius) {
        label(&mut d, model, id, points[id], place, radius);
    }
    d.close("g");
    d
}

/// The name of an axis with its unit.
fn axis_name(space: &Space, axis: usize) -> String {
    format!(
        "{} axis {} (1 = distance of random pairs)",
        space.name,
        axis + 1
    )
}

fn legend(d: &mut Drawing, model: &Model, layout: Layout, plot: &Plot) {
    let names = [cut(&model.species.a, LABEL), cut(&model.species.b, LABEL)];
    let end = d.species_legend((2.0, 40.0), [&names[0], &names[1]]);
    let (x, y) = match layout {
        Layout::Wide => (end + 6.0, 40.0),
        Layout::Narrow => (2.0, 62.0),
    };
    for side in 0..2 {
        d.mark(
            side,
            (x + 5.0 + 30.0 * side as f64, y - 4.5),
            4.8,
            &[
                ("fill", &SPECIES[side]),
                ("stroke", &INK),
                ("stroke-width", &1.6),
            ],
        );
    }
    d.line(
        (x + 11.0, y - 4.5),
        (x + 29.0, y - 4.5),
        &[("stroke", &INK), ("stroke-width", &1.2)],
    );
    d.text((x + 46.0, y), Anchor::Start, "landmark", &[]);
    if model.landmarks.iter().any(|landmark| landmark.contradicted) {
        let x = x + 46.0 + labels::width("landmark") + 14.0;
        let path = triangle((x + 5.0, y - 4.5), 5.5);
        d.leaf("path", &[("d", &path), ("fill", &ALARM)]);
        d.text((x + 15.0, y), Anchor::Start, "contradicted", &[]);
    }
    if layout == Layout::Wide {
        d.text(
            (plot.right, y),
            Anchor::End,
            "ellipse: 90 %, where shown",
            &[("fill", &MUTED)],
        );
    }
}

/// Ticks in a fixed number of places, the spare ones hidden: the script moves them to other axes.
fn ticks(d: &mut Drawing, plot: &Plot, scale: &Scale, ticks: Vec<(f64, String)>, across: bool) {
    d.open(
        "g",
        &[("class", &if across { "x-ticks" } else { "y-ticks" })],
    );
    for slot in 0..TICKS {
        let tick = ticks.get(slot);
        let at = tick.map_or(0.0, |(value, _)| scale.at(*value));
        let place = match across {
            true => format!("translate({} {})", n(at), plot.bottom),
            false => format!("translate({} {})", plot.left, n(at)),
        };
        let shown = if tick.is_some() { "inline" } else { "none" };
        d.open("g", &[("transform", &place), ("display", &shown)]);
        let text = tick.map_or("", |(_, text)| text);
        if across {
            d.line(
                (0.0, 0.0),
                (0.0, plot.top - plot.bottom),
                &[("stroke", &FAINT)],
            );
            d.text((0.0, 17.0), Anchor::Middle, text, &[("fill", &MUTED)]);
        } else {
            d.line(
                (0.0, 0.0),
                (plot.right - plot.left, 0.0),
                &[("stroke", &FAINT)],
            );
            d.text((-6.0, 4.5), Anchor::End, text, &[("fill", &MUTED)]);
        }
        d.close("g");
    }
    d.close("g");
}

/// Ellipses of all parcels; the page hides all but those of the parcels that are picked.
fn ellipses(
    d: &mut Drawing,
    model: &Model,
    space: &Space,
    pair: (usize, usize),
    at: &dyn Fn(usize) -> (f64, f64),
    (x, y): (&Scale, &Scale),
) {
    d.open("g", &[("class", &"ellipses")]);
    for (parcel, of) in model.parcels.iter().enumerate() {
        let (px, py) = at(parcel);
        let side = usize::from(of.side == Side::B);
        let half = |scale: &Scale, axis: usize| {
            let error = ELLIPSE * space.errors[axis][parcel];
            (scale.at(error) - scale.at(0.0)).abs()
        };
        // Drawn where a manuscript would want them: at the landmarks.
        let opacity = if of.landmark.is_some() { 0.45 } else { 0.0 };
        d.leaf(
            "ellipse",
            &[
                ("cx", &n(px)),
                ("cy", &n(py)),
                ("rx", &n(half(x, pair.0))),
                ("ry", &n(half(y, pair.1))),
                ("fill", &"none"),
                ("stroke", &SPECIES[side]),
                ("opacity", &opacity),
            ],
        );
    }
    d.close("g");
}

/// Lines between the partners of each landmark, and a triangle on those that the others contradict.
fn ties(d: &mut Drawing, model: &Model, at: &dyn Fn(usize) -> (f64, f64)) {
    d.open("g", &[("class", &"ties")]);
    for landmark in &model.landmarks {
        for &a in &landmark.parcels.a {
            for &b in &landmark.parcels.b {
                let (from, to) = (at(a), at(b));
                let path = format!("M{} {}L{} {}", n(from.0), n(from.1), n(to.0), n(to.1));
                let (stroke, dashes) = match landmark.contradicted {
                    true => (ALARM, "4 3"),
                    false => (INK, "none"),
                };
                d.leaf(
                    "path",
                    &[
                        ("d", &path),
                        ("stroke", &stroke),
                        ("stroke-width", &1.2),
                        ("stroke-dasharray", &dashes),
                    ],
                );
            }
        }
    }
    d.close("g");
    d.open("g", &[("class", &"warnings")]);
    for (id, landmark) in model.landmarks.iter().enumerate() {
        if landmark.contradicted {
            let (x, y) = middle(model, id, at);
            let place = format!("translate({} {})", n(x), n(y));
            let path = triangle((0.0, 0.0), 6.0);
            d.leaf(
                "path",
                &[
                    ("d", &path),
                    ("transform", &place),
                    ("fill", &ALARM),
                    ("stroke", &"#fff"),
                ],
            );
        }
    }
    d.close("g");
}

/// Half way between the partners of a landmark.
fn middle(model: &Model, landmark: usize, at: &dyn Fn(usize) -> (f64, f64)) -> (f64, f64) {
    let of = &model.landmarks[landmark].parcels;
    let mean = |members: &[usize]| {
        let count = members.len().max(1) as f64;
        let sum = members.iter().map(|&p| at(p));
        let (x, y) = sum.fold((0.0, 0.0), |(x, y), (px, py)| (x + px, y + py));
        (x / count, y / count)
    };
    let (a, b) = (mean(&of.a), mean(&of.b));
    ((a.0 + b.0) / 2.0, (a.1 + b.1) / 2.0)
}

/// Points that can have a label: parcels, then the middles of landmarks.
fn points(model: &Model, at: &dyn Fn(usize) -> (f64, f64)) -> Vec<(f64, f64)> {
    let parcels = (0..model.parcels.len()).map(at);
    let landmarks = (0..model.landmarks.len()).map(|id| middle(model, id, at));
    parcels.chain(landmarks).collect()
}

/// The text at a point.
fn text_of(model: &Model, id: usize) -> String {
    match id.checked_sub(model.parcels.len()) {
        None => cut(&model.parcels[id].label, LABEL),
        Some(landmark) => cut(&model.landmarks[landmark].name, LABEL),
    }
}

/// Which labels stand where: landmarks first, then open parcels from the outside in.
fn placed(model: &Model, points: &[(f64, f64)], plot: &Plot, radius: f64) -> Vec<(usize, usize)> {
    let (marks, middles) = points.split_at(model.parcels.len());
    let centre = (
        (plot.left + plot.right) / 2.0,
        (plot.top + plot.bottom) / 2.0,
    );
    let away = |(x, y): (f64, f64)| {
        let across = (x - centre.0) / (plot.right - plot.left);
        let up = (y - centre.1) / (plot.bottom - plot.top);
        across.hypot(up)
    };
    let mut open: Vec<usize> = (0..marks.len())
        .filter(|&parcel| model.parcels[parcel].landmark.is_none())
        .collect();
    open.sort_by(|&i, &j| away(marks[j]).total_cmp(&away(marks[i])).then(i.cmp(&j)));
    // No more than these can be placed; trying them all would take longer than it is worth.
    open.truncate(3 * plot.labels);
    let landmarks = marks.len()..marks.len() + middles.len();
    let wanted: Vec<Wanted> = landmarks
        .chain(open)
        .map(|id| Wanted {
            id,
            at: points[id],
            width: labels::width(&text_of(model, id)),
        })
        .collect();
    labels::place(&wanted, marks, radius, plot.frame(), plot.labels)
}

fn label(d: &mut Drawing, model: &Model, id: usize, (x, y): (f64, f64), place: usize, radius: f64) {
    let (dx, dy, anchor) = labels::offset(place, radius);
    let is_landmark = id >= model.parcels.len();
    let fill = if is_landmark { INK } else { MUTED };
    let weight = if is_landmark { "bold" } else { "normal" };
    if labels::is_led(place) {
        let end = (x + 0.86 * dx, y + 0.86 * (dy - 0.26 * SIZE));
        d.line((x, y), end, &[("stroke", &MUTED), ("stroke-width", &0.8)]);
    }
    d.text(
        (x + dx, y + dy),
        anchor,
        &text_of(model, id),
        &[
            ("data-id", &id),
            ("fill", &fill),
            ("font-weight", &weight),
            ("stroke", &"#fff"),
            ("stroke-width", &3),
            ("stroke-linejoin", &"round"),
            ("paint-order", &"stroke"),
        ],
    );
}

/// What the script needs to show other axes: ranges and ticks of each axis, coordinates and standard
/// errors to four digits, and which labels stand where for every pair of axes and both layouts.
pub fn data(model: &Model) -> Value {
    let radius = radius(model.parcels.len());
    let layouts = [Layout::Wide, Layout::Narrow];
    let places: Vec<Value> = (0..labels::PLACES)
        .map(|place| {
            let (dx, dy, anchor) = labels::offset(place, radius);
            json!([short(dx), short(dy), anchor.word(), labels::is_led(place)])
        })
        .collect();
    let spaces: Vec<Value> = model
        .spaces
        .iter()
        .map(|space| {
            let axes = space.axes.len();
            let ranges: Vec<(f64, f64)> = space
                .coordinates
                .iter()
                .map(|values| scale::range(values))
                .collect();
            let of_axis: Vec<Value> = (0..axes)
                .map(|axis| {
                    let ticks = layouts.map(|layout| {
                        let ticks = scale::ticks(ranges[axis], Plot::of(layout).ticks);
                        ticks.into_iter().take(TICKS).collect::<Vec<_>>()
                    });
                    json!({
                        "name": axis_name(space, axis),
                        "verdict": space.axes[axis].verdict(),
                        "range": [ranges[axis].0, ranges[axis].1],
                        "ticks": ticks,
                        "at": space.coordinates[axis].iter().map(|&x| digits(x)).collect::<Vec<_>>(),
                        "se": space.errors[axis].iter().map(|&x| digits(x)).collect::<Vec<_>>(),
                    })
                })
                .collect();
            let paired = axes.min(PAIRED);
            let labels = layouts.map(|layout| {
                let plot = Plot::of(layout);
                (0..paired)
                    .map(|i| {
                        (0..paired)
                            .map(|j| {
                                if i == j {
                                    return Vec::new();
                                }
                                let (x, y) = plot.scales(ranges[i], ranges[j]);
                                let at = |parcel: usize| {
                                    (
                                        x.at(space.coordinates[i][parcel]),
                                        y.at(space.coordinates[j][parcel]),
                                    )
                                };
                                placed(model, &points(model, &at), &plot, radius)
                            })
                            .collect::<Vec<_>>()
                    })
                    .collect::<Vec<_>>()
            });
            json!({"name": space.name, "axes": of_axis, "labels": labels})
        })
        .collect();
    json!({
        "spaces": spaces,
        "shown": model.shown,
        "places": places,
        "texts": (0..model.parcels.len() + model.landmarks.len())
            .map(|id| text_of(model, id))
            .collect::<Vec<_>>(),
        "ellipse": ELLIPSE,
    })
}

/// A length to a hundredth of a pixel.
fn short(x: f64) -> f64 {
    (x * 100.0).round() / 100.0
}

/// A number to four significant digits.
pub fn digits(x: f64) -> f64 {
    format!("{x:.3e}").parse().unwrap_or(x)
}
