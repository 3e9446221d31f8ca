//! What was put into the ground, as JSON for programs.

use crate::bodies::{Body, CORNER, FIELD_ANGLES, FIELD_STRENGTH, Margin, SIZE};
use crate::pods::Pod;
use crate::survey::NOISE;
use crate::truth::{Truth, in_area};
use crate::world::{BACKGROUND, COVER_LEVEL, PLANTED_DEPTHS, blur};
use serde_json::{Value, json};

impl Truth<'_> {
    /// The truth for programs, as JSON.
    pub fn json(&self) -> String {
        let margins = |body: &Body| body.margins().iter().map(margin_json).collect::<Vec<_>>();
        let slices = self.world.slices.iter().map(|slice| {
            let planted = PLANTED_DEPTHS.contains(&slice.depth);
            let decoys: Vec<_> = slice.decoys.iter().filter(|pod| in_area(pod.middle())).map(pod_json).collect();
            json!({ "depth_m": slice.depth, "planted": planted, "blur_m": blur(slice.depth), "decoys": decoys })
        });
        let planted = self.world.planted.iter().map(|(margin, pods)| {
            json!({ "body": margin.body, "faces": margin.faces, "pods": pods.iter().map(pod_json).collect::<Vec<_>>() })
        });
        let [east, north] = [0, 1].map(|i| CORNER[i] + SIZE[i]);
        let [inclination, declination] = FIELD_ANGLES;
        let field = json!({
            "strength_nT": FIELD_STRENGTH, "inclination_deg": inclination, "declination_deg": declination,
        });
        let truth = json!({
            "title": "Brindle Plain, an invented survey",
            "seed": self.seed,
            "crs": "EPSG:32633",
            "area": { "west": CORNER[0], "south": CORNER[1], "east": east, "north": north },
            "inducing_field": field,
            "noise": { "gravity_mGal": NOISE[0], "magnetics_nT": NOISE[1] },
            "background_log10_ohm_m": { "mean": BACKGROUND[0], "standard_deviation": BACKGROUND[1] },
            "cover_log10_ohm_m": COVER_LEVEL,
            "planted_depths_m": PLANTED_DEPTHS,
            "planted_side": "outside the dense body (the light side of the margin)",
            "bodies": self.bodies.iter().map(body_json).collect::<Vec<_>>(),
            "margins": self.bodies.iter().flat_map(margins).collect::<Vec<_>>(),
            "planted": planted.collect::<Vec<_>>(),
            "slices": slices.collect::<Vec<_>>(),
            "deposits": self.deposits.iter().map(|deposit| json!({
                "name": deposit.name, "place": rounded(deposit.place), "margin": deposit.margin,
            })).collect::<Vec<_>>(),
            "check": self.check.iter().map(|line| json!({
                "depth_m": line.depth, "planted": line.planted, "within_m": 1000.0,
                "ratio_margins": hundredths(line.by_margins), "ratio_gravity_crests": hundredths(line.by_crests),
            })).collect::<Vec<_>>(),
        });
        one_entry_a_line(&truth)
    }
}

/// JSON with each entry of the outermost object, and of the lists in it, on a line of its own: easy to read and to
/// compare, and a third of the size of fully indented text.
fn one_entry_a_line(truth: &Value) -> String {
    let entries = truth.as_object().into_iter().flatten().map(|(key, value)| {
        let value = match value {
            Value::Array(list) if list.iter().any(|item| item.is_object()) => {
                let lines: Vec<_> = list.iter().map(|item| format!("    {item}")).collect();
                format!("[\n{}\n  ]", lines.join(",\n"))
            }
            other => other.to_string(),
        };
        format!("  {}: {value}", Value::from(key.as_str()))
    });
    format!("{{\n{}\n}}\n", entries.collect::<Vec<_>>().join(",\n"))
}

fn body_json(body: &Body) -> Value {
    json!({
        "name": body.name,
        "corners": body.corners().map(rounded),
        "strike_deg": body.strike,
        "length_m": body.size[0],
        "width_m": body.size[1],
        "top_m": body.depth[0],
        "bottom_m": body.depth[1],
        "density_contrast_kg_m3": body.density,
        "susceptibility_si": body.susceptibility,
    })
}

fn margin_json(margin: &Margin) -> Value {
    json!({
        "body": margin.body,
        "faces": margin.faces,
        "outward_deg": margin.outward,
        "line": [rounded(margin.start), rounded(margin.end)],
        "length_m": margin.length().round(),
        "in_gravity": margin.density != 0.0,
        "conductors": margin.planted,
    })
}

/// A pod as its level and every tenth place along its middle.
fn pod_json(pod: &Pod) -> Value {
    let line: Vec<_> = pod.discs.iter().step_by(10).map(|(place, _)| rounded(*place)).collect();
    let widest = pod.discs.iter().map(|(_, radius)| 2.0 * radius).fold(0.0, f64::max);
    json!({ "log10_ohm_m": hundredths(pod.level), "widest_m": widest.round(), "line": line })
}

/// Whole metres.
fn rounded(place: [f64; 2]) -> [f64; 2] {
    place.map(f64::round)
}

fn hundredths(value: f64) -> f64 {
    (100.0 * value).round() / 100.0
}

#[cfg(test)]
mod tests {
    use super::*;

    /// Read back by serde_json, a general-purpose library.
    #[test]
    fn the_text_reads_back_as_what_was_written() {
        let value = json!({ "a \"b\"": 1.5, "list": [{ "x": [1, 2] }, { "x": [] }], "none": [], "numbers": [1, 2] });
        let text = one_entry_a_line(&value);
        assert_eq!(serde_json::from_str::<Value>(&text).unwrap(), value);
        assert_eq!(text.lines().count(), 9);
    }
}
