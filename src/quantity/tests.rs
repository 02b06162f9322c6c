//! What texts mean, what is refused and in which words, and that nothing is lost between text and quantity.

use proptest::prelude::*;

use super::show::{range_to_text, reference_to_text, to_text, uncertain_to_text};
use super::text::{
    expanded_only, plain, range, reference_conditions, remarks, span, uncertain, value, zero_reading,
};
use super::unit::lookup;
use super::*;

fn says<T: std::fmt::Debug>(result: Result<T, QuantityError>) -> String {
    match result {
        Ok(understood) => panic!("understood as {understood:?}"),
        Err(refused) => refused.to_string(),
    }
}

#[track_caller]
fn close(got: f64, want: f64, relative: f64) {
    assert!(
        (got - want).abs() <= relative * want.abs(),
        "got {got}, want {want}, relative tolerance {relative}"
    );
}

#[test]
fn every_form_of_quantity_text_is_understood() {
    assert_eq!(value("10.5 bar"), Ok(GaugePressure::from_bar(10.5)));
    close(value::<GaugePressure>("152 psi").unwrap().as_bar(), 10.480_03, 1e-6);
    assert_eq!(value("700 mL/min"), Ok(IndicatedFlow::from_l_min(0.7)));
    assert_eq!(value("42 L/h"), Ok(IndicatedFlow::from_l_min(0.7)));
    assert_eq!(value("0.48 L/min"), Ok(StpdFlow::from_l_min(0.48)));
    assert_eq!(value("21 °C"), Ok(Temperature::from_c(21.0)));
    close(value::<Temperature>("70 °F").unwrap().as_c(), 21.111_111_111, 1e-10);
    assert_eq!(value("294 K"), Ok(Temperature::from_k(294.0)));
    assert_eq!(value("1009.2 hPa"), Ok(AbsolutePressure::from_pa(100_920.0)));
    assert_eq!(value("1009 mbar"), Ok(AbsolutePressure::from_pa(100_900.0)));
    close(value::<AbsolutePressure>("757 mmHg").unwrap().as_pa(), 100_925.047_273, 1e-11);
    close(value::<AbsolutePressure>("29.92 inHg").unwrap().as_pa(), 101_320.748_1, 1e-9);
    assert_eq!(value("7.5 L"), Ok(Volume::from_l(7.5)));
    assert_eq!(value("76 µm"), Ok(Length::from_um(76.0)));
    assert_eq!(value("76 \u{3bc}m"), Ok(Length::from_um(76.0)));
    assert_eq!(value("0.003 in"), Ok(Length::from_m(76.2e-6)));
    assert_eq!(value("12 m"), Ok(Length::from_m(12.0)));
    assert_eq!(value("40 ft"), Ok(Length::from_m(12.192)));
    assert_eq!(value("82 kg"), Ok(Mass::from_kg(82.0)));
    assert_eq!(value("180 lb"), Ok(Mass::from_kg(81.646_626_6)));
    close(lookup(Kind::Voltage, "mV").unwrap().to_si(48.0), 0.048, 0.0);
    assert_eq!(value("0.8 %"), Ok(Share::from_ratio(0.008)));
    assert_eq!(value("99.5 %"), Ok(Share::from_ratio(0.995)));
    assert_eq!(value("0.002 bar/min"), Ok(PressureRate::from_pa_s(200.0 / 60.0)));
    assert_eq!(span("90 s"), Ok(Span::from_s(90.0)));
    assert_eq!(span("200 ms"), Ok(Span::from_s(0.2)));
    assert_eq!(span("2 min"), Ok(Span::from_s(120.0)));
    assert_eq!(span("00:08:30"), Ok(Span::from_s(510.0)));
    assert_eq!(span("48:00:00"), Ok(Span::from_s(172_800.0)));
    assert_eq!(span("00:00:00.1"), span("0.1 s"));
}

#[test]
fn spaces_minus_signs_and_exponents_are_read_as_people_type_them() {
    let same = Ok(GaugePressure::from_pa(-50_000.0));
    for text in [
        "-0.5 bar",
        "\u{2212}0.5 bar",
        " -0.5\u{a0}bar ",
        "-0.5\u{202f}bar",
        "-0.5bar",
        "-.5 bar",
        "-5e-1 bar",
    ] {
        assert_eq!(value(text), same, "{text:?}");
    }
    assert_eq!(value("1e-3 bar"), Ok(GaugePressure::from_pa(100.0)));
    assert_eq!(value("1E\u{2212}3 bar"), Ok(GaugePressure::from_pa(100.0)));
    assert_eq!(value("+1.5e+1bar"), Ok(GaugePressure::from_bar(15.0)));
    assert_eq!(value("21°C"), Ok(Temperature::from_c(21.0)));
    assert_eq!(value("21 ° C"), Ok(Temperature::from_c(21.0)));
    assert_eq!(value("0.7 L / min"), Ok(IndicatedFlow::from_l_min(0.7)));
}

#[test]
fn uncertainties_are_differences_in_any_unit_of_the_kind() {
    let volume = Ok(Uncertain { value: Volume::from_l(7.5), expanded: Some(Volume::from_l(1.0)) });
    for text in [
        "7.5 L ± 1.0 L",
        "7.5 L +/- 1.0 L",
        "7.5 ± 1.0 L",
        "7.5L±1.0L",
        "7.5 L ± 1000 mL",
        "7.5 L +/\u{2212} 1 L",
    ] {
        assert_eq!(uncertain(text), volume, "{text:?}");
    }
    assert_eq!(uncertain("7.5 L"), Ok(Uncertain { value: Volume::from_l(7.5), expanded: None }));
    let degree = TemperatureDifference::from_k(1.0);
    assert_eq!(
        uncertain("21.0 °C ± 1.0 °C"),
        Ok(Uncertain { value: Temperature::from_c(21.0), expanded: Some(degree) })
    );
    assert_eq!(
        uncertain("21 ± 1 °C"),
        Ok(Uncertain { value: Temperature::from_c(21.0), expanded: Some(degree) })
    );
    let fahrenheit = uncertain::<Temperature>("70 °F ± 2 °F").unwrap();
    assert_eq!(fahrenheit.expanded, Some(TemperatureDifference::from_k(2.0 * 5.0 / 9.0)));
    assert_eq!(expanded_only::<Temperature>("± 1.0 °C"), Ok(degree));
    assert_eq!(expanded_only::<Temperature>("1.0 °C"), Ok(degree));
    assert_eq!(expanded_only::<Temperature>("+/- 1 K"), Ok(degree));
    assert_eq!(expanded_only::<AbsolutePressure>("± 1 hPa"), Ok(PressureDifference::from_pa(100.0)));
    let purity = uncertain::<Share>("99.5 % ± 0.3 %").unwrap();
    assert_eq!(
        purity,
        Uncertain { value: Share::from_ratio(0.995), expanded: Some(Share::from_ratio(0.003)) }
    );
    assert_eq!(plain("0.98 ± 0.01").map(|g| (g.value.to_bits(), g.expanded.map(f64::to_bits))), {
        Ok((0.98f64.to_bits(), Some(0.01f64.to_bits())))
    });
}

#[test]
fn ranges_rise() {
    let meter = Ok((IndicatedFlow::from_l_min(0.02), IndicatedFlow::from_l_min(2.0)));
    assert_eq!(range("0.02 L/min to 2 L/min"), meter);
    assert_eq!(range("20 mL/min  to\u{a0}2 L/min"), meter);
    assert_eq!(range("0 to 16 bar"), Ok((GaugePressure::from_bar(0.0), GaugePressure::from_bar(16.0))));
    assert_eq!(
        range("-5 kPa to 25 kPa"),
        Ok((PressureDifference::from_pa(-5e3), PressureDifference::from_pa(25e3)))
    );
}

#[test]
fn reference_conditions_are_named_or_given_in_any_unit_and_order() {
    for preset in PRESETS {
        assert_eq!(reference_conditions(preset.name), Ok(preset.conditions), "{}", preset.name);
    }
    let by_name = |name: &str| PRESETS.into_iter().find(|preset| preset.name == name).unwrap().conditions;
    for text in [
        "20 °C, 101.325 kPa",
        "101.325 kPa, 20 °C",
        "20°C;1 atm",
        "293.15 K, 1013.25 hPa",
        "20 °C,1.01325 bar",
    ] {
        assert_eq!(reference_conditions(text), Ok(by_name("20 °C")), "{text:?}");
    }
    assert_eq!(reference_conditions("68 °F"), Ok(by_name("20 °C")));
    assert_eq!(reference_conditions(" stpd "), Ok(ReferenceConditions::STPD));
    assert_eq!(reference_conditions("0 °C, 101.325 kPa"), Ok(ReferenceConditions::STPD));
    assert_eq!(reference_conditions("20 °C, 100 kPa"), Ok(by_name("ANR")));
    assert_eq!(reference_conditions("1 bar, 20 C"), Ok(by_name("ANR")));
    assert_eq!(
        reference_conditions("25 °C, 101.3 kPa").unwrap().pressure,
        AbsolutePressure::from_pa(101_300.0)
    );
    // A float tube's scale may be made for some bar.
    assert!(reference_conditions("20 °C, 11 bar").is_ok());
}

/// Every sentence a person can be told, whole: they are interface.
#[test]
fn refusals_say_what_is_wrong_and_what_to_do() {
    const PRESSURES: &str = "bar, mbar, Pa, hPa, kPa, MPa, psi, mmHg, inHg, atm or ata";
    let sentences = [
        (says(value::<GaugePressure>("10.5")), format!("\"10.5\" has a number without a unit: give the pressure in {PRESSURES}")),
        (says(value::<GaugePressure>(" ")), "nothing is written where a pressure should stand: write it as in \"10.5 bar\"".into()),
        (says(value::<GaugePressure>("ten bar")), "\"ten bar\" does not begin with a number: write a pressure as in \"10.5 bar\"".into()),
        (says(value::<GaugePressure>("NaN bar")), "\"NaN bar\" is refused because NaN is not a number that was read: give a finite number or leave it out".into()),
        (says(value::<GaugePressure>("-Infinity bar")), "\"-Infinity bar\" is refused because Infinity is not a number that was read: give a finite number or leave it out".into()),
        (says(value::<GaugePressure>("1e999 bar")), "\"1e999 bar\" is too large a number: check its exponent".into()),
        (says(value::<GaugePressure>("1e305 bar")), "\"1e305 bar\" is too large a number: check its exponent".into()),
        (says(value::<GaugePressure>("10,5 bar")), "\"10,5 bar\" has a comma in its number: write 10.5, not 10,5".into()),
        (says(value::<AbsolutePressure>("1,013 mbar")), "\"1,013 mbar\" has a comma in its number: write 1013 or 1.013, not 1,013".into()),
        (says(value::<AbsolutePressure>("1.013,25 mbar")), "\"1.013,25 mbar\" has a comma in its number: write 1013.25, not 1.013,25".into()),
        (says(value::<AbsolutePressure>("1,013.25 mbar")), "\"1,013.25 mbar\" has a comma in its number: write 1013.25, not 1,013.25".into()),
        (says(value::<AbsolutePressure>("1,000,000 Pa")), "\"1,000,000 Pa\" has a comma in its number: write 1000000, not 1,000,000".into()),
        (says(value::<AbsolutePressure>("1 013 mbar")), "\"1 013 mbar\" has a second number where its unit should stand: write one number without spaces in it, as in \"10.5 bar\"".into()),
        (says(value::<GaugePressure>("10 barr")), format!("\"barr\" in \"10 barr\" is not a unit of pressure known here, the nearest is bar: use {PRESSURES}")),
        (says(value::<GaugePressure>("10 kpa")), format!("\"kpa\" in \"10 kpa\" is not a unit of pressure known here, the nearest is kPa: use {PRESSURES}")),
        (says(value::<GaugePressure>("10 furlongs")), format!("\"furlongs\" in \"10 furlongs\" is not a unit of pressure known here: use {PRESSURES}")),
        (says(lookup(Kind::Mass, "stone")), "\"stone\" is not a unit of mass known here: use kg, g or lb".into()),
        (says(value::<Length>("10 bar")), "\"bar\" in \"10 bar\" is a unit of pressure, and a length is asked for: use m, µm, mm, cm, in or ft".into()),
        (says(value::<IndicatedFlow>("700 sccm")), "\"sccm\" in \"700 sccm\" does not say at which temperature and pressure its litres are counted: write it in L, mL or ft³ and say the reference conditions in reads_at".into()),
        (says(value::<GaugePressure>("150 psig")), "\"psig\" in \"150 psig\" is refused because gauge or absolute is said by the key, not by the unit: write psi".into()),
        (says(value::<GaugePressure>("10 bar ± 0.1 bar")), "\"10 bar ± 0.1 bar\" has a ± where only a value is meant: leave the ± and what follows it out".into()),
        (says(uncertain::<Volume>("± 1 L")), "\"± 1 L\" has no value before its ±: write it as in \"7.5 L ± …\"".into()),
        (says(expanded_only::<Volume>("7 L ± 1 L")), "\"7 L ± 1 L\" has a value where only its ± is meant: leave out what stands before the ±".into()),
        (says(uncertain::<Volume>("7 L ± 1 L ± 1 L")), "\"7 L ± 1 L ± 1 L\" has more than one ±: give one expanded uncertainty".into()),
        (says(uncertain::<Volume>("7 L ± -1 L")), "\"7 L ± -1 L\" has a negative uncertainty: give the ± without a sign".into()),
        (says(uncertain::<Volume>("7 L ± 1")), "\"7 L ± 1\" has a number without a unit: give the volume in L, mL, cm³, m³ or ft³".into()),
        (says(uncertain::<Volume>("7 L ± 5 %")), "\"%\" in \"7 L ± 5 %\" is a unit of share, and a volume is asked for: use L, mL, cm³, m³ or ft³".into()),
        (says(value::<GaugePressure>("-1.2 bar")), "\"-1.2 bar\" is refused because a gauge pressure is never below -1 bar: check its sign, its unit and its key".into()),
        (says(value::<AbsolutePressure>("-1 Pa")), "\"-1 Pa\" is refused because an absolute pressure is never below zero: check its sign, its unit and its key".into()),
        (says(value::<Temperature>("-274 °C")), "\"-274 °C\" is refused because a temperature is always above absolute zero, -273.15 °C: check its sign, its unit and its key".into()),
        (says(value::<StpdFlow>("-0.1 L/min")), "\"-0.1 L/min\" is refused because a flow is never negative: check its sign, its unit and its key".into()),
        (says(range::<IndicatedFlow>("2 L/min")), "\"2 L/min\" is not a range: write its two ends with \"to\" between them, as in \"0.7 L/min to …\"".into()),
        (says(range::<IndicatedFlow>("2 L/min to 1 L/min")), "\"2 L/min to 1 L/min\" does not rise: write the lower end of the range first and the higher after it".into()),
        (says(span("8:30")), "\"8:30\" is not a span of time: write hours, minutes and seconds as in \"00:08:30\", or \"510 s\"".into()),
        (says(plain("0.98 L")), "\"0.98 L\" is not a plain number: write it without a unit, as in \"0.98\" or \"0.98 ± 0.01\"".into()),
        (says(reference_conditions("STP")), "\"STP\" does not say reference conditions known here: write STPD, 0 °C, 15 °C, 20 °C, 25 °C, 70 °F (these at 101.325 kPa), ANR (20 °C, 100 kPa), or a temperature and a pressure as in \"20 °C, 101.325 kPa\"".into()),
        (says(reference_conditions("20 °C, 101,325 kPa")), "\"20 °C, 101,325 kPa\" has a comma in its number: write 101325 or 101.325, not 101,325".into()),
        (says(reference_conditions("20 °C, 101.325 bar")), "\"20 °C, 101.325 bar\" would be reference conditions outside -40 °C to 100 °C and 10 kPa to 2 MPa: check the units of its temperature and pressure".into()),
        (says(Shown::parse("psi,bar")), "\"psi,bar\" names two units of pressure: keep one".into()),
        (says(Shown::parse("psi,min")), "\"min\" in \"psi,min\" cannot be chosen to show results in: choose among bar, mbar, Pa, hPa, kPa, MPa, psi, mmHg, inHg, atm, ata; L/min, mL/min, L/h, L/s, mL/s, cm³/min, m³/h, m³/s, ft³/h, ft³/min; m, µm, mm, cm, in, ft; °C, K, °F; L, mL, cm³, m³, ft³; kg, g, lb".into()),
    ];
    for (got, want) in sentences {
        assert_eq!(got, want);
    }
}

#[test]
fn litres_at_unstated_conditions_are_refused_in_any_spelling() {
    let spellings = [
        "sccm",
        "SCCM",
        "slpm",
        "sLpm",
        "SLPM",
        "nlpm",
        "NLPM",
        "slm",
        "NL/min",
        "nl/min",
        "Nl/min",
        "sL/min",
        "std L/min",
        "Nm3/h",
        "Nm³/h",
        "SCFH",
        "scfh",
        "scfm",
        "ln/min",
        "mln/min",
        "s.c.c.m.",
        "L(n)/min",
        "Standard L/min",
    ];
    for unit in spellings {
        let said = says(value::<IndicatedFlow>(&format!("0.7 {unit}")));
        assert!(said.contains("say the reference conditions in reads_at"), "{unit}: {said}");
        let said = says(lookup(Kind::Flow, unit));
        assert!(said.contains("say the reference conditions in reads_at"), "{unit}: {said}");
    }
    assert!(says(value::<Volume>("0.4 NL")).contains("say the reference conditions in reads_at"));
    assert!(says(Shown::parse("slpm")).contains("say the reference conditions in reads_at"));
}

#[test]
fn gauge_and_absolute_are_not_said_by_the_unit() {
    for unit in
        ["psig", "psia", "barg", "bara", "bar(g)", "bar abs", "BARA", "kPa gauge", "bar absolute", "PSI (a)"]
    {
        let said = says(value::<AbsolutePressure>(&format!("10 {unit}")));
        assert!(said.contains("gauge or absolute is said by the key"), "{unit}: {said}");
    }
}

#[test]
fn divers_atmosphere_is_taken_and_said() {
    assert_eq!(value("1 ata"), Ok(AbsolutePressure::STANDARD_ATMOSPHERE));
    for text in ["1.3 ata", "1.3ata", "1 ata ± 0.1 bar", "0.2 ata to 1.3 ata", "ata", "20 °C, 1 ata"] {
        assert_eq!(remarks(text).len(), 1, "{text}");
        assert!(remarks(text)[0].contains("1.01325 bar"));
    }
    assert!(lookup(Kind::Pressure, "ata").unwrap().remark.is_some());
    for text in ["10 bar", "1 atm", "data", "STPD"] {
        assert!(remarks(text).is_empty(), "{text}");
    }
}

#[test]
fn a_zero_reading_may_be_negative_and_a_flow_may_not() {
    assert_eq!(zero_reading("-0.0002 L/min"), Ok(IndicatedFlow::from_l_min(-0.0002)));
    assert!(value::<IndicatedFlow>("-0.0002 L/min").is_err());
    assert!(zero_reading::<IndicatedFlow>("NaN L/min").is_err());
    assert_eq!(value("-0.3 mbar"), Ok(PressureDifference::from_pa(-30.0)));
}

#[test]
fn limits_of_what_can_be_are_part_of_it() {
    assert_eq!(value("-1 bar"), Ok(GaugePressure::from_bar(-1.0)));
    assert!(value::<GaugePressure>("-1.0001 bar").is_err());
    assert_eq!(value("0 bar"), Ok(AbsolutePressure::from_pa(0.0)));
    assert!(value::<Temperature>("0 K").is_err());
    assert!(value::<Temperature>("-459.67 °F").is_err());
    assert!(value::<Temperature>("0.001 K").is_ok());
    for refused in
        [value::<Mass>("-1 kg").is_err(), value::<Volume>("-1 L").is_err(), value::<Length>("-1 m").is_err()]
    {
        assert!(refused);
    }
    assert!(span("-1 s").is_err() && value::<Share>("-1 %").is_err());
    assert_eq!(uncertain::<Volume>("7 L ± 0 L").unwrap().expanded, Some(Volume::from_l(0.0)));
}

#[test]
fn spans_that_are_no_clock_are_refused() {
    for text in
        ["8:30", "00:60:00", "00:00:60", "1:2:3", "00:08:30:00", "-00:08:30", "00:08:3x", "00:08:30.", "::"]
    {
        assert!(span(text).is_err(), "{text}");
    }
    assert!(span("90").is_err());
    assert!(span("90 m").is_err());
}

#[test]
fn every_unit_is_understood_in_each_spelling_and_is_unique_in_its_kind() {
    for kind in Kind::ALL {
        let symbols: Vec<&str> = kind.units().map(|unit| unit.symbol).collect();
        for (nth, symbol) in symbols.iter().enumerate() {
            assert!(!symbols[..nth].contains(symbol), "{symbol} twice");
            assert_eq!(lookup(kind, symbol).unwrap().symbol, *symbol);
        }
        let si = kind.si_unit();
        assert_eq!(
            (si.to_si(1.25).to_bits(), si.from_si(1.25).to_bits()),
            (1.25f64.to_bits(), 1.25f64.to_bits())
        );
    }
}

#[test]
fn factor_and_offset_describe_the_unit() {
    for kind in Kind::ALL {
        for unit in kind.units() {
            close(unit.to_si(7.25), 7.25 * unit.factor + unit.offset, 1e-14);
            close(unit.from_si(unit.to_si(7.25)), 7.25, 1e-12);
        }
    }
}

#[test]
fn shown_units_are_chosen_by_kind() {
    let shown = Shown::parse("psi,mL/min,ft,F").unwrap();
    let symbols = (shown.pressure.symbol, shown.flow.symbol, shown.length.symbol, shown.temperature.symbol);
    assert_eq!(symbols, ("psi", "mL/min", "ft", "°F"));
    assert_eq!((shown.volume.symbol, shown.mass.symbol), ("L", "kg"));
    assert_eq!(shown.unit(Kind::PressureRate).symbol, "psi/min");
    assert_eq!(shown.unit(Kind::TemperatureDifference).symbol, "°F");
    assert_eq!(Shown::parse(""), Ok(Shown::default()));
    let plain = Shown::default();
    let symbols = (plain.pressure.symbol, plain.flow.symbol, plain.length.symbol, plain.temperature.symbol);
    assert_eq!(symbols, ("bar", "L/min", "m", "°C"));
    close(GaugePressure::from_bar(10.0).shown(shown.pressure), 145.037_737_73, 1e-10);
    close(Temperature::from_c(100.0).shown(shown.temperature), 212.0, 1e-14);
}

#[test]
fn texts_of_what_was_read_are_the_shortest() {
    assert_eq!(to_text(value::<GaugePressure>("9.4 bar").unwrap()), "9.4 bar");
    assert_eq!(to_text(value::<GaugePressure>("1.1 bar").unwrap()), "1.1 bar");
    assert_eq!(to_text(StpdFlow::from_l_min(0.48)), "0.48 L/min");
    assert_eq!(to_text(IndicatedFlow::from_l_min(0.4817)), "0.4817 L/min");
    assert_eq!(to_text(Temperature::from_c(21.3)), "21.3 °C");
    assert_eq!(to_text(Length::from_um(76.2)), "76.2 µm");
    assert_eq!(to_text(Length::from_m(0.0)), "0 m");
    assert_eq!(to_text(Share::from_ratio(0.07)), "7 %");
    assert_eq!(to_text(Span::from_s(510.0)), "510 s");
    assert_eq!(to_text(value::<PressureRate>("0.002 bar/min").unwrap()), "0.002 bar/min");
    assert_eq!(uncertain_to_text(uncertain::<Temperature>("21.0 °C ± 1.0 °C").unwrap()), "21 °C ± 1 °C");
    assert_eq!(uncertain_to_text(uncertain::<Volume>("7.5 L").unwrap()), "7.5 L");
    let (low, high) = range::<GaugePressure>("0 bar to 16 bar").unwrap();
    assert_eq!(range_to_text(low, high), "0 bar to 16 bar");
    for preset in PRESETS {
        assert_eq!(reference_conditions(&reference_to_text(preset.conditions)), Ok(preset.conditions));
    }
    assert_eq!(reference_to_text(PRESETS[6].conditions), "20 °C, 100 kPa");
}

/// Text in `unit` → quantity → text → quantity, all to the last bit.
fn comes_back<T: Quantity>(shown: f64, unit: Unit) -> Result<(), TestCaseError> {
    let written = format!("{shown} {}", unit.symbol);
    let Ok(read) = value::<T>(&written) else {
        // The bound of what can be is tested by itself; here negatives are drawn for all types.
        prop_assert!(T::from_shown(shown, unit).check().is_err(), "{}", written);
        return Ok(());
    };
    prop_assert_eq!(read, T::from_shown(shown, unit), "text and column differ for {}", written);
    let again = to_text(read);
    prop_assert_eq!(value::<T>(&again), Ok(read), "{} was written as {}", written, again);
    if unit == T::KIND.default_unit() && T::KIND != Kind::Length {
        prop_assert!(again.ends_with(&format!(" {}", unit.symbol)), "{} was written as {}", written, again);
        prop_assert!(
            again.len() <= written.len().max(3 + unit.symbol.len()),
            "{} was written as {}",
            written,
            again
        );
    }
    Ok(())
}

/// A quantity with any SI value → text → the same quantity.
fn computed_comes_back<T: Quantity>(si: f64) -> Result<(), TestCaseError> {
    let quantity = T::from_si(si);
    if quantity.check().is_ok() {
        let text = to_text(quantity);
        prop_assert_eq!(value::<T>(&text), Ok(quantity), "{}", text);
    }
    Ok(())
}

macro_rules! for_every_type {
    ($function:ident($($argument:expr),*)) => {
        $function::<AbsolutePressure>($($argument),*)?;
        $function::<GaugePressure>($($argument),*)?;
        $function::<PressureDifference>($($argument),*)?;
        $function::<PressureRate>($($argument),*)?;
        $function::<Temperature>($($argument),*)?;
        $function::<TemperatureDifference>($($argument),*)?;
        $function::<StpdFlow>($($argument),*)?;
        $function::<IndicatedFlow>($($argument),*)?;
        $function::<Length>($($argument),*)?;
        $function::<Mass>($($argument),*)?;
        $function::<Volume>($($argument),*)?;
        $function::<Span>($($argument),*)?;
        $function::<Share>($($argument),*)?;
    };
}

fn in_every_unit<T: Quantity>(shown: f64) -> Result<(), TestCaseError> {
    T::KIND.units().try_for_each(|unit| comes_back::<T>(shown, unit))
}

fn with_every_unit_of_uncertainty<T: Quantity>(shown: f64, spread: f64) -> Result<(), TestCaseError> {
    for (unit, other) in T::KIND.units().zip(T::Difference::KIND.units()) {
        let value = T::from_shown(shown, unit);
        if value.check().is_err() {
            continue;
        }
        let expanded = T::Difference::from_shown(spread, other);
        let given = Uncertain { value, expanded: Some(expanded) };
        let typed = format!("{shown} {} +/- {spread} {}", unit.symbol, other.symbol);
        prop_assert_eq!(uncertain::<T>(&typed), Ok(given), "{}", typed);
        let written = uncertain_to_text(given);
        prop_assert_eq!(uncertain::<T>(&written), Ok(given), "{}", written);
        prop_assert_eq!(expanded_only::<T>(&format!("± {spread} {}", other.symbol)), Ok(expanded));
    }
    Ok(())
}

/// Numbers as instruments show them, and any others a double of sane size can be.
fn numbers() -> impl Strategy<Value = f64> {
    prop_oneof![
        (-99_999i32..=999_999, 0i32..6).prop_map(|(digits, places)| f64::from(digits) / 10f64.powi(places)),
        -1e6..1e6f64,
        (1f64..10.0, -30i32..30).prop_map(|(mantissa, exponent)| mantissa * 10f64.powi(exponent)),
    ]
}

/// Bits of texts that come near to quantities, joined at random.
fn near_texts() -> impl Strategy<Value = String> {
    let bits = prop::sample::select(vec![
        "1", "0", "10.5", "10,5", "-", "\u{2212}", "+", "e", "e5", ".", ",", " ", "\u{a0}", "±", "+/-", "to",
        " to ", "bar", "°C", "°", "µm", "%", "L/min", "sccm", "psig", "ata", "NaN", "inf", "∞", ":",
        "00:08:30", ";", "STPD", "kPa", "é", "\u{301}", "\0", "\n", "n", "s", "1e400", "L(n)/min",
    ]);
    prop::collection::vec(bits, 0..9).prop_map(|bits| bits.concat())
}

fn read_in_every_way(text: &str) -> Result<(), TestCaseError> {
    fn as_type<T: Quantity>(text: &str) -> Result<(), TestCaseError> {
        let all = [
            value::<T>(text).map(|_| ()),
            zero_reading::<T>(text).map(|_| ()),
            uncertain::<T>(text).map(|_| ()),
            expanded_only::<T>(text).map(|_| ()),
            range::<T>(text).map(|_| ()),
        ];
        for refused in all.into_iter().filter_map(Result::err) {
            let said = refused.to_string();
            prop_assert!(!said.contains('\n') && said.chars().count() < 500, "{}", said);
        }
        if let Ok(read) = value::<T>(text) {
            prop_assert!(read.si().is_finite() && read.check().is_ok());
        }
        Ok(())
    }
    for_every_type!(as_type(text));
    let _ =
        (reference_conditions(text).is_ok(), plain(text).is_ok(), Shown::parse(text).is_ok(), remarks(text));
    Ok(())
}

proptest! {
    #![proptest_config(ProptestConfig { failure_persistence: None, ..ProptestConfig::default() })]

    #[test]
    fn quantity_text_comes_back_in_every_unit(shown in numbers()) {
        for_every_type!(in_every_unit(shown));
    }

    #[test]
    fn computed_quantities_come_back(si in prop_oneof![numbers(), any::<f64>()]) {
        for_every_type!(computed_comes_back(si));
    }

    #[test]
    fn uncertainties_come_back(shown in numbers(), spread in numbers()) {
        for_every_type!(with_every_unit_of_uncertainty(shown, spread.abs()));
    }

    #[test]
    fn ranges_come_back(a in numbers(), b in numbers()) {
        let (low, high) = (PressureDifference::from_bar(a.min(b)), PressureDifference::from_bar(a.max(b)));
        prop_assume!(low < high);
        prop_assert_eq!(range(&range_to_text(low, high)), Ok((low, high)));
    }

    #[test]
    fn reference_conditions_come_back(c in -39.9..99.9f64, kpa in 10.1..1999.0f64) {
        let pressure = AbsolutePressure::from_pa(kpa * 1e3);
        let conditions = ReferenceConditions { temperature: Temperature::from_c(c), pressure };
        let text = reference_to_text(conditions);
        prop_assert_eq!(reference_conditions(&text), Ok(conditions), "{}", text);
    }

    #[test]
    fn no_text_makes_it_fall(any_text in any::<String>(), near in near_texts()) {
        read_in_every_way(&any_text)?;
        read_in_every_way(&near)?;
    }
}
