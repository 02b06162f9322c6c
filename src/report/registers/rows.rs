//! What an entry says, key by key, in the units asked for.

use super::AnyEntry;
use crate::entry::{
    Acceptance, Amount, Diluent, Diver, FirstStage, FloatScale, Instrument, InstrumentPapers, MeterKind,
    ModbusNumber, ModbusTable, Orifice, Papers, Protocol, Rule, Shop, Socket, Tolerance, WordOrder,
};
use crate::quantity::show::{reference_to_text, to_text, uncertain_to_text};
use crate::quantity::{PressureDifference, PressureRate, Quantity, ReferenceConditions, Share, Uncertain};
use crate::report::Units;
use crate::report::number::{limit_percent, shortest};

/// Figures of a quantity shown in another unit than it was given in: more than any instrument here has.
const FIGURES: i32 = 5;

/// The rows of an entry that are not empty: a label and its text; a text of several lines has several.
pub(super) fn rows(entry: &AnyEntry, units: &Units) -> Vec<(&'static str, String)> {
    let mut rows = Rows { units, rows: Vec::new() };
    match entry {
        AnyEntry::Orifice(entry) => rows.orifice(entry),
        AnyEntry::Instrument(entry) => rows.instrument(entry),
        AnyEntry::FirstStage(entry) => rows.first_stage(entry),
        AnyEntry::Diver(entry) => rows.diver(entry),
        AnyEntry::Acceptance(entry) => rows.acceptance(entry),
        AnyEntry::Shop(entry) => rows.shop(entry),
    }
    rows.rows
}

/// A quantity as it was given, or in the unit that was asked for instead.
pub(super) fn quantity<T: Quantity>(quantity: T, units: &Units) -> String {
    let unit = units.unit(T::KIND);
    if unit == T::KIND.default_unit() {
        return to_text(quantity);
    }
    format!("{} {}", shortest(quantity.shown(unit), FIGURES), unit.symbol)
}

pub(super) fn uncertain<T: Quantity>(given: Uncertain<T, T::Difference>, units: &Units) -> String {
    if units.unit(T::KIND) == T::KIND.default_unit() {
        return uncertain_to_text(given);
    }
    match given.expanded {
        Some(expanded) => format!("{} ± {}", quantity(given.value, units), quantity(expanded, units)),
        None => quantity(given.value, units),
    }
}

pub(super) fn tolerance(tolerance: Tolerance, units: &Units) -> String {
    match tolerance {
        Tolerance::Relative(share) => format!("± {}", limit_percent(share)),
        Tolerance::Flow(flow) => format!("± {}", quantity(flow, units)),
    }
}

pub(super) fn rule(rule: Rule) -> &'static str {
    match rule {
        Rule::Simple => "simple",
        Rule::Guarded => "guarded",
    }
}

pub(super) fn diluent(diluent: Diluent) -> String {
    match diluent {
        Diluent::Air => "air".to_owned(),
        Diluent::Oxygen(share) => format!("oxygen {}", to_text(share)),
    }
}

struct Rows<'u> {
    units: &'u Units,
    rows: Vec<(&'static str, String)>,
}

impl Rows<'_> {
    fn text(&mut self, label: &'static str, text: impl Into<String>) {
        self.rows.push((label, text.into()));
    }

    fn some(&mut self, label: &'static str, text: Option<&str>) {
        if let Some(text) = text {
            self.text(label, text);
        }
    }

    fn quantity<T: Quantity>(&mut self, label: &'static str, given: Option<T>) {
        if let Some(given) = given {
            self.text(label, quantity(given, self.units));
        }
    }

    /// An expanded uncertainty or another amount on both sides.
    fn around<T: Quantity>(&mut self, label: &'static str, given: Option<T>) {
        if let Some(given) = given {
            self.text(label, format!("± {}", quantity(given, self.units)));
        }
    }

    fn uncertain<T: Quantity>(&mut self, label: &'static str, given: Option<Uncertain<T, T::Difference>>) {
        if let Some(given) = given {
            self.text(label, uncertain(given, self.units));
        }
    }

    fn range<T: Quantity>(&mut self, label: &'static str, given: Option<(T, T)>) {
        if let Some((low, high)) = given {
            self.text(label, format!("{} to {}", quantity(low, self.units), quantity(high, self.units)));
        }
    }

    fn orifice(&mut self, given: &Orifice) {
        self.some("description", given.description.as_deref());
        self.some("serial", given.serial.as_deref());
        self.some("maker", given.maker.as_deref());
        self.some("customer", given.customer.as_deref());
        self.text("build", given.build.name());
        self.quantity("length", given.length);
        self.quantity("nominal diameter", given.nominal_diameter);
        self.some("acceptance", given.acceptance.as_ref().map(|id| id.as_str()));
    }

    fn first_stage(&mut self, given: &FirstStage) {
        self.text("compensated", if given.compensated { "yes: its IP follows depth" } else { "no" });
        self.range("IP range", Some(given.ip_range));
        self.quantity("gauge division", Some(given.division));
        self.quantity("gauge scale", given.gauge_scale);
        self.around("gauge error", given.gauge_error);
        self.quantity("IP spread", given.ip_spread);
        self.around("IP repeat", given.ip_repeat);
        self.quantity("highest IP", given.max_ip);
        self.uncertain("trapped volume", given.trapped_volume);
        self.uncertain("fall observed", given.fall_observed);
        self.some("maker", given.maker.as_deref());
        self.some("serial", given.serial.as_deref());
    }

    fn diver(&mut self, given: &Diver) {
        self.some("name", given.name.as_deref());
        self.quantity("mass", given.mass);
        self.uncertain("loop volume", given.loop_volume);
        if let Some(given) = given.diluent {
            self.text("diluent", diluent(given));
        }
    }

    fn acceptance(&mut self, given: &Acceptance) {
        self.quantity("IP", Some(given.ip));
        self.quantity("flow (STPD)", Some(given.flow));
        self.some("gas", given.gas.map(|gas| gas.name()));
        self.text("tolerance", tolerance(given.tolerance, self.units));
        self.text("rule", rule(given.rule));
        let limits = &given.limits;
        self.text("straight", limit_percent(limits.straight));
        self.text("rising = falling", limit_percent(limits.hysteresis));
        self.text("repeatable", limit_percent(limits.repeat));
        self.text("steady", limit_percent(limits.steady));
        self.text("significance", shortest(limits.significance, FIGURES));
        let (low, high) = limits.crossing_pa;
        let crossing = (PressureDifference::from_pa(low), PressureDifference::from_pa(high));
        self.range("crossing", Some(crossing));
        self.text("E_n", shortest(limits.en, FIGURES));
        self.quantity("leak", Some(PressureRate::from_pa_s(limits.leak_pa_s)));
    }

    fn shop(&mut self, given: &Shop) {
        self.text("name", &given.name);
        self.text("address", &given.address);
        self.some("contact", given.contact.as_deref());
        if let Some(logo) = &given.logo {
            self.text("logo", format!("{}, {} bytes", logo.file_name, logo.bytes.len()));
        }
        self.some("accent", given.accent.as_deref());
        self.some("number pattern", given.number_pattern.as_deref());
        for signatory in &given.signatories {
            let role = signatory.role.as_ref().map(|role| format!(", {role}")).unwrap_or_default();
            self.text("signatory", format!("{}{role}", signatory.name));
        }
        for statement in &given.statements {
            self.text("statement", statement);
        }
    }

    fn instrument(&mut self, given: &Instrument) {
        self.text("measures", given.measures.name());
        match &given.socket {
            Some(Socket::Port(name)) => self.text("port", name),
            Some(Socket::Usb(device)) => self.text("USB device", device),
            None => self.text("port", "none: read by eye"),
        }
        if let Some(baud) = given.baud {
            self.text("baud", baud.to_string());
        }
        self.some("frame", given.frame.as_deref());
        self.some("unit", given.unit.as_deref());
        if let Some(given) = &given.protocol {
            self.protocol(given);
        }
        match &given.papers {
            Some(InstrumentPapers::Meter(meter)) => {
                self.meter_kind(&meter.kind);
                self.papers(&meter.papers);
            }
            Some(InstrumentPapers::Transducer(transducer)) => self.papers(&transducer.papers),
            None => self.text("papers", "none"),
        }
    }

    fn protocol(&mut self, given: &Protocol) {
        match given {
            Protocol::Lines { ask, every, ends, pattern, stale_after } => {
                self.text("protocol", "lines of text");
                self.text(
                    "asked with",
                    ask.as_ref().map_or_else(|| "nothing: it streams".to_owned(), |ask| format!("{ask:?}")),
                );
                self.text("lines end with", format!("{ends:?}"));
                self.text("pattern", pattern);
                self.quantity("every", *every);
                self.quantity("stale after", *stale_after);
            }
            Protocol::ModbusRtu {
                device,
                table,
                register,
                number,
                word_order,
                scale,
                every,
                stale_after,
            } => {
                self.text("protocol", "Modbus RTU");
                let table = match table {
                    ModbusTable::Input => "input",
                    ModbusTable::Holding => "holding",
                };
                let number = match number {
                    ModbusNumber::F32 => "f32",
                    ModbusNumber::I16 => "i16",
                    ModbusNumber::U16 => "u16",
                    ModbusNumber::I32 => "i32",
                    ModbusNumber::U32 => "u32",
                };
                let order = match word_order {
                    WordOrder::Big => "big",
                    WordOrder::Little => "little",
                };
                self.text(
                    "reads",
                    format!("device {device}, {table} register {register}, {number}, {order} word first, times {scale}"),
                );
                self.quantity("every", *every);
                self.quantity("stale after", *stale_after);
            }
        }
    }

    fn meter_kind(&mut self, kind: &MeterKind) {
        self.text("meter", kind.name());
        let factor = |given: &Option<Uncertain<f64>>| {
            given.map(|given| match given.expanded {
                Some(expanded) => format!("{} ± {} (k = 2)", given.value, shortest(expanded, FIGURES)),
                None => given.value.to_string(),
            })
        };
        match kind {
            MeterKind::Mass { reads_at, made_for, gas_factor } => {
                self.reads_at(reads_at);
                self.text("made for", made_for.name());
                self.some("gas factor", factor(gas_factor).as_deref());
            }
            MeterKind::Volumetric { wet } | MeterKind::Timed { wet } => {
                self.text("wet", if *wet { "yes" } else { "no" });
            }
            MeterKind::Float { reads_at, made_for, scale, made_at, gas_factor } => {
                self.reads_at(reads_at);
                self.text("made for", made_for.name());
                self.text(
                    "scale",
                    match scale {
                        FloatScale::Actual => "actual litres",
                        FloatScale::Reference => "reference litres",
                    },
                );
                self.some("made at", made_at.map(reference_to_text).as_deref());
                self.some("gas factor", factor(gas_factor).as_deref());
            }
        }
    }

    fn reads_at(&mut self, at: &ReferenceConditions) {
        self.text("reads at", reference_to_text(*at));
    }

    fn papers<R: Quantity>(&mut self, papers: &Papers<R::Difference, R>) {
        let share = |ratio: f64| to_text(Share::from_ratio(ratio));
        self.some("gain", papers.gain.map(|gain| format!("± {}", share(gain))).as_deref());
        self.around("zero", papers.zero);
        match papers.noise {
            Some(Amount::OfReading(ratio)) => {
                self.text("noise", format!("± {} of the reading", share(ratio)))
            }
            Some(Amount::Fixed(noise)) => self.around("noise", Some(noise)),
            None => {}
        }
        self.quantity("resolution", papers.resolution);
        self.text("coverage", format!("k = {}", shortest(papers.coverage, FIGURES)));
        self.range("range", papers.range);
        self.some("certificate", papers.certificate.as_deref());
        self.some("due", papers.due.map(|day| day.to_string()).as_deref());
    }
}
