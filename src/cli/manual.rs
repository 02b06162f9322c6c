//! Completion scripts and the manual page, from the same definitions as the arguments.

use clap::CommandFactory as _;

use super::arguments::Arguments;
use super::{Ended, say};
use crate::work::ExitStatus;

pub(super) fn completions(shell: clap_complete::Shell) -> Result<ExitStatus, Ended> {
    let mut script = Vec::new();
    clap_complete::generate(shell, &mut Arguments::command(), "ebbline", &mut script);
    say(&String::from_utf8_lossy(&script), ExitStatus::Done)
}

/// One page: the program, then each verb with its options.
pub(super) fn man() -> Result<ExitStatus, Ended> {
    let mut command = Arguments::command();
    command.build();
    let mut page = Vec::new();
    head(&command, &mut page).map_err(Ended::Stdout)?;
    for verb in command.get_subcommands() {
        verb_section(verb, &mut page).map_err(Ended::Stdout)?;
    }
    let after = command.get_after_help().map(ToString::to_string).unwrap_or_default();
    page.extend_from_slice(
        format!(".SH \"EXIT STATUS AND CAUTION\"\n{}\n", after.replace('-', "\\-")).as_bytes(),
    );
    say(&String::from_utf8_lossy(&page), ExitStatus::Done)
}

/// Title, name, synopsis and the options of every verb; the verbs themselves follow with theirs.
fn head(command: &clap::Command, page: &mut Vec<u8>) -> std::io::Result<()> {
    let own = clap_mangen::Man::new(command.clone());
    own.render_title(page)?;
    own.render_name_section(page)?;
    own.render_synopsis_section(page)?;
    own.render_description_section(page)?;
    own.render_options_section(page)
}

/// A verb that stands for others is left to those.
fn verb_section(verb: &clap::Command, page: &mut Vec<u8>) -> std::io::Result<()> {
    let mut below = verb.get_subcommands().peekable();
    if below.peek().is_some() {
        return below.try_for_each(|verb| verb_section(verb, page));
    }
    let name = verb.get_bin_name().unwrap_or_else(|| verb.get_name()).to_uppercase().replace('-', "\\-");
    page.extend_from_slice(format!(".SH \"{name}\"\n").as_bytes());
    if let Some(about) = verb.get_about() {
        page.extend_from_slice(format!("{about}\n").replace('-', "\\-").as_bytes());
    }
    let own = clap_mangen::Man::new(verb.clone());
    own.render_synopsis_section(page)?;
    own.render_options_section(page)
}
