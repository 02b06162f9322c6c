//! Arbitrary values of `entry` for property tests: every text, every bit pattern of a float.

use chrono::{DateTime, FixedOffset, NaiveDate};
use proptest::collection::vec;
use proptest::option::of;
use proptest::prelude::*;

use crate::entry::*;
use crate::gas::Species;
use crate::quantity::*;

/// Every bit pattern: NaNs with their payloads, infinities, subnormals, both noughts.
pub(super) fn float() -> BoxedStrategy<f64> {
    prop_oneof![any::<u64>().prop_map(f64::from_bits), Just(-0.0), Just(f64::NAN), -1e3..1e3].boxed()
}

/// Any text: every plane of Unicode, control characters, none at all.
pub(crate) fn text() -> BoxedStrategy<String> {
    prop_oneof![vec(any::<char>(), 0..12).prop_map(String::from_iter), Just(String::new())].boxed()
}

pub(crate) fn id() -> BoxedStrategy<Id> {
    let letters = prop_oneof![
        Just("CMF-0417"),
        Just("ß_.x"),
        Just("Ω-τ"),
        Just("орифис"),
        Just("孔板"),
        Just("𐐷𐐷"),
        Just("a"),
    ];
    (letters, "[A-Za-z0-9._-]{0,20}")
        .prop_filter_map("an id", |(a, b)| Id::new(&format!("{a}{b}")).ok())
        .boxed()
}

/// A time RFC 3339 can say: its offsets are of whole minutes.
pub(super) fn time() -> BoxedStrategy<DateTime<FixedOffset>> {
    (-60_000_000_000_i64..200_000_000_000, 0..1_000_000_000_u32, -1439..1440_i32)
        .prop_map(|(seconds, nanoseconds, minutes)| {
            let offset = FixedOffset::east_opt(60 * minutes).unwrap();
            DateTime::from_timestamp(seconds, nanoseconds).unwrap().with_timezone(&offset)
        })
        .boxed()
}

fn day() -> BoxedStrategy<NaiveDate> {
    (-700_000..3_000_000_i32).prop_map(|day| NaiveDate::from_num_days_from_ce_opt(day).unwrap()).boxed()
}

fn species() -> BoxedStrategy<Species> {
    prop::sample::select(Species::ALL.to_vec()).boxed()
}

pub(super) fn uncertain<T: std::fmt::Debug + Clone + 'static, D: std::fmt::Debug + Clone + 'static>(
    value: fn(f64) -> T,
    difference: fn(f64) -> D,
) -> BoxedStrategy<Uncertain<T, D>> {
    (float(), of(float()))
        .prop_map(move |(v, d)| Uncertain { value: value(v), expanded: d.map(difference) })
        .boxed()
}

pub(super) fn influence<T: std::fmt::Debug + Clone + 'static, D: std::fmt::Debug + Clone + 'static>(
    value: fn(f64) -> T,
    difference: fn(f64) -> D,
) -> BoxedStrategy<Influence<T, D>> {
    (of(float()), of(float()))
        .prop_map(move |(v, d)| Influence { value: v.map(value), expanded: d.map(difference) })
        .boxed()
}

pub(super) fn reference() -> BoxedStrategy<ReferenceConditions> {
    (float(), float())
        .prop_map(|(t, p)| ReferenceConditions {
            temperature: Temperature::from_k(t),
            pressure: AbsolutePressure::from_pa(p),
        })
        .boxed()
}

fn papers<D, R>(difference: fn(f64) -> D, reading: fn(f64) -> R) -> BoxedStrategy<Papers<D, R>>
where
    D: std::fmt::Debug + Clone + 'static,
    R: std::fmt::Debug + Clone + 'static,
{
    let noise = prop_oneof![
        float().prop_map(Amount::OfReading),
        float().prop_map(move |amount| Amount::Fixed(difference(amount))),
    ];
    let rest = (float(), of((float(), float())), of(text()), of(day()));
    (of(float()), of(float()), of(noise), of(float()), rest)
        .prop_map(move |(gain, zero, noise, resolution, (coverage, range, certificate, due))| Papers {
            gain,
            zero: zero.map(difference),
            noise,
            resolution: resolution.map(difference),
            coverage,
            range: range.map(|(low, high)| (reading(low), reading(high))),
            certificate,
            due,
        })
        .boxed()
}

fn meter_kind() -> BoxedStrategy<MeterKind> {
    let factor = || of(uncertain(|v| v, |v| v));
    let scale = prop_oneof![Just(FloatScale::Actual), Just(FloatScale::Reference)];
    prop_oneof![
        (reference(), species(), factor()).prop_map(|(reads_at, made_for, gas_factor)| MeterKind::Mass {
            reads_at,
            made_for,
            gas_factor
        }),
        any::<bool>().prop_map(|wet| MeterKind::Volumetric { wet }),
        any::<bool>().prop_map(|wet| MeterKind::Timed { wet }),
        (reference(), species(), scale, of(reference()), factor()).prop_map(
            |(reads_at, made_for, scale, made_at, gas_factor)| MeterKind::Float {
                reads_at,
                made_for,
                scale,
                made_at,
                gas_factor,
            }
        ),
    ]
    .boxed()
}

fn meter() -> BoxedStrategy<Meter> {
    (of(id()), meter_kind(), papers(IndicatedFlow::from_l_min, IndicatedFlow::from_l_min))
        .prop_map(|(id, kind, papers)| Meter { id, kind, papers })
        .boxed()
}

fn transducer() -> BoxedStrategy<Transducer> {
    (of(id()), papers(PressureDifference::from_pa, GaugePressure::from_pa))
        .prop_map(|(id, papers)| Transducer { id, papers })
        .boxed()
}

pub(crate) fn acceptance(id: BoxedStrategy<Option<Id>>) -> BoxedStrategy<Acceptance> {
    let tolerance = prop_oneof![
        float().prop_map(Tolerance::Relative),
        float().prop_map(|flow| Tolerance::Flow(StpdFlow::from_m3_s(flow))),
    ];
    let limits = ((float(), float(), float(), float()), float(), (float(), float()), float(), float())
        .prop_map(|((straight, hysteresis, repeat, steady), significance, crossing_pa, en, leak_pa_s)| {
            Limits { straight, hysteresis, repeat, steady, significance, crossing_pa, en, leak_pa_s }
        });
    let rule = prop_oneof![Just(Rule::Simple), Just(Rule::Guarded)];
    (id, float(), float(), of(species()), tolerance, rule, limits)
        .prop_map(|(id, ip, flow, gas, tolerance, rule, limits)| Acceptance {
            id,
            ip: GaugePressure::from_pa(ip),
            flow: StpdFlow::from_m3_s(flow),
            gas,
            tolerance,
            rule,
            limits,
        })
        .boxed()
}

pub(crate) fn point() -> BoxedStrategy<PointReading> {
    let pressure = prop_oneof![
        float().prop_map(|p| Indication::Gauge(GaugePressure::from_pa(p))),
        float().prop_map(|p| Indication::Absolute(AbsolutePressure::from_pa(p))),
    ];
    let timed = (float(), float()).prop_map(|(volume, duration)| TimedVolume {
        volume: Volume::from_m3(volume),
        duration: Span::from_s(duration),
    });
    let flow = (float(), of(timed));
    let around = (of(float()), of(float()), of(float()), of(float()));
    let sweep = of(prop_oneof![Just(Sweep::Rising), Just(Sweep::Falling)]);
    (pressure, flow, of(float()), of(float()), float(), around, sweep, of(float()))
        .prop_map(|(pressure, (flow, timed), pu, fu, averaged, (t, b, mt, mp), sweep, time_s)| PointReading {
            pressure,
            flow: IndicatedFlow::from_l_min(flow),
            timed,
            pressure_scatter: pu.map(PressureDifference::from_pa),
            flow_scatter: fu.map(IndicatedFlow::from_l_min),
            averaged,
            temperature: t.map(Temperature::from_k),
            barometer: b.map(AbsolutePressure::from_pa),
            meter_temperature: mt.map(Temperature::from_k),
            meter_pressure: mp.map(AbsolutePressure::from_pa),
            sweep,
            time_s,
        })
        .boxed()
}

fn readings() -> BoxedStrategy<Readings> {
    let column = || vec(float(), 0..8);
    let series =
        (column(), column(), any::<bool>(), column(), of(column()), of(column()), of(column()), of(column()))
            .prop_map(|(time_s, pressure_pa, pressure_is_absolute, flow_l_min, t, b, mt, mp)| {
                SeriesReadings {
                    time_s,
                    pressure_pa,
                    pressure_is_absolute,
                    flow_l_min,
                    temperature_k: t,
                    barometer_pa: b,
                    meter_temperature_k: mt,
                    meter_pressure_pa: mp,
                }
            });
    prop_oneof![3 => vec(point(), 0..12).prop_map(Readings::Points), 1 => series.prop_map(Readings::Series)]
        .boxed()
}

fn conditions() -> BoxedStrategy<Conditions> {
    let meter = (
        influence(Temperature::from_k, TemperatureDifference::from_k),
        influence(AbsolutePressure::from_pa, PressureDifference::from_pa),
        influence(Temperature::from_k, TemperatureDifference::from_k),
    );
    (
        influence(Temperature::from_k, TemperatureDifference::from_k),
        influence(AbsolutePressure::from_pa, PressureDifference::from_pa),
        influence(PressureDifference::from_pa, PressureDifference::from_pa),
        influence(|v| v, |v| v),
        meter,
    )
        .prop_map(|(temperature, barometer, back_pressure, humidity, (mt, mp, wt))| Conditions {
            temperature,
            barometer,
            back_pressure,
            humidity,
            meter_temperature: mt,
            meter_pressure: mp,
            water_temperature: wt,
        })
        .boxed()
}

fn zero_and_leak() -> BoxedStrategy<ZeroAndLeak> {
    (of(float()), of(float()))
        .prop_map(|(zero, leak_pa_s)| ZeroAndLeak { zero: zero.map(IndicatedFlow::from_l_min), leak_pa_s })
        .boxed()
}

fn build() -> BoxedStrategy<Build> {
    prop::sample::select(vec![Build::ThinPlate, Build::ShortTube, Build::Nozzle, Build::Unknown]).boxed()
}

/// Any run.
pub(crate) fn run() -> BoxedStrategy<Run> {
    let purpose =
        prop::sample::select(vec![Purpose::Acceptance, Purpose::AsFound, Purpose::AsLeft, Purpose::Check]);
    let purity = of((float(), float()).prop_map(|(fraction, expanded)| Purity { fraction, expanded }));
    let left_out = vec((1..40_usize, text()).prop_map(|(point, why)| LeftOut { point, why }), 0..4);
    let head = (id(), build(), species(), purity, purpose, time(), of(text()));
    let rest = (readings(), conditions(), zero_and_leak(), zero_and_leak(), meter(), transducer());
    (head, rest, of(acceptance(of(id()).boxed())), left_out)
        .prop_map(|(head, rest, acceptance, left_out)| {
            let (orifice, build, gas, purity, purpose, taken, technician) = head;
            let (readings, conditions, before, after, meter, transducer) = rest;
            Run {
                orifice,
                build,
                gas,
                purity,
                purpose,
                taken,
                technician,
                readings,
                conditions,
                before,
                after,
                meter,
                transducer,
                acceptance,
                left_out,
            }
        })
        .boxed()
}

pub(crate) fn decision() -> BoxedStrategy<Decision> {
    let verdict = prop::sample::select(vec![
        StoredVerdict::Pass,
        StoredVerdict::Fail,
        StoredVerdict::Undecided,
        StoredVerdict::None,
    ]);
    let part =
        (text(), float(), float()).prop_map(|(source, u_l_min, dof)| StoredPart { source, u_l_min, dof });
    let against = of((1..=u32::MAX, float()).prop_map(|(run, en)| (RunNumber::new(run).unwrap(), en)));
    let flow = (any::<u32>(), species(), float(), float(), float(), float(), float(), float());
    let rest = (vec(part, 0..5), of((float(), float())), of(float()), vec(text(), 0..3), any::<u32>());
    let figures =
        (flow, rest, of(text()), of(text()), against).prop_map(|(flow, rest, meter, transducer, against)| {
            let (
                method_revision,
                gas,
                ip,
                p1_bar,
                flow_l_min,
                standard_uncertainty_l_min,
                dof,
                coverage_factor,
            ) = flow;
            let (parts, limits_l_min, conformity_probability, failed_checks, points_used) = rest;
            StoredFigures {
                method_revision,
                gas,
                ip: GaugePressure::from_pa(ip),
                p1_bar,
                flow_l_min,
                standard_uncertainty_l_min,
                dof,
                coverage_factor,
                parts,
                limits_l_min,
                conformity_probability,
                failed_checks,
                points_used,
                meter_certificate: meter,
                transducer_certificate: transducer,
                against,
            }
        });
    (verdict, figures, time(), of(text()), of(text()))
        .prop_map(|(verdict, figures, at, by, remark)| Decision { verdict, figures, at, by, remark })
        .boxed()
}

pub(crate) fn orifice() -> BoxedStrategy<Orifice> {
    let words = (of(text()), of(text()), of(text()), of(text()));
    (id(), words, build(), of(float()), of(float()), of(id()))
        .prop_map(|(id, (description, serial, maker, customer), build, length, diameter, acceptance)| {
            Orifice {
                id,
                description,
                serial,
                maker,
                customer,
                build,
                length: length.map(Length::from_m),
                nominal_diameter: diameter.map(Length::from_m),
                acceptance,
            }
        })
        .boxed()
}

pub(crate) fn first_stage() -> BoxedStrategy<FirstStage> {
    let gauge = (of(float()), of(float()), of(float()), of(float()), of(float()));
    let trapped = (
        of(uncertain(Volume::from_m3, Volume::from_m3)),
        of(uncertain(PressureRate::from_pa_s, PressureRate::from_pa_s)),
    );
    (id(), any::<bool>(), (float(), float()), float(), gauge, trapped, of(text()), of(text()))
        .prop_map(|(id, compensated, (low, high), division, gauge, trapped, maker, serial)| FirstStage {
            id,
            compensated,
            ip_range: (GaugePressure::from_pa(low), GaugePressure::from_pa(high)),
            division: PressureDifference::from_pa(division),
            gauge_scale: gauge.0.map(GaugePressure::from_pa),
            gauge_error: gauge.1.map(PressureDifference::from_pa),
            ip_spread: gauge.2.map(PressureDifference::from_pa),
            ip_repeat: gauge.3.map(PressureDifference::from_pa),
            max_ip: gauge.4.map(GaugePressure::from_pa),
            trapped_volume: trapped.0,
            fall_observed: trapped.1,
            maker,
            serial,
        })
        .boxed()
}

pub(crate) fn diver() -> BoxedStrategy<Diver> {
    let diluent =
        prop_oneof![Just(Diluent::Air), float().prop_map(|o| Diluent::Oxygen(Share::from_ratio(o)))];
    (id(), of(text()), of(float()), of(uncertain(Volume::from_m3, Volume::from_m3)), of(diluent))
        .prop_map(|(id, name, mass, loop_volume, diluent)| Diver {
            id,
            name,
            mass: mass.map(Mass::from_kg),
            loop_volume,
            diluent,
        })
        .boxed()
}

pub(crate) fn shop() -> BoxedStrategy<Shop> {
    let logo = (text(), vec(any::<u8>(), 0..40)).prop_map(|(file_name, bytes)| Logo { file_name, bytes });
    let signatory = (text(), of(text())).prop_map(|(name, role)| Signatory { name, role });
    (text(), text(), of(text()), of(logo), of(text()), of(text()), vec(signatory, 0..3), vec(text(), 0..3))
        .prop_map(|(name, address, contact, logo, accent, number_pattern, signatories, statements)| Shop {
            name,
            address,
            contact,
            logo,
            accent,
            number_pattern,
            signatories,
            statements,
        })
        .boxed()
}

pub(crate) fn instrument() -> BoxedStrategy<Instrument> {
    let measures = prop::sample::select(vec![
        Measures::Flow,
        Measures::Pressure,
        Measures::Temperature,
        Measures::Barometer,
        Measures::Cell,
        Measures::Depth,
    ]);
    let socket = prop_oneof![text().prop_map(Socket::Port), text().prop_map(Socket::Usb)];
    let span = || of(float().prop_map(Span::from_s));
    let number = prop::sample::select(vec![
        ModbusNumber::F32,
        ModbusNumber::I16,
        ModbusNumber::U16,
        ModbusNumber::I32,
        ModbusNumber::U32,
    ]);
    let table = prop_oneof![Just(ModbusTable::Input), Just(ModbusTable::Holding)];
    let order = prop_oneof![Just(WordOrder::Big), Just(WordOrder::Little)];
    let protocol = prop_oneof![
        (of(text()), span(), text(), text(), span()).prop_map(|(ask, every, ends, pattern, stale_after)| {
            Protocol::Lines { ask, every, ends, pattern, stale_after }
        }),
        (any::<u8>(), table, any::<u16>(), number, order, float(), span(), span()).prop_map(
            |(device, table, register, number, word_order, scale, every, stale_after)| Protocol::ModbusRtu {
                device,
                table,
                register,
                number,
                word_order,
                scale,
                every,
                stale_after,
            }
        ),
    ];
    let papers = prop_oneof![
        meter().prop_map(InstrumentPapers::Meter),
        transducer().prop_map(InstrumentPapers::Transducer),
    ];
    (id(), measures, of(socket), of(any::<u32>()), of(text()), of(text()), of(protocol), of(papers))
        .prop_map(|(id, measures, socket, baud, frame, unit, protocol, papers)| Instrument {
            id,
            measures,
            socket,
            baud,
            frame,
            unit,
            protocol,
            papers,
        })
        .boxed()
}
