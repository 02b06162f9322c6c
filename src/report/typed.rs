//! What somebody typed or named, and times, inside our own sentences.

/// A typed text as data: characters that do not show, or that turn the direction of text, are written as escapes, so
/// that no file can steer a terminal.
#[must_use]
pub fn tame(text: &str) -> String {
    let mut tamed = String::with_capacity(text.len());
    for c in text.chars() {
        let hidden = c.is_control()
            || matches!(c, '\u{200B}'..='\u{200F}' | '\u{202A}'..='\u{202E}' | '\u{2060}'..='\u{206F}' | '\u{FEFF}');
        if hidden {
            tamed.extend(c.escape_default());
        } else {
            tamed.push(c);
        }
    }
    tamed
}

/// A word for a shell: as it is where nothing in it means anything there, else between single quotes.
#[must_use]
pub fn shell_word(text: &str) -> String {
    let plain = |c: char| c.is_ascii_alphanumeric() || "_./%+:,@=-".contains(c);
    if !text.is_empty() && text.chars().all(plain) {
        return text.to_owned();
    }
    format!("'{}'", text.replace('\'', r"'\''"))
}

/// Seconds on a time column as `00:07:30`, the form in which a session file names a time; to the nearest second.
#[must_use]
pub fn clock(seconds: f64) -> String {
    let whole = seconds.abs().round() as u64;
    let sign = if seconds < 0.0 && whole > 0 { "-" } else { "" };
    format!("{sign}{:02}:{:02}:{:02}", whole / 3600, whole / 60 % 60, whole % 60)
}

/// A length of time in words: "45 s", "2 min 10 s", "25 min", "3 h 20 min"; seconds are dropped from an hour on.
#[must_use]
pub fn span(seconds: f64) -> String {
    let whole = seconds.max(0.0).round() as u64;
    let (h, min, s) = (whole / 3600, whole / 60 % 60, whole % 60);
    match (h, min, s) {
        (0, 0, s) => format!("{s} s"),
        (0, min, 0) => format!("{min} min"),
        (0, min, s) => format!("{min} min {s} s"),
        (h, 0, _) => format!("{h} h"),
        (h, min, _) => format!("{h} h {min} min"),
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn what_does_not_show_is_written_out() {
        assert_eq!(tame("dry suit, 5 mm é"), "dry suit, 5 mm é");
        assert_eq!(tame("a\u{1b}[2Jb\n\u{202e}c\u{200b}"), "a\\u{1b}[2Jb\\n\\u{202e}c\\u{200b}");
    }

    #[test]
    fn a_word_of_a_command_stays_one_word() {
        assert_eq!(shell_word("ebbline-rig/flow.toml"), "ebbline-rig/flow.toml");
        assert_eq!(shell_word("my rig"), "'my rig'");
        assert_eq!(shell_word("$(x)'"), r"'$(x)'\'''");
        assert_eq!(shell_word(""), "''");
    }

    #[test]
    fn times_are_written_as_a_session_file_has_them() {
        assert_eq!(clock(450.0), "00:07:30");
        assert_eq!(clock(59.6), "00:01:00");
        assert_eq!(clock(90_061.0), "25:01:01");
        assert_eq!(clock(-30.0), "-00:00:30");
        assert_eq!(clock(-0.2), "00:00:00");
    }

    #[test]
    fn spans_read_as_a_person_says_them() {
        assert_eq!(span(45.0), "45 s");
        assert_eq!(span(130.0), "2 min 10 s");
        assert_eq!(span(1500.0), "25 min");
        assert_eq!(span(12_000.0), "3 h 20 min");
        assert_eq!(span(7_200.0), "2 h");
    }
}
