//! What a person should know before trusting the result; the sentences stand in `report`.

/// One thing to know.
#[derive(Debug, Clone, PartialEq)]
pub enum Warning {
    /// The meter's papers state no gain: the budget has no row for it.
    MeterGainUnknown,
    /// The transducer's papers state neither gain nor zero.
    TransducerPapersUnknown,
    /// No ± for the barometer: ±2 hPa taken.
    BarometerAssumed,
    /// No ± for the gas temperature: ±1 °C taken.
    TemperatureAssumed,
    /// No ± for the meter's temperature: ±1 °C taken.
    MeterTemperatureAssumed,
    /// No ± for the meter's pressure: ±2 hPa taken.
    MeterPressureAssumed,
    /// No ± for the water temperature: ±1 °C taken.
    WaterTemperatureAssumed,
    /// The maker's gas factor carries no ±.
    GasFactorWithoutUncertainty,
    /// A float read with another gas and no factor: the middle of two laws was used.
    FloatLawUnknown {
        /// Factor by density.
        by_density: f64,
        /// Factor by viscosity.
        by_viscosity: f64,
    },
    /// The meter's papers state no noise and no resolution: the scatter about the line was used.
    FlowNoiseFromScatter,
    /// The points scatter more than their uncertainties, so the random part was widened.
    RandomPartWidened {
        /// By this factor.
        factor: f64,
        /// Whether a bend of the line, not chance, is part of it.
        bent: bool,
    },
    /// The choke model does not describe the points; the choke ratio stays as wide as it was known beforehand.
    ChokeModelFails,
    /// The acceptance names no gas and the run's gas is not oxygen: the nominal flow was taken for the run's gas.
    AcceptanceGasAssumed,
    /// A pressure at which the line is read, or that a flow asked for leads to, lies outside the points of the line.
    Extrapolated {
        /// Where the line is read, bar gauge.
        ip_bar_gauge: f64,
        /// Lowest and highest point of the line, bar absolute.
        span_bar_abs: (f64, f64),
        /// Where the line is read, bar absolute.
        at_bar_abs: f64,
    },
    /// An orifice that breathes air on the bench is not oxygen-clean afterwards.
    BenchGasIsNotOxygen,
}
