//! Tables and wrapped text of a given width, measured in terminal columns.

use super::color::{Palette, Style};
use unicode_width::{UnicodeWidthChar, UnicodeWidthStr};

/// Columns between two columns of a table.
const GAP: usize = 2;

/// Rows under headers. The first column is text and gives way where the table is too
/// wide; the others are as wide as they need to be.
#[derive(Debug)]
pub struct Table {
    headers: Vec<&'static str>,
    right: Vec<bool>,
    rows: Vec<Vec<(String, Style)>>,
}

impl Table {
    /// A table whose columns are `(header, whether it is set to the right)`.
    pub fn new(columns: impl IntoIterator<Item = (&'static str, bool)>) -> Self {
        let (headers, right) = columns.into_iter().unzip();
        Table { headers, right, rows: Vec::new() }
    }

    /// Adds a row; missing cells are empty.
    pub fn row(&mut self, cells: impl IntoIterator<Item = (String, Style)>) {
        let clean = cells.into_iter().map(|(text, style)| (printable(&text), style)).collect();
        self.rows.push(clean);
    }

    /// The table as lines, `indent` columns in, at most `width` wide.
    pub fn render(&self, palette: Palette, indent: usize, width: usize) -> String {
        let cell = |row: &[(String, Style)], column: usize| row.get(column).map_or(0, |(text, _)| text.width());
        let mut widths: Vec<usize> = (0..self.headers.len())
            .map(|column| {
                let widest = self.rows.iter().map(|row| cell(row, column)).max().unwrap_or(0);
                widest.max(self.headers[column].width())
            })
            .collect();
        let total = indent + widths.iter().sum::<usize>() + GAP * widths.len().saturating_sub(1);
        if let Some(first) = widths.first_mut() {
            *first = first.saturating_sub(total.saturating_sub(width)).max(8.min(*first));
        }
        let headers: Vec<_> = self.headers.iter().map(|header| ((*header).to_owned(), Style::Heading)).collect();
        let mut text = String::new();
        for row in std::iter::once(&headers).chain(&self.rows) {
            text.push_str(&" ".repeat(indent));
            let mut pending = 0;
            for (column, (cell, style)) in row.iter().enumerate() {
                let cell = shortened(cell, widths[column]);
                let padding = widths[column].saturating_sub(cell.width());
                let before = pending + if self.right[column] { padding } else { 0 };
                pending = GAP + if self.right[column] { 0 } else { padding };
                if !cell.is_empty() {
                    text.push_str(&" ".repeat(before));
                    text.push_str(&palette.paint(*style, &cell));
                } else {
                    pending += before;
                }
            }
            text.push('\n');
        }
        text
    }
}

/// `text` in at most `width` columns, its middle left out where it is longer.
fn shortened(text: &str, width: usize) -> String {
    if text.width() <= width {
        return text.to_owned();
    }
    let room = width.saturating_sub(2);
    let head = taken(text.chars(), room.div_ceil(2));
    let tail: String = taken(text.chars().rev(), room / 2).chars().rev().collect();
    format!("{head}..{tail}")
}

/// As many of `characters` as fit into `width` columns.
fn taken(characters: impl Iterator<Item = char>, width: usize) -> String {
    let mut used = 0;
    characters
        .take_while(|character| {
            used += character.width().unwrap_or(0);
            used <= width
        })
        .collect()
}

/// `text` with control characters escaped: a file name must not steer the terminal.
pub fn printable(text: &str) -> String {
    let mut clean = String::with_capacity(text.len());
    for character in text.chars() {
        if character.is_control() { clean.extend(character.escape_default()) } else { clean.push(character) }
    }
    clean
}

/// `text` as lines of at most `width` columns, the first `first` columns in, the
/// others `rest`. Breaks at spaces only, so that a path can be copied.
pub fn wrapped(text: &str, first: usize, rest: usize, width: usize) -> String {
    let mut out = " ".repeat(first);
    let mut used = first;
    let mut empty = true;
    for word in printable(text).split(' ') {
        if !empty && used + 1 + word.width() > width {
            out.push('\n');
            out.push_str(&" ".repeat(rest));
            used = rest;
        } else if !empty {
            out.push(' ');
            used += 1;
        }
        out.push_str(word);
        used += word.width();
        empty = false;
    }
    out.push('\n');
    out
}

#[cfg(test)]
mod tests {
    use super::*;

    fn table() -> Table {
        let mut table = Table::new([("band", false), ("worst dB", true), ("note", false)]);
        table.row([("hum".to_owned(), Style::Plain), ("27.90".to_owned(), Style::Bad), ("x".to_owned(), Style::Plain)]);
        table.row([("bird calls".to_owned(), Style::Plain), (String::new(), Style::Plain)]);
        table
    }

    #[test]
    fn columns_are_aligned_and_lines_have_no_trailing_spaces() {
        let text = table().render(Palette::OFF, 2, 80);
        assert_eq!(text, "  band        worst dB  note\n  hum            27.90  x\n  bird calls\n");
    }

    #[test]
    fn color_does_not_move_columns() {
        let colored = table().render(Palette::ON, 2, 80);
        let mut plain = colored.replace("\u{1b}[0m", "");
        for code in ["1", "31"] {
            plain = plain.replace(&format!("\u{1b}[{code}m"), "");
        }
        assert_eq!(plain, table().render(Palette::OFF, 2, 80));
    }

    #[test]
    fn a_table_too_wide_gives_way_in_its_first_column() {
        let mut table = Table::new([("band", false), ("worst dB", true)]);
        table.row([("a name that goes on and on".to_owned(), Style::Plain), ("1.00".to_owned(), Style::Plain)]);
        let text = table.render(Palette::OFF, 0, 26);
        assert_eq!(text, "band              worst dB\na name .. and on      1.00\n");
    }

    #[test]
    fn wide_characters_count_as_two_columns() {
        let mut table = Table::new([("band", false), ("n", true)]);
        table.row([("\u{4f4e}\u{97f3}".to_owned(), Style::Plain), ("1".to_owned(), Style::Plain)]);
        assert_eq!(table.render(Palette::OFF, 0, 80), "band  n\n\u{4f4e}\u{97f3}  1\n");
        assert_eq!(shortened("\u{4f4e}\u{97f3}\u{4f4e}\u{97f3}", 6), "\u{4f4e}..\u{97f3}");
    }

    #[test]
    fn text_wraps_at_spaces_and_keeps_long_words_whole() {
        assert_eq!(wrapped("one two three", 2, 4, 9), "  one two\n    three\n");
        assert_eq!(wrapped("a-path/that-is-long.wav ends", 0, 2, 10), "a-path/that-is-long.wav\n  ends\n");
    }

    #[test]
    fn control_characters_never_reach_the_terminal() {
        assert_eq!(printable("a\u{1b}[2Jb\n.wav"), "a\\u{1b}[2Jb\\n.wav");
    }
}
