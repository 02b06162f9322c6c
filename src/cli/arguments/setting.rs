//! Arguments of `setting`.

use std::path::PathBuf;

use chrono::NaiveDate;
use clap::{Args, ValueEnum};

use crate::entry::{Diluent, Purity};
use crate::quantity::text;
use crate::quantity::{
    AbsolutePressure, GaugePressure, Length, PressureDifference, QuantityError, Share, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};
use crate::work::setting::{FirstStageAsked, PlaceGiven};

/// Options of `setting`.
#[derive(Debug, Args)]
pub struct Setting {
    /// An orifice of the book, or a run file (a name with a slash, or ending in .toml); repeat to compare
    #[arg(long, value_name = "ORIFICE|FILE.toml", required = true)]
    pub orifice: Vec<String>,
    /// A diver of the book, with all sessions
    #[arg(long, value_name = "DIVER", conflicts_with = "session")]
    pub diver: Option<String>,
    /// A session file, or a session of the book; repeat for several
    #[arg(long, value_name = "FILE.toml|SESSION")]
    pub session: Vec<String>,
    /// A first stage of the register, or uncompensated (its IP does not follow depth), or compensated (it does)
    #[arg(long, value_name = "ID|uncompensated|compensated", default_value = "uncompensated", value_parser = first_stage)]
    pub first_stage: FirstStageAsked,
    /// Deepest depth of the dive; needed when compensated
    #[arg(long, value_name = "DEPTH", allow_hyphen_values = true, value_parser = text::value::<Length>)]
    pub max_depth: Option<Length>,
    /// Lowest and highest IP of the first stage, as in "8 bar to 12 bar" (else what the bench measured)
    #[arg(long, value_name = "RANGE", allow_hyphen_values = true, value_parser = ip_range)]
    pub ip_range: Option<(GaugePressure, GaugePressure)>,
    /// Division of the IP gauge (else 0.1 bar)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<PressureDifference>)]
    pub gauge_division: Option<PressureDifference>,
    /// Full scale of the IP gauge (else 20 bar)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<GaugePressure>)]
    pub gauge_scale: Option<GaugePressure>,
    /// Error of the IP gauge, ± (k = 2; else 2.5 % of its scale, with a warning)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<PressureDifference>)]
    pub gauge_error: Option<PressureDifference>,
    /// How far the IP may rise by itself: creep, lock-up, supply pressure (else 0.3 bar, with a warning)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<PressureDifference>)]
    pub ip_spread: Option<PressureDifference>,
    /// How well the IP comes back, ± (k = 2; else 0.1 bar, with a warning)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<PressureDifference>)]
    pub ip_repeat: Option<PressureDifference>,
    /// Largest chance that the injection exceeds the uptake (else 2.5 %)
    #[arg(long, value_name = "SHARE", allow_hyphen_values = true, value_parser = text::value::<Share>)]
    pub chance: Option<Share>,
    /// Least shortfall of the injection, as a share of the uptake (else 5 %)
    #[arg(long, value_name = "SHARE", allow_hyphen_values = true, value_parser = text::value::<Share>)]
    pub shortfall: Option<Share>,
    /// Water dived in (else sea)
    #[arg(long)]
    pub water: Option<Water>,
    /// Its temperature, as in "12 °C ± 2 °C" (else overfeed is judged at 4 °C and leanness at 30 °C)
    #[arg(long, value_name = "TEMPERATURE", allow_hyphen_values = true, value_parser = water_temperature)]
    pub water_temperature: Option<Uncertain<Temperature, TemperatureDifference>>,
    /// Where the IP is set: altitude or barometer (else 1013.25 hPa ± 30 hPa)
    #[arg(long, value_name = "ALTITUDE|BAROMETER", allow_hyphen_values = true, value_parser = place)]
    pub set_at: Option<PlaceGiven>,
    /// Where the dive is: altitude or barometer (else 1013.25 hPa ± 30 hPa)
    #[arg(long, value_name = "ALTITUDE|BAROMETER", allow_hyphen_values = true, value_parser = place)]
    pub dive_at: Option<PlaceGiven>,
    /// Loop and lungs, as in "7.5 L ± 1.0 L" (else the diver's entry, else what the sessions say)
    #[arg(long, value_name = "VOLUME", allow_hyphen_values = true, value_parser = loop_volume)]
    pub loop_volume: Option<Uncertain<Volume>>,
    /// air, or its oxygen as in "18 %" (else the diver's entry, else air)
    #[arg(long, value_name = "GAS", value_parser = diluent)]
    pub diluent: Option<Diluent>,
    /// Purity of the oxygen (else "99.5 % ± 0.3 %")
    #[arg(long, value_name = "SHARE", value_parser = purity)]
    pub oxygen: Option<Purity>,
    /// Upper PO2 of the drift table (else 1.3 bar)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<AbsolutePressure>)]
    pub po2_high: Option<AbsolutePressure>,
    /// Lower PO2 of the drift table (else 0.7 bar)
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<AbsolutePressure>)]
    pub po2_low: Option<AbsolutePressure>,
    /// Uptake at work, STPD (else 1.5 L/min)
    #[arg(long, value_name = "FLOW", allow_hyphen_values = true, value_parser = text::value::<StpdFlow>)]
    pub work: Option<StpdFlow>,
    /// The day it is for, as in 2026-12-01: calibrations that fell due before it are overdue (else today)
    #[arg(long, value_name = "DATE")]
    pub on: Option<NaiveDate>,
    /// Judge this IP
    #[arg(long, value_name = "PRESSURE", allow_hyphen_values = true, value_parser = text::value::<GaugePressure>)]
    pub ip: Option<GaugePressure>,
    /// A flow meter of the register: what it should show on the assembled unit
    #[arg(long, value_name = "ID")]
    pub meter: Option<String>,
    /// Volume between the shut cylinder valve and the orifice, for the check before a dive (else the first stage's)
    #[arg(long, value_name = "VOLUME", allow_hyphen_values = true, value_parser = loop_volume)]
    pub trapped_volume: Option<Uncertain<Volume>>,
    /// Go on with an overdue, failed or undecided orifice, or an implausible uptake, for this reason; recorded and printed
    #[arg(long, value_name = "TEXT")]
    pub despite: Option<String>,
    /// Draw injection against depth and against IP; the ending says how
    #[arg(long, value_name = "FILE.svg|.png")]
    pub plot: Option<PathBuf>,
    /// Write the sheet a diver keeps: one page to laminate, or text; the ending says which
    #[arg(long, value_name = "FILE.pdf|.txt")]
    pub sheet: Option<PathBuf>,
    /// Paper of the sheet (else a5)
    #[arg(long, value_name = "a5|a4")]
    pub paper: Option<SheetPaper>,
}

/// The paper of a sheet.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum SheetPaper {
    /// 148 mm by 210 mm
    A5,
    /// 210 mm by 297 mm
    A4,
}

/// What is dived in.
#[derive(Debug, Clone, Copy, PartialEq, Eq, ValueEnum)]
pub enum Water {
    /// Sea water
    Sea,
    /// Fresh water
    Fresh,
}

#[allow(clippy::unnecessary_wraps, reason = "a value parser answers so")]
fn first_stage(text: &str) -> Result<FirstStageAsked, QuantityError> {
    Ok(match text {
        "uncompensated" => FirstStageAsked::Uncompensated,
        "compensated" => FirstStageAsked::Compensated,
        id => FirstStageAsked::Registered(id.to_owned()),
    })
}

fn ip_range(text: &str) -> Result<(GaugePressure, GaugePressure), QuantityError> {
    text::range(text)
}

fn water_temperature(text: &str) -> Result<Uncertain<Temperature, TemperatureDifference>, QuantityError> {
    text::uncertain(text)
}

fn loop_volume(text: &str) -> Result<Uncertain<Volume>, QuantityError> {
    text::uncertain(text)
}

/// An altitude where the unit is one of length, else a barometer.
fn place(text: &str) -> Result<PlaceGiven, QuantityError> {
    match (text::value::<Length>(text), text::uncertain(text)) {
        (Ok(altitude), _) => Ok(PlaceGiven::Altitude(altitude)),
        (Err(_), Ok(barometer)) => Ok(PlaceGiven::Barometer(barometer)),
        // With a unit of length it was meant as an altitude.
        (Err(of_length), Err(_)) if text.trim_end().ends_with('m') || text.trim_end().ends_with("ft") => {
            Err(of_length)
        }
        (Err(_), Err(of_pressure)) => Err(of_pressure),
    }
}

fn diluent(text: &str) -> Result<Diluent, QuantityError> {
    if text.eq_ignore_ascii_case("air") {
        return Ok(Diluent::Air);
    }
    let share = text.strip_prefix("oxygen").unwrap_or(text).trim();
    text::value::<Share>(share).map(Diluent::Oxygen)
}

fn purity(text: &str) -> Result<Purity, QuantityError> {
    let given = text::uncertain::<Share>(text)?;
    Ok(crate::work::setting::purity_of(given))
}
