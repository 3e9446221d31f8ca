//! The study as understood, with every default spelled out.

use toml::{Table, Value};

use super::plan::{Plan, PlannedLayer};
use super::settings::{Angles, BodyChoice};
use crate::conductor::Threshold;
use crate::grid::VectorSource;

impl Plan {
    /// The study as TOML text that means the same as the user's file, with nothing left to a default.
    pub fn spelled_out(&self) -> String {
        let study = &self.study;
        let mut file = Table::new();
        file.insert("title".into(), study.title.clone().into());
        // The study file takes no larger seed.
        let seed = Value::Integer(i64::try_from(study.seed).unwrap_or(i64::MAX));
        file.insert("seed".into(), seed);
        file.insert(
            "frame".into(),
            table([("crs", self.frame.crs.definition().into()), ("cell", self.frame.cell.into())]),
        );
        let slices = self.slices.iter().map(|slice| {
            let mut keys = self.layer(&slice.layer);
            keys.insert("depth".into(), slice.depth.into());
            Value::Table(keys)
        });
        let mut conductivity = vec![
            ("quantity", study.conductivity.quantity.name().into()),
            ("slices", Value::Array(slices.collect())),
            ("conductors", bodies(&study.conductivity.conductors, "below", self.conductor_area)),
        ];
        if let Some(choice) = &study.conductivity.resistors {
            conductivity.push(("resistors", bodies(choice, "above", self.resistor_area)));
        }
        file.insert("conductivity".into(), table(conductivity));
        let potentials = study.potentials.iter().zip(&self.potentials).map(|(field, planned)| {
            let mut keys = self.layer(&planned.layer);
            keys.insert("name".into(), field.name.clone().into());
            keys.insert("kind".into(), field.kind.name().into());
            if let Some(heights) = &field.heights {
                keys.insert("heights".into(), numbers(heights));
            }
            if let Some(noise) = field.noise {
                keys.insert("noise".into(), noise.into());
            }
            if let Some(directions) = planned.directions {
                let angles = |angles: Angles| {
                    [("inclination", angles.inclination.into()), ("declination", angles.declination.into())]
                };
                for (key, angle) in angles(directions.field) {
                    keys.insert(key.into(), angle);
                }
                if let Some(own) = directions.magnetisation {
                    keys.insert("magnetisation".into(), table(angles(own)));
                }
            }
            let contacts = table([
                ("strong", field.contacts.quantiles.0.into()),
                ("weak", field.contacts.quantiles.1.into()),
                ("significance", field.contacts.significance.into()),
                ("least_length", planned.least_length.into()),
            ]);
            keys.insert("contacts".into(), contacts);
            Value::Table(keys)
        });
        insert_list(&mut file, "potential", potentials.collect());
        let lines = study.lines.iter().map(|lines| Value::Table(self.vectors(&lines.name, &lines.source)));
        insert_list(&mut file, "lines", lines.collect());
        let units = study.units.iter().map(|units| {
            let mut keys = self.vectors(&units.name, &units.source);
            keys.insert("role".into(), units.role.name().into());
            Value::Table(keys)
        });
        insert_list(&mut file, "units", units.collect());
        if let Some(deposits) = &study.deposits {
            let mut keys = Table::new();
            keys.insert("path".into(), study.named(&deposits.path).into());
            insert_text(&mut keys, "crs", &deposits.crs);
            if let Some([x, y, name]) = &deposits.columns {
                let columns = table([("x", x.clone().into()), ("y", y.clone().into()), ("name", name.clone().into())]);
                keys.insert("columns".into(), columns);
            }
            file.insert("deposits".into(), Value::Table(keys));
        }
        let test = table([
            ("within", numbers(&self.within)),
            ("profile", numbers(&self.profile)),
            ("distance_cap", self.distance_cap.into()),
            ("null", "shifts".into()),
            ("family", study.test.level.into()),
            ("height_per_depth", study.test.height_per_depth.into()),
            ("resolution", study.test.resolution.name().into()),
        ]);
        file.insert("test".into(), test);
        file.to_string()
    }

    fn vectors(&self, name: &str, source: &VectorSource) -> Table {
        let mut keys = Table::new();
        keys.insert("name".into(), name.into());
        keys.insert("path".into(), self.study.named(&source.path).into());
        insert_text(&mut keys, "layer", &source.layer);
        insert_text(&mut keys, "crs", &source.crs);
        if let Some(filter) = &source.filter {
            let texts = |values: &[String]| Value::Array(values.iter().map(|value| value.clone().into()).collect());
            let keep =
                [("column", filter.column.clone().into()), ("is", texts(&filter.is)), ("not", texts(&filter.not))];
            keys.insert("keep".into(), table(keep));
        }
        keys
    }

    fn layer(&self, layer: &PlannedLayer) -> Table {
        let mut keys = Table::new();
        keys.insert("path".into(), self.study.named(&layer.source.path).into());
        keys.insert("band".into(), Value::Integer(i64::try_from(layer.band).unwrap_or(1)));
        insert_text(&mut keys, "variable", &layer.source.variable);
        insert_text(&mut keys, "crs", &layer.source.crs);
        keys
    }
}

fn bodies(choice: &BodyChoice, absolute: &'static str, least_area: f64) -> Value {
    let threshold = match choice.threshold {
        Threshold::Quantile(quantile) => ("quantile", quantile.into()),
        Threshold::Absolute(limit) => (absolute, limit.into()),
        Threshold::Mixture => ("mixture", true.into()),
    };
    table([threshold, ("least_area", least_area.into())])
}

fn table<'a>(keys: impl IntoIterator<Item = (&'a str, Value)>) -> Value {
    Value::Table(keys.into_iter().map(|(key, value)| (key.to_string(), value)).collect())
}

fn numbers(values: &[f64]) -> Value {
    Value::Array(values.iter().map(|value| Value::Float(*value)).collect())
}

fn insert_text(keys: &mut Table, key: &str, text: &Option<String>) {
    if let Some(text) = text {
        keys.insert(key.into(), text.clone().into());
    }
}

fn insert_list(file: &mut Table, key: &str, list: Vec<Value>) {
    if !list.is_empty() {
        file.insert(key.into(), Value::Array(list));
    }
}
