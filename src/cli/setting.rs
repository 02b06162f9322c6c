//! `setting` on the terminal.

use super::arguments::{Global, Setting, SheetPaper as PaperAsked, Water};
use super::{Ended, note, say, units};
use crate::report::{setting as words, setting_json};
use crate::work::ExitStatus;
use crate::work::setting::{Asked, SettingRequest, SheetPaper, make_setting};

pub(super) fn setting(arguments: &Setting, global: &Global) -> Result<ExitStatus, Ended> {
    let units = units(global);
    let outcome = make_setting(&SettingRequest {
        orifices: arguments.orifice.clone(),
        diver: arguments.diver.clone(),
        sessions: arguments.session.clone(),
        first_stage: arguments.first_stage.clone(),
        asked: asked(arguments),
        meter: arguments.meter.clone(),
        on: arguments.on,
        book: global.book.clone(),
        plot: arguments.plot.clone(),
        sheet: arguments.sheet.clone(),
        paper: arguments.paper.map(|paper| match paper {
            PaperAsked::A5 => SheetPaper::A5,
            PaperAsked::A4 => SheetPaper::A4,
        }),
        units,
    })?;
    let named = outcome.named();
    let reported = outcome.reported(&named);
    if let Some(why) = words::why_not(&reported) {
        note(&format!("ebbline: {why}"));
    }
    for (what, path) in [("plot", &arguments.plot), ("sheet", &arguments.sheet)] {
        if let Some(path) = path {
            note(&format!("{what} written to {}", path.display()));
        }
    }
    let text = if global.json { setting_json::document(&reported) } else { words::text(&reported, &units) };
    say(&text, outcome.status())
}

fn asked(arguments: &Setting) -> Asked {
    Asked {
        max_depth: arguments.max_depth,
        ip_range: arguments.ip_range,
        gauge_division: arguments.gauge_division,
        gauge_scale: arguments.gauge_scale,
        gauge_error: arguments.gauge_error,
        ip_spread: arguments.ip_spread,
        ip_repeat: arguments.ip_repeat,
        chance: arguments.chance,
        shortfall: arguments.shortfall,
        fresh_water: arguments.water.map(|water| water == Water::Fresh),
        water_temperature: arguments.water_temperature,
        set_at: arguments.set_at,
        dive_at: arguments.dive_at,
        loop_volume: arguments.loop_volume,
        diluent: arguments.diluent,
        oxygen: arguments.oxygen,
        po2_high: arguments.po2_high,
        po2_low: arguments.po2_low,
        work: arguments.work,
        judge: arguments.ip,
        trapped_volume: arguments.trapped_volume,
        despite: arguments.despite.clone(),
    }
}
