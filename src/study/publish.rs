//! Writing what was found: tables, figures, map layers, page and provenance, whole or not at all.

use std::collections::BTreeMap;
use std::path::{Path, PathBuf};
use std::time::SystemTime;

use super::answer::{capital, list};
use super::methods::methods;
use super::plan::Plan;
use super::progress::Progress;
use super::run::{Findings, SubjectFinding, run};
use super::series::Series;
use super::settings::Study;
use crate::coincidence::{Test, Verdict};
use crate::conductor::{Side, outlines};
use crate::error::{Error, Result};
use crate::evidence::{
    Column, DepthPanel, Input, OutputFolder, Page, PageTable, Provenance, Shape, VectorLayer, depth_label,
    distance_label, file_stem, grouped, hash_file, rfc3339, significant, write_figures, write_geopackage, write_page,
    write_provenance, write_tables,
};
use crate::grid::write_raster;

/// Where and how a run writes.
#[derive(Debug, Clone)]
pub struct RunOptions {
    /// The folder to write.
    pub out: PathBuf,
    /// Replace the folder if an earlier run wrote it.
    pub replace: bool,
    /// Threads in use, for the record; the results do not depend on it.
    pub threads: usize,
}

/// Reads a study, runs it, writes the evidence folder, and returns the answer's headline.
///
/// # Errors
/// Anything wrong with the study, its layers or the output folder. The folder is written whole or not at all.
pub fn run_and_publish(study: &Path, options: &RunOptions, progress: &dyn Progress) -> Result<String> {
    let started = SystemTime::now();
    // Before any work, so that a folder that may not be written is not found out after it.
    let folder = OutputFolder::prepare(&options.out, options.replace)?;
    let plan = Plan::make(Study::read(study)?)?;
    // A vector file or a table that is missing is refused by its reader, in its own words.
    if plan.files().iter().any(|path| !path.exists()) {
        plan.read_small_files()?;
    }
    progress.stage("hashing the inputs", 1);
    let inputs = hash_inputs(&plan)?;
    progress.step();
    let findings = run(plan, progress)?;
    progress.stage("writing the evidence", 5);
    let headline = publish(&findings, &inputs, folder.path(), progress)?;
    let provenance = findings.provenance(inputs, options, started);
    write_provenance(folder.path(), &provenance)?;
    folder.finish()?;
    progress.step();
    Ok(headline)
}

/// Writes everything but the provenance record, which alone knows of time and threads.
fn publish(findings: &Findings, inputs: &[Input], folder: &Path, progress: &dyn Progress) -> Result<String> {
    let tables = findings.tables();
    write_tables(folder, &tables)?;
    progress.step();
    findings.write_layers(folder)?;
    progress.step();
    let maps = findings.maps()?;
    let curves = findings.curves();
    let figures: Vec<_> = maps.iter().cloned().chain(curves.iter().map(|(figure, _)| figure.clone())).collect();
    write_figures(folder, &figures)?;
    progress.step();
    let answer = findings.answer();
    let headline = answer.headline.clone();
    let page = Page {
        title: findings.plan.study.title.clone(),
        question: findings.question(),
        answer,
        cautions: Page::standing_cautions(),
        first_depth: findings.first_depth(),
        depths: findings.slices.iter().zip(maps).map(|(slice, map)| findings.panel(slice.depth, map)).collect(),
        curves,
        tables: tables.iter().map(|table| PageTable { table, folded: table.name != "coincidence" }).collect(),
        methods: methods(findings),
        inputs: inputs.to_vec(),
        command: format!("salband run {} --out DIR", findings.named(&findings.plan.study.path)),
        run: vec![
            ("salband".into(), env!("CARGO_PKG_VERSION").into()),
            ("seed".into(), findings.plan.study.seed.to_string()),
        ],
        study: findings.plan.spelled_out(),
    };
    write_page(&folder.join("report.html"), &page)?;
    progress.step();
    Ok(headline)
}

fn hash_inputs(plan: &Plan) -> Result<Vec<Input>> {
    let study = std::iter::once(("study".to_string(), plan.study.path.clone()));
    let layers = plan.files().into_iter().map(|path| ("layer".to_string(), path));
    let hash = |(role, path): (String, PathBuf)| {
        let (bytes, sha256) = hash_file(&path)?;
        Ok(Input { role, path: plan.study.named(&path), bytes, sha256 })
    };
    study.chain(layers).map(hash).collect()
}

impl Study {
    /// A path as the study names it: from the study's folder where it lies below that.
    pub(super) fn named(&self, path: &Path) -> String {
        let folder = self.path.parent().unwrap_or(Path::new(""));
        path.strip_prefix(folder).unwrap_or(path).display().to_string()
    }
}

impl Findings {
    pub(super) fn named(&self, path: &Path) -> String {
        self.plan.study.named(path)
    }

    /// The depth with the highest score of a conductor test, which the page shows first.
    fn first_depth(&self) -> usize {
        let conductors = self.comparison.tests.iter().filter(|t| t.tested && self.side(t) == Some(Side::Conductor));
        let best = conductors.filter(|t| t.p_family.is_some()).max_by(|a, b| a.score.total_cmp(&b.score));
        match best.map(|test| self.subjects[test.subject]) {
            Some(SubjectFinding::Bodies { slice, .. }) => slice,
            _ => 0,
        }
    }

    fn panel(&self, depth: f64, map: crate::evidence::Figure) -> DepthPanel {
        let conductors = |test: &Test| self.depth(test) == Some(depth) && self.side(test) == Some(Side::Conductor);
        let here = |test: &&Test| conductors(test) && test.tested;
        let tests: Vec<&Test> = self.comparison.tests.iter().filter(here).collect();
        let mut facts = Vec::new();
        if let Some(slice) = self.slices.iter().find(|slice| slice.depth == depth) {
            let bodies = &slice.conductors;
            let area: f64 = bodies.bodies.iter().map(|body| body.area_m2).sum();
            let threshold = 10f64.powf(bodies.threshold_log10);
            facts.push(("conductors".into(), bodies.bodies.len().to_string()));
            facts.push((
                "conductor area".into(),
                format!("{} km\u{b2}", if area < 1e9 { significant(area / 1e6, 3) } else { grouped(area / 1e6) }),
            ));
            facts.push(("threshold".into(), format!("below {} \u{3a9} m", significant(threshold, 3))));
        }
        for series in self.series.iter().copied() {
            let within = self.telling_distance(series, Side::Conductor);
            let at = tests.iter().find(|t| self.series_of(t) == series && t.measure.within() == Some(within));
            if let Some(test) = at {
                let value = match test.p_family {
                    Some(p) => format!("{} \u{d7} ({})", significant(test.effect, 3), self.p_label(test, p)),
                    None => "cannot tell".into(),
                };
                facts.push((self.plan.near_label(series, within), value));
            }
        }
        let mut verdicts: Vec<String> = self.series.iter().flat_map(|series| self.verdicts(*series, &tests)).collect();
        if verdicts.is_empty() {
            let told = |bodies: bool| self.told(|test| conductors(test) && test.measure.within().is_some() == bodies);
            verdicts.push(
                match (told(true), told(false)) {
                    (true, _) => "Nothing shown beyond chance at this depth.",
                    (false, true) => {
                        "Whether conductors lie closer at this depth, the data cannot tell; conductivity is not shown to rise \
                         with gradient strength."
                    }
                    (false, false) => "At this depth the data cannot tell.",
                }
                .into(),
            );
        }
        DepthPanel {
            depth_m: depth,
            title: depth_label(depth),
            established: tests.iter().any(|test| test.verdict == Verdict::Found),
            map,
            facts,
            verdicts,
        }
    }

    /// What was found against one reference at one depth: a sentence for each verdict worth one.
    fn verdicts(&self, series: Series, tests: &[&Test]) -> Vec<String> {
        let label = self.plan.series_label(series);
        let told = |verdict: Verdict| {
            let found = tests.iter().filter(|test| self.series_of(test) == series && test.verdict == verdict);
            let what: Vec<String> = found
                .map(|test| match test.measure.within() {
                    Some(0.0) => "inside".to_string(),
                    Some(within) => format!("within {}", distance_label(within)),
                    None => test.measure.words().to_string(),
                })
                .collect();
            (!what.is_empty()).then(|| format!("{}, {}: {verdict}.", capital(&label), list(&what)))
        };
        [told(Verdict::Found), told(Verdict::OnlyAlone)].into_iter().flatten().collect()
    }

    /// The map layers: bodies, contacts and deposits as a GeoPackage, grids as GeoTIFF.
    fn write_layers(&self, folder: &Path) -> Result<()> {
        let gis = folder.join("gis");
        std::fs::create_dir_all(&gis).map_err(|source| Error::ours("making a folder").file(&gis).because(source))?;
        let bodies = |side: Side, name: &str| VectorLayer {
            name: name.into(),
            geometry: self
                .slices
                .iter()
                .filter_map(|slice| slice.side(side))
                .flat_map(|bodies| outlines(bodies, &self.plan.frame))
                .map(Shape::Polygon)
                .collect(),
            fields: self.body_columns(side),
        };
        let contacts = self.references.iter().flat_map(|reference| &reference.contacts);
        let mut layers = vec![
            bodies(Side::Conductor, "conductors"),
            VectorLayer {
                name: "contacts".into(),
                geometry: contacts.map(|contact| Shape::Line(contact.line.clone())).collect(),
                fields: self.contact_columns(),
            },
        ];
        let (mapped, fields) = self.mapped_layer();
        if !mapped.is_empty() {
            layers.push(VectorLayer { name: "mapped".into(), geometry: mapped, fields });
        }
        if self.plan.study.conductivity.resistors.is_some() {
            layers.push(bodies(Side::Resistor, "resistors"));
        }
        if !self.deposits.is_empty() {
            layers.push(VectorLayer {
                name: "deposits".into(),
                geometry: self.deposits.iter().map(|d| Shape::Point(geo::Point::new(d.x, d.y))).collect(),
                fields: self.deposit_columns(),
            });
        }
        write_geopackage(&gis.join("salband.gpkg"), &self.plan.frame.crs, &layers)?;
        for slice in &self.slices {
            let path = gis.join(format!("log10_resistivity_{}.tif", slice.depth));
            let title = format!("log10 resistivity at {} m", slice.depth);
            write_raster(&path, &slice.placed.grid, &title, "log10 ohm m")?;
        }
        for reference in &self.references {
            let potential = self.series[reference.series].potential();
            if let (Some(strength), Some(height), Some(index)) = (&reference.strength, reference.height, potential) {
                let field = &self.plan.study.potentials[index];
                let unit = format!("{} per metre", field.kind.unit());
                let title = format!("horizontal gradient of {} at height {} m", field.name, height.round());
                let at = match reference.slice {
                    Some(slice) => format!("for_{}", self.slices[slice].depth),
                    None => height.to_string(),
                };
                let path = gis.join(format!("{}_gradient_{at}.tif", file_stem(&field.name)));
                write_raster(&path, strength, &title, &unit)?;
            }
        }
        for (field, found) in self.plan.study.potentials.iter().zip(&self.potentials) {
            let unit = match field.kind {
                super::settings::PotentialKind::Magnetic { .. } => "nT",
                kind => kind.unit(),
            };
            let path = gis.join(format!("{}_field.tif", file_stem(&field.name)));
            write_raster(&path, &found.placed.grid, &format!("{} on the frame", field.name), unit)?;
        }
        Ok(())
    }

    /// Mapped lines and the outlines of mapped units, cut at the frame, each with the name of its set.
    fn mapped_layer(&self) -> (Vec<Shape>, Vec<Column>) {
        let mut names: Vec<&str> = Vec::new();
        let mut kinds = Vec::new();
        let mut shapes = Vec::new();
        let mut take = |name, kind, lines: &[geo::LineString<f64>]| {
            for line in lines {
                names.push(name);
                kinds.push(kind);
                shapes.push(Shape::Line(line.clone()));
            }
        };
        for reference in &self.references {
            if let Series::Lines(index) = self.series[reference.series] {
                take(self.plan.study.lines[index].name.as_str(), "lines", &reference.lines);
            }
        }
        for (choice, found) in self.plan.study.units.iter().zip(&self.units) {
            take(choice.name.as_str(), "outline of units", &found.outlines);
        }
        let text = |name: &str, meaning: &str, values: &[&str]| {
            Column::text(name, meaning, values.iter().map(|value| (*value).to_string()))
        };
        let fields = vec![
            text("name", "Name of the set", &names),
            text("kind", "Mapped lines, or the outline of mapped units", &kinds),
        ];
        (shapes, fields)
    }

    fn provenance(&self, inputs: Vec<Input>, options: &RunOptions, started: SystemTime) -> Provenance {
        let finished = SystemTime::now();
        let versions = BTreeMap::from([("gdal".to_string(), gdal::version::version_info("RELEASE_NAME"))]);
        Provenance {
            program: env!("CARGO_PKG_NAME").into(),
            version: env!("CARGO_PKG_VERSION").into(),
            command: std::env::args().collect::<Vec<_>>().join(" "),
            study: self.plan.spelled_out(),
            inputs,
            seed: self.plan.study.seed,
            threads: options.threads,
            started: rfc3339(started),
            finished: rfc3339(finished),
            seconds: finished.duration_since(started).map_or(0.0, |time| time.as_secs_f64()),
            versions,
        }
    }
}
