//! The legend of a map: only what the map shows.

use super::figure::{Canvas, WIDTH, path_data};
use super::map::MapFigure;
use super::number::significant;

const LINE: f64 = 24.0;

/// What may stand in the legend.
#[derive(Debug, Clone, Copy, PartialEq)]
enum Entry {
    Conductor,
    Contact,
    Mapped,
    NoData,
    Deposit,
}

fn entries(map: &MapFigure) -> Vec<Entry> {
    let gaps = map.footprint.is_some_and(|footprint| footprint.count() < footprint.0.len());
    [
        (!map.conductors.is_empty(), Entry::Conductor),
        (!map.contacts.is_empty(), Entry::Contact),
        (!map.mapped.is_empty(), Entry::Mapped),
        (gaps, Entry::NoData),
        (!map.deposits.is_empty(), Entry::Deposit),
    ]
    .into_iter()
    .filter_map(|(shown, entry)| shown.then_some(entry))
    .collect()
}

/// The height of the legend.
pub(super) fn key_height(map: &MapFigure) -> f64 {
    let bar = if map.background.is_some() { LINE + 8.0 } else { 0.0 };
    entries(map).len().div_ceil(2) as f64 * LINE + bar + 4.0
}

/// Draws the legend from `top` down; `range` holds the values at the ends of the background's colours.
pub(super) fn key(canvas: &mut Canvas, map: &MapFigure, range: Option<(f64, f64)>, top: f64) {
    let entries = entries(map);
    for (index, entry) in entries.iter().enumerate() {
        let x = if index % 2 == 0 { 0.0 } else { WIDTH * 0.4 };
        let y = top + (index / 2) as f64 * LINE + 10.0;
        let words = match entry {
            Entry::Conductor => {
                canvas.rectangle("sb-conductor", (x, y - 7.0), (26.0, 14.0));
                "Conductor"
            }
            Entry::Contact => {
                canvas.outline("sb-contact", path_data([(x, y + 2.0), (x + 26.0, y + 2.0)], false));
                let ticks = [5.0, 13.0, 21.0].map(|by| path_data([(x + by, y + 2.0), (x + by, y - 3.0)], false));
                canvas.outline("sb-contact", ticks.concat());
                "Contact, ticks on the dense side"
            }
            Entry::Mapped => {
                canvas.outline("sb-mapped", path_data([(x, y), (x + 26.0, y)], false));
                "Mapped line or outline"
            }
            Entry::NoData => {
                canvas.rectangle("sb-frame", (x, y - 7.0), (26.0, 14.0));
                let lines = [(7.0, 7.0), (14.0, 14.0), (21.0, 14.0), (26.0, 9.0)];
                let hatch =
                    lines.map(|(by, rise)| path_data([(x + by - rise, y + 7.0), (x + by, y + 7.0 - rise)], false));
                canvas.outline("sb-hatch", hatch.concat());
                "No data"
            }
            Entry::Deposit => {
                let centre = x + 13.0;
                let diamond = [(centre, y - 6.0), (centre + 5.0, y), (centre, y + 6.0), (centre - 5.0, y)];
                canvas.outline("sb-deposit", path_data(diamond, true));
                "Known deposit"
            }
        };
        canvas.key((x + 34.0, y + 5.0), words);
    }
    let (Some(background), Some((low, high))) = (&map.background, range) else { return };
    let y = top + entries.len().div_ceil(2) as f64 * LINE + 6.0;
    let stops = (0..=8).map(|step| {
        let [r, g, b] = background.colours.at(f64::from(step) / 8.0);
        svg::node::element::Stop::new()
            .set("offset", f64::from(step) / 8.0)
            .set("stop-color", format!("#{r:02x}{g:02x}{b:02x}"))
    });
    let id = format!("{}-colours", canvas.id);
    let gradient = svg::node::element::LinearGradient::new().set("id", id.clone());
    canvas.add(stops.fold(gradient, |gradient, stop| gradient.add(stop)));
    let low = format!("\u{2264} {}", significant(low, 2));
    let start = low.chars().count() as f64 * 9.5 + 10.0;
    canvas.key((0.0, y + 11.0), &low);
    let class = if background.colours == super::Colours::Quiet { "sb-quiet" } else { "sb-raster" };
    let bar = svg::node::element::Rectangle::new().set("class", class).set("fill", format!("url(#{id})"));
    canvas.add(bar.set("x", start).set("y", y).set("width", 90).set("height", 13));
    canvas.rectangle("sb-frame", (start, y), (90.0, 13.0));
    let words = format!("\u{2265} {}   {}", significant(high, 2), background.label);
    canvas.key((start + 97.0, y + 11.0), &words);
}
