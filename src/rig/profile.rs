//! The instruments of the rig as entries of the register.

use super::assembled::Rig;
use super::gauge::AtWork;
use super::lines::Speaks;
use super::port::Wiring;
use crate::entry::{Instrument, Protocol, Socket};
use crate::quantity::Span;

/// How often a device on a bus is asked.
const BUS_EVERY_S: f64 = 0.2;
/// A reading this old is stale, or ten intervals old where those are longer.
const STALE_AFTER_S: f64 = 2.0;

impl Rig {
    /// Every instrument, in the order of the settings, as `record::write_register` writes it. The port is the one it is
    /// found at just now, or the name of the port in the settings while it is served nowhere.
    #[must_use]
    pub fn profiles(&self) -> Vec<Instrument> {
        let all = self.gauges.iter().enumerate();
        all.filter_map(|(number, at_work)| self.profile(number, at_work)).collect()
    }

    fn profile(&self, number: usize, at_work: &AtWork) -> Option<Instrument> {
        let (port, speaker, place) = self.ports.iter().enumerate().find_map(|(port, at)| {
            at.speakers.iter().enumerate().find_map(|(speaker, s)| {
                Some((port, speaker, s.gauges.iter().position(|gauge| *gauge == number)?))
            })
        })?;
        let settings = &self.ports.get(port)?.settings;
        let stale = |every_s: f64| Some(Span::from_s(STALE_AFTER_S.max(10.0 * every_s)));
        let protocol = match &settings.wiring {
            Wiring::Lines(device) => {
                let (ask, asked_s, every_s) = match &device.speaks {
                    Speaks::ByItself { every_s } => (None, None, *every_s),
                    Speaks::WhenAsked { ask, every_s, .. } => {
                        (Some(ask.clone()), Some(Span::from_s(*every_s)), *every_s)
                    }
                };
                Protocol::Lines {
                    ask,
                    every: asked_s,
                    ends: device.ends.clone(),
                    pattern: device.pattern(place),
                    stale_after: stale(every_s),
                }
            }
            Wiring::Bus { devices, .. } => {
                let device = devices.get(speaker)?;
                let value = device.values.get(place)?;
                Protocol::ModbusRtu {
                    device: device.address,
                    table: value.table,
                    register: value.register,
                    number: value.number,
                    word_order: value.word_order,
                    scale: value.scale,
                    every: Some(Span::from_s(BUS_EVERY_S)),
                    stale_after: stale(BUS_EVERY_S),
                }
            }
        };
        let gauge = &at_work.gauge;
        let found_at = self.found_at.get(port).cloned().flatten();
        Some(Instrument {
            id: gauge.id.clone(),
            measures: gauge.source.measures(),
            socket: Some(Socket::Port(found_at.unwrap_or_else(|| settings.name.clone()))),
            baud: Some(settings.baud),
            frame: Some(settings.frame.clone()),
            unit: Some(gauge.unit.symbol.to_owned()),
            protocol: Some(protocol),
            papers: gauge.papers.clone(),
        })
    }
}
