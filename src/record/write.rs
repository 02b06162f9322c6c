//! A [`Run`] to a run file and its table of readings.
//!
//! Comes in: a run. Goes out: the text of the TOML file and of the CSV it names, which read back as an equal run. The
//! CSV holds only numbers and the words of the sweep; what a person typed stands in the TOML. Every number has the
//! fewest digits that come back to the last bit, in the customary unit of its column where all of them do, else in
//! the SI unit.
//!
//! Left out is what no file can say: a quantity that only some points have (its column is then not written), a first
//! reading that is not at 0 s, a value in the conditions beside a column of the same quantity, a series of a timed meter.

use std::fmt::Write;

use super::instruments::COVERAGE;
use crate::entry::{
    Acceptance, Amount, Build, FloatScale, Indication, Influence, Meter, MeterKind, Papers, PointReading,
    Readings, Rule, Run, SeriesReadings, Sweep, Tolerance, Transducer, ZeroAndLeak,
};
use crate::quantity::show::{range_to_text, reference_to_text, to_text, uncertain_to_text};
use crate::quantity::unit::{self, Unit};
use crate::quantity::{
    AbsolutePressure, IndicatedFlow, PressureDifference, PressureRate, Quantity, Share, Span, Temperature,
    Uncertain,
};

/// Writes a run: first the run file, then the table of readings that it names `readings_name`.
#[must_use]
pub fn write_run(run: &Run, readings_name: &str) -> (String, String) {
    let (columns, rows) = match &run.readings {
        Readings::Points(points) => (of_points(points), "points"),
        Readings::Series(series) => (of_series(series), "series"),
    };
    let mut toml = Toml::default();
    toml.text("record", "bench run");
    toml.text("orifice", run.orifice.as_str());
    if run.build != Build::Unknown {
        toml.text("build", run.build.name());
    }
    toml.text("gas", run.gas.name());
    if let Some(purity) = run.purity {
        let value = Share::from_ratio(purity.fraction);
        let expanded = Some(Share::from_ratio(purity.expanded));
        toml.text("oxygen", &uncertain_to_text(Uncertain { value, expanded }));
    }
    toml.text("purpose", run.purpose.name());
    toml.text("taken", &run.taken.to_rfc3339());
    toml.some("technician", run.technician.as_deref());
    toml.text("readings", readings_name);
    toml.text("rows", rows);
    toml.table("columns");
    for column in &columns {
        toml.line(column.key, &column.said(if column.absolute { ", absolute = true" } else { "" }));
    }
    conditions(&mut toml, run);
    zero_and_leak(&mut toml, "before", run.before);
    zero_and_leak(&mut toml, "after", run.after);
    meter(&mut toml, &run.meter);
    transducer(&mut toml, &run.transducer);
    if let Some(limits) = &run.acceptance {
        acceptance(&mut toml, limits);
    }
    for left_out in &run.left_out {
        toml.0.push_str("\n[[leave_out]]\n");
        toml.line("point", &left_out.point.to_string());
        toml.text("why", &left_out.why);
    }
    (toml.0, csv(&columns))
}

/// The lines of a TOML file.
#[derive(Default)]
pub(super) struct Toml(pub(super) String);

impl Toml {
    pub(super) fn table(&mut self, name: &str) {
        self.0.push_str(&format!("\n[{name}]\n"));
    }

    pub(super) fn line(&mut self, key: &str, value: &str) {
        self.0.push_str(&format!("{key} = {value}\n"));
    }

    pub(super) fn text(&mut self, key: &str, value: &str) {
        self.line(key, &quoted(value));
    }

    pub(super) fn some(&mut self, key: &str, value: Option<&str>) {
        if let Some(value) = value {
            self.text(key, value);
        }
    }

    pub(super) fn quantity<T: Quantity>(&mut self, key: &str, value: Option<T>) {
        self.some(key, value.map(to_text).as_deref());
    }

    pub(super) fn share(&mut self, key: &str, ratio: Option<f64>) {
        self.quantity(key, ratio.map(Share::from_ratio));
    }

    /// As [`Toml::influence`], in a customary unit where value and ± both come back in it.
    pub(super) fn influence_in<T: Quantity>(
        &mut self,
        customary: &str,
        key: &str,
        given: Influence<T, T::Difference>,
    ) {
        let text = |value: Option<T>| {
            let unit = unit::lookup(T::KIND, customary).ok()?;
            let value = value.map(|v| cell(v, unit)).unwrap_or_else(|| Some(String::new()))?;
            let expanded = match given.expanded {
                Some(d) => {
                    let unit = unit::lookup(<T::Difference as Quantity>::KIND, customary).ok()?;
                    format!("± {} {customary}", cell(d, unit)?)
                }
                None => String::new(),
            };
            let value = if value.is_empty() { value } else { format!("{value} {customary}") };
            Some([value, expanded].into_iter().filter(|part| !part.is_empty()).collect::<Vec<_>>().join(" "))
        };
        match text(given.value).filter(|text| !text.is_empty()) {
            Some(text) => self.text(key, &text),
            None => self.influence(key, given),
        }
    }

    pub(super) fn influence<T: Quantity>(&mut self, key: &str, given: Influence<T, T::Difference>) {
        let text = match (given.value, given.expanded) {
            (Some(value), expanded) => uncertain_to_text(Uncertain { value, expanded }),
            (None, Some(expanded)) => format!("± {}", to_text(expanded)),
            (None, None) => return,
        };
        self.text(key, &text);
    }
}

/// A text as a TOML basic string (TOML 1.0, "String").
pub(super) fn quoted(text: &str) -> String {
    let mut quoted = String::from("\"");
    for c in text.chars() {
        match c {
            '"' | '\\' => quoted.extend(['\\', c]),
            '\n' => quoted.push_str("\\n"),
            '\r' => quoted.push_str("\\r"),
            '\t' => quoted.push_str("\\t"),
            _ if c.is_control() => quoted.push_str(&format!("\\u{:04X}", u32::from(c))),
            _ => quoted.push(c),
        }
    }
    quoted.push('"');
    quoted
}

fn conditions(toml: &mut Toml, run: &Run) {
    let given = &run.conditions;
    toml.table("conditions");
    toml.influence("temperature", given.temperature);
    toml.influence_in("hPa", "barometer", given.barometer);
    toml.influence("back_pressure", given.back_pressure);
    let humidity = Influence {
        value: given.humidity.value.map(Share::from_ratio),
        expanded: given.humidity.expanded.map(Share::from_ratio),
    };
    toml.influence("humidity", humidity);
    toml.influence("meter_temperature", given.meter_temperature);
    toml.influence_in("hPa", "meter_pressure", given.meter_pressure);
    toml.influence("water_temperature", given.water_temperature);
}

fn zero_and_leak(toml: &mut Toml, name: &str, given: ZeroAndLeak) {
    if given != ZeroAndLeak::default() {
        toml.table(name);
        toml.quantity("zero", given.zero);
        toml.quantity("leak", given.leak_pa_s.map(PressureRate::from_pa_s));
    }
}

/// `[meter]`.
pub(super) fn meter(toml: &mut Toml, meter: &Meter) {
    toml.table("meter");
    toml.some("id", meter.id.as_ref().map(|id| id.as_str()));
    toml.text("kind", meter.kind.name());
    let factor = |toml: &mut Toml, given: &Option<Uncertain<f64>>| match given {
        Some(Uncertain { value, expanded: Some(expanded) }) => {
            let stated = at_coverage(*expanded, meter.papers.coverage);
            toml.text("gas_factor", &format!("{} ± {}", digits(*value), digits(stated)));
        }
        Some(Uncertain { value, expanded: None }) => toml.line("gas_factor", &number(*value)),
        None => {}
    };
    match &meter.kind {
        MeterKind::Mass { reads_at, made_for, gas_factor } => {
            toml.text("reads_at", &reference_to_text(*reads_at));
            toml.text("made_for", made_for.name());
            factor(toml, gas_factor);
        }
        MeterKind::Volumetric { wet } | MeterKind::Timed { wet } => toml.line("wet", &wet.to_string()),
        MeterKind::Float { reads_at, made_for, scale, made_at, gas_factor } => {
            toml.text("reads_at", &reference_to_text(*reads_at));
            toml.text("made_for", made_for.name());
            toml.text(
                "scale",
                match scale {
                    FloatScale::Actual => "actual",
                    FloatScale::Reference => "reference",
                },
            );
            toml.some("made_at", made_at.map(reference_to_text).as_deref());
            factor(toml, gas_factor);
        }
    }
    papers(toml, &meter.papers);
}

/// An expanded uncertainty at k = 2 as a table with another coverage factor states it.
fn at_coverage(expanded: f64, coverage: f64) -> f64 {
    let to_k2 = COVERAGE / coverage;
    let near = expanded / to_k2;
    let (up, down) = (near.next_up(), near.next_down());
    let comes_back = |stated: &f64| (stated * to_k2).to_bits() == expanded.to_bits();
    [near, up, down, up.next_up(), down.next_down()].into_iter().find(comes_back).unwrap_or(near)
}

/// `[transducer]`.
pub(super) fn transducer(toml: &mut Toml, transducer: &Transducer) {
    toml.table("transducer");
    toml.some("id", transducer.id.as_ref().map(|id| id.as_str()));
    papers(toml, &transducer.papers);
}

fn papers<R: Quantity>(toml: &mut Toml, papers: &Papers<R::Difference, R>) {
    toml.share("gain", papers.gain);
    toml.quantity("zero", papers.zero);
    match papers.noise {
        Some(Amount::OfReading(share)) => toml.share("noise", Some(share)),
        Some(Amount::Fixed(noise)) => toml.quantity("noise", Some(noise)),
        None => {}
    }
    toml.quantity("resolution", papers.resolution);
    toml.line("coverage", &number(papers.coverage));
    toml.some("range", papers.range.map(|(low, high)| range_to_text(low, high)).as_deref());
    toml.some("certificate", papers.certificate.as_deref());
    toml.some("due", papers.due.map(|day| day.to_string()).as_deref());
}

fn acceptance(toml: &mut Toml, given: &Acceptance) {
    toml.table("acceptance");
    limits(toml, given);
}

/// The keys of `[acceptance]`, and of the register's file.
pub(super) fn limits(toml: &mut Toml, given: &Acceptance) {
    toml.some("id", given.id.as_ref().map(|id| id.as_str()));
    toml.quantity("ip", Some(given.ip));
    toml.quantity("flow", Some(given.flow));
    toml.some("gas", given.gas.map(|gas| gas.name()));
    match given.tolerance {
        Tolerance::Relative(share) => toml.share("tolerance", Some(share)),
        Tolerance::Flow(flow) => toml.quantity("tolerance", Some(flow)),
    }
    toml.text(
        "rule",
        match given.rule {
            Rule::Simple => "simple",
            Rule::Guarded => "guarded",
        },
    );
    let limits = &given.limits;
    toml.share("straight", Some(limits.straight));
    toml.share("hysteresis", Some(limits.hysteresis));
    toml.share("repeat", Some(limits.repeat));
    toml.share("steady", Some(limits.steady));
    toml.line("significance", &number(limits.significance));
    let (low, high) = limits.crossing_pa;
    toml.text(
        "crossing",
        &range_to_text(PressureDifference::from_pa(low), PressureDifference::from_pa(high)),
    );
    toml.line("en", &number(limits.en));
    toml.quantity("leak", Some(PressureRate::from_pa_s(limits.leak_pa_s)));
}

/// A column of the table: its key in `[columns]`, its head, and its cells.
pub(super) struct Column {
    pub(super) key: &'static str,
    pub(super) name: String,
    unit: Option<Unit>,
    absolute: bool,
    cells: Vec<String>,
}

impl Column {
    /// The same column under another name.
    pub(super) fn named(self, name: String) -> Self {
        Self { name, ..self }
    }

    /// The table that stands for it in `[columns]`, with `more` keys at its end.
    pub(super) fn said(&self, more: &str) -> String {
        let unit = self.unit.map_or_else(String::new, |unit| format!(", unit = {}", quoted(unit.symbol)));
        format!("{{ column = {}{unit}{more} }}", quoted(&self.name))
    }
}

fn of_points(points: &[PointReading]) -> Vec<Column> {
    let absolute = points.iter().any(|point| matches!(point.pressure, Indication::Absolute(_)));
    let timed = points.iter().all(|point| point.timed.is_some());
    let means = points.iter().any(|point| point.averaged.to_bits() != 1_f64.to_bits());
    let sweeps = points.iter().any(|point| point.sweep.is_some()).then(|| Column {
        key: "sweep",
        name: "sweep".to_owned(),
        unit: None,
        absolute: false,
        cells: points.iter().map(|point| sweep_word(point.sweep).to_owned()).collect(),
    });
    let pressure = |point: &PointReading| Some(PressureDifference::from_pa(point.pressure.shown_pa()));
    let counts = means.then(|| Column {
        key: "averaged",
        name: "averaged".to_owned(),
        unit: None,
        absolute: false,
        cells: points.iter().map(|point| digits(point.averaged)).collect(),
    });
    [
        each(points, "time", "s", |point| point.time_s.map(Span::from_s)),
        sweeps,
        each(points, "pressure", "bar", pressure).map(|column| Column { absolute, ..column }),
        each(points, "flow", "L/min", |point| Some(point.flow)).filter(|_| !timed),
        each(points, "volume", "L", |point| point.timed.map(|t| t.volume)),
        each(points, "duration", "s", |point| point.timed.map(|t| t.duration)),
        each(points, "temperature", "°C", |point| point.temperature),
        each(points, "barometer", "hPa", |point| point.barometer),
        each(points, "meter_temperature", "°C", |point| point.meter_temperature),
        each(points, "meter_pressure", "hPa", |point| point.meter_pressure),
        each(points, "pressure_scatter", "bar", |point| point.pressure_scatter),
        each(points, "flow_scatter", "L/min", |point| point.flow_scatter),
        counts,
    ]
    .into_iter()
    .flatten()
    .collect()
}

fn of_series(series: &SeriesReadings) -> Vec<Column> {
    let absolute = series.pressure_is_absolute;
    let some = |values: &Option<Vec<f64>>, key, unit, make: fn(f64) -> AbsolutePressure| {
        values.as_ref().map(|values| column(key, unit, values.iter().map(|v| make(*v)).collect()))
    };
    let temperature = |values: &Option<Vec<f64>>, key| {
        values.as_ref().map(|k| column(key, "°C", k.iter().map(|k| Temperature::from_k(*k)).collect()))
    };
    let pressure = series.pressure_pa.iter().map(|pa| PressureDifference::from_pa(*pa)).collect();
    let flow = series.flow_l_min.iter().map(|l_min| IndicatedFlow::from_l_min(*l_min)).collect();
    [
        Some(column("time", "s", series.time_s.iter().map(|s| Span::from_s(*s)).collect())),
        Some(Column { absolute, ..column("pressure", "bar", pressure) }),
        Some(column("flow", "L/min", flow)),
        temperature(&series.temperature_k, "temperature"),
        some(&series.barometer_pa, "barometer", "hPa", AbsolutePressure::from_pa),
        temperature(&series.meter_temperature_k, "meter_temperature"),
        some(&series.meter_pressure_pa, "meter_pressure", "hPa", AbsolutePressure::from_pa),
    ]
    .into_iter()
    .flatten()
    .collect()
}

/// The column of a quantity that every point has; none when one lacks it.
fn each<T: Quantity>(
    points: &[PointReading],
    key: &'static str,
    unit: &str,
    take: impl Fn(&PointReading) -> Option<T>,
) -> Option<Column> {
    points.iter().map(take).collect::<Option<Vec<T>>>().map(|values| column(key, unit, values))
}

/// A column in the customary unit, where each of its numbers comes back in it, else in the SI unit.
pub(super) fn column<T: Quantity>(key: &'static str, customary: &str, values: Vec<T>) -> Column {
    let customary = unit::lookup(T::KIND, customary).unwrap_or_else(|_| T::KIND.default_unit());
    let in_unit = |unit: Unit| values.iter().map(|value| cell(*value, unit)).collect::<Option<Vec<String>>>();
    let (unit, cells) = match in_unit(customary) {
        Some(cells) => (customary, cells),
        None => {
            let si = T::KIND.si_unit();
            let plain = |value: &T| cell(*value, si).unwrap_or_else(|| digits(value.shown(si)));
            (si, values.iter().map(plain).collect())
        }
    };
    let name = format!("{key}_{}", suffix(unit.symbol));
    Column { key, name, unit: Some(unit), absolute: false, cells }
}

/// The shortest number that comes back as the same quantity; none when the unit has no such number, empty for a
/// missing reading.
fn cell<T: Quantity>(value: T, unit: Unit) -> Option<String> {
    if value.si().is_nan() {
        return Some(String::new());
    }
    let shown = value.shown(unit);
    // The fewest significant digits first: a temperature in °C has more doubles than in K, so the double nearest to
    // what is shown (20.800000000000011) is seldom the one that was read. Then the neighbours, one step of which the
    // factor of a unit may cost.
    let rounded = (0..=16).filter_map(|decimals| format!("{shown:.decimals$e}").parse().ok());
    let (up, down) = (shown.next_up(), shown.next_down());
    rounded
        .chain([shown, up, down, up.next_up(), down.next_down()])
        .find(|number: &f64| number.is_finite() && T::from_shown(*number, unit) == value)
        .map(digits)
}

/// A unit as the end of a column's name.
fn suffix(symbol: &str) -> String {
    let plain = symbol.replace('/', "_").replace('°', "");
    plain.to_lowercase()
}

fn sweep_word(sweep: Option<Sweep>) -> &'static str {
    match sweep {
        Some(Sweep::Rising) => "rising",
        Some(Sweep::Falling) => "falling",
        None => "",
    }
}

/// The shortest digits that are this double, with an exponent where zeros would have to be counted.
fn digits(x: f64) -> String {
    if x == 0.0 || (1e-5..1e15).contains(&x.abs()) { format!("{x}") } else { format!("{x:e}") }
}

/// A TOML number: an integer where it is a small one, else a float.
pub(super) fn number(x: f64) -> String {
    if x.fract() == 0.0 && x.abs() < 1e15 { format!("{x}") } else { format!("{x:?}") }
}

pub(super) fn csv(columns: &[Column]) -> String {
    let mut text = columns.iter().map(|column| column.name.as_str()).collect::<Vec<_>>().join(",");
    text.push('\n');
    let rows = columns.iter().map(|column| column.cells.len()).max().unwrap_or(0);
    for row in 0..rows {
        for (index, column) in columns.iter().enumerate() {
            let comma = if index == 0 { "" } else { "," };
            let cell = column.cells.get(row).map_or("", String::as_str);
            // Writing to a text cannot fail.
            let _ = write!(text, "{comma}{cell}");
        }
        text.push('\n');
    }
    text
}
