//! The rig as it comes: the bench of an invented shop, with one line of every sort.

use super::RigError;
use super::assembled::Settings;
use super::bench::BenchSettings;
use super::gauge::Gauge;
use super::lines::{Field, LinesDevice, Speaks};
use super::modbus::{ModbusDevice, ModbusValue};
use super::port::{PortSettings, Wiring};
use crate::entry::{Amount, Id, Meter, MeterKind, ModbusNumber, ModbusTable, Papers, Transducer, WordOrder};
use crate::gas::Species;
use crate::quantity::{
    AbsolutePressure, GaugePressure, IndicatedFlow, PressureDifference, ReferenceConditions, Temperature,
};

/// What the papers of the rig's instruments go by: nobody shall take them for a calibration.
const CERTIFICATE: &str = "simulated";

impl Settings {
    /// The rig of a seed:
    ///
    /// | port | instruments | speaks |
    /// |---|---|---|
    /// | `flow` | `rig-flow` | lines by itself, five a second, with unit, ending in carriage return and line feed |
    /// | `bus` | `rig-ip`, `rig-barometer`, `rig-gas` | Modbus devices 1, 2, 3: i32 in thousandths, f32 low word first, i16 in tenths |
    /// | `cells` | `rig-cell-1` to `-3` (mV) | one line of three fields when asked by `C?` |
    /// | `depth` | `rig-depth` | lines by itself, one a second, without unit, ending in carriage return |
    ///
    /// # Errors
    /// None, but for a defect of these settings.
    pub fn standard(seed: u64) -> Result<Self, RigError> {
        let (flow, ip, barometer) = (id("rig-flow")?, id("rig-ip")?, id("rig-barometer")?);
        let (gas, depth) = (id("rig-gas")?, id("rig-depth")?);
        let cells = [id("rig-cell-1")?, id("rig-cell-2")?, id("rig-cell-3")?];
        let mut gauges = vec![
            Gauge::flow(flow.clone(), meter())?,
            Gauge::pressure(ip.clone(), transducer()),
            Gauge::barometer(barometer.clone(), barometer_papers()),
            Gauge::temperature(gas.clone()),
        ];
        // 10.1 mV in air, as a common cell.
        gauges.extend(cells.iter().map(|cell| Gauge::cell(cell.clone(), Some(48.0))));
        gauges.push(Gauge::depth(depth.clone()));
        let by_itself = |gauge: Id, unit: Option<&str>, ends: &str, every_s| {
            Wiring::Lines(LinesDevice {
                fields: vec![Field { gauge, unit: unit.map(str::to_owned) }],
                separator: ';',
                ends: ends.to_owned(),
                speaks: Speaks::ByItself { every_s },
            })
        };
        let value = |gauge: &Id, table, register, number, word_order, scale| ModbusValue {
            gauge: gauge.clone(),
            table,
            register,
            number,
            word_order,
            scale,
        };
        let devices = vec![
            ModbusDevice {
                address: 1,
                values: vec![value(&ip, ModbusTable::Input, 0, ModbusNumber::I32, WordOrder::Big, 0.001)],
            },
            ModbusDevice {
                address: 2,
                values: vec![value(
                    &barometer,
                    ModbusTable::Holding,
                    10,
                    ModbusNumber::F32,
                    WordOrder::Little,
                    1.0,
                )],
            },
            ModbusDevice {
                address: 3,
                values: vec![value(&gas, ModbusTable::Input, 4, ModbusNumber::I16, WordOrder::Big, 0.1)],
            },
        ];
        let cells = Wiring::Lines(LinesDevice {
            fields: cells.into_iter().map(|gauge| Field { gauge, unit: None }).collect(),
            separator: ';',
            ends: "\n".to_owned(),
            speaks: Speaks::WhenAsked { ask: "C?\n".to_owned(), delay_s: 0.01, every_s: 1.0 },
        });
        let port = |name: &str, baud, wiring| PortSettings {
            name: name.to_owned(),
            baud,
            frame: if name == "bus" { "8E1" } else { "8N1" }.to_owned(),
            wiring,
        };
        let ports = vec![
            port("flow", 19_200, by_itself(flow, Some("L/min"), "\r\n", 0.2)),
            port("bus", 19_200, Wiring::Bus { devices, delay_s: 0.005 }),
            port("cells", 9_600, cells),
            port("depth", 9_600, by_itself(depth, None, "\r", 1.0)),
        ];
        Ok(Self { seed, bench: BenchSettings::default(), gauges, ports, faults: Vec::new() })
    }
}

fn id(name: &str) -> Result<Id, RigError> {
    Ok(Id::new(name)?)
}

fn meter() -> Meter {
    let reads_at = ReferenceConditions {
        temperature: Temperature::from_c(20.0),
        pressure: AbsolutePressure::STANDARD_ATMOSPHERE,
    };
    Meter {
        id: None,
        kind: MeterKind::Mass { reads_at, made_for: Species::Oxygen, gas_factor: None },
        papers: Papers {
            gain: Some(0.008),
            zero: Some(IndicatedFlow::from_l_min(0.000_6)),
            noise: Some(Amount::OfReading(0.002)),
            resolution: Some(IndicatedFlow::from_l_min(0.000_1)),
            coverage: 2.0,
            range: Some((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0))),
            certificate: Some(CERTIFICATE.to_owned()),
            due: None,
        },
    }
}

fn transducer() -> Transducer {
    Transducer {
        id: None,
        papers: Papers {
            gain: Some(0.002),
            zero: Some(PressureDifference::from_bar(0.010)),
            noise: Some(Amount::Fixed(PressureDifference::from_bar(0.004))),
            resolution: Some(PressureDifference::from_bar(0.001)),
            coverage: 2.0,
            range: Some((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))),
            certificate: Some(CERTIFICATE.to_owned()),
            due: None,
        },
    }
}

fn barometer_papers() -> Transducer {
    Transducer {
        id: None,
        papers: Papers {
            gain: None,
            zero: Some(PressureDifference::from_pa(100.0)),
            noise: Some(Amount::Fixed(PressureDifference::from_pa(10.0))),
            resolution: Some(PressureDifference::from_pa(10.0)),
            coverage: 2.0,
            range: Some((GaugePressure::from_bar(0.8), GaugePressure::from_bar(1.1))),
            certificate: Some(CERTIFICATE.to_owned()),
            due: None,
        },
    }
}
