//! A drawing as text that is both valid XML and valid inside HTML. Looks are attributes, not styles, so
//! that any editor of drawings shows a figure as the page does.

use std::fmt::{Display, Write};

/// Fonts of all figures.
pub const FONT: &str = "Helvetica, Arial, sans-serif";
/// Height of letters; nothing on a figure is smaller.
pub const SIZE: f64 = 12.5;
/// Room around a figure.
const EDGE: f64 = 6.0;
/// Colour of text and outlines.
pub const INK: &str = "#1d2427";
/// Colour of what stands back: 6.4 to 1 against white.
pub const MUTED: &str = "#56626a";
/// Colour of lines that only guide the eye.
pub const FAINT: &str = "#d5d9d8";
/// Colours of both species: blue and orange of different lightness, told apart by every kind of colour
/// vision. Shape says the same: discs for a, diamonds for b.
pub const SPECIES: [&str; 2] = ["#14588a", "#b85410"];
/// Colour of what contradicts; a triangle says the same.
pub const ALARM: &str = "#9c1743";

/// Where a text is held.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Anchor {
    /// At its start.
    Start,
    /// In its middle.
    Middle,
    /// At its end.
    End,
}

impl Anchor {
    /// The word of the attribute.
    pub fn word(self) -> &'static str {
        match self {
            Anchor::Start => "start",
            Anchor::Middle => "middle",
            Anchor::End => "end",
        }
    }
}

/// One figure in one size.
#[derive(Debug, Clone)]
pub struct Drawing {
    /// Width in pixels of the page at its natural size.
    pub width: f64,
    /// Height.
    pub height: f64,
    /// Attributes of the whole that the script of the page reads.
    pub data: String,
    /// What is drawn.
    body: String,
}

impl Drawing {
    /// An empty drawing.
    pub fn new(width: f64, height: f64) -> Drawing {
        Drawing {
            width,
            height,
            data: String::new(),
            body: String::new(),
        }
    }

    /// An element without content.
    pub fn leaf(&mut self, name: &str, attributes: &[(&str, &dyn Display)]) {
        self.tag(name, attributes);
        self.body.push_str("/>");
    }

    /// The beginning of an element.
    pub fn open(&mut self, name: &str, attributes: &[(&str, &dyn Display)]) {
        self.tag(name, attributes);
        self.body.push('>');
    }

    /// The end of an element.
    pub fn close(&mut self, name: &str) {
        let _ = write!(self.body, "</{name}>");
    }

    fn tag(&mut self, name: &str, attributes: &[(&str, &dyn Display)]) {
        let _ = write!(self.body, "<{name}");
        for (key, value) in attributes {
            let _ = write!(self.body, " {key}=\"{}\"", escape(&value.to_string()));
        }
    }

    /// Text in the usual size and colour, with further attributes.
    pub fn text(
        &mut self,
        at: (f64, f64),
        anchor: Anchor,
        text: &str,
        more: &[(&str, &dyn Display)],
    ) {
        let (x, y) = (n(at.0), n(at.1));
        let word = anchor.word();
        let mut attributes: Vec<(&str, &dyn Display)> =
            vec![("x", &x), ("y", &y), ("text-anchor", &word)];
        attributes.extend(more);
        self.open("text", &attributes);
        self.body.push_str(&escape(text));
        self.close("text");
    }

    /// A straight line.
    pub fn line(&mut self, from: (f64, f64), to: (f64, f64), more: &[(&str, &dyn Display)]) {
        let path = format!("M{} {}L{} {}", n(from.0), n(from.1), n(to.0), n(to.1));
        let mut attributes: Vec<(&str, &dyn Display)> = vec![("d", &path)];
        attributes.extend(more);
        self.leaf("path", &attributes);
    }

    /// A rectangle.
    pub fn rect(&mut self, at: (f64, f64), size: (f64, f64), more: &[(&str, &dyn Display)]) {
        let (x, y, w, h) = (n(at.0), n(at.1), n(size.0), n(size.1));
        let mut attributes: Vec<(&str, &dyn Display)> =
            vec![("x", &x), ("y", &y), ("width", &w), ("height", &h)];
        attributes.extend(more);
        self.leaf("rect", &attributes);
    }

    /// The mark of a species around the origin or elsewhere: a disc of a, a diamond of b, of like area.
    pub fn mark(
        &mut self,
        side: usize,
        at: (f64, f64),
        radius: f64,
        more: &[(&str, &dyn Display)],
    ) {
        let path = mark_path(side, at, radius);
        let mut attributes: Vec<(&str, &dyn Display)> = vec![("d", &path)];
        attributes.extend(more);
        self.leaf("path", &attributes);
    }

    /// The heading of a figure.
    pub fn heading(&mut self, text: &str) {
        self.text(
            (0.0, 15.0),
            Anchor::Start,
            text,
            &[("font-size", &15), ("font-weight", &"bold")],
        );
    }

    /// A legend of marks and words along a line; returns where it ends.
    pub fn species_legend(&mut self, at: (f64, f64), words: [&str; 2]) -> f64 {
        let mut x = at.0;
        for (side, word) in words.into_iter().enumerate() {
            self.mark(
                side,
                (x + 5.0, at.1 - 4.5),
                4.5,
                &[("fill", &SPECIES[side])],
            );
            self.text((x + 14.0, at.1), Anchor::Start, word, &[]);
            x += 14.0 + super::labels::width(word) + 16.0;
        }
        x
    }

    /// The element for a page. `name` says what it shows to those who cannot see it.
    pub fn inline(&self, class: &str, name: &str) -> String {
        self.element(
            &format!(
                " class=\"{}\" role=\"img\" aria-label=\"{}\"{}",
                escape(class),
                escape(name),
                self.data
            ),
            "",
        )
    }

    /// A file of its own.
    pub fn file(&self, title: &str, description: &str) -> String {
        let about = format!(
            "<title>{}</title><desc>{}</desc>",
            escape(title),
            escape(description)
        );
        let mut text = String::from("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n");
        text += &self.element(" role=\"img\"", &about);
        text.push('\n');
        text
    }

    fn element(&self, attributes: &str, first: &str) -> String {
        let (width, height) = (n(self.width + 2.0 * EDGE), n(self.height + 2.0 * EDGE));
        format!(
            "<svg xmlns=\"http://www.w3.org/2000/svg\" width=\"{width}\" height=\"{height}\" \
             viewBox=\"-{EDGE} -{EDGE} {width} {height}\" font-family=\"{FONT}\" font-size=\"{SIZE}\" \
             fill=\"{INK}\"{attributes}>{first}<rect x=\"-{EDGE}\" y=\"-{EDGE}\" width=\"100%\" \
             height=\"100%\" fill=\"#fff\"/>{}</svg>",
            self.body
        )
    }
}

/// The outline of a species' mark.
pub fn mark_path(side: usize, (x, y): (f64, f64), r: f64) -> String {
    if side == 0 {
        let (left, y, r, d) = (n(x - r), n(y), n(r), n(2.0 * r));
        format!("M{left} {y}a{r} {r} 0 1 0 {d} 0a{r} {r} 0 1 0 -{d} 0z")
    } else {
        let r = 1.25 * r;
        format!(
            "M{} {}L{} {}L{} {}L{} {}z",
            n(x),
            n(y - r),
            n(x + r),
            n(y),
            n(x),
            n(y + r),
            n(x - r),
            n(y)
        )
    }
}

/// The outline of a triangle, the mark of what contradicts.
pub fn triangle((x, y): (f64, f64), r: f64) -> String {
    format!(
        "M{} {}L{} {}L{} {}z",
        n(x),
        n(y - r),
        n(x + r),
        n(y + 0.8 * r),
        n(x - r),
        n(y + 0.8 * r)
    )
}

/// A length with as many digits as a screen can show.
pub fn n(x: f64) -> String {
    let rounded = (x * 100.0).round() / 100.0;
    // Zero has no sign.
    (rounded + 0.0).to_string()
}

/// Text as XML and HTML take it. What XML has no way to write becomes U+FFFD.
pub fn escape(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => escaped.push_str("&amp;"),
            '<' => escaped.push_str("&lt;"),
            '>' => escaped.push_str("&gt;"),
            '"' => escaped.push_str("&quot;"),
            '\'' => escaped.push_str("&#39;"),
            '\t' | '\n' | '\r' => escaped.push(' '),
            c if c.is_control() || matches!(c, '\u{fffe}' | '\u{ffff}') => {
                escaped.push('\u{fffd}');
            }
            c => escaped.push(c),
        }
    }
    escaped
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn text_cannot_leave_its_place() {
        assert_eq!(
            escape("</text><script>'\"&\u{1}\n"),
            "&lt;/text&gt;&lt;script&gt;&#39;&quot;&amp;\u{fffd} "
        );
    }

    #[test]
    fn a_file_is_xml_whatever_the_labels() {
        let mut drawing = Drawing::new(10.0, 10.0);
        let hostile = "<script>\"' & \u{0}\u{202e}\u{1f9e0}";
        drawing.text((1.0, 2.0), Anchor::Start, hostile, &[("class", &hostile)]);
        let file = drawing.file(hostile, hostile);
        let mut reader = quick_xml::Reader::from_str(&file);
        let mut texts = 0;
        loop {
            match reader.read_event().expect("the file is XML") {
                quick_xml::events::Event::Eof => break,
                quick_xml::events::Event::Text(_) => texts += 1,
                _ => {}
            }
        }
        assert!(texts >= 3);
    }
}
