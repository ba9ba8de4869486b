//! Ids and remarks are foreign text: each output has its own way to keep them from meaning anything but themselves.

use std::collections::BTreeSet;

/// For HTML and SVG, in text and in quoted attributes.
pub(crate) fn markup(text: &str) -> String {
    let mut escaped = String::with_capacity(text.len());
    for letter in text.chars() {
        match letter {
            '&' => escaped.push_str("&amp;"),
            '<' => escaped.push_str("&lt;"),
            '>' => escaped.push_str("&gt;"),
            '"' => escaped.push_str("&quot;"),
            '\'' => escaped.push_str("&#39;"),
            letter => escaped.push(printable(letter)),
        }
    }
    escaped
}

/// For a terminal: nothing that moves the cursor or turns the direction of writing.
pub(crate) fn terminal(text: &str) -> String {
    text.chars().map(printable).collect()
}

fn printable(letter: char) -> char {
    let turns = matches!(letter, '\u{202a}'..='\u{202e}' | '\u{2066}'..='\u{2069}');
    let forbidden = matches!(letter, '\u{fffe}' | '\u{ffff}');
    if (letter.is_control() && letter != '\n' && letter != '\t') || turns || forbidden {
        '\u{fffd}'
    } else {
        letter
    }
}

/// A cell of a CSV file (RFC 4180), which a spreadsheet must not read as a formula.
pub(crate) fn csv_text(text: &str) -> String {
    let formula = text.starts_with(['=', '+', '-', '@', '\t', '\r']);
    let text = if formula { format!("'{text}") } else { text.to_owned() };
    if text.contains([',', ';', '"', '\n', '\r', '\'']) || text != text.trim() {
        format!("\"{}\"", text.replace('"', "\"\""))
    } else {
        text
    }
}

/// JSON inside a `script` element: no `<` that could end it, no separators that old readers take for line ends.
pub(crate) fn script_json(value: &serde_json::Value) -> String {
    value
        .to_string()
        .replace('<', "\\u003c")
        .replace('>', "\\u003e")
        .replace('&', "\\u0026")
        .replace('\u{2028}', "\\u2028")
        .replace('\u{2029}', "\\u2029")
}

/// A name for a file or folder, made of an id: letters, digits, `.`, `-`, `_`, never a way out of the folder.
pub(crate) fn file_name(id: &str) -> String {
    let name: String = id
        .chars()
        .map(|letter| {
            if letter.is_ascii_alphanumeric() || "._-".contains(letter) {
                letter
            } else {
                '_'
            }
        })
        .collect();
    let name = name.trim_start_matches('.');
    let short: String = name.chars().take(80).collect();
    if short.is_empty() { "_".to_owned() } else { short }
}

/// A name for a file made of an id that no other id has: different ids may make the same one, and upper and lower case are
/// one to some file systems.
pub(crate) fn free_file_name(id: &str, taken: &mut BTreeSet<String>) -> String {
    let base = file_name(id);
    let free = (1..).map(|number| {
        if number == 1 {
            base.clone()
        } else {
            format!("{base}-{number}")
        }
    });
    free.into_iter()
        .find(|name| taken.insert(name.to_lowercase()))
        .expect("numbers do not run out")
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn ids_mean_nothing_but_themselves() {
        assert_eq!(markup("<script>'\"&"), "&lt;script&gt;&#39;&quot;&amp;");
        assert_eq!(markup("a\u{0}b"), "a\u{fffd}b");
        assert_eq!(terminal("\u{1b}[2Jx\u{202e}y"), "\u{fffd}[2Jx\u{fffd}y");
        assert_eq!(
            script_json(&serde_json::json!(["</script><!--"])),
            r#"["\u003c/script\u003e\u003c!--"]"#
        );
    }

    #[test]
    fn spreadsheets_see_no_formulas() {
        for (id, cell) in [
            ("=1+1", "\"'=1+1\""),
            ("+x", "\"'+x\""),
            ("-3", "\"'-3\""),
            ("@sum", "\"'@sum\""),
            ("b,c", "\"b,c\""),
            ("say \"x\"", "\"say \"\"x\"\"\""),
            ("n0", "n0"),
        ] {
            assert_eq!(csv_text(id), cell);
        }
    }

    #[test]
    fn file_names_stay_in_their_folder() {
        assert_eq!(file_name("../../etc/passwd"), "_.._etc_passwd");
        assert_eq!(file_name(".."), "_");
        assert_eq!(file_name("snow & wind"), "snow___wind");
        assert_eq!(file_name("grün"), "gr_n");
    }
}
