//! Names of suites, families and cases.

use crate::wording::flaw;

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
