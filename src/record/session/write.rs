//! A [`Session`] to a session file and its table of readings.
//!
//! Comes in: a session. Goes out: the text of the TOML file and of the CSV it names, which read back as an equal
//! session. The CSV holds only numbers under fixed names; what a person typed, the names of the cells too, stands in
//! the TOML. Every number has the fewest digits that come back to the last bit, in the customary unit where it does.
//! Every assumption is written, so that a file means the same when a default changes.
//!
//! Left out is what no file can say: a first reading that is not at 0 s, a moment before it between two nanoseconds, a
//! row without any reading, a value in the conditions beside a column of the same quantity or a ± without either, two
//! cells of one name, and what is refused (no injection, a make-up of nothing, a cylinder of a loop that is not topped).

use super::super::write::{Column, Toml, column, csv, number, quoted};
use super::around::{FEEDS, WATERS};
use super::events::word;
use super::moment::moment_text;
use crate::entry::{
    Assumptions, CellSignal, Cylinder, Diluent, Event, Injection, LeakTest, LineReference, Metered, Rest,
    Session, What,
};
use crate::quantity::show::{range_to_text, reference_to_text, to_text, uncertain_to_text};
use crate::quantity::{
    Length, PartialPressure, Quantity, Share, Span, StpdFlow, Temperature, Uncertain, Voltage,
};

/// Writes a session: first the session file, then the table of readings that it names `readings_name`.
#[must_use]
pub fn write_session(session: &Session, readings_name: &str) -> (String, String) {
    let mut toml = Toml::default();
    head(&mut toml, session, readings_name);
    let columns = columns(&mut toml, session);
    conditions(&mut toml, session);
    cells(&mut toml, session);
    rest(&mut toml, &session.rest);
    assumptions(&mut toml, &session.assumptions);
    if let Some(given) = &session.cylinder {
        cylinder(&mut toml, given);
    }
    for given in &session.events {
        event(&mut toml, given, session);
    }
    (toml.0, csv(&columns))
}

fn head(toml: &mut Toml, session: &Session, readings_name: &str) {
    toml.text("record", "session");
    toml.text("diver", session.diver.as_str());
    toml.quantity("mass", session.mass);
    toml.text("place", session.place.name());
    toml.text("loop", session.kept.name());
    match session.diluent {
        Diluent::Air => toml.text("diluent", "air"),
        Diluent::Oxygen(share) => toml.text("diluent", &format!("oxygen {}", to_text(share))),
    }
    toml.some("loop_volume", session.loop_volume.map(uncertain_to_text).as_deref());
    match session.leak_test {
        LeakTest::Passed => toml.text("leak_test", "passed"),
        LeakTest::Measured(leak) => toml.text("leak_test", &uncertain_to_text(leak)),
        LeakTest::NotDone => {}
    }
    flag(toml, "nose_clip", session.nose_clip);
    if let Some(purity) = session.oxygen {
        let value = Share::from_ratio(purity.fraction);
        let expanded = Some(Share::from_ratio(purity.expanded));
        toml.text("oxygen", &uncertain_to_text(Uncertain { value, expanded }));
    }
    toml.text("taken", &session.taken.to_rfc3339());
    toml.text("readings", readings_name);
    match &session.line {
        Some(LineReference::RunFile(name)) => toml.text("line", name),
        Some(LineReference::Orifice(id)) => toml.text("orifice", id.as_str()),
        None => {}
    }
}

/// `[columns]`, and the columns themselves.
fn columns(toml: &mut Toml, session: &Session) -> Vec<Column> {
    let readings = &session.readings;
    let typed = |values: &[f64], make: fn(f64) -> Length| values.iter().map(|v| make(*v)).collect();
    let time = column("time", "s", readings.time_s.iter().map(|s| Span::from_s(*s)).collect());
    let cells = readings.cells.iter().zip(1..).map(|(cell, count)| {
        let column = match &cell.signal {
            CellSignal::Bar(bar) => {
                column("cell", "bar", bar.iter().map(|p| PartialPressure::from_bar(*p)).collect())
            }
            CellSignal::Volts { readings, .. } => {
                column("cell", "mV", readings.iter().map(|v| Voltage::from_v(*v)).collect())
            }
        };
        let name = column.name.replacen("cell", &format!("cell_{count}"), 1);
        (column.named(name), cell.name.as_str())
    });
    let cells: Vec<(Column, &str)> = cells.collect();
    let depth = readings.depth_m.as_ref().map(|m| column("depth", "m", typed(m, Length::from_m)));
    let temperatures = readings.loop_temperature_k.as_ref().map(|kelvins| {
        column("loop_temperature", "°C", kelvins.iter().map(|k| Temperature::from_k(*k)).collect())
    });
    toml.table("columns");
    toml.line(time.key, &time.said(""));
    let named: Vec<String> = cells
        .iter()
        .map(|(column, name)| match *name == column.name {
            true => column.said(""),
            false => column.said(&format!(", name = {}", quoted(name))),
        })
        .collect();
    toml.line("cells", &format!("[\n    {},\n]", named.join(",\n    ")));
    for column in depth.iter().chain(&temperatures) {
        toml.line(column.key, &column.said(""));
    }
    let cells = cells.into_iter().map(|(column, _)| column);
    std::iter::once(time).chain(cells).chain(depth).chain(temperatures).collect()
}

fn conditions(toml: &mut Toml, session: &Session) {
    let given = &session.conditions;
    toml.table("conditions");
    toml.influence_in("hPa", "barometer", given.barometer);
    toml.influence("depth", given.depth);
    toml.text("water", word_of(&WATERS, &given.water));
    toml.influence("loop_temperature", given.loop_temperature);
    toml.quantity("time_on_loop", given.time_on_loop);
    flag(toml, "scrubber_warm", given.scrubber_warm);
}

fn cells(toml: &mut Toml, session: &Session) {
    let points: Vec<(f64, f64)> = session
        .readings
        .cells
        .iter()
        .filter_map(|cell| match cell.signal {
            CellSignal::Volts { in_air, in_oxygen, .. } => Some((in_air, in_oxygen)),
            CellSignal::Bar(_) => None,
        })
        .collect();
    let papers = &session.cells;
    if papers.gain.is_none() && papers.calibrated_at.is_none() && points.is_empty() {
        return;
    }
    toml.table("cells");
    toml.share("gain", papers.gain);
    if !points.is_empty() {
        let list = |volts: Vec<f64>| {
            let texts: Vec<String> =
                volts.into_iter().map(|v| quoted(&to_text(Voltage::from_v(v)))).collect();
            format!("[{}]", texts.join(", "))
        };
        toml.line("air", &list(points.iter().map(|(air, _)| *air).collect()));
        toml.line("oxygen", &list(points.iter().map(|(_, oxygen)| *oxygen).collect()));
    }
    if let Some(at) = papers.calibrated_at {
        let pairs = [
            ("barometer", to_text(at.barometer)),
            ("temperature", to_text(at.temperature)),
            ("humidity", to_text(Share::from_ratio(at.humidity))),
            ("oxygen", to_text(Share::from_ratio(at.oxygen))),
        ];
        let pairs: Vec<String> =
            pairs.iter().map(|(key, text)| format!("{key} = {}", quoted(text))).collect();
        toml.line("calibrated_at", &format!("{{ {} }}", pairs.join(", ")));
    }
}

fn rest(toml: &mut Toml, rest: &Rest) {
    if *rest == Rest::default() {
        return;
    }
    toml.table("rest");
    toml.some("posture", rest.posture.as_deref());
    toml.quantity("rested_for", rest.rested_for);
    toml.quantity("last_meal", rest.last_meal);
    toml.quantity("last_exercise", rest.last_exercise);
    toml.quantity("last_dive", rest.last_dive);
    flag(toml, "caffeine_or_nicotine", rest.caffeine_or_nicotine);
    toml.quantity("water_temperature", rest.water_temperature);
    toml.some("suit", rest.suit.as_deref());
}

fn assumptions(toml: &mut Toml, given: &Assumptions) {
    toml.table("assumptions");
    toml.quantity("dead_time", Some(given.dead_time));
    toml.quantity("warm_up", Some(given.warm_up));
    toml.share("lung_share", Some(given.lung_share));
    toml.quantity("lung_carbon_dioxide", Some(given.lung_carbon_dioxide));
    flows(toml, "washout", given.washout);
    toml.quantity("washout_time", Some(given.washout_time));
    toml.share("sealed_fraction", Some(given.sealed_fraction));
    toml.quantity("sealed_wait", Some(given.sealed_wait));
    toml.share("wander", Some(given.wander));
    toml.share("least_wander", Some(given.least_wander));
    toml.quantity("wander_time", Some(given.wander_time));
    if let Some(leak) = given.leak {
        flows(toml, "leak", leak);
    }
    toml.share("day_spread", Some(given.day_spread));
    toml.line("day_spread_weight", &number(given.day_spread_weight));
    toml.quantity("cell_limit", Some(given.cell_limit));
    toml.share("cell_faults", Some(given.cell_faults));
    toml.share("cell_gain", Some(given.cell_gain));
    toml.share("flush", Some(given.flush));
    toml.quantity("depth_drift", Some(given.depth_drift));
    toml.quantity("ip_gauge", Some(given.ip_gauge));
    toml.share("flow", Some(given.flow));
    toml.share("metered", Some(given.metered));
    let (value, expanded) = given.gas_temperature;
    toml.text("gas_temperature", &uncertain_to_text(Uncertain { value, expanded: Some(expanded) }));
    toml.share("loop_volume", Some(given.loop_volume));
    toml.quantity("mark", Some(given.mark));
    toml.quantity("average_over", Some(given.average_over));
    toml.quantity("least_usable", Some(given.least_usable));
}

/// The two ends of a flow; where they are equal, a list.
fn flows(toml: &mut Toml, key: &str, (low, high): (StpdFlow, StpdFlow)) {
    if low.si() < high.si() {
        toml.text(key, &range_to_text(low, high));
    } else {
        toml.line(key, &format!("[{}, {}]", quoted(&to_text(low)), quoted(&to_text(high))));
    }
}

fn cylinder(toml: &mut Toml, given: &Cylinder) {
    toml.table("cylinder");
    toml.text("volume", &uncertain_to_text(given.volume));
    toml.text("from", &uncertain_to_text(given.from));
    toml.text("from_temperature", &uncertain_to_text(given.from_temperature));
    toml.text("to", &uncertain_to_text(given.to));
    toml.text("to_temperature", &uncertain_to_text(given.to_temperature));
    toml.text("feeds", word_of(&FEEDS, &given.feeds));
}

fn event(toml: &mut Toml, given: &Event, session: &Session) {
    let moment = |second| moment_text(second, &session.taken);
    toml.0.push_str("\n[[events]]\n");
    toml.text("at", &moment(given.at_s));
    toml.text("what", word(&given.what));
    match given.what {
        What::Injection(Injection::Off) => toml.line("off", "true"),
        What::Injection(Injection::Flow(flow)) => toml.text("flow", &uncertain_to_text(flow)),
        What::Injection(Injection::Ip(ip)) => toml.text("ip", &uncertain_to_text(ip)),
        What::OxygenAdd(Some(amount)) | What::DiluentAdd(Some(amount)) | What::Vent(Some(amount)) => {
            metered(toml, amount);
        }
        What::OxygenAdd(None) | What::DiluentAdd(None) | What::Vent(None) | What::Stop => {}
        What::MakeUp { kept, mark } => {
            toml.some("loop", kept.map(|kept| kept.name()));
            if mark {
                toml.line("mark", "true");
            }
        }
        What::Exclude { until_s } => toml.text("until", &moment(until_s)),
    }
}

fn metered(toml: &mut Toml, amount: Metered) {
    toml.text("volume", &uncertain_to_text(amount.volume));
    toml.some("reads_at", amount.reads_at.map(reference_to_text).as_deref());
}

fn flag(toml: &mut Toml, key: &str, value: Option<bool>) {
    if let Some(value) = value {
        toml.line(key, &value.to_string());
    }
}

fn word_of<T: PartialEq>(words: &[(&'static str, T)], meaning: &T) -> &'static str {
    words.iter().find(|(_, known)| known == meaning).map_or("", |(word, _)| *word)
}
