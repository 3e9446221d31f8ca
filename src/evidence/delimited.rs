//! Text that a spreadsheet would take for a formula.

use std::borrow::Cow;

/// A text for a CSV cell: one that begins like a formula (`=`, `+`, `-`, `@`, tab, carriage return or line feed) gets a
/// leading apostrophe, so that a spreadsheet shows it instead of running it. Quoting is the writer's business.
pub(super) fn neutralised(text: &str) -> Cow<'_, str> {
    if text.starts_with(['=', '+', '-', '@', '\t', '\r', '\n']) {
        Cow::Owned(format!("'{text}"))
    } else {
        Cow::Borrowed(text)
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn formulas_become_text_and_the_rest_is_left() {
        for dangerous in ["=1+1", "+1", "-1", "@SUM(A1)", "\t=1", "\r=1", "\n=1"] {
            assert_eq!(neutralised(dangerous), format!("'{dangerous}"));
        }
        for harmless in ["", "north", "a=b", " 1", "\u{e9}t\u{e9}"] {
            assert_eq!(neutralised(harmless), harmless);
        }
    }
}
