//! `setting`: orifices and a diver's uptake to the intermediate pressure to set.

use std::path::{Path, PathBuf};

use chrono::NaiveDate;

use super::fit::{names_a_file, plot_kind, write_plot};
use super::lines::{self, FoundLine};
use super::output::write_whole;
use super::registers::id_of;
use super::runs::said;
use super::shelf::{Shelf, meter_of};
use super::uptake::{GatheredSession, gather, named, work_out};
use super::{ExitStatus, WorkError};
use crate::book::Book;
use crate::certificate;
use crate::certificate::paper::{Paper, render};
use crate::clock;
use crate::entry::{Diluent, Diver, FirstStage, Id, Purity};
use crate::gas::Water;
use crate::plot::{SettingPlot, setting_plot};
use crate::quantity::{
    AbsolutePressure, GaugePressure, Length, PressureDifference, Share, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};
use crate::report::Units;
use crate::report::session_uptake;
use crate::report::setting::{self as words, OrificeNamed, Reported, favourable};
use crate::report::sheet;
use crate::setting::{
    DEFAULT_CHANCE, DEFAULT_PURITY, DEFAULT_SHORTFALL, FirstStageKind, RestingUptake, Setting,
    SettingOptions, Trapped, setting,
};
use crate::uptake::Uptake;

pub use crate::setting::PlaceGiven;

/// Which first stage.
#[derive(Debug, Clone, PartialEq, Eq, Default)]
pub enum FirstStageAsked {
    /// One of no name whose pressure does not follow depth.
    #[default]
    Uncompensated,
    /// One of no name whose pressure follows depth.
    Compensated,
    /// One of the register.
    Registered(String),
}

/// What is asked.
#[derive(Debug, Clone, Default)]
pub struct SettingRequest {
    /// Orifices of the book, or run files; several are compared.
    pub orifices: Vec<String>,
    /// A diver of the book, all of whose sessions count.
    pub diver: Option<String>,
    /// Session files, or numbers of sessions.
    pub sessions: Vec<String>,
    /// The first stage.
    pub first_stage: FirstStageAsked,
    /// Everything else that was said; what was not is filled from the registers, then by defaults.
    pub asked: Asked,
    /// A flow meter of the register whose reading is to be foretold.
    pub meter: Option<String>,
    /// The day on which calibrations are in date or not; else today.
    pub on: Option<NaiveDate>,
    /// Where the book is, if it was said.
    pub book: Option<PathBuf>,
    /// Where to draw it, `.svg` or `.png`.
    pub plot: Option<PathBuf>,
    /// Where to write the sheet a diver keeps, `.pdf` or `.txt`.
    pub sheet: Option<PathBuf>,
    /// The paper of the sheet; else A5. Without a sheet that is a PDF it is refused.
    pub paper: Option<SheetPaper>,
    /// The units of plot and sheet.
    pub units: Units,
}

/// The paper of a sheet.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum SheetPaper {
    /// 148 mm by 210 mm.
    A5,
    /// 210 mm by 297 mm.
    A4,
}

/// What a sheet is written as.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
enum SheetKind {
    Text,
    Pdf(Paper),
}

/// What was said of first stage, gauge, place and loop, each as [`SettingOptions`] has it.
#[derive(Debug, Clone, PartialEq, Default)]
#[allow(missing_docs, reason = "each stands in `SettingOptions`")]
pub struct Asked {
    pub max_depth: Option<Length>,
    pub ip_range: Option<(GaugePressure, GaugePressure)>,
    pub gauge_division: Option<PressureDifference>,
    pub gauge_scale: Option<GaugePressure>,
    pub gauge_error: Option<PressureDifference>,
    pub ip_spread: Option<PressureDifference>,
    pub ip_repeat: Option<PressureDifference>,
    pub chance: Option<Share>,
    pub shortfall: Option<Share>,
    pub fresh_water: Option<bool>,
    pub water_temperature: Option<Uncertain<Temperature, TemperatureDifference>>,
    pub set_at: Option<PlaceGiven>,
    pub dive_at: Option<PlaceGiven>,
    pub loop_volume: Option<Uncertain<Volume>>,
    pub diluent: Option<Diluent>,
    pub oxygen: Option<Purity>,
    pub po2_high: Option<AbsolutePressure>,
    pub po2_low: Option<AbsolutePressure>,
    pub work: Option<StpdFlow>,
    pub judge: Option<GaugePressure>,
    pub trapped_volume: Option<Uncertain<Volume>>,
    pub despite: Option<String>,
}

impl Asked {
    fn options(&self) -> Result<SettingOptions, WorkError> {
        let water = |fresh| if fresh { Water::Fresh } else { Water::Sea };
        let despite = self.despite.as_deref().map(|text| said("--despite", text)).transpose()?;
        Ok(SettingOptions {
            first_stage: FirstStageKind::default(),
            max_depth: self.max_depth,
            ip_range: self.ip_range,
            max_ip: None,
            gauge_division: self.gauge_division,
            gauge_scale: self.gauge_scale,
            gauge_error: self.gauge_error,
            ip_spread: self.ip_spread,
            ip_repeat: self.ip_repeat,
            chance: self.chance.map(Share::as_ratio),
            shortfall: self.shortfall.map(Share::as_ratio),
            water: self.fresh_water.map(water),
            water_temperature: self.water_temperature,
            set_at: self.set_at,
            dive_at: self.dive_at,
            loop_volume: self.loop_volume,
            diluent: self.diluent,
            po2_high: self.po2_high,
            po2_low: self.po2_low,
            work: self.work,
            oxygen: self.oxygen,
            judge: self.judge,
            despite: despite.map(str::to_owned),
            meter: None,
            trapped: self.trapped_volume.map(Trapped::Volume),
            contents: None,
        })
    }
}

/// A purity that was typed; without a ± it takes that of the default.
#[must_use]
pub fn purity_of(given: Uncertain<Share>) -> Purity {
    Purity {
        fraction: given.value.as_ratio(),
        expanded: given.expanded.map_or(DEFAULT_PURITY.expanded, Share::as_ratio),
    }
}

/// What came of it.
#[derive(Debug, Clone, PartialEq)]
pub struct SettingOutcome {
    /// The setting.
    pub setting: Setting,
    /// What it was asked with, defaults not filled in.
    pub options: SettingOptions,
    /// The orifices, in order.
    pub orifices: Vec<FoundLine>,
    /// The diver.
    pub diver: String,
    /// The sessions, in words.
    pub sessions: Vec<String>,
    /// The uptake.
    pub uptake: Uptake,
    /// Why there is no uptake.
    pub uptake_why_not: Option<String>,
    /// The first stage, in words, when it is one of the register.
    pub first_stage: Option<String>,
    /// The day it holds for.
    pub on: NaiveDate,
    /// What was noticed on the way.
    pub notes: Vec<String>,
}

impl SettingOutcome {
    /// The orifices for `report`.
    #[must_use]
    pub fn named(&self) -> Vec<OrificeNamed<'_>> {
        self.orifices
            .iter()
            .map(|found| OrificeNamed { line: &found.words, run: &found.run, analysis: &found.analysis })
            .collect()
    }

    /// The same for `report`.
    #[must_use]
    pub fn reported<'a>(&'a self, orifices: &'a [OrificeNamed<'a>]) -> Reported<'a> {
        Reported {
            setting: &self.setting,
            options: &self.options,
            orifices,
            diver: Some(&self.diver),
            sessions: &self.sessions,
            uptake: Some(&self.uptake),
            uptake_why_not: self.uptake_why_not.as_deref(),
            first_stage: self.first_stage.as_deref(),
            on: self.on,
            notes: &self.notes,
        }
    }

    /// Favourable when an orifice is recommended, and nothing speaks against an IP that was to be judged.
    #[must_use]
    pub fn status(&self) -> ExitStatus {
        let orifices = self.named();
        if favourable(&self.reported(&orifices)) { ExitStatus::Done } else { ExitStatus::Unfavourable }
    }
}

/// Gathers orifices and sessions, works out the setting, draws it and writes the sheet.
///
/// # Errors
/// A file or entry that is missing or refused, a call that is wrong, a plot or sheet that cannot be written.
pub fn make_setting(request: &SettingRequest) -> Result<SettingOutcome, WorkError> {
    let kind = request.plot.as_deref().map(plot_kind).transpose()?;
    let sheet = sheet_kind(request)?;
    if request.orifices.is_empty() {
        return Err(WorkError::Setting(crate::setting::SettingError::NoOrifice));
    }
    let on = request.on.unwrap_or_else(|| clock::now().date_naive());
    let shelf = Shelf::find(request.book.as_deref()).ok();
    let mut book = LazyBook { said: request.book.as_deref(), opened: None };
    let mut notes = Vec::new();

    let mut options = request.asked.options()?;
    let mut first_stage = None;
    match &request.first_stage {
        FirstStageAsked::Uncompensated => options.first_stage = FirstStageKind::Uncompensated,
        FirstStageAsked::Compensated => options.first_stage = FirstStageKind::Compensated,
        FirstStageAsked::Registered(id) => {
            let stage = registered_stage(book.open()?, id)?;
            options = options.with_first_stage(&stage);
            first_stage = Some(stage.id.to_string());
        }
    }
    if let Some(meter) = &request.meter {
        let id = id_of(meter)?;
        let found = meter_of(book.open()?, &id)?.ok_or(WorkError::NoMeter(id))?;
        options.meter = Some(found);
    }
    let mut orifices: Vec<FoundLine> = Vec::with_capacity(request.orifices.len());
    for orifice in &request.orifices {
        let found = if names_a_file(orifice) {
            lines::from_file(Path::new(orifice), shelf.as_ref(), on)?
        } else {
            lines::from_book(book.open()?, &id_of(orifice)?, on)?
        };
        if let Some(twice) = orifices.iter().find(|other| other.input.id.same_as(&found.input.id)) {
            return Err(WorkError::OrificeTwice(twice.input.id.clone()));
        }
        notes.extend(found.notes.iter().cloned());
        orifices.push(found);
    }
    let of: Vec<String> = request.diver.iter().chain(&request.sessions).cloned().collect();
    if of.is_empty() {
        return Err(WorkError::NobodyToSetFor);
    }
    let sessions = gather(&of, request.book.as_deref(), &mut notes)?;
    let uptake = work_out(&sessions)?;
    let in_the_book = of.iter().any(|of| !names_a_file(of));
    fill_from_diver(&mut options, &uptake, &mut book, in_the_book, &mut notes)?;
    loosened(&options, &mut notes);

    let resting = uptake.lowest().map(|(_, estimate)| RestingUptake::from(estimate));
    let inputs: Vec<_> = orifices.iter().map(|found| found.input.clone()).collect();
    let setting = setting(&inputs, resting.as_ref(), &options).map_err(WorkError::Setting)?;
    let uptake_why_not = uptake_why_not(&sessions, &uptake);
    let outcome = SettingOutcome {
        setting,
        options,
        orifices,
        diver: uptake.diver.to_string(),
        sessions: sessions.iter().enumerate().map(|(i, s)| session_words(i, s, &uptake)).collect(),
        uptake,
        uptake_why_not,
        first_stage,
        on,
        notes,
    };
    if let (Some(kind), Some(path)) = (sheet, &request.sheet) {
        write_whole(path, &sheet_bytes(&outcome, kind, &request.units)?)?;
    }
    if let (Some(kind), Some(path)) = (kind, &request.plot) {
        let why_not = why_not_drawn(&outcome);
        let plot = SettingPlot { units: request.units, why_not, ..SettingPlot::default() };
        write_plot(&setting_plot(&outcome.setting, &plot), kind, path)?;
    }
    Ok(outcome)
}

/// Why there is no setting, as the plots say it.
fn why_not_drawn(outcome: &SettingOutcome) -> Option<String> {
    let named = outcome.named();
    let why_not = words::why_not(&outcome.reported(&named));
    why_not.map(|why| why.strip_prefix("no setting: ").map_or(why.clone(), str::to_owned))
}

/// What the sheet's name and the paper ask for.
fn sheet_kind(request: &SettingRequest) -> Result<Option<SheetKind>, WorkError> {
    let Some(path) = request.sheet.as_deref() else {
        return match request.paper {
            Some(_) => Err(WorkError::PaperWithoutSheet),
            None => Ok(None),
        };
    };
    let ending = path.extension().and_then(|ending| ending.to_str()).unwrap_or_default();
    if ending.eq_ignore_ascii_case("pdf") {
        let paper = match request.paper {
            None | Some(SheetPaper::A5) => Paper::A5,
            Some(SheetPaper::A4) => Paper::A4,
        };
        Ok(Some(SheetKind::Pdf(paper)))
    } else if ending.eq_ignore_ascii_case("txt") {
        if request.paper.is_some() {
            return Err(WorkError::PaperWithoutSheet);
        }
        Ok(Some(SheetKind::Text))
    } else {
        Err(WorkError::SheetKind(path.to_owned()))
    }
}

fn sheet_bytes(outcome: &SettingOutcome, kind: SheetKind, units: &Units) -> Result<Vec<u8>, WorkError> {
    let named = outcome.named();
    let reported = outcome.reported(&named);
    match kind {
        SheetKind::Text => Ok(sheet::text(&reported, units).into_bytes()),
        SheetKind::Pdf(paper) => {
            let document = certificate::sheet::document(&reported, units, why_not_drawn(outcome), paper);
            render(&document).map_err(|problems| {
                let all: Vec<String> = problems.iter().map(ToString::to_string).collect();
                WorkError::SheetNotSet(all.join("; "))
            })
        }
    }
}

/// A book that is opened when something of it is first asked for.
struct LazyBook<'a> {
    said: Option<&'a Path>,
    opened: Option<Book>,
}

impl LazyBook<'_> {
    fn open(&mut self) -> Result<&Book, WorkError> {
        match &mut self.opened {
            Some(book) => Ok(book),
            none => Ok(none.insert(Shelf::find(self.said)?.to_read()?)),
        }
    }
}

fn registered_stage(book: &Book, id: &str) -> Result<FirstStage, WorkError> {
    let id = id_of(id)?;
    let found = book.entry::<FirstStage>(&id)?.ok_or(WorkError::NoFirstStage(id))?;
    Ok(found.entry)
}

/// Loop volume and diluent that were not said: from the diver's entry where the book was asked for the diver, the volume
/// else from the last session that knew it.
fn fill_from_diver(
    options: &mut SettingOptions,
    uptake: &Uptake,
    book: &mut LazyBook<'_>,
    in_the_book: bool,
    notes: &mut Vec<String>,
) -> Result<(), WorkError> {
    let entry = if in_the_book { diver_entry(book.open()?, &uptake.diver)? } else { None };
    if let Some(entry) = entry {
        options.loop_volume = options.loop_volume.or(entry.loop_volume);
        options.diluent = options.diluent.or(entry.diluent);
    }
    if options.loop_volume.is_none()
        && let Some(volume) = volume_of_sessions(uptake)
    {
        notes.push(format!(
            "the loop volume was not stated, so that of the last session is taken for the drift of PO2: {:.1} L",
            volume.value.as_l()
        ));
        options.loop_volume = Some(volume);
    }
    Ok(())
}

/// Limits that were set looser than the method's own are said where the number is read.
fn loosened(options: &SettingOptions, notes: &mut Vec<String>) {
    if let Some(chance) = options.chance.filter(|chance| *chance > DEFAULT_CHANCE) {
        notes.push(format!(
            "the allowed chance of overfeeding was set to {:.1} %, where 2.5 % is usual: both the setting and the IP never \
             to exceed hold no more than that",
            100.0 * chance
        ));
    }
    if let Some(shortfall) = options.shortfall.filter(|shortfall| *shortfall < DEFAULT_SHORTFALL) {
        notes.push(format!(
            "the least shortfall was set to {:.2} % of the uptake, where 5 % is usual",
            100.0 * shortfall
        ));
    }
}

fn diver_entry(book: &Book, diver: &Id) -> Result<Option<Diver>, WorkError> {
    Ok(book.entry::<Diver>(diver)?.map(|found| found.entry))
}

fn volume_of_sessions(uptake: &Uptake) -> Option<Uncertain<Volume>> {
    let (place, _) = uptake.lowest()?;
    let last = place.sessions.iter().rev().find_map(|session| session.answer.as_ref().ok())?;
    let litres = |l: f64| Volume::from_m3(l * 1e-3);
    // To a tenth of a litre, which is less than anybody knows.
    let rounded = |l: f64| libm::round(10.0 * l) / 10.0;
    let volume = last.loop_volume;
    Some(Uncertain { value: litres(rounded(volume.litres)), expanded: Some(litres(2.0 * volume.u)) })
}

fn session_words(index: usize, gathered: &GatheredSession, uptake: &Uptake) -> String {
    let session = &gathered.session;
    let worked = uptake.places.iter().flat_map(|place| &place.sessions).find(|worked| worked.index == index);
    let none = if worked.is_some_and(|worked| worked.answer.is_err()) { " (no number)" } else { "" };
    format!("{} of {}, {}{none}", gathered.name, session.taken.date_naive(), session.place.name())
}

fn uptake_why_not(sessions: &[GatheredSession], uptake: &Uptake) -> Option<String> {
    let sessions = named(sessions);
    session_uptake::why_not(&session_uptake::Reported {
        uptake,
        sessions: &sessions,
        monte_carlo: &[],
        notes: &[],
    })
}
