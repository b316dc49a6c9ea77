//! Names of suites, families and cases.

use crate::wording::is_line_breaking;

/// The longest name, in characters.
const LONGEST: usize = 120;

/// What is wrong with a name, if anything. It must survive as a field of a table, a label and a word on a
/// command line.
pub(super) fn flaw(name: &str) -> Option<String> {
    let length = name.chars().count();
    if name.trim().is_empty() {
        return Some("the name is empty".into());
    }
    if length > LONGEST {
        return Some(format!("the name has {length} characters; at most {LONGEST} are allowed"));
    }
    if name.trim() != name {
        return Some(format!("the name \"{name}\" begins or ends with a blank"));
    }
    let bad = name.chars().find(|&c| is_line_breaking(c) || matches!(c, ',' | '"' | '\''));
    bad.map(|c| {
        let c = c.escape_default();
        format!("the name holds `{c}`; use printable characters, no comma and no quotes")
    })
}

/// What is wrong with the name of a suite, which is also the name of its results folder.
pub(super) fn suite_flaw(name: &str) -> Option<String> {
    if name.starts_with('.') || name.contains(['/', '\\', ':']) {
        return Some(format!("the name \"{name}\" cannot be the name of a folder"));
    }
    flaw(name)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_that_would_break_a_table_are_refused() {
        for good in ["k-017", "Näher dran", "a:b/c", &"x".repeat(120)] {
            assert_eq!(flaw(good), None, "{good}");
        }
        for bad in ["", " ", "a,b", "a\nb", "a\"b", "it's", " a", "a\u{2028}b", "\u{7}", &"x".repeat(121)] {
            assert!(flaw(bad).is_some(), "{bad:?}");
        }
        for bad in ["..", ".hidden", "a/b", "a\\b"] {
            assert!(suite_flaw(bad).is_some(), "{bad}");
        }
    }
}
