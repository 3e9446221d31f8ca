//! Everything that leaves the program: tables, figures, GIS layers, the report page and the provenance record.
//!
//! This room receives plain data and writes it; it knows nothing of how anything was computed.
//!
//! | file | holds |
//! | --- | --- |
//! | `folder` | the output folder, written whole or not at all |
//! | `leftovers` | what a run that was killed left beside it |
//! | `column`, `table` | named columns with units, as CSV, Parquet and Markdown |
//! | `delimited`, `markdown` | making a text safe for a spreadsheet and for Markdown |
//! | `number` | numbers as people read them |
//! | `gis` | points, lines and polygons as a GeoPackage |
//! | `moment`, `provenance` | time, hashes of the inputs, and the record of a run |
//! | `colours`, `picture` | colour maps, and arrays as PNG |
//! | `figure`, `axis` | what every figure shares: canvas, classes, scales and ticks |
//! | `map` (with `map_shapes`, `map_border`, `map_key`) | a map of one depth |
//! | `reading` | a measure as observed, with its null |
//! | `depth_curve` | a measure against depth with its null band |
//! | `distance_profile` | a measure against distance, one small chart for each depth |
//! | `page`, `page_view` | the report page: its data, and how it becomes HTML |

mod axis;
mod colours;
mod column;
mod delimited;
mod depth_curve;
mod distance_profile;
mod figure;
mod folder;
mod gis;
mod leftovers;
mod map;
mod map_border;
mod map_key;
mod map_shapes;
mod markdown;
mod moment;
mod number;
mod page;
mod page_view;
mod picture;
mod provenance;
mod reading;
mod table;

pub use colours::Colours;
pub use column::{Column, Values};
pub use depth_curve::{DepthCurve, DepthRow};
pub use distance_profile::{DistanceProfile, ProfilePanel, ProfilePoint};
pub use figure::{Figure, write_figures};
pub use folder::OutputFolder;
pub use gis::{Shape, VectorLayer, write_geopackage};
pub use map::{Background, ContactLine, Deposit, MapFigure, Side};
pub use moment::rfc3339;
pub use number::{depth_label, distance_label, grouped, significant};
pub use page::{Answer, DepthPanel, KeyFigure, Method, Page, PageTable, write_page};
pub use picture::{data_uri, png};
pub use provenance::{Input, Provenance, hash_file, write_provenance};
pub use reading::Reading;
pub use table::{Table, dictionary, file_stem, write_tables};
