//! What a vector file holds, in words: its layers, their shapes and their columns.

use std::collections::BTreeMap;
use std::fmt::Write as _;
use std::path::Path;

use gdal::vector::{Layer, LayerAccess, geometry_type_flatten, geometry_type_to_name};
use gdal::{Dataset, DatasetOptions, GdalOpenFlags};

use super::Crs;
use super::attribute::{ColumnKind, value_text};
use super::source::silence_gdal;

/// The most different values that a column may have for them to be listed.
const LISTED: usize = 12;

/// A column and how often each of its values was met; the counts are given up when there are too many values.
struct Column {
    name: String,
    kind: ColumnKind,
    values: Option<BTreeMap<String, usize>>,
}

/// The layers of a vector file in words, or `None` if it is not one.
///
/// Each layer: number of features, system, kinds of shapes; each column: its kind and, for text with at most 12 different
/// values, the values and how many features have each, as a filter would name them.
pub fn describe_layers(path: &Path) -> Option<String> {
    silence_gdal();
    let options = DatasetOptions { open_flags: GdalOpenFlags::GDAL_OF_VECTOR, ..DatasetOptions::default() };
    let dataset = path.exists().then(|| Dataset::open_ex(path, options).ok()).flatten()?;
    let mut text = format!("{}: vector file ({})", path.display(), dataset.driver().short_name());
    for mut layer in dataset.layers() {
        describe(&mut layer, &mut text);
    }
    Some(text)
}

fn describe(layer: &mut Layer<'_>, text: &mut String) {
    let crs = layer.spatial_ref().and_then(|reference| Crs::from_reference(&reference).ok());
    let column = |name: String, kind| Column { name, kind, values: (kind == ColumnKind::Text).then(BTreeMap::new) };
    let mut columns: Vec<Column> =
        layer.defn().fields().map(|field| column(field.name(), ColumnKind::of(field.field_type()))).collect();
    let (mut features, mut shapes) = (0usize, BTreeMap::<String, usize>::new());
    for feature in layer.features() {
        features += 1;
        let shape = feature.geometry().filter(|shape| !shape.is_empty());
        let kind =
            shape.map(|shape| geometry_type_to_name(geometry_type_flatten(shape.geometry_type())).to_lowercase());
        *shapes.entry(kind.unwrap_or_else(|| "no shape".into())).or_default() += 1;
        for (index, column) in columns.iter_mut().enumerate() {
            let Some(values) = &mut column.values else { continue };
            // A value that cannot be read counts as none; reading the layer for a study names it.
            *values.entry(value_text(&feature, index).ok().flatten().unwrap_or_default()).or_default() += 1;
            if values.len() > LISTED {
                column.values = None;
            }
        }
    }
    let system = crs.map_or("no coordinate system".into(), |crs| crs.name);
    // Writing to a String cannot fail.
    let _ = write!(text, "\n  layer {:?}: {features} features, {system}", layer.name());
    for (kind, count) in shapes {
        let _ = write!(text, ", {kind} ({count})");
    }
    let width = columns.iter().map(|column| format!("{:?}", column.name).chars().count()).max().unwrap_or(0);
    for Column { name, kind, values } in columns {
        let _ = write!(text, "\n    column {:width$}  {}", format!("{name:?}"), kind.word());
        let values = values.filter(|values| !values.is_empty()).into_iter().flatten();
        for (index, (value, count)) in values.enumerate() {
            let _ = write!(text, "{} {value:?} ({count})", if index == 0 { ":" } else { "," });
        }
    }
}
