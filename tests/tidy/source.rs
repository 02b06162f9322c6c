//! What a Rust source says, as far as the tidy checks ask: its paths, its macros, and which of it is tests.
//!
//! Takes the text of a file, returns flat paths: `use crate::{a, b::c}` is `crate::a` and `crate::b::c`, and a path in
//! the middle of an expression counts like one in a `use`. Comments and the insides of literals say nothing. Left out:
//! what only the compiler knows (names brought in by `*`, code made by macros).

/// A path as written, flat.
#[derive(Debug, Clone, PartialEq, Eq)]
pub(crate) struct Named {
    /// `["crate", "gas", "Species"]`.
    pub segments: Vec<String>,
    /// Line, from 1.
    pub line: usize,
    /// How many inline modules surround it.
    pub inline_modules: usize,
    /// Whether it stands in a module under `#[cfg(test)]`.
    pub in_tests: bool,
}

/// A source file, read.
#[derive(Debug, Default)]
pub(crate) struct Source {
    /// Every path of two segments or more.
    pub paths: Vec<Named>,
    /// Every macro called, as a path of one segment.
    pub macros: Vec<Named>,
    /// Modules declared in files of their own, in order.
    pub modules: Vec<String>,
    /// Those of them that stand under `#[cfg(test)]`.
    pub test_modules: Vec<String>,
}

impl Source {
    pub(crate) fn of(text: &str) -> Self {
        let tokens = tokens(text);
        let mut source = Self::default();
        // The braces open just now; those of an inline module say so, and whether it is tests.
        let mut open: Vec<Option<bool>> = Vec::new();
        let mut test_attribute = false;
        let mut i = 0;
        while i < tokens.len() {
            let word = |at: usize| tokens.get(at).map_or("", |t| t.text.as_str());
            match word(i) {
                "{" => open.push(None),
                "}" => {
                    open.pop();
                }
                "#" if ["#", "[", "cfg", "(", "test", ")", "]"]
                    .iter()
                    .enumerate()
                    .all(|(k, w)| word(i + k) == *w) =>
                {
                    test_attribute = true;
                    i += 7;
                    continue;
                }
                "mod" if word(i + 2) == ";" => {
                    source.modules.push(word(i + 1).to_owned());
                    if std::mem::take(&mut test_attribute) {
                        source.test_modules.push(word(i + 1).to_owned());
                    }
                }
                "mod" if word(i + 2) == "{" => {
                    open.push(Some(std::mem::take(&mut test_attribute)));
                    i += 3;
                    continue;
                }
                "fn" | "struct" | "use" => test_attribute = false,
                _ => {}
            }
            let named = |segments: Vec<String>, line: usize| Named {
                segments,
                line,
                inline_modules: open.iter().flatten().count(),
                in_tests: open.contains(&Some(true)),
            };
            if is_name(word(i)) && word(i + 1) == "::" {
                let mut flat = Vec::new();
                i = flatten(&tokens, i, &[], &mut flat);
                source.paths.extend(flat.into_iter().map(|(segments, line)| named(segments, line)));
                continue;
            }
            if is_name(word(i)) && word(i + 1) == "!" && word(i + 2) != "=" {
                source.macros.push(named(vec![word(i).to_owned()], tokens[i].line));
            }
            i += 1;
        }
        source
    }
}

struct Token {
    text: String,
    line: usize,
}

fn is_name(text: &str) -> bool {
    text.starts_with(|c: char| c.is_alphabetic() || c == '_')
}

/// Reads a path, or a tree of them in braces, from `at`; returns the index after it.
fn flatten(tokens: &[Token], at: usize, before: &[String], out: &mut Vec<(Vec<String>, usize)>) -> usize {
    let word = |at: usize| tokens.get(at).map_or("", |t| t.text.as_str());
    if word(at) == "{" {
        let mut i = at + 1;
        while i < tokens.len() && word(i) != "}" {
            // A comma, or the new name after `as`, is passed over.
            let new_name = word(i - 1) == "as";
            i = if is_name(word(i)) && word(i) != "as" && !new_name || matches!(word(i), "{" | "*") {
                flatten(tokens, i, before, out)
            } else {
                i + 1
            };
        }
        return i + 1;
    }
    let mut path = before.to_vec();
    path.push(word(at).to_owned());
    let goes_on = word(at + 1) == "::" && (is_name(word(at + 2)) || matches!(word(at + 2), "{" | "*"));
    if goes_on {
        return flatten(tokens, at + 2, &path, out);
    }
    out.push((path, tokens[at].line));
    at + 1
}

/// Names, `::` and single characters; comments are dropped and literals left empty.
fn tokens(text: &str) -> Vec<Token> {
    let chars: Vec<char> = text.chars().collect();
    let at = |i: usize| chars.get(i).copied().unwrap_or('\0');
    let mut tokens = Vec::new();
    let (mut i, mut line) = (0, 1);
    while i < chars.len() {
        let start = i;
        let c = at(i);
        if c == '/' && at(i + 1) == '/' {
            while i < chars.len() && at(i) != '\n' {
                i += 1;
            }
        } else if c == '/' && at(i + 1) == '*' {
            let mut depth = 0;
            loop {
                match (at(i), at(i + 1)) {
                    ('/', '*') => (depth, i) = (depth + 1, i + 2),
                    ('*', '/') => (depth, i) = (depth - 1, i + 2),
                    _ => i += 1,
                }
                if depth == 0 || i >= chars.len() {
                    break;
                }
            }
        } else if let Some(end) = raw_string(&chars, i) {
            i = end;
        } else if c == '"' {
            i += 1;
            while i < chars.len() && at(i) != '"' {
                i += if at(i) == '\\' { 2 } else { 1 };
            }
            i += 1;
        } else if c == '\'' && (at(i + 1) == '\\' || at(i + 2) == '\'') {
            i += if at(i + 1) == '\\' { 3 } else { 2 };
            while i < chars.len() && at(i) != '\'' {
                i += 1;
            }
            i += 1;
        } else if c.is_alphanumeric() || c == '_' {
            while at(i).is_alphanumeric() || at(i) == '_' {
                i += 1;
            }
            tokens.push(Token { text: chars[start..i].iter().collect(), line });
        } else if c == ':' && at(i + 1) == ':' {
            i += 2;
            tokens.push(Token { text: "::".into(), line });
        } else {
            i += 1;
            if !c.is_whitespace() {
                tokens.push(Token { text: c.into(), line });
            }
        }
        line += chars[start..i.min(chars.len())].iter().filter(|c| **c == '\n').count();
    }
    tokens
}

/// The index after a raw string that starts at `i`.
fn raw_string(chars: &[char], i: usize) -> Option<usize> {
    let mut at = i;
    if matches!(chars.get(at), Some('b' | 'c')) {
        at += 1;
    }
    if chars.get(at) != Some(&'r') {
        return None;
    }
    let hashes = chars[at + 1..].iter().take_while(|c| **c == '#').count();
    let open = at + 1 + hashes;
    if chars.get(open) != Some(&'"') {
        return None;
    }
    let ends =
        |k: usize| chars[k] == '"' && chars[k + 1..].iter().take_while(|c| **c == '#').count() >= hashes;
    let close = (open + 1..chars.len()).find(|k| ends(*k))?;
    Some(close + 1 + hashes)
}
