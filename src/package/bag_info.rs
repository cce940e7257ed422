//! `bag-info.txt` (RFC 8493, section 2.2.2).

/// Lines longer than this are broken where they can be: the RFC recommends 79
/// characters at most.
const LINE_CHARACTERS: usize = 79;

/// What `bag-info.txt` says of a bag.
pub struct BagInfo<'a> {
    /// The spec's title.
    pub title: Option<&'a str>,
    /// When the run started, RFC 3339.
    pub started: &'a str,
    /// Length of all payload files together.
    pub payload_bytes: u64,
    /// How many there are.
    pub payload_files: u64,
}

impl BagInfo<'_> {
    /// The whole file.
    pub fn text(&self) -> String {
        let date = self.started.get(..10).unwrap_or(self.started);
        let oxum = format!("{}.{}", self.payload_bytes, self.payload_files);
        let agent = concat!(env!("CARGO_PKG_NAME"), " ", env!("CARGO_PKG_VERSION"));
        let mut text = element("Bag-Software-Agent", agent);
        text.push_str(&element("Bagging-Date", date));
        if let Some(title) = self.title {
            text.push_str(&element("External-Description", title));
        }
        text.push_str(&element("Payload-Oxum", &oxum));
        text
    }
}

/// One element, folded: a line goes on in the next, which then begins with a space.
///
/// Lines are broken at spaces only, and the space that begins the next line stands for
/// the one broken at. A reader that drops the line break, or keeps it, or drops it with
/// the padding and puts a space, gets the same words.
///
/// Nothing at all where `value` holds no word.
fn element(label: &str, value: &str) -> String {
    let mut text = format!("{label}:");
    let mut column = text.chars().count();
    let empty = text.len();
    for word in value.split(|character: char| character.is_whitespace() || character.is_control()) {
        if word.is_empty() {
            continue;
        }
        let characters = word.chars().count();
        let first = text.len() == empty;
        if column + 1 + characters > LINE_CHARACTERS && !first {
            text.push('\n');
            column = 0;
        }
        text.push(' ');
        text.push_str(word);
        column += 1 + characters;
    }
    if text.len() == empty {
        return String::new();
    }
    text.push('\n');
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    fn info(title: Option<&str>) -> String {
        BagInfo { title, started: "2031-05-02T06:10:00Z", payload_bytes: 1234, payload_files: 5 }.text()
    }

    /// RFC 8493, section 2.2.2: labels, date form, and `OctetCount.StreamCount`.
    #[test]
    fn every_element_has_its_form() {
        let agent = concat!("Bag-Software-Agent: bandproof ", env!("CARGO_PKG_VERSION"));
        assert_eq!(
            info(Some("Reed-bed recorders")),
            format!(
                "{agent}\nBagging-Date: 2031-05-02\nExternal-Description: Reed-bed recorders\nPayload-Oxum: 1234.5\n"
            )
        );
    }

    #[test]
    fn a_bag_without_a_title_has_no_description() {
        assert!(!info(None).contains("Description"));
        assert!(!info(Some(" \n\t")).contains("Description"));
    }

    #[test]
    fn long_values_are_folded_at_spaces_and_read_the_same() {
        let title = "Wörter ".repeat(40);
        let text = info(Some(&title));
        assert!(text.lines().all(|line| line.chars().count() <= LINE_CHARACTERS), "{text}");
        let folded: Vec<&str> = text.lines().filter(|line| line.contains("Wörter")).collect();
        assert!(folded.len() > 3 && folded.iter().skip(1).all(|line| line.starts_with(" W")), "{text}");
        let unfolded = folded.concat();
        assert_eq!(unfolded, format!("External-Description: {}", title.trim_end()));
    }

    #[test]
    fn a_word_too_long_for_a_line_is_not_broken() {
        let word = "x".repeat(200);
        assert_eq!(element("A", &format!("{word} y {word}")), format!("A: {word}\n y\n {word}\n"));
    }

    #[test]
    fn line_breaks_in_a_title_make_no_new_element() {
        let text = info(Some("first\nPayload-Oxum: 1.1\r\n\u{85}\u{2028}last"));
        assert!(text.contains("External-Description: first Payload-Oxum: 1.1 last\n"), "{text}");
    }
}
