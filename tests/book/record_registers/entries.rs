//! Entries of the registers, drawn by chance.

use chrono::NaiveDate;
use ebbline::entry::*;
use ebbline::gas::Species;
use ebbline::quantity::*;
use ebbline::record::RegisterEntry;
use proptest::prelude::*;

use super::LOGO;

fn ids() -> impl Strategy<Value = Id> {
    "[A-Za-zÄß][-A-Za-z0-9_.é]{0,8}".prop_filter_map("a name", |text| Id::new(&text).ok())
}

/// Words as they are after reading: no spaces around, nothing hidden, something there.
fn words() -> impl Strategy<Value = String> {
    "[!-~äß€][ -~äß€]{0,12}[!-~äß€]"
}

fn maybe<T: std::fmt::Debug>(some: impl Strategy<Value = T>) -> impl Strategy<Value = Option<T>> {
    proptest::option::of(some)
}

fn uncertain<T: std::fmt::Debug + Clone>(
    from: fn(f64) -> T,
    most: f64,
) -> impl Strategy<Value = Option<Uncertain<T>>> {
    maybe(
        (1e-9..most, maybe(0.0..most)).prop_map(move |(value, expanded)| Uncertain {
            value: from(value),
            expanded: expanded.map(from),
        }),
    )
}

fn orifices() -> impl Strategy<Value = RegisterEntry> {
    let builds = vec![Build::ThinPlate, Build::ShortTube, Build::Nozzle, Build::Unknown];
    let size = || maybe((1e-6..1e-2_f64).prop_map(Length::from_m));
    let texts = (maybe(words()), maybe(words()), maybe(words()), maybe(words()));
    (ids(), texts, proptest::sample::select(builds), size(), size(), maybe(ids())).prop_map(
        |(id, (description, serial, maker, customer), build, length, nominal_diameter, acceptance)| {
            RegisterEntry::Orifice(Orifice {
                id,
                description,
                serial,
                maker,
                customer,
                build,
                length,
                nominal_diameter,
                acceptance,
            })
        },
    )
}

fn first_stages() -> impl Strategy<Value = RegisterEntry> {
    let spread = || maybe((0.0..1e5_f64).prop_map(PressureDifference::from_pa));
    let volumes = (uncertain(Volume::from_m3, 1e-4), uncertain(PressureRate::from_pa_s, 1e5));
    (
        (ids(), any::<bool>(), 0.0..9e5_f64, 2e5..9e5_f64, 1.0..2e5_f64),
        (maybe(0.0..1e6_f64), maybe(1.0..1e6_f64)),
        (spread(), spread(), spread()),
        volumes,
        (maybe(words()), maybe(words())),
    )
        .prop_map(|((id, compensated, low, width, division), (scale, most), spreads, volumes, texts)| {
            let high = low + width;
            RegisterEntry::FirstStage(FirstStage {
                id,
                compensated,
                ip_range: (GaugePressure::from_pa(low), GaugePressure::from_pa(high)),
                division: PressureDifference::from_pa(division),
                gauge_scale: scale.map(|above| GaugePressure::from_pa(high + above)),
                gauge_error: spreads.0,
                ip_spread: spreads.1,
                ip_repeat: spreads.2,
                max_ip: most.map(|above| GaugePressure::from_pa(low + above)),
                trapped_volume: volumes.0,
                fall_observed: volumes.1,
                maker: texts.0,
                serial: texts.1,
            })
        })
}

fn divers() -> impl Strategy<Value = RegisterEntry> {
    let diluent = prop_oneof![
        Just(Diluent::Air),
        (1e-3..1.0_f64).prop_map(|share| Diluent::Oxygen(Share::from_ratio(share)))
    ];
    let mass = maybe((1.0..300.0_f64).prop_map(Mass::from_kg));
    (ids(), maybe(words()), mass, uncertain(Volume::from_m3, 0.02), maybe(diluent)).prop_map(
        |(id, name, mass, loop_volume, diluent)| {
            RegisterEntry::Diver(Diver { id, name, mass, loop_volume, diluent })
        },
    )
}

/// Acceptance limits with a name.
pub(crate) fn acceptances() -> impl Strategy<Value = RegisterEntry> {
    let tolerance = prop_oneof![
        (1e-4..0.5_f64).prop_map(Tolerance::Relative),
        (1e-9..1e-5_f64).prop_map(|flow| Tolerance::Flow(StpdFlow::from_m3_s(flow))),
    ];
    let share = || 1e-5..0.2_f64;
    let limits = (
        share(),
        share(),
        share(),
        share(),
        1e-4..0.4_f64,
        -1e5..0.0_f64,
        1.0..1e5_f64,
        0.1..5.0_f64,
        1e-3..1e3_f64,
    );
    let gas = maybe(proptest::sample::select(Species::ALL.to_vec()));
    let rule = proptest::sample::select(vec![Rule::Simple, Rule::Guarded]);
    (ids(), 0.0..2e6_f64, 1e-7..1e-4_f64, gas, tolerance, rule, limits).prop_map(
        |(id, ip, flow, gas, tolerance, rule, limits)| {
            let (straight, hysteresis, repeat, steady, significance, low, high, en, leak_pa_s) = limits;
            RegisterEntry::Acceptance(Acceptance {
                id: Some(id),
                ip: GaugePressure::from_pa(ip),
                flow: StpdFlow::from_m3_s(flow),
                gas,
                tolerance,
                rule,
                limits: Limits {
                    straight,
                    hysteresis,
                    repeat,
                    steady,
                    significance,
                    crossing_pa: (low, high),
                    en,
                    leak_pa_s,
                },
            })
        },
    )
}

fn shops() -> impl Strategy<Value = RegisterEntry> {
    let lines = || proptest::collection::vec(words(), 1..4).prop_map(|lines| lines.join("\n"));
    let logo = maybe(Just(Logo { file_name: "logo.svg".to_owned(), bytes: LOGO.to_vec() }));
    let pattern = maybe("[A-QT-Z]{0,3}\\{year\\}-\\{n(:[1-9])?\\}");
    let signatories = proptest::collection::vec((words(), maybe(words())), 0..3).prop_map(|people| {
        let mut signatories: Vec<Signatory> = Vec::new();
        for (name, role) in people {
            if signatories.iter().all(|other| other.name.to_lowercase() != name.to_lowercase()) {
                signatories.push(Signatory { name, role });
            }
        }
        signatories
    });
    let statements = proptest::collection::vec(words(), 0..3);
    (words(), lines(), maybe(lines()), logo, maybe("#[0-9a-fA-F]{6}"), pattern, signatories, statements)
        .prop_map(|(name, address, contact, logo, accent, number_pattern, signatories, statements)| {
            RegisterEntry::Shop(Shop {
                name,
                address,
                contact,
                logo,
                accent,
                number_pattern,
                signatories,
                statements,
            })
        })
}

fn protocols() -> impl Strategy<Value = Protocol> {
    let times = || (maybe(1e-3..10.0_f64), maybe(10.5..100.0_f64));
    let span = |s: Option<f64>| s.map(Span::from_s);
    let lines =
        (maybe("[ -~\r\n\t]{1,9}"), "[\r\n;]{1,2}", times()).prop_map(move |(ask, ends, (every, stale))| {
            let pattern = r"^\s*(?P<value>[-+.\deE]+)\s*(?P<unit>\S*)".to_owned();
            Protocol::Lines { ask, every: span(every), ends, pattern, stale_after: span(stale) }
        });
    let table = proptest::sample::select(vec![ModbusTable::Input, ModbusTable::Holding]);
    let numbers =
        vec![ModbusNumber::F32, ModbusNumber::I16, ModbusNumber::U16, ModbusNumber::I32, ModbusNumber::U32];
    let number = proptest::sample::select(numbers);
    let scale = any::<f64>().prop_filter("a number", |x| x.is_finite() && x.abs() > 0.0);
    let modbus = (1..=247_u8, table, 0..u16::MAX, number, any::<bool>(), scale, times()).prop_map(
        move |(device, table, register, number, little, scale, (every, stale))| {
            let one = matches!(number, ModbusNumber::I16 | ModbusNumber::U16);
            let word_order = if little && !one { WordOrder::Little } else { WordOrder::Big };
            let (every, stale_after) = (span(every), span(stale));
            Protocol::ModbusRtu { device, table, register, number, word_order, scale, every, stale_after }
        },
    );
    prop_oneof![lines, modbus]
}

fn papers<D: std::fmt::Debug, R: std::fmt::Debug>(
    difference: fn(f64) -> D,
    reading: fn(f64) -> R,
) -> impl Strategy<Value = Papers<D, R>> {
    let amount = move || maybe((0.0..0.1_f64).prop_map(difference));
    let noise = prop_oneof![
        (0.0..0.1_f64).prop_map(Amount::OfReading),
        (0.0..0.1_f64).prop_map(move |noise| Amount::Fixed(difference(noise))),
    ];
    let range =
        maybe((0.0..1.0_f64, 1.5..9.0_f64).prop_map(move |(low, high)| (reading(low), reading(high))));
    let day = maybe((0..20_000_i64).prop_map(|days| NaiveDate::default() + chrono::Duration::days(days)));
    (maybe(0.0..0.1_f64), amount(), maybe(noise), amount(), 0.5..4.0_f64, range, maybe(words()), day)
        .prop_map(|(gain, zero, noise, resolution, coverage, range, certificate, due)| Papers {
            gain,
            zero,
            noise,
            resolution,
            coverage,
            range,
            certificate,
            due,
        })
}

fn meters() -> impl Strategy<Value = Meter> {
    let reference = || {
        (250.0..320.0_f64, 8e4..1.2e5_f64).prop_map(|(k, pa)| ReferenceConditions {
            temperature: Temperature::from_k(k),
            pressure: AbsolutePressure::from_pa(pa),
        })
    };
    let gas = || proptest::sample::select(Species::ALL.to_vec());
    let mass = (reference(), gas()).prop_map(|(reads_at, made_for)| MeterKind::Mass {
        reads_at,
        made_for,
        gas_factor: None,
    });
    let float = (reference(), gas(), maybe(reference())).prop_map(|(reads_at, made_for, made_at)| {
        let scale = if made_at.is_some() { FloatScale::Reference } else { FloatScale::Actual };
        MeterKind::Float { reads_at, made_for, scale, made_at, gas_factor: None }
    });
    let kind = prop_oneof![
        mass,
        float,
        any::<bool>().prop_map(|wet| MeterKind::Volumetric { wet }),
        any::<bool>().prop_map(|wet| MeterKind::Timed { wet }),
    ];
    (kind, papers(IndicatedFlow::from_l_min, IndicatedFlow::from_l_min)).prop_map(|(kind, papers)| Meter {
        id: None,
        kind,
        papers,
    })
}

fn instruments() -> impl Strategy<Value = RegisterEntry> {
    let socket = prop_oneof![
        words().prop_map(Socket::Port),
        "[0-9a-fA-F]{4}:[0-9a-fA-F]{4}:[!-~]{1,9}".prop_map(Socket::Usb),
    ];
    let line = (socket, 1..=u32::MAX, maybe("8[NEO][12]"), protocols());
    let measures = vec![
        Measures::Flow,
        Measures::Pressure,
        Measures::Temperature,
        Measures::Barometer,
        Measures::Cell,
        Measures::Depth,
    ];
    let transducer = papers(PressureDifference::from_bar, GaugePressure::from_bar)
        .prop_map(|papers| Transducer { id: None, papers });
    (ids(), proptest::sample::select(measures), maybe(line), maybe(meters()), maybe(transducer)).prop_map(
        |(id, measures, line, meter, transducer)| {
            let unit = match measures {
                Measures::Flow => "mL/min",
                Measures::Pressure => "psi",
                Measures::Temperature => "°F",
                Measures::Barometer => "hPa",
                Measures::Cell => "mV",
                Measures::Depth => "ft",
            };
            let papers = match measures {
                Measures::Flow => meter.map(|m| InstrumentPapers::Meter(Meter { id: Some(id.clone()), ..m })),
                Measures::Pressure | Measures::Barometer => {
                    transducer.map(|t| InstrumentPapers::Transducer(Transducer { id: Some(id.clone()), ..t }))
                }
                _ => None,
            };
            let unit = Some(unit.to_owned());
            let (socket, baud, frame, protocol) = match line {
                Some((socket, baud, frame, protocol)) => (Some(socket), Some(baud), frame, Some(protocol)),
                None => (None, None, None, None),
            };
            RegisterEntry::Instrument(Instrument {
                id,
                measures,
                socket,
                baud,
                frame,
                unit,
                protocol,
                papers,
            })
        },
    )
}

/// An entry of any register, as it is after reading.
pub(crate) fn any_entry() -> impl Strategy<Value = RegisterEntry> {
    prop_oneof![orifices(), first_stages(), divers(), acceptances(), shops(), instruments()]
}
