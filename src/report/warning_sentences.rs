//! The warnings of a bench run as sentences that say what to do.

use super::Units;
use super::number::{figures, fixed};
use crate::bench::{DEFAULT_BAROMETER_EXPANDED_PA, DEFAULT_TEMPERATURE_EXPANDED_K, Warning};

/// One warning as one sentence.
#[must_use]
pub fn sentence(warning: &Warning, units: &Units) -> String {
    let kelvin = DEFAULT_TEMPERATURE_EXPANDED_K;
    let hpa = DEFAULT_BAROMETER_EXPANDED_PA / 100.0;
    match warning {
        Warning::MeterGainUnknown => "the flow meter's papers state no gain, so the budget has no row for its \
            scale and the uncertainty is too small: put gain = \"… %\" from its certificate into [meter]"
            .into(),
        Warning::TransducerPapersUnknown => "the transducer's papers state neither gain nor zero, so the budget \
            has no row for it and the uncertainty is too small: fill them in from its certificate"
            .into(),
        Warning::BarometerAssumed => {
            format!("no ± is given for the barometer; ±{hpa:.0} hPa (k = 2) was taken: state it in [conditions]")
        }
        Warning::TemperatureAssumed => {
            format!("no ± is given for the gas temperature; ±{kelvin:.0} °C (k = 2) was taken: state it in [conditions]")
        }
        Warning::MeterTemperatureAssumed => {
            format!("no ± is given for the meter's temperature; ±{kelvin:.0} °C (k = 2) was taken: state it in [conditions]")
        }
        Warning::MeterPressureAssumed => {
            format!("no ± is given for the meter's pressure; ±{hpa:.0} hPa (k = 2) was taken: state it in [conditions]")
        }
        Warning::WaterTemperatureAssumed => {
            format!("no ± is given for the water temperature; ±{kelvin:.0} °C (k = 2) was taken: state it in [conditions]")
        }
        Warning::GasFactorWithoutUncertainty => "the gas factor carries no ±, so the budget has no row for it: \
            ask the meter's maker and write gas_factor = \"0.98 ± 0.01\""
            .into(),
        Warning::FloatLawUnknown { by_density, by_viscosity } => format!(
            "the float's scale was made for another gas and the maker gives no factor: by density the flow is \
             {} of the reading, by viscosity {}; the middle was used and the distance is in the budget. \
             Ask the maker for a gas_factor",
            fixed(*by_density, 3),
            fixed(*by_viscosity, 3)
        ),
        Warning::FlowNoiseFromScatter => "the flow meter's papers state neither noise nor resolution: the scatter \
            about the line was used for the random part. State noise and resolution in [meter]"
            .into(),
        Warning::RandomPartWidened { factor, bent } => {
            let advice = if *bent {
                "Part of it is a bend, as the discharge coefficient of a small hole makes it over a wide span: points \
                 nearer the nominal IP would lie straighter"
            } else {
                "Look at the residuals, and wait longer at each point"
            };
            format!(
                "the points scatter {} times as much as their stated uncertainties; the random part was widened by \
                 that (Birge), with n − 2 degrees of freedom. {advice}",
                figures(*factor, 2)
            )
        }
        Warning::ChokeModelFails => "no choke ratio and discharge coefficient describe these points, so nothing \
            was learnt about the choke ratio: look at the residuals and at any check that does not hold"
            .into(),
        Warning::AcceptanceGasAssumed => "the acceptance does not say for which gas its flow is meant, and the \
            bench gas is not oxygen: it was taken for the bench gas. Write gas = \"oxygen\" into [acceptance] if it \
            is meant for oxygen"
            .into(),
        Warning::Extrapolated { ip_bar_gauge, span_bar_abs, at_bar_abs } => format!(
            "{} gauge is {} absolute, outside the points of the line ({} to {} {} absolute): take points there",
            units.pressure_text(*ip_bar_gauge),
            units.pressure_text(*at_bar_abs),
            fixed(units.pressure(span_bar_abs.0), 2),
            fixed(units.pressure(span_bar_abs.1), 2),
            units.pressure_symbol()
        ),
        Warning::BenchGasIsNotOxygen => super::cautions::BENCH_GAS.into(),
    }
}
