//! Figures of a run. Each is drawn here and nowhere else: the page shows the very drawings that are
//! written to `figures/`, in one size for wide and one for narrow screens, and its script only moves and
//! marks what is there.

mod axes;
mod joint_space;
mod labels;
mod landmarks;
mod left_out;
mod matrix;
mod scale;
mod standing;
mod svg;

pub(super) use joint_space::{data as joint_space_data, digits};
pub(super) use matrix::Shown as MatrixShown;

use super::model::Model;
use svg::Drawing;

/// Widths that a figure is drawn for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Layout {
    /// A column of a page on a desk, a full page in print.
    Wide,
    /// A telephone, one column in print.
    Narrow,
}

impl Layout {
    /// Width in pixels at natural size. On a screen of 390 pixels a narrow figure is shown at its
    /// natural size or larger, so that no letter is smaller than `svg::SIZE`.
    #[must_use]
    pub fn width(self) -> f64 {
        match self {
            Layout::Wide => 720.0,
            Layout::Narrow => 340.0,
        }
    }
}

/// A figure.
pub struct Figure {
    /// Its name, also that of its file.
    pub name: &'static str,
    /// What it shows, in a few words.
    pub title: String,
    /// The same in a sentence or two, for those who cannot see it.
    pub description: String,
    /// For wide screens; the size of the file, unless there is only the other.
    pub wide: Option<Drawing>,
    /// For narrow screens.
    pub narrow: Drawing,
}

impl Figure {
    /// The file for a manuscript.
    #[must_use]
    pub fn file(&self) -> String {
        self.wide
            .as_ref()
            .unwrap_or(&self.narrow)
            .file(&self.title, &self.description)
    }

    /// Both sizes for the page, which shows the one that fits.
    #[must_use]
    pub fn inline(&self) -> String {
        match &self.wide {
            Some(wide) => {
                wide.inline("drawing wide", &self.description)
                    + &self.narrow.inline("drawing narrow", &self.description)
            }
            None => self.narrow.inline("drawing", &self.description),
        }
    }
}

/// All figures of a run, in the order of [`crate::report::FIGURES`].
#[must_use]
pub fn figures(model: &Model) -> Vec<Figure> {
    vec![
        left_out::figure(model),
        standing::figure(model),
        joint_space::figure(model),
        axes::figure(model),
        landmarks::figure(model),
        matrix::figure(model),
    ]
}
