//! Tables in Markdown, for pasting into a report.

use super::table::Table;

/// A text that stays text inside a Markdown table: pipes, markup and tags are escaped, line breaks become spaces.
pub(super) fn escaped(text: &str) -> String {
    let letters: Vec<char> = text.chars().collect();
    let mut out = String::with_capacity(text.len());
    for (position, &letter) in letters.iter().enumerate() {
        let inside_word = |at: Option<usize>| at.and_then(|at| letters.get(at)).is_some_and(|c| c.is_alphanumeric());
        match letter {
            '_' if inside_word(position.checked_sub(1)) && inside_word(Some(position + 1)) => out.push('_'),
            '\\' | '`' | '*' | '_' | '[' | ']' | '|' | '~' => {
                out.push('\\');
                out.push(letter);
            }
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '&' => out.push_str("&amp;"),
            letter if letter.is_control() => out.push(' '),
            letter => out.push(letter),
        }
    }
    out
}

/// The whole table: caption, cells (numbers to four significant digits), and the meaning of each column.
pub(super) fn markdown(table: &Table) -> String {
    let mut out = format!("**{}**\n\n|", escaped(&table.caption));
    for column in &table.columns {
        out.push_str(&format!(" {} |", escaped(&column.heading())));
    }
    out.push_str("\n|");
    for column in &table.columns {
        out.push_str(if column.values.is_text() { " --- |" } else { " ---: |" });
    }
    out.push('\n');
    for row in 0..table.rows() {
        out.push('|');
        for column in &table.columns {
            out.push_str(&format!(" {} |", escaped(&column.values.rounded(row))));
        }
        out.push('\n');
    }
    out.push('\n');
    for column in &table.columns {
        out.push_str(&format!("- {}: {}\n", escaped(&column.heading()), escaped(&column.meaning)));
    }
    out
}

#[cfg(test)]
mod tests {
    use super::super::column::{Column, Values};
    use super::*;

    #[test]
    fn markup_stays_text() {
        assert_eq!(escaped("a|b"), "a\\|b");
        assert_eq!(escaped("depth_m _x_"), "depth_m \\_x\\_");
        assert_eq!(escaped("<script>&\n*"), "&lt;script&gt;&amp; \\*");
        assert_eq!(escaped("[x](y)"), "\\[x\\](y)");
    }

    #[test]
    fn a_table_has_one_line_for_each_row() {
        let table = Table {
            name: "t".into(),
            caption: "Two rows".into(),
            columns: vec![
                Column::number("p_value", "", "chance", [Some(0.0123456), None]),
                Column {
                    name: "who".into(),
                    unit: "".into(),
                    meaning: "a|b".into(),
                    values: Values::Text(vec!["x|y".into(), "z".into()]),
                },
            ],
        };
        let lines: Vec<String> = markdown(&table).lines().map(str::to_owned).collect();
        assert_eq!(
            lines,
            [
                "**Two rows**",
                "",
                "| p_value | who |",
                "| ---: | --- |",
                "| 0.01235 | x\\|y |",
                "|  | z |",
                "",
                "- p_value: chance",
                "- who: a\\|b",
            ]
        );
    }
}
