//! Settings of every kind, each with all that a report is made of.

use chrono::NaiveDate;
use ebbline::bench::Analysis;
use ebbline::entry::{Amount, Id, Meter, MeterKind, Papers, Run};
use ebbline::gas::Species;
use ebbline::quantity::{
    AbsolutePressure, IndicatedFlow, Length, ReferenceConditions, Shown, Temperature, Uncertain, Volume,
};
use ebbline::report::setting::{OrificeNamed, Reported, text};
use ebbline::report::{Units, setting_json, sheet};
use ebbline::setting::{
    FirstStageKind, OrificeInput, RestingUptake, Setting, SettingOptions, Standing, Trapped, setting,
};
use ebbline::uptake::Uptake;
use serde_json::Value;

use crate::setting_support::*;
use crate::simulator::{Random, Scene, Trial};

/// Everything a report is made of.
pub(crate) struct Desk {
    pub(crate) setting: Setting,
    pub(crate) options: SettingOptions,
    pub(crate) lines: Vec<String>,
    pub(crate) run: Run,
    pub(crate) analysis: Analysis,
    pub(crate) diver: String,
    pub(crate) sessions: Vec<String>,
    pub(crate) uptake: Option<Uptake>,
    pub(crate) uptake_why_not: Option<String>,
    pub(crate) notes: Vec<String>,
}

impl Desk {
    pub(crate) fn new(
        orifices: &[OrificeInput],
        uptake: Option<&RestingUptake>,
        options: SettingOptions,
    ) -> Self {
        let trial = Trial::new(Scene::PLAIN, &mut Random::new(7));
        Self {
            setting: setting(orifices, uptake, &options).expect("a good call"),
            options,
            lines: vec!["run R0003 of 2026-11-12, accepted".into(); orifices.len()],
            analysis: trial.analyse_nominal(),
            run: trial.run,
            diver: "D-07".into(),
            sessions: vec!["S0001 of 2026-11-20, couch".into(), "S0002 of 2026-11-21, couch".into()],
            uptake: None,
            uptake_why_not: None,
            notes: Vec::new(),
        }
    }

    pub(crate) fn say<T>(&self, say: impl FnOnce(&Reported<'_>) -> T) -> T {
        let orifices: Vec<OrificeNamed<'_>> = self
            .lines
            .iter()
            .map(|line| OrificeNamed { line, run: &self.run, analysis: &self.analysis })
            .collect();
        say(&Reported {
            setting: &self.setting,
            options: &self.options,
            orifices: &orifices,
            diver: Some(&self.diver),
            sessions: &self.sessions,
            uptake: self.uptake.as_ref(),
            uptake_why_not: self.uptake_why_not.as_deref(),
            first_stage: Some("FS-1"),
            on: NaiveDate::from_ymd_opt(2026, 11, 22).unwrap(),
            notes: &self.notes,
        })
    }

    pub(crate) fn text(&self) -> String {
        self.say(|reported| text(reported, &Units::default()))
    }

    pub(crate) fn sheet(&self) -> String {
        self.say(|reported| sheet::text(reported, &Units::default()))
    }

    pub(crate) fn json(&self) -> Value {
        serde_json::to_value(self.say(setting_json::json)).unwrap()
    }
}

pub(crate) fn shown(units: &str) -> Units {
    Units::new(Shown::parse(units).unwrap())
}

pub(crate) fn meter() -> Meter {
    Meter {
        id: Some(Id::new("FM-01").unwrap()),
        kind: MeterKind::Mass {
            reads_at: ReferenceConditions {
                temperature: Temperature::from_c(20.0),
                pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
            },
            made_for: Species::Oxygen,
            gas_factor: None,
        },
        papers: Papers {
            gain: Some(0.008),
            zero: None,
            noise: Some(Amount::OfReading(0.002)),
            resolution: None,
            coverage: 2.0,
            range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
            certificate: None,
            due: None,
        },
    }
}

/// What a careful diver says; the rest takes its default.
pub(crate) fn careful() -> SettingOptions {
    SettingOptions {
        gauge_error: bar(0.2),
        loop_volume: Some(Uncertain { value: Volume::from_l(7.0), expanded: None }),
        water_temperature: water(12.0),
        trapped: Some(Trapped::Volume(Uncertain { value: Volume::from_l(0.015), expanded: None })),
        meter: Some(meter()),
        ..SettingOptions::default()
    }
}

pub(crate) fn recommended() -> Desk {
    Desk::new(&[orifice("CMF-0417", bench_line(0.028))], Some(&diver(0.33, 0.014, 12.0)), careful())
}

pub(crate) fn compensated() -> Desk {
    let options = SettingOptions {
        first_stage: FirstStageKind::Compensated,
        max_depth: Some(Length::from_m(20.0)),
        ..careful()
    };
    Desk::new(&[orifice("CMF-0417", bench_line(0.028))], Some(&diver(0.33, 0.014, 12.0)), options)
}

/// A hole too large: even the lowest measured pressure feeds too much.
pub(crate) fn refused() -> Desk {
    let uptake = diver(0.33, 0.014, 12.0);
    let options = SettingOptions { despite: Some("the other one is away".into()), ..careful() };
    let too_large = OrificeInput { standing: Standing::Failed, ..orifice("CMF-0417", bench_line(0.12)) };
    Desk::new(&[too_large], Some(&uptake), options)
}

pub(crate) fn judged(ip_bar: f64) -> Desk {
    let options = SettingOptions { judge: Some(gauge(ip_bar)), ..careful() };
    Desk::new(&[orifice("CMF-0417", bench_line(0.028))], Some(&diver(0.33, 0.014, 12.0)), options)
}

pub(crate) fn without_uptake() -> Desk {
    let mut desk = Desk::new(&[orifice("CMF-0417", bench_line(0.028))], None, careful());
    desk.uptake_why_not = Some("fewer than two cells agree".into());
    desk
}

pub(crate) fn two_orifices() -> Desk {
    let options = SettingOptions { ip_range: Some((gauge(8.0), gauge(11.0))), ..careful() };
    let orifices = [
        orifice("CMF-0417", bench_line(0.028)),
        OrificeInput { standing: Standing::NeverJudged, ..orifice("CMF-0502", bench_line(0.12)) },
    ];
    Desk::new(&orifices, Some(&diver(0.33, 0.014, 12.0)), options)
}

pub(crate) fn all_desks() -> Vec<(&'static str, Desk)> {
    vec![
        ("recommended", recommended()),
        ("compensated", compensated()),
        ("refused", refused()),
        ("judged well", judged(9.2)),
        ("judged badly", judged(10.6)),
        ("without uptake", without_uptake()),
        ("two orifices", two_orifices()),
    ]
}

pub(crate) fn columns(line: &str) -> usize {
    line.chars().count()
}

#[track_caller]
pub(crate) fn holds(text: &str, needles: &[&str]) {
    for needle in needles {
        assert!(text.contains(needle), "{needle:?} is not in: {text}");
    }
}
