//! Arbitrary sessions for property tests: every text, every bit pattern of a float, columns of any length.

use proptest::collection::vec;
use proptest::option::of;
use proptest::prelude::*;

use super::strategy::{float, id, influence, reference, text, time, uncertain};
use crate::entry::*;
use crate::gas::Water;
use crate::quantity::*;

fn column() -> BoxedStrategy<Vec<f64>> {
    vec(float(), 0..8).boxed()
}

fn flow() -> BoxedStrategy<StpdFlow> {
    float().prop_map(StpdFlow::from_m3_s).boxed()
}

fn span() -> BoxedStrategy<Option<Span>> {
    of(float().prop_map(Span::from_s)).boxed()
}

fn kept() -> BoxedStrategy<LoopKept> {
    prop::sample::select(vec![LoopKept::Sealed, LoopKept::Held, LoopKept::Topped]).boxed()
}

fn readings() -> BoxedStrategy<SessionReadings> {
    let signal = prop_oneof![
        column().prop_map(CellSignal::Bar),
        (column(), float(), float()).prop_map(|(readings, in_air, in_oxygen)| CellSignal::Volts {
            readings,
            in_air,
            in_oxygen
        }),
    ];
    let cell = (text(), signal).prop_map(|(name, signal)| CellReadings { name, signal });
    (column(), vec(cell, 0..5), of(column()), of(column()))
        .prop_map(|(time_s, cells, depth_m, loop_temperature_k)| SessionReadings {
            time_s,
            cells,
            depth_m,
            loop_temperature_k,
        })
        .boxed()
}

/// The same columns without their numbers.
pub(crate) fn emptied(readings: &SessionReadings) -> SessionReadings {
    let mut emptied = readings.clone();
    emptied.time_s.clear();
    for cell in &mut emptied.cells {
        match &mut cell.signal {
            CellSignal::Bar(readings) | CellSignal::Volts { readings, .. } => readings.clear(),
        }
    }
    for column in emptied.depth_m.iter_mut().chain(&mut emptied.loop_temperature_k) {
        column.clear();
    }
    emptied
}

fn conditions() -> BoxedStrategy<SessionConditions> {
    let water = prop_oneof![Just(Water::Sea), Just(Water::Fresh)];
    (
        influence(AbsolutePressure::from_pa, PressureDifference::from_pa),
        influence(Length::from_m, Length::from_m),
        water,
        influence(Temperature::from_k, TemperatureDifference::from_k),
        span(),
        of(any::<bool>()),
    )
        .prop_map(|(barometer, depth, water, loop_temperature, time_on_loop, scrubber_warm)| {
            SessionConditions { barometer, depth, water, loop_temperature, time_on_loop, scrubber_warm }
        })
        .boxed()
}

fn cells() -> BoxedStrategy<CellPapers> {
    let at = (float(), float(), float(), float()).prop_map(|(b, t, humidity, oxygen)| CalibratedAt {
        barometer: AbsolutePressure::from_pa(b),
        temperature: Temperature::from_k(t),
        humidity,
        oxygen,
    });
    (of(float()), of(at)).prop_map(|(gain, calibrated_at)| CellPapers { gain, calibrated_at }).boxed()
}

fn rest() -> BoxedStrategy<Rest> {
    (of(text()), [span(), span(), span(), span()], of(any::<bool>()), of(float()), of(text()))
        .prop_map(|(posture, spans, caffeine_or_nicotine, water, suit)| {
            let [rested_for, last_meal, last_exercise, last_dive] = spans;
            Rest {
                posture,
                rested_for,
                last_meal,
                last_exercise,
                last_dive,
                caffeine_or_nicotine,
                water_temperature: water.map(Temperature::from_k),
                suit,
            }
        })
        .boxed()
}

fn event() -> BoxedStrategy<Event> {
    let metered = || {
        of((uncertain(Volume::from_m3, Volume::from_m3), of(reference()))
            .prop_map(|(volume, reads_at)| Metered { volume, reads_at }))
    };
    let injection = prop_oneof![
        Just(Injection::Off),
        uncertain(StpdFlow::from_m3_s, StpdFlow::from_m3_s).prop_map(Injection::Flow),
        uncertain(GaugePressure::from_pa, PressureDifference::from_pa).prop_map(Injection::Ip),
    ];
    let what = prop_oneof![
        injection.prop_map(What::Injection),
        metered().prop_map(What::OxygenAdd),
        metered().prop_map(What::DiluentAdd),
        metered().prop_map(What::Vent),
        (of(kept()), any::<bool>()).prop_map(|(kept, mark)| What::MakeUp { kept, mark }),
        float().prop_map(|until_s| What::Exclude { until_s }),
        Just(What::Stop),
    ];
    (float(), what).prop_map(|(at_s, what)| Event { at_s, what }).boxed()
}

fn cylinder() -> BoxedStrategy<Cylinder> {
    let contents = || uncertain(GaugePressure::from_pa, PressureDifference::from_pa);
    let warm = || uncertain(Temperature::from_k, TemperatureDifference::from_k);
    let feeds = prop_oneof![Just(Feeds::All), Just(Feeds::Adds)];
    (uncertain(Volume::from_m3, Volume::from_m3), contents(), warm(), contents(), warm(), feeds)
        .prop_map(|(volume, from, from_temperature, to, to_temperature, feeds)| Cylinder {
            volume,
            from,
            from_temperature,
            to,
            to_temperature,
            feeds,
        })
        .boxed()
}

/// Every assumption another number.
fn assumptions() -> BoxedStrategy<Assumptions> {
    let flows = || (flow(), flow());
    (vec(float(), 26), flows(), of(flows()))
        .prop_map(|(numbers, washout, leak)| {
            let mut numbers = numbers.into_iter();
            let mut next = || numbers.next().unwrap_or_default();
            Assumptions {
                dead_time: Span::from_s(next()),
                warm_up: Span::from_s(next()),
                lung_share: next(),
                lung_carbon_dioxide: PressureDifference::from_pa(next()),
                washout,
                washout_time: Span::from_s(next()),
                sealed_fraction: next(),
                sealed_wait: Span::from_s(next()),
                wander: next(),
                least_wander: next(),
                wander_time: Span::from_s(next()),
                leak,
                day_spread: next(),
                day_spread_weight: next(),
                cell_limit: PressureDifference::from_pa(next()),
                cell_faults: next(),
                cell_gain: next(),
                flush: next(),
                depth_drift: Length::from_m(next()),
                ip_gauge: PressureDifference::from_pa(next()),
                flow: next(),
                metered: next(),
                gas_temperature: (Temperature::from_k(next()), TemperatureDifference::from_k(next())),
                loop_volume: next(),
                mark: Volume::from_m3(next()),
                average_over: Span::from_s(next()),
                least_usable: Span::from_s(next()),
            }
        })
        .boxed()
}

/// Any session.
pub(crate) fn session() -> BoxedStrategy<Session> {
    let place = prop_oneof![Just(Place::Couch), Just(Place::Pool)];
    let diluent =
        prop_oneof![Just(Diluent::Air), float().prop_map(|o| Diluent::Oxygen(Share::from_ratio(o)))];
    let leak_test = prop_oneof![
        Just(LeakTest::Passed),
        Just(LeakTest::NotDone),
        uncertain(StpdFlow::from_m3_s, StpdFlow::from_m3_s).prop_map(LeakTest::Measured),
    ];
    let oxygen = of((float(), float()).prop_map(|(fraction, expanded)| Purity { fraction, expanded }));
    let line =
        of(prop_oneof![text().prop_map(LineReference::RunFile), id().prop_map(LineReference::Orifice)]);
    let volume = of(uncertain(Volume::from_m3, Volume::from_m3));
    let head =
        (id(), of(float()), place, kept(), diluent, volume, leak_test, of(any::<bool>()), oxygen, time());
    let rest = (conditions(), cells(), rest(), assumptions(), vec(event(), 0..6), of(cylinder()));
    (head, readings(), line, rest)
        .prop_map(|(head, readings, line, rest)| {
            let (diver, mass, place, kept, diluent, loop_volume, leak_test, nose_clip, oxygen, taken) = head;
            let (conditions, cells, rest, assumptions, events, cylinder) = rest;
            Session {
                diver,
                mass: mass.map(Mass::from_kg),
                place,
                kept,
                diluent,
                loop_volume,
                leak_test,
                nose_clip,
                oxygen,
                taken,
                readings,
                line,
                conditions,
                cells,
                rest,
                assumptions,
                events,
                cylinder,
            }
        })
        .boxed()
}

/// Anything left out of a session.
pub(crate) fn left_out() -> BoxedStrategy<SessionLeftOut> {
    (of((float(), float())), text(), of(text()), time())
        .prop_map(|(stretch_s, why, by, at)| SessionLeftOut { stretch_s, why, by, at })
        .boxed()
}
