//! How wide a text is, and texts made to fit.
//!
//! Comes in: a text. Goes out: its width, the text shortened or broken into lines for a given width, or freed of what
//! cannot be drawn. Widths are the advance widths of DejaVu Sans 2.37 (table `hmtx`, units of 1/2048 em) for Latin,
//! Greek and Cyrillic letters; every other character counts as wide as the widest that font has. Left out: kerning
//! and ligatures, which only make a text narrower.

/// Units of the tables in one em.
const UNITS_PER_EM: f64 = 2048.0;
/// Of a character that is in no table: the widest of the font, U+2031.
const WIDEST: u16 = 3554;
/// Bold over regular: the widest ratio among the letters of the tables (π), in which ŀ, whose ratio is 1.63, is not.
const BOLD: f64 = 1.32;
/// Accents kept on one letter; more of them would reach into the lines above and below.
const MOST_ACCENTS: usize = 2;

/// Weight of a text.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(super) enum Weight {
    Regular,
    Bold,
}

/// Width of a text in pixels, at least: what is drawn is never wider.
pub(super) fn width(text: &str, size: f64, weight: Weight) -> f64 {
    let units: f64 = text.chars().map(|c| f64::from(advance(c))).sum();
    let wider = match weight {
        Weight::Regular => 1.0,
        Weight::Bold => BOLD,
    };
    units / UNITS_PER_EM * size * wider
}

/// The text, or as much of its beginning as fits with an ellipsis.
pub(super) fn shorten(text: &str, size: f64, weight: Weight, room: f64) -> String {
    if width(text, size, weight) <= room {
        return text.to_owned();
    }
    let mut kept = String::new();
    for c in text.chars() {
        kept.push(c);
        if width(&kept, size, weight) + width("…", size, weight) > room {
            kept.pop();
            break;
        }
    }
    format!("{}…", kept.trim_end_matches([' ', ',', ';', ':']))
}

/// The text on at most `most` lines, broken at spaces; a line that cannot be broken is shortened, and so is the last.
pub(super) fn wrap(text: &str, size: f64, room: f64, most: usize) -> Vec<String> {
    let fits = |line: &str| width(line, size, Weight::Regular) <= room;
    let mut lines: Vec<String> = Vec::new();
    let mut words = text.split(' ').filter(|w| !w.is_empty()).peekable();
    while words.peek().is_some() && lines.len() < most {
        if lines.len() + 1 == most {
            let rest: Vec<&str> = words.by_ref().collect();
            lines.push(shorten(&rest.join(" "), size, Weight::Regular, room));
            break;
        }
        let mut line = words.next().unwrap_or_default().to_owned();
        while let Some(word) = words.peek() {
            let longer = format!("{line} {word}");
            if !fits(&longer) {
                break;
            }
            line = longer;
            words.next();
        }
        lines.push(shorten(&line, size, Weight::Regular, room));
    }
    lines
}

/// The text without what XML forbids, what turns the direction of writing, what has no width, and heaps of accents;
/// white space of any kind becomes one space each.
pub(super) fn clean(text: &str) -> String {
    let mut out = String::with_capacity(text.len());
    let mut accents = 0;
    for c in text.chars() {
        if c.is_whitespace() {
            out.push(' ');
            accents = 0;
        } else if is_accent(c) {
            accents += 1;
            if accents <= MOST_ACCENTS {
                out.push(c);
            }
        } else if !c.is_control() && !is_unseen(c) {
            out.push(c);
            accents = 0;
        }
    }
    out
}

fn is_accent(c: char) -> bool {
    matches!(
        u32::from(c),
        0x300..=0x36F | 0x483..=0x489 | 0x1AB0..=0x1AFF | 0x1DC0..=0x1DFF | 0x20D0..=0x20FF | 0xFE20..=0xFE2F
    )
}

/// Joiners, marks of direction, variation selectors, tags, private letters and what Unicode says is no character.
fn is_unseen(c: char) -> bool {
    let code = u32::from(c);
    matches!(
        code,
        0xAD | 0x34F
            | 0x61C
            | 0x180B..=0x180F
            | 0x200B..=0x200F
            | 0x202A..=0x202E
            | 0x2060..=0x206F
            | 0xE000..=0xF8FF
            | 0xFDD0..=0xFDEF
            | 0xFE00..=0xFE0F
            | 0xFEFF
            | 0xFFF0..=0xFFFB
            | 0xE0000..=0x10FFFF
    ) || code & 0xFFFE == 0xFFFE
}

fn advance(c: char) -> u16 {
    let within = |first: u32, table: &[u16]| {
        u32::from(c).checked_sub(first).and_then(|i| table.get(i as usize).copied())
    };
    within(0x20, &ASCII)
        .or_else(|| within(0xA0, &LATIN))
        .or_else(|| within(0x391, &GREEK))
        .or_else(|| within(0x400, &CYRILLIC))
        .or_else(|| MARKS.iter().find(|(mark, _)| *mark == c).map(|(_, advance)| *advance))
        .unwrap_or(WIDEST)
}

#[rustfmt::skip]
const ASCII: [u16; 95] = [
    651, 821, 942, 1716, 1303, 1946, 1597, 563, 799, 799, 1024, 1716, 651, 739, 651, 690, 1303, 1303, 1303,
    1303, 1303, 1303, 1303, 1303, 1303, 1303, 690, 690, 1716, 1716, 1716, 1087, 2048, 1401, 1405, 1430,
    1577, 1294, 1178, 1587, 1540, 604, 604, 1343, 1141, 1767, 1532, 1612, 1235, 1612, 1423, 1300, 1251,
    1499, 1401, 2025, 1403, 1251, 1403, 799, 690, 799, 1716, 1024, 1024, 1255, 1300, 1126, 1300, 1260, 721,
    1300, 1298, 569, 569, 1186, 569, 1995, 1298, 1253, 1300, 1300, 842, 1067, 803, 1298, 1212, 1675, 1212,
    1212, 1075, 1303, 690, 1303, 1716,
];
#[rustfmt::skip]
const LATIN: [u16; 224] = [
    651, 821, 1303, 1303, 1303, 1303, 690, 1024, 1024, 2048, 965, 1253, 1716, 739, 2048, 1024, 1024, 1716,
    821, 821, 1024, 1303, 1303, 651, 1024, 821, 965, 1253, 1985, 1985, 1985, 1087, 1401, 1401, 1401, 1401,
    1401, 1401, 1995, 1430, 1294, 1294, 1294, 1294, 604, 604, 604, 604, 1587, 1532, 1612, 1612, 1612, 1612,
    1612, 1716, 1612, 1499, 1499, 1499, 1499, 1251, 1239, 1290, 1255, 1255, 1255, 1255, 1255, 1255, 2011,
    1126, 1260, 1260, 1260, 1260, 569, 569, 569, 569, 1253, 1298, 1253, 1253, 1253, 1253, 1253, 1716, 1253,
    1298, 1298, 1298, 1298, 1212, 1300, 1212, 1401, 1255, 1401, 1255, 1401, 1255, 1430, 1126, 1430, 1126,
    1430, 1126, 1430, 1126, 1577, 1300, 1587, 1300, 1294, 1260, 1294, 1260, 1294, 1260, 1294, 1260, 1294,
    1260, 1587, 1300, 1587, 1300, 1587, 1300, 1587, 1300, 1540, 1298, 1876, 1423, 604, 569, 604, 569, 604,
    569, 604, 569, 604, 569, 1208, 1138, 604, 569, 1343, 1186, 1186, 1141, 569, 1141, 569, 1141, 768, 1141,
    3554, 1151, 582, 1532, 1298, 1532, 1298, 1532, 1298, 1666, 1532, 1298, 1612, 1253, 1612, 1253, 1612,
    1253, 2191, 2095, 1423, 842, 1423, 842, 1423, 842, 1300, 1067, 1300, 1067, 1300, 1067, 1300, 1067,
    1251, 803, 1251, 803, 1251, 803, 1499, 1298, 1499, 1298, 1499, 1298, 1499, 1298, 1499, 1298, 1499,
    1298, 2025, 1675, 1251, 1212, 1251, 1403, 1075, 1403, 1075, 1403, 1075, 721,
];
#[rustfmt::skip]
const GREEK: [u16; 57] = [
    1401, 1405, 1141, 1401, 1294, 1403, 1540, 1612, 604, 1343, 1401, 1767, 1532, 1294, 1612, 1540, 1235,
    3554, 1294, 1251, 1251, 1612, 1403, 1612, 1565, 604, 1251, 1350, 1107, 1298, 693, 1185, 1350, 1307,
    1212, 1253, 1107, 1114, 1298, 1253, 693, 1207, 1212, 1303, 1144, 1142, 1253, 1233, 1300, 1202, 1298,
    1233, 1185, 1351, 1183, 1351, 1715,
];
#[rustfmt::skip]
const CYRILLIC: [u16; 96] = [
    1294, 1294, 1610, 1249, 1430, 1300, 604, 604, 604, 2240, 2140, 1610, 1454, 1532, 1248, 1540, 1401,
    1405, 1405, 1249, 1600, 1294, 2206, 1313, 1532, 1532, 1454, 1540, 1767, 1540, 1612, 1540, 1235, 1430,
    1251, 1248, 1763, 1403, 1590, 1404, 2190, 2240, 1705, 1807, 1405, 1430, 2211, 1423, 1255, 1263, 1207,
    1076, 1416, 1260, 1845, 1089, 1331, 1331, 1237, 1309, 1545, 1339, 1253, 1339, 1300, 1126, 1193, 1212,
    1751, 1212, 1394, 1210, 1874, 1929, 1447, 1617, 1207, 1124, 1724, 1232, 1260, 1260, 1280, 1076, 1124,
    1067, 569, 569, 569, 1848, 1840, 1335, 1237, 1331, 1212, 1339,
];
#[rustfmt::skip]
const MARKS: [(char, u16); 13] = [
    ('\u{2013}', 1024), ('\u{2014}', 2048), ('\u{2018}', 651), ('\u{2019}', 651), ('\u{201c}', 1061), ('\u{201d}', 1061), ('\u{2026}', 2048), ('\u{2212}', 1716), ('\u{b7}', 651), ('\u{2264}', 1716), ('\u{2265}', 1716), ('\u{2248}', 1716), ('\u{2192}', 1716),
];

#[cfg(test)]
mod tests {
    use super::*;

    /// Advance widths of a TrueType font by character, from its tables `cmap` (format 12) and `hmtx`.
    fn advances_in(font: &[u8]) -> impl Fn(char) -> Option<u16> + '_ {
        let u16_at = |at: usize| u16::from_be_bytes([font[at], font[at + 1]]);
        let u32_at = move |at: usize| (usize::from(u16_at(at)) << 16) + usize::from(u16_at(at + 2));
        let table = move |tag: &[u8]| {
            let record = (0..usize::from(u16_at(4))).map(|i| 12 + 16 * i).find(|r| &font[*r..*r + 4] == tag);
            u32_at(record.unwrap() + 8)
        };
        let (cmap, hmtx, hhea) = (table(b"cmap"), table(b"hmtx"), table(b"hhea"));
        let long_metrics = usize::from(u16_at(hhea + 34));
        let encodings = (0..usize::from(u16_at(cmap + 2))).map(|i| cmap + u32_at(cmap + 8 + 8 * i));
        let segments = encodings.into_iter().find(|s| u16_at(*s) == 12).unwrap();
        move |c| {
            let code = c as usize;
            let groups = (0..u32_at(segments + 12)).map(|i| segments + 16 + 12 * i);
            let group = groups.into_iter().find(|g| (u32_at(*g)..=u32_at(g + 4)).contains(&code))?;
            let glyph = u32_at(group + 8) + code - u32_at(group);
            Some(u16_at(hmtx + 4 * glyph.min(long_metrics - 1)))
        }
    }

    #[test]
    fn widths_are_those_of_the_bundled_font() {
        let regular = advances_in(dejavu::sans::regular());
        let listed = |c: &char| advance(*c) != WIDEST;
        let mut counted = 0;
        for c in (' '..='\u{ffff}').filter(|c| !c.is_control()) {
            if let Some(in_font) = regular(c) {
                if listed(&c) {
                    assert_eq!(advance(c), in_font, "{c:?}");
                    counted += 1;
                }
                assert!(advance(c) >= in_font, "{c:?} is {in_font} wide");
            }
        }
        assert!(counted > 450, "only {counted} letters are in the tables");
    }

    #[test]
    fn bold_is_no_wider_than_said() {
        let (regular, bold) = (advances_in(dejavu::sans::regular()), advances_in(dejavu::sans::bold()));
        for c in ' '..='\u{45f}' {
            if let (Some(thin), Some(thick), true) = (regular(c), bold(c), advance(c) != WIDEST) {
                assert!(f64::from(thick) <= BOLD * f64::from(thin), "{c:?}: {thin} and {thick}");
            }
        }
    }

    #[test]
    fn a_shortened_text_fits_and_says_that_it_was_shortened() {
        let long = "the hose came off while the point was being taken";
        let short = shorten(long, 12.0, Weight::Regular, 120.0);
        assert!(short.ends_with('…') && short.len() > 8, "{short}");
        assert!(width(&short, 12.0, Weight::Regular) <= 120.0);
        assert_eq!(shorten("hose", 12.0, Weight::Regular, 120.0), "hose");
    }

    #[test]
    fn wrapped_lines_fit_and_lose_no_word_while_there_is_room() {
        let text = "flow within 0.456 to 0.504 L/min, guarded by its uncertainty";
        let lines = wrap(text, 12.0, 150.0, 9);
        assert_eq!(lines.join(" "), text);
        assert!(lines.iter().all(|l| width(l, 12.0, Weight::Regular) <= 150.0), "{lines:?}");
        let two = wrap(text, 12.0, 150.0, 2);
        assert_eq!(two.len(), 2);
        assert!(two[1].ends_with('…'));
        assert!(wrap("", 12.0, 150.0, 2).is_empty());
    }

    #[test]
    fn what_xml_forbids_or_the_eye_misses_is_dropped() {
        assert_eq!(clean("a\u{0}b\u{1b}c\u{fffe}d"), "abcd");
        assert_eq!(clean("a\r\nb\tc"), "a  b c");
        assert_eq!(clean("a\u{202e}b\u{2066}c\u{200d}d"), "abcd");
        assert_eq!(clean("e\u{301}\u{301}\u{301}\u{301}x"), "e\u{301}\u{301}x");
        assert_eq!(clean("Отверстие <&\">"), "Отверстие <&\">");
    }
}
