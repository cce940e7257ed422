//! `bandproof schema`.

use super::args::{SchemaArgs, SchemaOf};
use super::exit::Exit;
use super::screen::{complain, print};
use bandproof::{report, spec};

/// Runs the command.
pub fn run(arguments: &SchemaArgs) -> Exit {
    let schema = match arguments.of {
        SchemaOf::Spec => spec::schema(),
        SchemaOf::Report => report::schema(),
    };
    match serde_json::to_string_pretty(&schema) {
        Ok(text) => print(&format!("{}\n", ascii(&text)), Exit::Done),
        Err(error) => {
            complain(&format!("the schema can't be put into JSON: {error}"));
            Exit::Failed
        }
    }
}

/// JSON with every character beyond ASCII, and DEL, escaped: patterns hold spaces and
/// control characters that nobody would see.
fn ascii(json: &str) -> String {
    let mut text = String::with_capacity(json.len());
    for c in json.chars() {
        if c.is_ascii() && c != '\u{7f}' {
            text.push(c);
        } else {
            let units = c.encode_utf16(&mut [0; 2]).iter().map(|unit| format!("\\u{unit:04x}")).collect::<String>();
            text.push_str(&units);
        }
    }
    text
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_cannot_be_seen_is_escaped_and_reads_back() {
        let text = "a\u{7f}\u{a0}\u{3000}\u{1f426}\u{2028}b";
        let escaped = ascii(&serde_json::to_string(text).unwrap());
        assert_eq!(escaped, r#""a\u007f\u00a0\u3000\ud83d\udc26\u2028b""#);
        assert_eq!(serde_json::from_str::<String>(&escaped).unwrap(), text);
    }
}
