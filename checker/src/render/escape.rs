//! Foreign text made harmless for the place it goes to. The one home of every escape.
//! Must not know where the text came from.

use std::borrow::Cow;

/// Characters that draw nothing themselves but change what is drawn: controls, and marks that
/// reorder or hide text.
#[must_use]
pub fn hidden(c: char) -> bool {
    c.is_control()
        || matches!(c,
            '\u{200b}'..='\u{200f}' | '\u{2028}'..='\u{202e}' | '\u{2060}'..='\u{206f}' | '\u{feff}' | '\u{fff9}'..='\u{fffb}'
            | '\u{e0000}'..='\u{e007f}')
}

/// For one line of a terminal: a hidden character becomes `\u{1b}` spelled out.
#[must_use]
pub fn terminal(text: &str) -> Cow<'_, str> {
    if !text.chars().any(hidden) {
        return Cow::Borrowed(text);
    }
    let spelled = |c: char| {
        if hidden(c) {
            c.escape_unicode().collect()
        } else {
            String::from(c)
        }
    };
    Cow::Owned(text.chars().map(spelled).collect())
}

/// For source text in a terminal: as [`terminal`], but byte for byte as long, so that positions
/// stay true. Tabs and line ends stay; a lone carriage return ends a line, as it does elsewhere.
#[must_use]
pub fn source(text: &str) -> Cow<'_, str> {
    let plain = |c: char| matches!(c, '\n' | '\t') || !hidden(c);
    if text.chars().all(plain) {
        return Cow::Borrowed(text);
    }
    let mut out = String::with_capacity(text.len());
    let mut rest = text.chars().peekable();
    while let Some(c) = rest.next() {
        match c {
            '\r' if rest.peek() == Some(&'\n') => out.push(c),
            '\r' => out.push('\n'),
            c if plain(c) => out.push(c),
            c => out.push_str(match c.len_utf8() {
                1 => "?",
                2 => "\u{bf}",
                3 => "\u{fffd}",
                _ => "\u{10fffd}",
            }),
        }
    }
    Cow::Owned(out)
}

/// For a paragraph or a table cell of Markdown: no mark-up, no HTML, no link, no mention, one line.
#[must_use]
pub fn markdown(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '\n' | '\t' => out.push(' '),
            c if hidden(c) => out.extend(c.escape_unicode()),
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '@' => out.push_str("&#64;"),
            '\\' | '`' | '*' | '_' | '{' | '}' | '[' | ']' | '#' | '|' | '~' | '$' => {
                out.extend(['\\', c])
            }
            ':' if out.ends_with("http") || out.ends_with("https") => out.push_str("&#58;"),
            '.' if out.ends_with("www") => out.push_str("&#46;"),
            c => out.push(c),
        }
    }
    out
}

/// The same for a sentence in which back-ticks mark words of the language: those become code spans,
/// whoever wrote them, in which nothing else is mark-up.
#[must_use]
pub fn markdown_words(text: &str) -> String {
    if !text.matches('`').count().is_multiple_of(2) {
        return markdown(text);
    }
    let piece = |(at, piece): (usize, &str)| match at % 2 {
        0 => markdown(piece),
        _ if piece.trim().is_empty() => markdown(&format!("`{piece}`")),
        _ => markdown_code(piece),
    };
    text.split('`').enumerate().map(piece).collect()
}

/// For a code span of Markdown, fenced so that back-ticks inside cannot end it.
#[must_use]
pub fn markdown_code(text: &str) -> String {
    let text: String = terminal(text).replace('|', "\\|");
    let longest = text.split(|c| c != '`').map(str::len).max().unwrap_or(0);
    let fence = "`".repeat(longest + 1);
    let pad = if longest > 0 { " " } else { "" };
    format!("{fence}{pad}{text}{pad}{fence}")
}

/// For text and quoted attributes of HTML and XML. Characters that XML 1.0 forbids become U+FFFD.
#[must_use]
pub fn xml(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    for c in text.chars() {
        match c {
            '&' => out.push_str("&amp;"),
            '<' => out.push_str("&lt;"),
            '>' => out.push_str("&gt;"),
            '"' => out.push_str("&quot;"),
            '\'' => out.push_str("&#39;"),
            '\n' => out.push_str("&#10;"),
            c if hidden(c) || matches!(c, '\u{fffe}' | '\u{ffff}') => out.push('\u{fffd}'),
            c => out.push(c),
        }
    }
    out
}

/// One cell of comma-separated values after RFC 4180, in which no spreadsheet sees a formula.
/// A cell that is just a number stays a number.
#[must_use]
pub fn csv(text: &str) -> String {
    let text: String = terminal(text).into_owned();
    let starts_formula = |c: char| {
        matches!(
            c,
            '=' | '+' | '-' | '@' | '|' | '%' | '＝' | '＋' | '－' | '＠'
        )
    };
    let number = text.parse::<f64>().is_ok_and(f64::is_finite);
    let risky = !number && text.trim_start().starts_with(starts_formula);
    let text = if risky { format!("'{text}") } else { text };
    if text.contains(['"', ',', ';', '\n', '\r', '\t']) || text.starts_with([' ', '\'']) {
        return format!("\"{}\"", text.replace('"', "\"\""));
    }
    text
}

/// For a message of SARIF, in which `[text](target)` would be a link; lines stay lines.
#[must_use]
pub fn sarif(text: &str) -> String {
    text.lines()
        .map(|line| terminal(line).replace("](", "] ("))
        .collect::<Vec<_>>()
        .join("\n")
}

/// The message of a workflow command of a build service.
#[must_use]
pub fn annotation(text: &str) -> String {
    terminal(text)
        .replace('%', "%25")
        .replace('\r', "%0D")
        .replace('\n', "%0A")
}

/// A property of a workflow command.
#[must_use]
pub fn annotation_property(text: &str) -> String {
    annotation(text).replace(':', "%3A").replace(',', "%2C")
}

/// A relative path as a URI reference.
#[must_use]
pub fn uri(path: &str) -> String {
    let mut out = String::with_capacity(path.len());
    for byte in path.bytes() {
        match byte {
            b'a'..=b'z' | b'A'..=b'Z' | b'0'..=b'9' | b'-' | b'.' | b'_' | b'~' | b'/' => {
                out.push(char::from(byte))
            }
            other => out.push_str(&format!("%{other:02X}")),
        }
    }
    out
}

#[cfg(test)]
mod tests {
    use super::*;
    use proptest::prelude::*;

    #[test]
    fn escape_codes_are_spelled_out() {
        assert_eq!(terminal("a\u{1b}[31mb\u{202e}"), "a\\u{1b}[31mb\\u{202e}");
        assert_eq!(
            source("a\u{1b}\tb\u{202e}c\rd\r\n"),
            "a?\tb\u{fffd}c\nd\r\n"
        );
    }

    #[test]
    fn markdown_has_no_mark_up_left() {
        assert_eq!(markdown("<script>|`*@me"), "&lt;script&gt;\\|\\`\\*&#64;me");
        assert_eq!(markdown_code("a`b"), "`` a`b ``");
    }

    #[test]
    fn words_of_the_language_become_code() {
        assert_eq!(
            markdown_words("write `ref R1_2` *now*"),
            "write `ref R1_2` \\*now\\*"
        );
        assert_eq!(markdown_words("a ` <b>"), "a \\` &lt;b&gt;");
        assert_eq!(markdown_words("``x``"), "\\`\\`x\\`\\`");
    }

    #[test]
    fn cells_are_no_formulas() {
        // the characters a spreadsheet takes as the start of a formula: common practice, no source
        assert_eq!(csv("=cmd|'/c'!A1"), "\"'=cmd|'/c'!A1\"");
        assert_eq!(csv("-13.0"), "-13.0");
        assert_eq!(csv("a\"b,c"), "\"a\"\"b,c\""); // RFC 4180, 2.7
    }

    proptest! {
        #[test]
        fn nothing_hidden_gets_through(text in "\\PC*|[\u{0}-\u{9f}\u{200b}-\u{206f}a]{0,20}") {
            prop_assert!(!terminal(&text).chars().any(hidden));
            prop_assert_eq!(source(&text).len(), text.len());
            prop_assert!(!source(&text).chars().any(|c| hidden(c) && !matches!(c, '\n' | '\t' | '\r')));
            let escaped = xml(&text);
            prop_assert!(!escaped.contains(['<', '>', '"']) && !escaped.chars().any(hidden));
            prop_assert!(!markdown(&text).contains(['<', '>', '\n']));
            prop_assert!(!markdown_words(&text).contains('\n'));
        }
    }
}
