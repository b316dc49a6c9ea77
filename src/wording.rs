//! Words for the reader of an error: lists, near misses, and what a deserialiser says, in plain English.

/// The candidate that looks most like `word`, if one is close enough to be meant.
pub(crate) fn nearest<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> Option<&'a str> {
    // Share of the letters left alone by the fewest edits (insert, delete, replace, swap); below 0.6 a proposal
    // misleads more often than it helps (our own choice).
    const CLOSE: f64 = 0.6;
    candidates
        .into_iter()
        .map(|candidate| (strsim::normalized_damerau_levenshtein(word, candidate), candidate))
        .filter(|(similarity, _)| *similarity >= CLOSE)
        .max_by(|a, b| a.0.total_cmp(&b.0))
        .map(|(_, candidate)| candidate)
}

/// `did you mean `x`? ` or nothing.
pub(crate) fn proposal<'a>(word: &str, candidates: impl IntoIterator<Item = &'a str>) -> String {
    nearest(word, candidates).map_or_else(String::new, |near| format!("did you mean `{near}`? "))
}

/// What to say of a name that stands for nothing among `names`; `what` is what it was taken for.
pub(crate) fn unknown_name(what: &str, word: &str, names: &[&str]) -> String {
    let near = proposal(word, names.iter().copied());
    format!("there is no {what} `{word}`; {near}give one of {}", names.join(", "))
}

/// What to say of a key that has no meaning where it stands.
pub(crate) fn unknown_key(word: &str, allowed: &[&str]) -> String {
    if allowed.is_empty() {
        return format!("unknown key `{word}`; none is allowed here");
    }
    format!("unknown key `{word}`; {}allowed: {}", proposal(word, allowed.iter().copied()), allowed.join(", "))
}

/// A deserialiser's message in the words of this file: unknown and missing keys, wrong types.
pub(crate) fn plain(message: &str) -> String {
    if let Some(rest) = message.strip_prefix("unknown field `") {
        let mut quoted = rest.split('`').step_by(2);
        let word = quoted.next().unwrap_or_default();
        let allowed: Vec<&str> = quoted.filter(|name| !name.is_empty()).collect();
        return unknown_key(word, &allowed);
    }
    if let Some((word, known)) =
        message.strip_prefix("unknown variant `").and_then(|rest| rest.split_once("`, expected "))
    {
        return format!("is `{word}`; give {known}");
    }
    if let Some(rest) = message.strip_prefix("missing field `") {
        return format!("`{}` is missing", rest.trim_end_matches('`'));
    }
    for (start, verb) in [("invalid type: ", "is "), ("invalid value: ", "is "), ("invalid length ", "has length ")]
    {
        if let Some((found, expected)) = message.strip_prefix(start).and_then(|rest| rest.split_once(", expected "))
        {
            return format!("{verb}{}; give {}", plain_type(found), plain_type(expected));
        }
    }
    message.into()
}

fn plain_type(words: &str) -> String {
    let words = words
        .replace("floating point", "the number")
        .replace("integer `", "the number `")
        .replace("boolean `", "`");
    match words.as_str() {
        "f64" => "a number".into(),
        "usize" | "u32" | "u64" => "a whole number, 0 or above".into(),
        "sequence" | "a sequence" => "a list".into(),
        "fewer elements in array" => "fewer entries".into(),
        "map" | "a map" => "a table".into(),
        "a boolean" => "true or false".into(),
        "a string" => "a text in quotes".into(),
        "null" | "unit value" => "null".into(),
        _ => match words.strip_prefix("string ") {
            Some(text) => format!("the text {text}"),
            None => words.replace("an array of length", "a list of length"),
        },
    }
}

/// Begins a line of an excerpt below a message, such as a formula with a caret under the place at fault.
pub(crate) const EXCERPT: &str = "\n    ";

/// `text` on one line, but for excerpts: it may hold what a stranger wrote, and nothing of that may break the line or move
/// the cursor.
pub fn printable(text: &str) -> String {
    let mut printed = String::with_capacity(text.len());
    for (k, part) in text.split(EXCERPT).enumerate() {
        if k > 0 {
            printed.push_str(EXCERPT);
        }
        for c in part.chars() {
            if is_line_breaking(c) { printed.extend(c.escape_default()) } else { printed.push(c) }
        }
    }
    printed
}

/// Whether a character can end a line or move the cursor.
pub(crate) fn is_line_breaking(c: char) -> bool {
    c.is_control() || matches!(c, '\u{2028}' | '\u{2029}')
}

/// The longest name, in characters.
const LONGEST: usize = 120;

/// What is wrong with a name, if anything. It must survive as a field of a table, a label and a word on a
/// command line.
pub(crate) fn flaw(name: &str) -> Option<String> {
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

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn near_misses_are_proposed_and_far_ones_are_not() {
        assert_eq!(nearest("statoin", ["position", "station"]), Some("station"));
        assert_eq!(nearest("zzz", ["position", "station"]), None);
    }

    #[test]
    fn deserialisers_are_translated() {
        for (from, to) in [
            (
                "unknown field `statoin`, expected `station` or `position`",
                "unknown key `statoin`; did you mean `station`? allowed: station, position",
            ),
            ("unknown field `q`, expected one of `A`, `b`, `c`", "unknown key `q`; allowed: A, b, c"),
            ("missing field `A`", "`A` is missing"),
            ("unknown variant `c`, expected `a` or `b`", "is `c`; give `a` or `b`"),
            ("invalid type: string \"3\", expected f64", "is the text \"3\"; give a number"),
            (
                "invalid type: floating point `0.5`, expected usize",
                "is the number `0.5`; give a whole number, 0 or above",
            ),
            ("invalid type: integer `1`, expected a boolean", "is the number `1`; give true or false"),
            ("invalid type: boolean `true`, expected a string", "is `true`; give a text in quotes"),
            ("invalid length 1, expected an array of length 2", "has length 1; give a list of length 2"),
            ("anything else", "anything else"),
        ] {
            assert_eq!(plain(from), to);
        }
    }
}
