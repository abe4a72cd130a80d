//! An invented hemisphere: points spread evenly over a ball, divided among the parcels, as a GIFTI
//! label file. Only the parcel of each vertex is written; there is no shape to show.

/// Vertices of the hemisphere.
const VERTICES: usize = 1000;
/// One vertex in this many lies on the wall between the hemispheres and belongs to no parcel.
const WALL_EVERY: usize = 20;

/// The label file of a left hemisphere from the centres of its parcels, x growing towards the middle.
pub fn label_file(centres: &[[f64; 3]], labels: &[String]) -> String {
    let keys = keys(centres);
    let mut xml = String::from(concat!(
        "<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n",
        "<!DOCTYPE GIFTI SYSTEM \"http://www.nitrc.org/frs/download.php/115/gifti.dtd\">\n",
        "<GIFTI Version=\"1.0\" NumberOfDataArrays=\"1\">\n",
        "<MetaData>\n",
        "<MD><Name>AnatomicalStructurePrimary</Name><Value>CortexLeft</Value></MD>\n",
        "</MetaData>\n",
        "<LabelTable>\n",
        "<Label Key=\"0\" Red=\"0\" Green=\"0\" Blue=\"0\" Alpha=\"0\">wall</Label>\n",
    ));
    for (key, label) in (1..).zip(labels) {
        let [red, green, blue] = [7, 11, 13].map(|step| f64::from(key * step % 20) / 20.0);
        xml.push_str(&format!(
            "<Label Key=\"{key}\" Red=\"{red}\" Green=\"{green}\" Blue=\"{blue}\" Alpha=\"1\">{label}</Label>\n"
        ));
    }
    xml.push_str(&format!(
        "</LabelTable>\n\
         <DataArray Intent=\"NIFTI_INTENT_LABEL\" DataType=\"NIFTI_TYPE_INT32\" \
         ArrayIndexingOrder=\"RowMajorOrder\" Dimensionality=\"1\" Dim0=\"{VERTICES}\" \
         Encoding=\"ASCII\" Endian=\"LittleEndian\" ExternalFileName=\"\" ExternalFileOffset=\"0\">\n\
         <MetaData>\n<MD><Name>Name</Name><Value>parcels</Value></MD>\n</MetaData>\n<Data>\n"
    ));
    for line in keys.chunks(25) {
        let cells: Vec<String> = line.iter().map(usize::to_string).collect();
        xml.push_str(&(cells.join(" ") + "\n"));
    }
    xml + "</Data>\n</DataArray>\n</GIFTI>\n"
}

/// For each vertex the number of its parcel, counted from 1; 0 on the wall.
fn keys(centres: &[[f64; 3]]) -> Vec<usize> {
    let vertices: Vec<[f64; 3]> = (0..VERTICES).map(vertex).collect();
    let middle: [f64; 3] = std::array::from_fn(|axis| {
        centres.iter().map(|centre| centre[axis]).sum::<f64>() / centres.len() as f64
    });
    let seeds: Vec<[f64; 3]> = centres
        .iter()
        .map(|centre| {
            let away: [f64; 3] = std::array::from_fn(|axis| centre[axis] - middle[axis]);
            let length = away.iter().map(|x| x * x).sum::<f64>().sqrt();
            away.map(|x| x / length)
        })
        .collect();
    // The last vertices lie towards the middle.
    let free = VERTICES - VERTICES / WALL_EVERY;
    let mut keys = vec![0; VERTICES];
    // Every parcel has a vertex, however crowded its neighbourhood.
    for (parcel, seed) in seeds.iter().enumerate() {
        let open = (0..free).filter(|&v| keys[v] == 0);
        if let Some(v) = nearest(open, |v| likeness(&vertices[v], seed)) {
            keys[v] = parcel + 1;
        }
    }
    for v in 0..free {
        if keys[v] == 0 {
            let parcel = nearest(0..seeds.len(), |p| likeness(&vertices[v], &seeds[p]));
            keys[v] = parcel.map_or(0, |p| p + 1);
        }
    }
    keys
}

/// A point of the spiral that covers a ball evenly, from the outside to the middle (common practice, no
/// source).
fn vertex(at: usize) -> [f64; 3] {
    let golden = std::f64::consts::PI * (3.0 - 5.0_f64.sqrt());
    let medial = 2.0 * (at as f64 + 0.5) / VERTICES as f64 - 1.0;
    let radius = (1.0 - medial * medial).sqrt();
    let turn = golden * at as f64;
    [medial, radius * turn.cos(), radius * turn.sin()]
}

/// The cosine of the angle between two directions.
fn likeness(one: &[f64; 3], other: &[f64; 3]) -> f64 {
    one.iter().zip(other).map(|(x, y)| x * y).sum()
}

fn nearest(among: impl Iterator<Item = usize>, likeness: impl Fn(usize) -> f64) -> Option<usize> {
    among.max_by(|&x, &y| likeness(x).total_cmp(&likeness(y)))
}
