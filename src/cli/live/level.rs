//! The level line: a short stroke beside a live value that lies level when it is steady and tilts with its drift; beside
//! a check it is whole, broken or crossed.

use super::look::Look;
use crate::report::bench_live::Holds;

/// Columns of the stroke beside a value.
pub(super) const COLUMNS: u16 = 7;

/// The stroke for a tilt of -3 to 3 steps; the steeper, the shorter, since its rise is one row.
pub(super) const fn tilted(tilt: i8, look: Look) -> &'static str {
    match (look.is_ascii(), tilt) {
        (_, 0) => look.glyph("───────", "-------"),
        (false, 1) => "⎼⎼⎼─⎻⎻⎻",
        (false, -1) => "⎻⎻⎻─⎼⎼⎼",
        (false, 2) => "⎽⎽⎼─⎻⎺⎺",
        (false, -2) => "⎺⎺⎻─⎼⎽⎽",
        (false, 3..) => "  ⎽─⎺  ",
        (false, _) => "  ⎺─⎽  ",
        (true, 1) => "___---~",
        (true, -1) => "~---___",
        (true, 2) => " __--~ ",
        (true, -2) => " ~--__ ",
        (true, 3..) => "  _/~  ",
        (true, _) => "  ~\\_  ",
    }
}

/// The stroke beside a check: whole, broken in the middle, crossed.
pub(super) const fn of_check(holds: Holds, look: Look) -> &'static str {
    match holds {
        Holds::Yes => look.glyph("───", "---"),
        Holds::Open => look.glyph("─ ─", "- -"),
        Holds::No => look.glyph("─╳─", "-X-"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::cli::live::look::Glyphs;
    use crate::cli::live::pen::width;

    #[test]
    fn every_tilt_has_a_stroke_of_its_own_and_of_one_width() {
        for glyphs in [Glyphs::Full, Glyphs::Ascii] {
            let look = Look { glyphs, colour: false };
            let all: Vec<&str> = (-3..=3).map(|tilt| tilted(tilt, look)).collect();
            for (place, stroke) in all.iter().enumerate() {
                assert_eq!(width(stroke), usize::from(COLUMNS));
                assert!(!all.iter().take(place).any(|other| other == stroke), "{stroke}");
            }
            assert_eq!(tilted(9, look), tilted(3, look));
            assert_eq!(tilted(-9, look), tilted(-3, look));
        }
    }
}
