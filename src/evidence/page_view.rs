//! How the report page becomes HTML.

use base64::Engine;
use base64::engine::general_purpose::STANDARD;
use minijinja::{Environment, UndefinedBehavior, Value, context};
use sha2::{Digest, Sha256};

use super::column::{Column, Values};
use super::figure::Figure;
use super::number::{depth_label, grouped};
use super::page::{DepthPanel, Page, PageTable};
use super::table::file_stem;
use crate::error::{Error, Result};

const TEMPLATE: &str = include_str!("page.html.jinja");
const LOOKS: &str = include_str!("page.css");
const SCRIPT: &str = include_str!("page.js");

/// A text column with a cell longer than this is given room and wrapped.
const LONG_TEXT: usize = 26;

impl Page<'_> {
    /// The page as HTML. Every text is escaped, save the figures, which escape their own.
    ///
    /// # Errors
    /// A defect of the template.
    pub fn render(&self) -> Result<String> {
        let failed = |error: minijinja::Error| Error::ours("rendering the report page").because(error);
        let mut environment = Environment::new();
        environment.set_undefined_behavior(UndefinedBehavior::Strict);
        // The name ends in .html, which turns the escaping on.
        environment.add_template("report.html", TEMPLATE).map_err(failed)?;
        environment.get_template("report.html").and_then(|template| template.render(self.view())).map_err(failed)
    }

    fn view(&self) -> Value {
        let answer = &self.answer;
        let key_figures = answer.figures.iter().map(|figure| {
            context! { label => &figure.label, value => &figure.value, note => &figure.note }
        });
        let curves =
            self.curves.iter().map(|(figure, caption)| context! { figure => drawing(figure), caption => caption });
        let methods = self.methods.iter().map(|method| {
            context! { heading => &method.heading, text => &method.text, reference => &method.reference }
        });
        let inputs = self.inputs.iter().map(|input| {
            let bytes = grouped(input.bytes as f64);
            context! { role => &input.role, path => &input.path, bytes => bytes, sha256 => &input.sha256 }
        });
        let first_depth = self.first_depth.min(self.depths.len().saturating_sub(1));
        context! {
            policy => policy(),
            looks => Value::from_safe_string(LOOKS.into()),
            script => Value::from_safe_string(SCRIPT.into()),
            title => &self.title,
            question => &self.question,
            headline => &answer.headline,
            key_figures => list(key_figures),
            detail => texts(&answer.detail),
            limits => texts(&answer.limits),
            cautions => texts(&self.cautions),
            depths => list(self.depths.iter().enumerate().map(|(index, panel)| depth(panel, index == first_depth))),
            curves => list(curves),
            tables => list(self.tables.iter().map(table)),
            methods => list(methods),
            inputs => list(inputs),
            command => &self.command,
            run => pairs(&self.run),
            study => &self.study,
        }
    }
}

fn list(values: impl Iterator<Item = Value>) -> Value {
    Value::from(values.collect::<Vec<Value>>())
}

fn texts(texts: &[String]) -> Value {
    list(texts.iter().map(Value::from))
}

fn pairs(pairs: &[(String, String)]) -> Value {
    list(pairs.iter().map(|(name, value)| context! { name => name, value => value }))
}

fn drawing(figure: &Figure) -> Value {
    context! {
        svg => Value::from_safe_string(figure.svg.clone()),
        file => format!("figures/{}.svg", file_stem(&figure.name)),
    }
}

fn depth(panel: &DepthPanel, first: bool) -> Value {
    context! {
        label => depth_label(panel.depth_m),
        title => &panel.title,
        established => panel.established,
        first => first,
        map => drawing(&panel.map),
        facts => pairs(&panel.facts),
        verdicts => texts(&panel.verdicts),
    }
}

fn table(shown: &PageTable) -> Value {
    let table = shown.table;
    let columns = table.columns.iter().map(|column| {
        context! { name => &column.name, unit => &column.unit, meaning => &column.meaning, class => column_class(column) }
    });
    let classes: Vec<&str> = table.columns.iter().map(column_class).collect();
    let rows = (0..table.rows().min(Page::MOST_ROWS)).map(|row| {
        let cells = table.columns.iter().zip(&classes);
        list(cells.map(|(column, class)| context! { text => column.values.rounded(row), class => *class }))
    });
    context! {
        caption => &table.caption,
        file => format!("tables/{}", file_stem(&table.name)),
        folded => shown.folded,
        columns => list(columns),
        rows => list(rows),
        all_rows => grouped(table.rows() as f64),
        shown_rows => grouped(Page::MOST_ROWS as f64),
        cut => table.rows() > Page::MOST_ROWS,
    }
}

fn column_class(column: &Column) -> &'static str {
    match &column.values {
        Values::Text(cells) if cells.iter().any(|cell| cell.chars().count() > LONG_TEXT) => "long",
        Values::Text(_) => "word",
        Values::Number(_) | Values::Count(_) => "num",
    }
}

/// The content security policy: nothing from the network, no script but our own (by its hash), no form.
fn policy() -> String {
    let hash = STANDARD.encode(Sha256::digest(SCRIPT.as_bytes()));
    format!(
        "default-src 'none'; img-src data:; style-src 'unsafe-inline'; script-src 'sha256-{hash}'; base-uri 'none'; form-action 'none'"
    )
}

#[cfg(test)]
mod tests {
    use super::super::figure::Canvas;
    use super::super::page::{Answer, KeyFigure, Method};
    use super::super::provenance::Input;
    use super::super::table::Table;
    use super::*;

    const EVIL: &str = "<script>alert('x')</script>\" onload=\"x";

    fn evil_table(rows: usize) -> Table {
        let columns = vec![
            Column::text(EVIL, EVIL, (0..rows).map(|row| format!("{EVIL}{row}"))),
            Column::number("p", "", "chance", (0..rows).map(|row| (row > 0).then_some(0.123456))),
        ];
        Table { name: EVIL.into(), caption: EVIL.into(), columns }
    }

    fn rendered(table: &Table, depths: usize) -> String {
        let evil = || EVIL.to_owned();
        let map = |index: usize| Canvas::new(&format!("map {index}"), EVIL, EVIL, 10.0).finish();
        let panel = |index: usize| DepthPanel {
            depth_m: 500.0 * (index + 1) as f64,
            title: evil(),
            established: index == 1,
            map: map(index),
            facts: vec![(evil(), evil())],
            verdicts: vec![evil()],
        };
        let page = Page {
            title: evil(),
            question: evil(),
            answer: Answer {
                headline: evil(),
                figures: vec![KeyFigure { label: evil(), value: evil(), note: evil() }],
                detail: vec![evil()],
                limits: vec![evil()],
            },
            cautions: Page::standing_cautions(),
            depths: (0..depths).map(panel).collect(),
            first_depth: 99,
            curves: vec![(map(99), evil())],
            tables: vec![PageTable { table, folded: false }, PageTable { table, folded: true }],
            methods: vec![Method { heading: evil(), text: evil(), reference: evil() }],
            inputs: vec![Input { role: evil(), path: evil(), bytes: 12345, sha256: "00ff".into() }],
            command: evil(),
            run: vec![(evil(), evil())],
            study: evil(),
        };
        page.render().unwrap()
    }

    #[test]
    fn names_stay_text_everywhere() {
        let html = rendered(&evil_table(3), 2);
        assert_eq!(html.matches("<script").count(), 1, "only our own script");
        assert!(!html.contains("alert('x')</script>"));
        let mut tags = html.split('<').skip(1).filter_map(|rest| rest.split('>').next());
        assert!(tags.all(|tag| !tag.contains("\" onload=")), "no name breaks out of an attribute");
        assert!(html.contains("&lt;script&gt;"));
    }

    #[test]
    fn nothing_reaches_the_network() {
        // The escaping of the template writes a slash as a character reference.
        let html = rendered(&evil_table(3), 2).replace("&#x2f;", "/");
        for source in [" src=\"http", "href=\"http", "href=\"//", "url(http", "@import", "fetch("] {
            assert!(!html.contains(source), "{source}");
        }
        assert!(html.contains("default-src &#x27;none&#x27;") || html.contains("default-src 'none'"));
        assert!(html.contains(&STANDARD.encode(Sha256::digest(SCRIPT.as_bytes()))));
        assert!(html.contains(SCRIPT), "the script stands as it was hashed");
    }

    #[test]
    fn every_caution_stands_before_the_first_map() {
        let html = rendered(&evil_table(3), 2);
        let first_map = html.find("sb-map-0-title").unwrap();
        for caution in Page::standing_cautions() {
            assert!(html.find(&caution).unwrap() < first_map, "{caution}");
        }
    }

    #[test]
    fn a_long_table_is_cut_and_names_its_file() {
        let long = rendered(&evil_table(201), 1);
        assert!(long.contains("first 200 of 201 rows"));
        assert!(long.contains(&format!("x{}", 199)) && !long.contains("onload=&quot;x200"));
        assert!(!rendered(&evil_table(200), 1).contains("first 200 of"));
        assert!(long.replace("&#x2f;", "/").contains("href=\"tables/script-alert-x-script-onload-x.csv"));
    }

    #[test]
    fn one_depth_is_first_and_no_depth_is_no_harm() {
        assert_eq!(rendered(&evil_table(1), 3).matches(" checked").count(), 1);
        assert!(rendered(&evil_table(0), 0).contains("</html>"));
    }

    #[test]
    fn two_renderings_are_equal() {
        assert_eq!(rendered(&evil_table(3), 3), rendered(&evil_table(3), 3));
    }
}
