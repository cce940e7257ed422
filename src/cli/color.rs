//! When to color, and with what.

use bandproof::report::Verdict;
use std::ffi::OsStr;
use std::io::{IsTerminal, stdout};

/// `--color`.
#[derive(Clone, Copy, Debug, PartialEq, Eq, clap::ValueEnum)]
pub enum When {
    /// On a terminal, unless NO_COLOR is set or TERM is dumb
    Auto,
    /// Always, whatever NO_COLOR says
    Always,
    /// Never
    Never,
}

/// The environment's part in the decision.
#[derive(Clone, Copy, Debug)]
struct Surroundings<'a> {
    terminal: bool,
    no_color: Option<&'a OsStr>,
    term: Option<&'a OsStr>,
}

impl When {
    /// Whether text on stdout is to be colored.
    pub fn for_stdout(self) -> Palette {
        let (no_color, term) = (std::env::var_os("NO_COLOR"), std::env::var_os("TERM"));
        let around =
            Surroundings { terminal: stdout().is_terminal(), no_color: no_color.as_deref(), term: term.as_deref() };
        Palette { on: self.decide(around) }
    }

    fn decide(self, around: Surroundings<'_>) -> bool {
        match self {
            When::Always => true,
            When::Never => false,
            // An empty NO_COLOR counts as unset (no-color.org).
            When::Auto => {
                around.terminal
                    && around.no_color.is_none_or(OsStr::is_empty)
                    && around.term.is_none_or(|term| term != "dumb")
            }
        }
    }
}

/// What a piece of text is, and so how it looks.
#[derive(Clone, Copy, Debug, Default, PartialEq, Eq)]
pub enum Style {
    /// Running text.
    #[default]
    Plain,
    /// Heads a part.
    Heading,
    /// As it should be.
    Good,
    /// Neither good nor bad.
    Open,
    /// Not as it should be.
    Bad,
}

impl From<Verdict> for Style {
    fn from(verdict: Verdict) -> Self {
        match verdict {
            Verdict::Met => Style::Good,
            Verdict::Missed => Style::Bad,
            Verdict::Unproven => Style::Open,
        }
    }
}

/// Colors text, or not.
#[derive(Clone, Copy, Debug)]
pub struct Palette {
    on: bool,
}

impl Palette {
    /// Never colors.
    #[cfg(test)]
    pub const OFF: Palette = Palette { on: false };
    /// Always colors.
    #[cfg(test)]
    pub const ON: Palette = Palette { on: true };

    /// `text` in `style`, as escape sequences of ECMA-48 (SGR).
    pub fn paint(self, style: Style, text: &str) -> String {
        let code = match style {
            Style::Plain => return text.to_owned(),
            Style::Heading => "1",
            Style::Good => "32",
            Style::Open => "33",
            Style::Bad => "31",
        };
        if self.on { format!("\u{1b}[{code}m{text}\u{1b}[0m") } else { text.to_owned() }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn color_follows_the_option_then_the_environment() {
        let os = OsStr::new;
        // option, terminal, NO_COLOR, TERM; colored
        let table = [
            (When::Auto, true, None, Some(os("xterm")), true),
            (When::Auto, true, None, None, true),
            (When::Auto, true, Some(os("")), None, true),
            (When::Auto, true, Some(os("1")), None, false),
            (When::Auto, true, None, Some(os("dumb")), false),
            (When::Auto, false, None, Some(os("xterm")), false),
            (When::Always, false, Some(os("1")), Some(os("dumb")), true),
            (When::Never, true, None, Some(os("xterm")), false),
        ];
        for (when, terminal, no_color, term, colored) in table {
            let around = Surroundings { terminal, no_color, term };
            assert_eq!(when.decide(around), colored, "{when:?} {around:?}");
        }
    }

    #[test]
    fn plain_text_is_never_wrapped_in_escapes() {
        assert_eq!(Palette::ON.paint(Style::Plain, "text"), "text");
        assert_eq!(Palette::OFF.paint(Style::Bad, "text"), "text");
        assert_eq!(Palette::ON.paint(Style::Bad, "text"), "\u{1b}[31mtext\u{1b}[0m");
    }
}
