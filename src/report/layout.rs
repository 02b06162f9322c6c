//! Lines of 80 columns: wrapped paragraphs and aligned tables.

/// Width of everything printed for people.
pub const WIDTH: usize = 80;

/// `text` broken at spaces, the first line behind `first` and the others behind `rest`; a word that is too long for
/// a line stands on its own.
#[must_use]
pub fn wrapped(first: &str, rest: &str, text: &str) -> String {
    let mut lines: Vec<String> = Vec::new();
    let mut line = first.to_owned();
    let mut empty = true;
    for word in glued(text) {
        let gap = usize::from(!empty);
        if !empty && columns(&line) + gap + columns(&word) > WIDTH {
            lines.push(std::mem::replace(&mut line, rest.to_owned()));
            empty = true;
        }
        if !empty {
            line.push(' ');
        }
        line.push_str(&word);
        empty = false;
    }
    lines.push(line);
    lines.join("\n") + "\n"
}

/// The words of a text, with a number and what belongs to it (its unit, the ± after it) kept together.
fn glued(text: &str) -> Vec<String> {
    const AFTER_A_NUMBER: [&str; 16] = [
        "%", "bar", "kPa", "hPa", "mbar", "psi", "L/min", "mL/min", "L/h", "mL/h", "°C", "°F", "K", "µm",
        "s", "±",
    ];
    let mut words: Vec<String> = Vec::new();
    for word in text.split_whitespace() {
        let bare = word.trim_end_matches([',', '.', ';', ':', ')']);
        let belongs = AFTER_A_NUMBER.contains(&bare) || words.last().is_some_and(|w| w.ends_with('±'));
        match words.last_mut() {
            Some(last) if belongs && last.chars().any(|c| c.is_ascii_digit()) => {
                last.push(' ');
                last.push_str(word);
            }
            _ => words.push(word.to_owned()),
        }
    }
    words
}

/// A table: heads, units under them, rows; numbers to the right, the last column to the left when `last_left`.
#[must_use]
pub fn table(heads: &[&str], units: &[&str], rows: &[Vec<String>], last_left: bool) -> String {
    let count = heads.len();
    let width = |i: usize| {
        let cells = rows.iter().filter_map(|r| r.get(i)).map(|c| columns(c));
        cells.chain([columns(heads[i]), columns(units[i])]).max().unwrap_or(0)
    };
    let widths: Vec<usize> = (0..count).map(width).collect();
    // A last column of words ends where the page does.
    let before: usize = 1 + widths[..count - 1].iter().map(|w| w + 1).sum::<usize>() + 2;
    let room = WIDTH.saturating_sub(before).max(8);
    let line = |cells: &[&str]| {
        let mut text = String::from(" ");
        for (i, cell) in cells.iter().enumerate() {
            let pad = " ".repeat(widths[i].saturating_sub(columns(cell)));
            if last_left && i == count - 1 {
                text.push_str(&format!("  {}", shortened(cell, room)));
            } else {
                text.push_str(&format!(" {pad}{cell}"));
            }
        }
        text.trim_end().to_owned() + "\n"
    };
    let mut text = line(heads);
    if units.iter().any(|u| !u.is_empty()) {
        text.push_str(&line(units));
    }
    for row in rows {
        text.push_str(&line(&row.iter().map(String::as_str).collect::<Vec<_>>()));
    }
    text
}

/// A text cut to a number of columns, with a sign that it was.
#[must_use]
pub fn shortened(text: &str, most: usize) -> String {
    if columns(text) <= most {
        return text.to_owned();
    }
    text.chars().take(most - 1).collect::<String>() + "…"
}

/// Numbers of one column with the same number of decimals: as many as the one that has most.
#[must_use]
pub fn same_decimals(numbers: &[String]) -> Vec<String> {
    let decimals = |text: &String| text.split_once('.').map_or(0, |(_, d)| d.len());
    let most = numbers.iter().map(decimals).max().unwrap_or(0);
    numbers
        .iter()
        .map(|text| match (most - decimals(text), text.contains('.')) {
            (0, _) => text.clone(),
            (missing, true) => format!("{text}{}", "0".repeat(missing)),
            (missing, false) => format!("{text}.{}", "0".repeat(missing)),
        })
        .collect()
}

/// Columns a text takes on a terminal: its characters, without combining marks (our own texts and names have nothing
/// wider).
#[must_use]
pub fn columns(text: &str) -> usize {
    text.chars().filter(|c| !('\u{300}'..='\u{36f}').contains(c)).count()
}

/// A number of things: "1 run", "2 runs".
#[must_use]
pub fn counted(count: u64, thing: &str) -> String {
    format!("{count} {thing}{}", if count == 1 { "" } else { "s" })
}

/// Numbers as "1, 3-5 and 9".
#[must_use]
pub fn numbers(list: &[usize]) -> String {
    let mut runs: Vec<(usize, usize)> = Vec::new();
    for &n in list {
        match runs.last_mut() {
            Some((_, last)) if *last + 1 == n => *last = n,
            _ => runs.push((n, n)),
        }
    }
    let texts: Vec<String> = runs
        .iter()
        .flat_map(|&(a, b)| match b - a {
            0 => vec![a.to_string()],
            1 => vec![a.to_string(), b.to_string()],
            _ => vec![format!("{a}-{b}")],
        })
        .collect();
    match texts.split_last() {
        None => String::new(),
        Some((last, [])) => last.clone(),
        Some((last, rest)) => format!("{} and {last}", rest.join(", ")),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn paragraphs_stay_within_the_width() {
        let text = wrapped("  - ", "    ", &"word ".repeat(60));
        assert!(text.lines().all(|l| l.chars().count() <= WIDTH));
        assert!(text.lines().skip(1).all(|l| l.starts_with("    word")));
    }

    #[test]
    fn a_number_keeps_its_unit_on_its_line() {
        assert_eq!(
            glued("at 10.0 bar (0.5 %), 1 ± 2 L/min; a bar"),
            ["at", "10.0 bar", "(0.5 %),", "1 ± 2 L/min;", "a", "bar"]
        );
    }

    #[test]
    fn lists_of_numbers_read_as_a_person_writes_them() {
        assert_eq!(numbers(&[1]), "1");
        assert_eq!(numbers(&[1, 2]), "1 and 2");
        assert_eq!(numbers(&[1, 3, 4, 5, 9]), "1, 3-5 and 9");
    }

    #[test]
    fn a_last_column_of_words_ends_at_the_width() {
        let rows = vec![vec!["1".into(), "why ".repeat(40)]];
        let text = table(&["no", ""], &["", ""], &rows, true);
        assert!(text.lines().all(|l| columns(l) <= WIDTH) && text.contains('…'), "{text}");
    }

    #[test]
    fn numbers_of_a_column_end_at_the_same_place() {
        let numbers = ["4.012", "4", "0.5"].map(str::to_owned);
        assert_eq!(same_decimals(&numbers), ["4.012", "4.000", "0.500"]);
        assert_eq!(same_decimals(&["7".to_owned()]), ["7"]);
    }

    #[test]
    fn tables_are_aligned() {
        let rows = vec![
            vec!["1".into(), "10.25".into(), "left".into()],
            vec!["12".into(), "9.5".into(), "x".into()],
        ];
        let text = table(&["no", "IP", "why"], &["", "bar", ""], &rows, true);
        assert_eq!(text, "  no    IP  why\n       bar\n   1 10.25  left\n  12   9.5  x\n");
    }
}
