//! The report page: what goes into it.

use std::io::Write;
use std::path::Path;

use super::figure::Figure;
use super::provenance::Input;
use super::table::{Table, create};
use crate::error::{Error, Result};

/// All that the report page shows. Every text may hold anything: it is escaped.
#[derive(Debug, Clone)]
pub struct Page<'a> {
    /// The study's title.
    pub title: String,
    /// The question that was asked, in one sentence.
    pub question: String,
    /// The answer.
    pub answer: Answer,
    /// What the reader must bear in mind, set right beside the answer; see [`Page::standing_cautions`].
    pub cautions: Vec<String>,
    /// One panel for each depth, from the shallowest down.
    pub depths: Vec<DepthPanel>,
    /// The depth that is shown first, as an index into `depths`.
    pub first_depth: usize,
    /// Figures over all depths or distances, each with a caption.
    pub curves: Vec<(Figure, String)>,
    /// The tables, in order.
    pub tables: Vec<PageTable<'a>>,
    /// How it was done, step by step.
    pub methods: Vec<Method>,
    /// The input files with their hashes.
    pub inputs: Vec<Input>,
    /// The command that repeats the run.
    pub command: String,
    /// Facts of the run, as (name, value): version, seed, threads, when, how long.
    pub run: Vec<(String, String)>,
    /// The study as understood, with all defaults spelled out.
    pub study: String,
}

/// The answer, in order of importance.
#[derive(Debug, Clone, PartialEq)]
pub struct Answer {
    /// One or two sentences with effect, p and depth.
    pub headline: String,
    /// The few numbers that carry the answer.
    pub figures: Vec<KeyFigure>,
    /// Further sentences, each a paragraph.
    pub detail: Vec<String>,
    /// What limits the answer, each one point.
    pub limits: Vec<String>,
}

/// One number that carries the answer.
#[derive(Debug, Clone, PartialEq)]
pub struct KeyFigure {
    /// What it is, in two or three words.
    pub label: String,
    /// The number with its unit.
    pub value: String,
    /// Few words of context.
    pub note: String,
}

/// What is known at one depth.
#[derive(Debug, Clone, PartialEq)]
pub struct DepthPanel {
    /// Depth, m, positive down.
    pub depth_m: f64,
    /// The heading.
    pub title: String,
    /// Whether the result at this depth is established; marked in the chooser.
    pub established: bool,
    /// The map.
    pub map: Figure,
    /// Numbers of this depth, as (name, value with unit).
    pub facts: Vec<(String, String)>,
    /// The verdicts in words.
    pub verdicts: Vec<String>,
}

/// A table as shown on the page.
#[derive(Debug, Clone, Copy)]
pub struct PageTable<'a> {
    /// The table; its files are `tables/NAME.csv` and so on.
    pub table: &'a Table,
    /// Folded away until it is asked for.
    pub folded: bool,
}

/// One step of the method.
#[derive(Debug, Clone, PartialEq)]
pub struct Method {
    /// The heading.
    pub heading: String,
    /// What was done, with the numbers that were used.
    pub text: String,
    /// The published source; empty if there is none.
    pub reference: String,
}

impl Page<'_> {
    /// The most rows of a table that the page shows; the files hold all.
    pub const MOST_ROWS: usize = 200;

    /// The cautions that belong beside every result of this kind.
    pub fn standing_cautions() -> Vec<String> {
        [
            "Association is not mineralisation: a conductor that follows a margin may be graphite, clay, saline water or sulphide.",
            "An inversion is a smoothed and non-unique image of the ground; other models fit the same soundings.",
            "A shared cover, or a shared pattern of acquisition, can make two maps alike.",
            "Public reporting of exploration results belongs to a competent or qualified person under the code that applies.",
        ]
        .map(str::to_owned)
        .to_vec()
    }
}

/// Writes the page as one HTML file that needs nothing from elsewhere and may not reach the network.
///
/// # Errors
/// A file that exists already or cannot be written.
pub fn write_page(path: &Path, page: &Page) -> Result<()> {
    let html = page.render()?;
    create(path)?
        .write_all(html.as_bytes())
        .map_err(|error| Error::ours("writing the report page").file(path).because(error))
}
