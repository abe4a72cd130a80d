//! Labels that never overlap: each takes the best free place around its point, or none.

use super::svg::{Anchor, SIZE};

/// Distances from a point at which its label may stand, in pixels beyond the mark. From the third on a
/// line leads to it.
const RINGS: [f64; 4] = [3.0, 9.0, 20.0, 34.0];
/// Directions, in the order in which they are tried: right, left, above, below, then between.
const DIRECTIONS: [(f64, f64); 8] = [
    (1.0, 0.0),
    (-1.0, 0.0),
    (0.0, -1.0),
    (0.0, 1.0),
    (0.75, -0.75),
    (0.75, 0.75),
    (-0.75, -0.75),
    (-0.75, 0.75),
];
/// Places around a point.
pub const PLACES: usize = RINGS.len() * DIRECTIONS.len();
/// Marks that a label may cover at most: in a crowd it is still read, by its white outline.
const COVERED: usize = 2;
/// Height of a label above and below its baseline, for letters of [`SIZE`].
const ASCENT: f64 = 0.80 * SIZE;
const DESCENT: f64 = 0.28 * SIZE;

/// A label that wants a place.
#[derive(Debug, Clone)]
pub struct Wanted {
    /// What it belongs to.
    pub id: usize,
    /// Its point.
    pub at: (f64, f64),
    /// Width of its text.
    pub width: f64,
}

/// Where a place lies, from the point to the baseline of the text, and how the text is held there.
pub fn offset(place: usize, radius: f64) -> (f64, f64, Anchor) {
    let (dx, dy) = DIRECTIONS[place % DIRECTIONS.len()];
    let away = radius + RINGS[place / DIRECTIONS.len()];
    let anchor = if dx > 0.1 {
        Anchor::Start
    } else if dx < -0.1 {
        Anchor::End
    } else {
        Anchor::Middle
    };
    // Beside the point the text is centred on it; above and below it keeps clear.
    let lift = match dy {
        d if d < -0.9 => -DESCENT,
        d if d > 0.9 => ASCENT,
        _ => (ASCENT - DESCENT) / 2.0,
    };
    (dx * away, dy * away + lift, anchor)
}

/// Whether a line leads to a label at this place.
pub fn is_led(place: usize) -> bool {
    place / DIRECTIONS.len() >= 2
}

/// A box on the drawing: left, top, right, bottom.
type Bounds = (f64, f64, f64, f64);

fn bounds(wanted: &Wanted, place: usize, radius: f64) -> Bounds {
    let (dx, dy, anchor) = offset(place, radius);
    let (x, y) = (wanted.at.0 + dx, wanted.at.1 + dy);
    let left = match anchor {
        Anchor::Start => x,
        Anchor::Middle => x - wanted.width / 2.0,
        Anchor::End => x - wanted.width,
    };
    (left, y - ASCENT, left + wanted.width, y + DESCENT)
}

/// Places labels in the order in which they are given, at most `most`, within `frame` and clear of each
/// other; `marks` are the points that they should not cover. Returns what was placed, and where.
pub fn place(
    wanted: &[Wanted],
    marks: &[(f64, f64)],
    radius: f64,
    frame: Bounds,
    most: usize,
) -> Vec<(usize, usize)> {
    let grid = Grid::new(marks, frame);
    let mut taken: Vec<Bounds> = Vec::new();
    let mut placed = Vec::new();
    for label in wanted {
        if placed.len() == most {
            break;
        }
        let free = (0..PLACES).filter_map(|place| {
            let found = bounds(label, place, radius);
            let inside = found.0 >= frame.0
                && found.1 >= frame.1
                && found.2 <= frame.2
                && found.3 <= frame.3;
            if !inside || taken.iter().any(|other| overlap(found, *other, 2.0)) {
                return None;
            }
            let covered = grid.within(found, radius * 0.6);
            (covered <= COVERED).then_some((covered, place, found))
        });
        let best = free.min_by_key(|(covered, place, _)| {
            // A covered mark is worse than a place further out, but for the last ring.
            covered * DIRECTIONS.len() * 3 + place
        });
        if let Some((_, place, found)) = best {
            taken.push(found);
            placed.push((label.id, place));
        }
    }
    placed
}

fn overlap(x: Bounds, y: Bounds, room: f64) -> bool {
    x.0 < y.2 + room && y.0 < x.2 + room && x.1 < y.3 + room && y.1 < x.3 + room
}

/// Points sorted into squares, so that the few near a label are found at once.
struct Grid<'m> {
    marks: &'m [(f64, f64)],
    origin: (f64, f64),
    columns: usize,
    rows: usize,
    cells: Vec<Vec<usize>>,
}

/// Side of a square.
const CELL: f64 = 24.0;

impl<'m> Grid<'m> {
    fn new(marks: &'m [(f64, f64)], frame: Bounds) -> Grid<'m> {
        let count = |span: f64| (span / CELL).ceil().max(1.0) as usize + 1;
        let (columns, rows) = (count(frame.2 - frame.0), count(frame.3 - frame.1));
        let mut grid = Grid {
            marks,
            origin: (frame.0, frame.1),
            columns,
            rows,
            cells: vec![Vec::new(); columns * rows],
        };
        for (at, &(x, y)) in marks.iter().enumerate() {
            if x.is_finite() && y.is_finite() {
                let (column, row) = grid.cell(x, y);
                grid.cells[row * columns + column].push(at);
            }
        }
        grid
    }

    fn cell(&self, x: f64, y: f64) -> (usize, usize) {
        let at = |value: f64, count: usize| ((value / CELL).max(0.0) as usize).min(count - 1);
        (
            at(x - self.origin.0, self.columns),
            at(y - self.origin.1, self.rows),
        )
    }

    /// How many points a box covers, with some room around.
    fn within(&self, found: Bounds, room: f64) -> usize {
        let (left, top) = self.cell(found.0 - room, found.1 - room);
        let (right, bottom) = self.cell(found.2 + room, found.3 + room);
        let mut covered = 0;
        for row in top..=bottom {
            for column in left..=right {
                covered += self.cells[row * self.columns + column]
                    .iter()
                    .filter(|&&at| {
                        let (x, y) = self.marks[at];
                        x > found.0 - room
                            && x < found.2 + room
                            && y > found.1 - room
                            && y < found.3 + room
                    })
                    .count();
            }
        }
        covered
    }
}

/// How wide a text is at most in letters of [`SIZE`]: no font is at hand, so the widths are those of the
/// wider of common sans-serif fonts, from memory.
pub fn width(text: &str) -> f64 {
    text.chars()
        .map(|c| match c {
            'i' | 'j' | 'l' | '.' | ',' | ':' | ';' | '\'' | '|' | '!' => 0.34,
            'f' | 't' | 'r' | '(' | ')' | '[' | ']' | ' ' | '-' | '/' => 0.42,
            'm' | 'w' | 'M' | 'W' | '%' | '@' => 0.98,
            'A'..='Z' => 0.74,
            'a'..='z' | '0'..='9' => 0.64,
            c if (c as u32) < 0x250 => 0.72,
            c if (c as u32) < 0x1100 => 0.8,
            _ => 1.25,
        })
        .sum::<f64>()
        * SIZE
}

/// A label cut to so many characters.
pub fn cut(text: &str, most: usize) -> String {
    if text.chars().count() <= most {
        return text.to_owned();
    }
    let head: String = text.chars().take(most.saturating_sub(1)).collect();
    format!("{}…", head.trim_end())
}

/// A label cut to a width.
pub fn fit(text: &str, most: f64) -> String {
    let letters = text.chars().count();
    (0..letters)
        .map(|less| cut(text, letters - less))
        .find(|cut| width(cut) <= most)
        .unwrap_or_default()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn labels_keep_clear_of_each_other_and_of_the_edge() {
        // A crowd on a small plot: most cannot be placed.
        let points: Vec<(f64, f64)> = (0..200)
            .map(|k| {
                let k = f64::from(k);
                (10.0 + (k * 37.7) % 280.0, 10.0 + (k * 61.3) % 180.0)
            })
            .collect();
        let wanted: Vec<Wanted> = points
            .iter()
            .enumerate()
            .map(|(id, &at)| Wanted {
                id,
                at,
                width: 30.0 + (id % 7) as f64 * 9.0,
            })
            .collect();
        let frame = (0.0, 0.0, 300.0, 200.0);
        let placed = place(&wanted, &points, 3.0, frame, 1000);
        assert!(placed.len() > 5, "{}", placed.len());
        let boxes: Vec<Bounds> = placed
            .iter()
            .map(|&(id, at)| bounds(&wanted[id], at, 3.0))
            .collect();
        for (i, one) in boxes.iter().enumerate() {
            assert!(one.0 >= 0.0 && one.1 >= 0.0 && one.2 <= 300.0 && one.3 <= 200.0);
            for other in &boxes[i + 1..] {
                assert!(!overlap(*one, *other, 0.0));
            }
        }
        assert_eq!(place(&wanted, &points, 3.0, frame, 4).len(), 4);
    }

    #[test]
    fn a_label_is_cut_to_a_width() {
        assert_eq!(fit("motor field", 500.0), "motor field");
        let short = fit("motor field", 60.0);
        assert!(short.ends_with('…') && width(&short) <= 60.0, "{short}");
        assert_eq!(fit("", 10.0), "");
    }

    #[test]
    fn a_lone_label_stands_beside_its_mark() {
        let wanted = [Wanted {
            id: 7,
            at: (50.0, 50.0),
            width: 30.0,
        }];
        let placed = place(&wanted, &[(50.0, 50.0)], 4.0, (0.0, 0.0, 200.0, 100.0), 9);
        assert_eq!(placed, [(7, 0)]);
    }
}
