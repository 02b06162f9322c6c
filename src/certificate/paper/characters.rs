//! Which characters a text may hold.
//!
//! Comes in: a text. Goes out: what in it cannot be printed, or must not be because a reader would see something other
//! than what stands there. Whether the font has a character at all is asked in [`super::faces`].

use std::fmt;

/// Marks on one letter; more of them would reach into the lines above and below. Greek with all its accents, taken
/// apart, has three.
const MOST_MARKS: usize = 3;

/// What is wrong with a character of a text.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Hash)]
pub enum Fault {
    /// The bundled font has no picture of it.
    Missing(char),
    /// A control character: a line break, a tab, a bell.
    Control(char),
    /// Turns the direction of writing, so that a text reads other than it is.
    Direction(char),
    /// Shows nothing.
    Invisible(char),
    /// A letter of a script written from right to left, which is not set here.
    RightToLeft(char),
    /// Unicode gives it no meaning: private use, or no character at all.
    Meaningless(char),
    /// One mark too many on a letter.
    Heaped(char),
}

impl Fault {
    /// The character.
    pub fn character(self) -> char {
        match self {
            Self::Missing(c)
            | Self::Control(c)
            | Self::Direction(c)
            | Self::Invisible(c)
            | Self::RightToLeft(c)
            | Self::Meaningless(c)
            | Self::Heaped(c) => c,
        }
    }
}

impl fmt::Display for Fault {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let code = format!("U+{:04X}", u32::from(self.character()));
        match self {
            Self::Missing(c) => {
                write!(f, "the font has no \u{201C}{c}\u{201D} ({code}): write it in other letters")
            }
            Self::Control(c) => write!(f, "holds {} ({code}): take it out", control_name(*c)),
            Self::Direction(c) => {
                write!(
                    f,
                    "holds the {} ({code}), which makes a text read other than it is: take it out",
                    direction_name(*c)
                )
            }
            Self::Invisible(_) => write!(f, "holds an invisible character ({code}): take it out"),
            Self::RightToLeft(c) => {
                write!(
                    f,
                    "holds \u{201C}\u{2068}{c}\u{2069}\u{201D} ({code}), which is written from right to left: write it in Latin, Greek or Cyrillic letters"
                )
            }
            Self::Meaningless(_) => {
                write!(f, "holds {code}, which is no character with a meaning: take it out")
            }
            Self::Heaped(_) => write!(
                f,
                "heaps more than {MOST_MARKS} marks on a letter, the last of them {code}: take some out"
            ),
        }
    }
}

/// What must not be printed, in the order of the text, each character once.
pub(super) fn refused(text: &str) -> Vec<Fault> {
    let mut faults: Vec<Fault> = Vec::new();
    let mut marks = 0;
    for c in text.chars() {
        marks = if is_mark(c) { marks + 1 } else { 0 };
        let fault = if marks > MOST_MARKS { Some(Fault::Heaped(c)) } else { fault(c) };
        if let Some(fault) = fault
            && !faults.contains(&fault)
        {
            faults.push(fault);
        }
    }
    faults
}

/// What is wrong with a character wherever it stands.
pub(super) fn fault(c: char) -> Option<Fault> {
    let code = u32::from(c);
    if c.is_control() || matches!(code, 0x2028 | 0x2029) {
        Some(Fault::Control(c))
    } else if matches!(code, 0x61C | 0x200E | 0x200F | 0x202A..=0x202E | 0x2066..=0x2069) {
        Some(Fault::Direction(c))
    } else if matches!(
        code,
        // Soft hyphen, joiners, fillers, variation selectors, marks of annotation, tags.
        0xAD | 0x34F | 0x115F | 0x1160 | 0x17B4 | 0x17B5 | 0x180B..=0x180F | 0x200B..=0x200D | 0x2060..=0x2065
            | 0x206A..=0x206F | 0x3164 | 0xFE00..=0xFE0F | 0xFEFF | 0xFFA0 | 0xFFF0..=0xFFFB | 0xE0000..=0xE0FFF
    ) {
        Some(Fault::Invisible(c))
    } else if matches!(code, 0xE000..=0xF8FF | 0xFDD0..=0xFDEF | 0xF0000..=0x10FFFF)
        || code & 0xFFFE == 0xFFFE
    {
        Some(Fault::Meaningless(c))
    } else if matches!(code, 0x590..=0x8FF | 0xFB1D..=0xFDFF | 0xFE70..=0xFEFE | 0x10800..=0x10FFF | 0x1E800..=0x1EFFF)
    {
        Some(Fault::RightToLeft(c))
    } else {
        None
    }
}

/// Marks that stand on the letter before them (Unicode's blocks of combining marks).
pub(super) fn is_mark(c: char) -> bool {
    matches!(
        u32::from(c),
        0x300..=0x36F | 0x483..=0x489 | 0x1AB0..=0x1AFF | 0x1DC0..=0x1DFF | 0x20D0..=0x20FF | 0xFE20..=0xFE2F
    )
}

fn control_name(c: char) -> &'static str {
    match c {
        '\n' | '\r' | '\u{85}' | '\u{2028}' | '\u{2029}' => "a line break",
        '\t' => "a tab",
        '\0' => "a null",
        _ => "a control character",
    }
}

fn direction_name(c: char) -> &'static str {
    match u32::from(c) {
        0x61C => "Arabic letter mark",
        0x200E => "left-to-right mark",
        0x200F => "right-to-left mark",
        0x202A => "left-to-right embedding",
        0x202B => "right-to-left embedding",
        0x202C => "end of a directional formatting",
        0x202D => "left-to-right override",
        0x202E => "right-to-left override",
        0x2066 => "left-to-right isolate",
        0x2067 => "right-to-left isolate",
        0x2068 => "first-strong isolate",
        _ => "end of a directional isolate",
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn names_of_many_peoples_pass() {
        for name in [
            "Ødegård & Łęcka",
            "Γεώργιος Ἀθάνατος",
            "Юрій Ґалаґан",
            "Nguye\u{302}\u{303}n",
            "25 °C ± 0.3 Ω, ≤ 10⁻⁹",
        ] {
            assert_eq!(refused(name), [], "{name}");
        }
    }

    #[test]
    fn what_would_mislead_is_refused_by_name() {
        let of = |text: &str| refused(text).iter().map(ToString::to_string).collect::<Vec<_>>().join("; ");
        assert_eq!(
            of("a\u{202E}b"),
            "holds the right-to-left override (U+202E), which makes a text read other than it is: take it out"
        );
        assert_eq!(
            of("a\nb\nc\u{7}"),
            "holds a line break (U+000A): take it out; holds a control character (U+0007): take it out"
        );
        assert_eq!(of("a\u{200B}b"), "holds an invisible character (U+200B): take it out");
        assert_eq!(of("\u{E000}"), "holds U+E000, which is no character with a meaning: take it out");
        assert_eq!(of("\u{FFFE}"), "holds U+FFFE, which is no character with a meaning: take it out");
        assert!(of("שלום").starts_with(
            "holds \u{201C}\u{2068}ש\u{2069}\u{201D} (U+05E9), which is written from right to left"
        ));
        assert_eq!(of("a\u{301}\u{301}\u{301}"), "");
        assert_eq!(
            of("a\u{301}\u{301}\u{301}\u{302}"),
            "heaps more than 3 marks on a letter, the last of them U+0302: take some out"
        );
    }
}
