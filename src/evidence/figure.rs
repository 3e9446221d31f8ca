//! What every figure shares: the canvas, the classes and a few marks.

use std::fs;
use std::io::Write;
use std::path::Path;

use svg::node::element::{Description, Line, Path as Outline, Rectangle, Style, Text, Title};
use svg::{Document, Node};

use super::table::{create, file_stem};
use crate::error::{Error, Result};

/// Width of every figure in its own units; it scales to the width that it is given.
pub(super) const WIDTH: f64 = 520.0;

/// The most letters in a line of a title, and the distance between two lines.
const TITLE_LETTERS: usize = 44;
const TITLE_LINE: f64 = 21.0;

/// The looks, by class. A page may override them (in the dark, say); a figure file stands alone with these.
const STYLE: &str = "
.sb text{font-family:system-ui,-apple-system,'Segoe UI',Roboto,'Liberation Sans',Arial,sans-serif;font-size:14px;fill:#1f262d}
.sb .sb-title{font-size:16px;font-weight:600}
.sb .sb-small{font-size:13px;fill:#4d5863}
.sb .sb-strong{font-weight:600}
.sb .sb-place{font-size:12px;stroke:#fff;stroke-width:3px;stroke-linejoin:round;paint-order:stroke}
.sb .sb-paper{fill:#fff}
.sb .sb-frame{fill:none;stroke:#77828d;stroke-width:1}
.sb .sb-rule{fill:none;stroke:#dfe3e7;stroke-width:1}
.sb .sb-tick{fill:none;stroke:#77828d;stroke-width:1}
.sb .sb-neutral{fill:none;stroke:#4d5863;stroke-width:1;stroke-dasharray:2 3}
.sb .sb-band{fill:#cbd5df}
.sb .sb-mean{fill:none;stroke:#5b6a78;stroke-width:1.6}
.sb .sb-observed{fill:none;stroke:#a8470b;stroke-width:1.6}
.sb .sb-full{fill:#a8470b;stroke:#a8470b;stroke-width:2}
.sb .sb-hollow{fill:#fff;stroke:#a8470b;stroke-width:2}
.sb .sb-conductor{fill:#f0a13c;fill-opacity:.55;stroke:#a8470b;stroke-width:1.2;stroke-linejoin:round}
.sb .sb-contact{fill:none;stroke:#123a6f;stroke-width:1.5;stroke-linejoin:round;stroke-linecap:round}
.sb .sb-mapped{fill:none;stroke:#5b3a8c;stroke-width:1.3;stroke-dasharray:6 3;stroke-linejoin:round;stroke-linecap:butt}
.sb .sb-casing{fill:none;stroke:#fff;stroke-width:4;stroke-linejoin:round;stroke-linecap:round}
.sb .sb-deposit{fill:#fff;stroke:#14181c;stroke-width:1.4}
.sb .sb-ink{fill:#1f262d;stroke:#1f262d;stroke-width:1}
.sb .sb-hatch{fill:none;stroke:#9aa4ae;stroke-width:1}
.sb .sb-void{fill:#fff}
";

/// A finished figure: a name for its file, a title, a description in words, and the SVG itself.
#[derive(Debug, Clone, PartialEq)]
pub struct Figure {
    /// The name of the file, without extension; also the stem of the identifiers inside.
    pub name: String,
    /// The title.
    pub title: String,
    /// What the figure shows, in words, for those who cannot see it.
    pub description: String,
    /// A complete `<svg>` element that needs nothing from elsewhere.
    pub svg: String,
}

/// Writes each figure as `folder/figures/NAME.svg`.
///
/// # Errors
/// A file that exists already or cannot be written.
pub fn write_figures(folder: &Path, figures: &[Figure]) -> Result<()> {
    let folder = folder.join("figures");
    fs::create_dir_all(&folder).map_err(|error| Error::ours("creating a folder").file(&folder).because(error))?;
    for figure in figures {
        let path = folder.join(format!("{}.svg", file_stem(&figure.name)));
        let text = format!("<?xml version=\"1.0\" encoding=\"UTF-8\"?>\n{}\n", figure.svg);
        create(&path)?
            .write_all(text.as_bytes())
            .map_err(|error| Error::ours("writing a figure").file(&path).because(error))?;
    }
    Ok(())
}

/// A figure in the making. Everything a user has named goes through [`Canvas::text`] or the title and description, where it
/// is escaped; attributes take only our own text.
pub(super) struct Canvas {
    /// Stem of the identifiers in this figure, so that many can share a page.
    pub(super) id: String,
    name: String,
    title: String,
    description: String,
    document: Document,
}

impl Canvas {
    /// A sheet of [`WIDTH`] by `height` with its title, whose last line stands on 20. A long title takes more lines, for
    /// which the sheet grows upwards.
    pub(super) fn new(name: &str, title: &str, description: &str, height: f64) -> Self {
        let id = format!("sb-{}", file_stem(name).replace('.', "-"));
        let lines = wrapped(title, TITLE_LETTERS);
        let above = TITLE_LINE * lines.len().saturating_sub(1) as f64;
        let document = Document::new()
            .set("class", "sb")
            .set("viewBox", format!("0 {} {WIDTH} {}", place(-above), place(height + above)))
            .set("role", "img")
            .set("aria-labelledby", format!("{id}-title {id}-desc"))
            .add(Title::new(clean(title)).set("id", format!("{id}-title")))
            .add(Description::new().set("id", format!("{id}-desc")).add(svg::node::Text::new(clean(description))))
            .add(Style::new(STYLE));
        let mut canvas = Self { id, name: name.into(), title: title.into(), description: description.into(), document };
        canvas.rectangle("sb-paper", (0.0, -above), (WIDTH, height + above));
        for (index, line) in lines.iter().enumerate() {
            canvas.text("sb-title", (0.0, 20.0 - above + TITLE_LINE * index as f64), "start", line);
        }
        canvas
    }

    /// Adds any node.
    pub(super) fn add(&mut self, node: impl Into<Box<dyn Node>>) {
        self.document.append(node.into());
    }

    /// Adds a text; `anchor` is `start`, `middle` or `end`.
    pub(super) fn text(&mut self, class: &str, (x, y): (f64, f64), anchor: &str, content: &str) {
        let text = Text::new(clean(content)).set("class", class).set("x", place(x)).set("y", place(y));
        self.add(text.set("text-anchor", anchor));
    }

    /// Adds a straight line.
    pub(super) fn line(&mut self, class: &str, (x1, y1): (f64, f64), (x2, y2): (f64, f64)) {
        let line = Line::new().set("class", class).set("x1", place(x1)).set("y1", place(y1));
        self.add(line.set("x2", place(x2)).set("y2", place(y2)));
    }

    /// Adds a rectangle.
    pub(super) fn rectangle(&mut self, class: &str, (x, y): (f64, f64), (width, height): (f64, f64)) {
        let rectangle = Rectangle::new().set("class", class).set("x", place(x)).set("y", place(y));
        self.add(rectangle.set("width", place(width)).set("height", place(height)));
    }

    /// Adds an outline given as path data.
    pub(super) fn outline(&mut self, class: &str, data: String) {
        self.add(Outline::new().set("class", class).set("d", data).set("fill-rule", "evenodd"));
    }

    /// Adds a round marker: filled if the result is established, hollow if not.
    pub(super) fn marker(&mut self, (x, y): (f64, f64), radius: f64, established: bool) {
        let class = if established { "sb-full" } else { "sb-hollow" };
        let circle = svg::node::element::Circle::new().set("class", class).set("cx", place(x)).set("cy", place(y));
        self.add(circle.set("r", radius));
    }

    /// Adds the words of a legend entry behind a mark.
    pub(super) fn key(&mut self, (x, y): (f64, f64), content: &str) {
        self.text("sb-small", (x, y), "start", content);
    }

    /// The finished figure.
    pub(super) fn finish(self) -> Figure {
        let svg = self.document.to_string();
        Figure { name: self.name, title: self.title, description: self.description, svg }
    }
}

/// A place rounded to a hundredth of a unit: nothing smaller can be seen, and the files stay small.
pub(super) fn place(value: f64) -> f64 {
    (value * 100.0).round() / 100.0 + 0.0
}

/// Path data through places, open or closed.
pub(super) fn path_data(points: impl IntoIterator<Item = (f64, f64)>, closed: bool) -> String {
    let mut data = String::new();
    for (index, (x, y)) in points.into_iter().enumerate() {
        data.push_str(&format!("{}{} {}", if index == 0 { "M" } else { "L" }, place(x), place(y)));
    }
    if closed && !data.is_empty() {
        data.push('Z');
    }
    data
}

/// A text broken between words into lines of at most `most` letters; a longer word has a line to itself.
fn wrapped(text: &str, most: usize) -> Vec<String> {
    let mut lines: Vec<String> = Vec::new();
    for word in text.split_whitespace() {
        match lines.last_mut() {
            Some(line) if line.chars().count() + 1 + word.chars().count() <= most => {
                line.push(' ');
                line.push_str(word);
            }
            _ => lines.push(word.to_owned()),
        }
    }
    lines
}

/// A text without the control characters that XML forbids.
fn clean(text: &str) -> String {
    text.chars().map(|letter| if letter.is_control() { ' ' } else { letter }).collect()
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_stay_text() {
        let mut canvas = Canvas::new("a \"b\" <c>", "<script>alert(1)</script>", "a & b\u{0}", 10.0);
        canvas.text("sb-small", (1.0, 2.0), "start", "</text><script>");
        let svg = canvas.finish().svg;
        assert!(!svg.contains("<script>"), "{svg}");
        assert!(svg.contains("&lt;script&gt;alert(1)&lt;/script&gt;") && svg.contains("a &amp; b "));
        assert!(svg.contains("id=\"sb-a-b-c-title\""));
    }

    #[test]
    fn figures_are_files_that_never_overwrite_each_other() {
        let folder = tempfile::tempdir().unwrap();
        let figure = Canvas::new("map 1", "t", "d", 10.0).finish();
        write_figures(folder.path(), std::slice::from_ref(&figure)).unwrap();
        let text = fs::read_to_string(folder.path().join("figures/map-1.svg")).unwrap();
        assert!(text.starts_with("<?xml") && text.contains("<svg") && text.trim_end().ends_with("</svg>"));
        assert!(write_figures(folder.path(), &[figure]).is_err());
    }

    #[test]
    fn a_long_title_takes_more_lines() {
        assert_eq!(wrapped("one two  three", 7), ["one two", "three"]);
        assert_eq!(wrapped("unbreakable", 4), ["unbreakable"]);
        assert!(wrapped("", 4).is_empty());
        let svg = Canvas::new("n", &"word ".repeat(20), "d", 10.0).finish().svg;
        assert_eq!(svg.matches("class=\"sb-title\"").count(), 3, "100 letters in lines of 44");
        assert!(svg.contains("viewBox=\"0 -42 520 52\""));
    }

    #[test]
    fn paths_are_rounded() {
        assert_eq!(path_data([(0.123456, -0.0001), (2.0, 3.5)], true), "M0.12 0L2 3.5Z");
        assert_eq!(path_data([], true), "");
    }
}
