//! Whether a table of somebody's own may go into an export as it is.
//!
//! A spreadsheet takes a cell that begins with `=`, `+`, `-` or `@` for a formula and may run it. An export holds only
//! numbers, times and fixed words, so a table with anything else is written anew. The text is cut at every character some
//! spreadsheet may take for a delimiter, so that it is safe however it is opened.

/// Words a cell may hold.
const WORDS: [&str; 2] = ["rising", "falling"];

/// Whether every cell is empty, a number, a time or a fixed word, and every head a plain name.
pub(super) fn is_plain(table: &[u8]) -> bool {
    let Ok(text) = std::str::from_utf8(table) else { return false };
    let mut lines = text.trim_start_matches('\u{FEFF}').lines();
    let heads = lines.next().unwrap_or_default();
    cells(heads).all(is_head) && lines.all(|line| cells(line).all(is_cell))
}

fn cells(line: &str) -> impl Iterator<Item = &str> {
    line.split([',', ';', '\t', '|', '\r']).map(unquoted)
}

fn unquoted(cell: &str) -> &str {
    let cell = cell.trim_matches(' ');
    cell.strip_prefix('"').and_then(|cell| cell.strip_suffix('"')).unwrap_or(cell).trim_matches(' ')
}

fn is_head(cell: &str) -> bool {
    let plain = |c: char| c.is_alphanumeric() || " _-./%°()[]".contains(c);
    cell.is_empty() || (cell.starts_with(char::is_alphabetic) && cell.chars().all(plain))
}

fn is_cell(cell: &str) -> bool {
    cell.is_empty() || WORDS.contains(&cell) || is_number(cell) || is_time(cell)
}

/// Digits with a sign, a decimal point and an exponent.
fn is_number(cell: &str) -> bool {
    let plain = cell.bytes().all(|c| c.is_ascii_digit() || matches!(c, b'+' | b'-' | b'.' | b'e' | b'E'));
    plain && cell.parse::<f64>().is_ok_and(f64::is_finite)
}

/// A time of day, elapsed time, or date and time: begins with a digit and has only what those have.
fn is_time(cell: &str) -> bool {
    let plain = |c: u8| {
        c.is_ascii_digit() || matches!(c, b':' | b'.' | b'T' | b't' | b'Z' | b'z' | b'+' | b'-' | b' ')
    };
    cell.starts_with(|c: char| c.is_ascii_digit()) && cell.contains(':') && cell.bytes().all(plain)
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn tables_of_numbers_times_and_sweeps_are_plain() {
        for table in [
            "time,sweep,ip_bar,flow\n09:41:00,rising,4.016,0.2336\n09:42:37,falling,-5.501e-1,+0.3\n",
            "\u{FEFF}Zeit;Druck [bar];Fluss\r\n2026-11-12T09:40:00+11:00;4,016;0,2336\r\n;;\r\n",
            "a\tb\n\"1.5\"\t 2 \n",
            "",
        ] {
            assert!(is_plain(table.as_bytes()), "{table:?}");
        }
    }

    #[test]
    fn anything_a_spreadsheet_could_run_or_a_person_typed_is_not() {
        for table in [
            "ip,flow\n=1+1,2\n",
            "ip,flow\n1,@SUM(A1)\n",
            "ip,flow\n1,\"=cmd|' /C calc'!A0\"\n",
            "ip,flow\n-1+2,2\n",
            "ip,flow\n+A1,2\n",
            "=A1,flow\n1,2\n",
            "-ip,flow\n1,2\n",
            "ip,flow,remark\n1,2,hose touched\n",
            "ip;flow\n1;2,=A1\n",
            "ip,flow\n1,2\t=A1\n",
            "ip,flow\n1,2\r=A1\n",
            "ip,flow\n1,inf\n",
            "# ip,flow\n1,2\n",
            "ip,flow\n\" =1\",2\n",
        ] {
            assert!(!is_plain(table.as_bytes()), "{table:?}");
        }
        assert!(!is_plain(b"ip,flow\n1,\xFF\n"));
    }
}
