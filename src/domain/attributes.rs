//! What is known of a parcel besides its connections.

use super::Hemisphere;

/// How large a parcel is; one or the other, since they do not compare.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Extent {
    /// Surface, in the square of the unit of coordinates; above 0.
    Area(f64),
    /// Volume, in its cube; above 0.
    Volume(f64),
}

impl Extent {
    /// The area, where it is one.
    #[must_use]
    pub fn area(self) -> Option<f64> {
        match self {
            Extent::Area(area) => Some(area),
            Extent::Volume(_) => None,
        }
    }

    /// The volume, where it is one.
    #[must_use]
    pub fn volume(self) -> Option<f64> {
        match self {
            Extent::Area(_) => None,
            Extent::Volume(volume) => Some(volume),
        }
    }
}

/// Attributes of one parcel; each is absent where nothing was said.
#[derive(Debug, Clone, Default, PartialEq)]
pub struct Attributes {
    /// Side of the brain.
    pub hemisphere: Option<Hemisphere>,
    /// Where its centre lies: finite, in any one unit.
    pub coordinates: Option<[f64; 3]>,
    /// How large it is.
    pub extent: Option<Extent>,
    /// The lobe, system or other group it belongs to.
    pub group: Option<String>,
    /// Its name in full.
    pub long_name: Option<String>,
}
