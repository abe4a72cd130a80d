//! What kind of file it is, by its first bytes. Endings of names say nothing here.

/// Kinds of files that are told apart.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Kind {
    /// Compressed by gzip.
    Gzip,
    /// One NumPy array.
    Npy,
    /// A zip archive, as of NumPy arrays.
    Zip,
    /// MATLAB 5 to 7.
    Mat,
    /// HDF5, as of MATLAB 7.3.
    Hdf5,
    /// NIfTI-2, as of CIFTI-2.
    Nifti2,
    /// NIfTI-1, an image.
    Nifti1,
    /// None of these.
    Text,
}

impl Kind {
    /// The kind of a file's bytes.
    #[must_use]
    pub fn of(bytes: &[u8]) -> Kind {
        let at = |start: usize, magic: &[u8]| {
            bytes
                .get(start..)
                .is_some_and(|rest| rest.starts_with(magic))
        };
        let hdf5 = b"\x89HDF\r\n\x1a\n";
        if at(0, b"\x1f\x8b") {
            Kind::Gzip
        } else if at(0, b"\x93NUMPY") {
            Kind::Npy
        } else if at(0, b"PK\x03\x04") || at(0, b"PK\x05\x06") {
            Kind::Zip
        // MATLAB puts a block of its own of 512 bytes before its HDF5.
        } else if at(0, hdf5) || at(512, hdf5) || at(0, b"MATLAB 7.3 MAT-file") {
            Kind::Hdf5
        } else if at(124, b"\x00\x01IM") || at(124, b"\x01\x00MI") || at(0, b"MATLAB 5.0 MAT-file")
        {
            Kind::Mat
        } else if at(4, b"n+2\0") || at(4, b"ni2\0") {
            Kind::Nifti2
        } else if at(344, b"n+1\0") || at(344, b"ni1\0") {
            Kind::Nifti1
        } else {
            Kind::Text
        }
    }
}
