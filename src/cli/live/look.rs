//! What a terminal can show: which characters, and whether colours.

use std::borrow::Cow;

use ratatui::style::{Color, Modifier, Style};
use ratatui::symbols::Marker;

/// What a terminal can show.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Look {
    /// The characters.
    pub glyphs: Glyphs,
    /// Whether colours; they only help, shape and word carry the meaning.
    pub colour: bool,
}

/// The characters a terminal can show.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Glyphs {
    /// Letters of every script, block elements, braille.
    Full,
    /// The same without braille, as on a console whose font has 512 characters.
    Blocks,
    /// ASCII alone.
    Ascii,
}

impl Look {
    /// As the environment says: the locale for the characters, `TERM` for the console, and `NO_COLOR`.
    #[must_use]
    pub fn of_environment(no_colour: bool) -> Self {
        let said = |name: &str| std::env::var(name).ok().filter(|value| !value.is_empty());
        let term = said("TERM").unwrap_or_default();
        Self::of(
            ["LC_ALL", "LC_CTYPE", "LANG"].into_iter().find_map(said).as_deref(),
            &term,
            no_colour || said("NO_COLOR").is_some(),
        )
    }

    /// As a locale and the name of a terminal say.
    #[must_use]
    pub fn of(locale: Option<&str>, term: &str, no_colour: bool) -> Self {
        let utf8 = locale.is_some_and(|locale| {
            let locale = locale.to_ascii_lowercase();
            locale.contains("utf-8") || locale.contains("utf8")
        });
        // Elsewhere than on Unix there is no locale of that kind, and the terminals of today are UTF-8.
        let glyphs = match (utf8 || cfg!(not(unix)), term) {
            (false, _) => Glyphs::Ascii,
            (true, "linux") => Glyphs::Blocks,
            (true, _) => Glyphs::Full,
        };
        Self { glyphs, colour: !no_colour }
    }

    /// Whether ASCII alone can be shown.
    #[must_use]
    pub const fn is_ascii(self) -> bool {
        matches!(self.glyphs, Glyphs::Ascii)
    }

    /// A text in characters that can be shown. A letter that cannot is a question mark.
    #[must_use]
    pub fn text(self, text: &str) -> Cow<'_, str> {
        if !self.is_ascii() || text.is_ascii() {
            return Cow::Borrowed(text);
        }
        let mut plain = String::with_capacity(text.len());
        for c in text.chars() {
            match c {
                _ if c.is_ascii() => plain.push(c),
                '·' | '—' | '–' | '−' | '─' => plain.push('-'),
                '±' => plain.push_str("+/-"),
                'µ' | 'μ' => plain.push('u'),
                '…' => plain.push_str("..."),
                '×' => plain.push('x'),
                '²' => plain.push('2'),
                '³' => plain.push('3'),
                // As in "20 °C", which then reads "20 C".
                '°' => {}
                _ => plain.push('?'),
            }
        }
        Cow::Owned(plain)
    }

    /// What lines of a plot are drawn with; none in ASCII.
    pub(super) const fn marker(self) -> Option<Marker> {
        match self.glyphs {
            Glyphs::Full => Some(Marker::Braille),
            Glyphs::Blocks => Some(Marker::HalfBlock),
            Glyphs::Ascii => None,
        }
    }

    /// A character, or what stands for it in ASCII.
    pub(super) const fn glyph(self, full: &'static str, ascii: &'static str) -> &'static str {
        if self.is_ascii() { ascii } else { full }
    }

    /// What matters most.
    pub(super) const fn strong(self) -> Style {
        Style::new().add_modifier(Modifier::BOLD)
    }

    /// What matters least.
    pub(super) const fn faint(self) -> Style {
        Style::new().add_modifier(Modifier::DIM)
    }

    /// The line itself, and what can be acted on.
    pub(super) const fn accent(self) -> Style {
        self.coloured(Style::new(), Color::Cyan)
    }

    /// What is wrong with a value.
    pub(super) const fn warning(self) -> Style {
        self.coloured(Style::new().add_modifier(Modifier::BOLD), Color::Red)
    }

    /// What is dangerous: reversed, whether in colour or not.
    pub(super) const fn alarm(self) -> Style {
        let style = Style::new().add_modifier(Modifier::BOLD.union(Modifier::REVERSED));
        self.coloured(style, Color::Red)
    }

    /// What is ready.
    pub(super) const fn ready(self) -> Style {
        Style::new().add_modifier(Modifier::BOLD.union(Modifier::REVERSED))
    }

    const fn coloured(self, style: Style, colour: Color) -> Style {
        if self.colour { style.fg(colour) } else { style }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn the_locale_and_the_terminal_say_what_can_be_shown() {
        assert_eq!(Look::of(Some("de_DE.UTF-8"), "xterm-256color", false).glyphs, Glyphs::Full);
        assert_eq!(Look::of(Some("en_US.utf8"), "linux", false).glyphs, Glyphs::Blocks);
        if cfg!(unix) {
            assert_eq!(Look::of(Some("C"), "xterm", true), Look { glyphs: Glyphs::Ascii, colour: false });
            assert_eq!(Look::of(None, "xterm", false).glyphs, Glyphs::Ascii);
        }
    }

    #[test]
    fn what_cannot_be_shown_keeps_its_meaning_where_it_can() {
        let ascii = Look { glyphs: Glyphs::Ascii, colour: false };
        assert_eq!(ascii.text("0.48 ± 0.01 L/min · 20 °C"), "0.48 +/- 0.01 L/min - 20 C");
        assert_eq!(ascii.text("Ева…"), "???...");
    }
}
