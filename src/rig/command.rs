//! What somebody tells the rig while it runs.

use super::RigError;
use super::couch::Feed;
use super::fault::{Fault, Lasts};
use crate::quantity::text::{span, value};
use crate::quantity::{GaugePressure, Length, StpdFlow, Volume};

/// Something to do.
#[derive(Debug, Clone, PartialEq)]
pub enum Command {
    /// Turn the regulator; ends the script.
    Ip(GaugePressure),
    /// Feed the loop otherwise.
    Feed(Feed),
    /// Another mean uptake.
    Uptake(StpdFlow),
    /// Another depth.
    Depth(Length),
    /// Oxygen into the loop, at STPD.
    AddOxygen(Volume),
    /// Diluent into the loop, at STPD.
    AddDiluent(Volume),
    /// A fault of the device that an instrument belongs to.
    Fault {
        /// The instrument.
        device: String,
        /// What.
        fault: Fault,
        /// How long.
        lasts: Lasts,
        /// In how many seconds.
        in_s: f64,
    },
    /// No faults any more: those of one device that have begun, or all of all devices.
    Clear(Option<String>),
}

impl Command {
    /// How commands are written.
    pub const KNOWN: &'static str = "\"set ip 10 bar\", \"set feed off|orifice|0.21 L/min\", \
        \"set uptake 0.26 L/min\", \"set depth 2 m\", \"add oxygen 0.4 L\", \"add diluent 0.5 L\" (flows and volumes \
        STPD), \"fault FM-01 silence for 5 s\" (or \"once\", \"always\"; \"in 30 s\" to begin later), \
        \"clear FM-01\" or \"clear\"";

    /// Reads a command: words between white space, quantities as everywhere.
    ///
    /// # Errors
    /// [`RigError::Command`] for what is none, [`RigError::Unit`] for a bad quantity, [`RigError::Fault`] and
    /// [`RigError::FaultNeeds`] for a bad fault.
    pub fn parse(text: &str) -> Result<Self, RigError> {
        let words: Vec<&str> = text.split_whitespace().collect();
        let none = || RigError::Command { said: text.trim().to_owned(), known: Self::KNOWN };
        match words.as_slice() {
            ["set", "ip", rest @ ..] => Ok(Self::Ip(value(&rest.join(" "))?)),
            ["set", "feed", "off"] => Ok(Self::Feed(Feed::Off)),
            ["set", "feed", "orifice"] => Ok(Self::Feed(Feed::Orifice)),
            ["set", "feed", rest @ ..] => Ok(Self::Feed(Feed::Flow(value(&rest.join(" "))?))),
            ["set", "uptake", rest @ ..] => Ok(Self::Uptake(value(&rest.join(" "))?)),
            ["set", "depth", rest @ ..] => Ok(Self::Depth(value(&rest.join(" "))?)),
            ["add", "oxygen", rest @ ..] => Ok(Self::AddOxygen(value(&rest.join(" "))?)),
            ["add", "diluent", rest @ ..] => Ok(Self::AddDiluent(value(&rest.join(" "))?)),
            ["fault", device, fault, rest @ ..] => {
                let (argument, rest) = match rest {
                    [argument, rest @ ..]
                        if Fault::takes_argument(fault)
                            && !matches!(*argument, "for" | "in" | "once" | "always") =>
                    {
                        (Some(*argument), rest)
                    }
                    rest => (None, rest),
                };
                let fault = Fault::parse(fault, argument)?;
                let (lasts, rest) = match rest {
                    ["once", rest @ ..] => (Lasts::Once, rest),
                    ["always", rest @ ..] => (Lasts::UntilCleared, rest),
                    ["for", number, unit, rest @ ..] => {
                        (Lasts::For(span(&format!("{number} {unit}"))?.as_s()), rest)
                    }
                    rest => (Lasts::Once, rest),
                };
                let in_s = match rest {
                    [] => 0.0,
                    ["in", number, unit] => span(&format!("{number} {unit}"))?.as_s(),
                    _ => return Err(none()),
                };
                Ok(Self::Fault { device: (*device).to_owned(), fault, lasts, in_s })
            }
            ["clear"] => Ok(Self::Clear(None)),
            ["clear", device] => Ok(Self::Clear(Some((*device).to_owned()))),
            _ => Err(none()),
        }
    }
}
