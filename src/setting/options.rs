//! What a setting is asked with, and what it takes where nothing is said.
//!
//! Comes in: [`SettingOptions`], everything optional. Goes out: [`Used`], every number that was used, in the unit its name
//! says, and which of them were defaults. Expanded uncertainties (k = 2) are divided here and nowhere else.

use super::SettingError;
use crate::bench::DEFAULT_TEMPERATURE_EXPANDED_K;
use crate::entry::{Diluent, FirstStage, Meter, Purity};
use crate::gas::{self, Water};
use crate::quantity::{
    AbsolutePressure, GaugePressure, Length, PressureDifference, PressureRate, StpdFlow, Temperature,
    TemperatureDifference, Uncertain, Volume,
};

/// Division of the gauge of the intermediate pressure, bar (common practice, no source).
pub const DEFAULT_GAUGE_DIVISION_BAR: f64 = 0.1;
/// Full scale of that gauge, bar (common practice, no source).
pub const DEFAULT_GAUGE_SCALE_BAR: f64 = 20.0;
/// Expanded error of that gauge as a share of its scale: a gauge of class 2.5.
pub const DEFAULT_GAUGE_ERROR_OF_SCALE: f64 = 0.025;
/// How far the intermediate pressure may rise by itself (lock-up, creep, supply pressure), bar (common practice, no source).
pub const DEFAULT_IP_SPREAD_BAR: f64 = 0.3;
/// How well the intermediate pressure comes back, expanded, bar (common practice, no source).
pub const DEFAULT_IP_REPEAT_BAR: f64 = 0.1;
/// Largest probability that the injection exceeds the uptake (the method's choice: one side of a 95 % interval).
pub const DEFAULT_CHANCE: f64 = 0.025;
/// Least shortfall of the injection, as a share of the uptake (the method's choice).
pub const DEFAULT_SHORTFALL: f64 = 0.05;
/// Largest shortfall of a setting, as a share of the uptake: too lean also kills (the method's choice; cannot be changed).
pub const LARGEST_SHORTFALL: f64 = 0.25;
/// Barometer where nothing is said, bar: the standard atmosphere.
pub const DEFAULT_BAROMETER_BAR: f64 = 1.013_25;
/// Expanded uncertainty of a barometer that is not read, bar: weather at sea level (common practice, no source).
pub const WEATHER_EXPANDED_BAR: f64 = 0.030;
/// Expanded uncertainty of a barometer that is read and has no ±, bar (common practice, no source).
pub const BAROMETER_EXPANDED_BAR: f64 = 0.002;
/// Coldest gas where the water temperature is not known, °C: overfeed is judged here, the flow is largest.
pub const COLDEST_C: f64 = 4.0;
/// Warmest gas where the water temperature is not known, °C: leanness is judged here, the flow is least.
pub const WARMEST_C: f64 = 30.0;
/// Gas temperature of the best estimate where the water temperature is not known, °C: the line's own.
pub const NOMINAL_C: f64 = 20.0;
/// Upper PO2 of the drift table, bar (common practice, no source).
pub const DEFAULT_PO2_HIGH_BAR: f64 = 1.3;
/// Lower PO2 of the drift table, bar (common practice, no source).
pub const DEFAULT_PO2_LOW_BAR: f64 = 0.7;
/// Uptake at work, L/min STPD (common practice, no source).
pub const DEFAULT_WORK_L_MIN: f64 = 1.5;
/// Purity of the oxygen where none is stated (the same as a session's and a run's): 99.5 % ± 0.3 %.
pub const DEFAULT_PURITY: Purity = Purity { fraction: 0.995, expanded: 0.003 };
/// Temperature of the gas in the loop, °C: that of a warm loop, as in a session (common practice, no source).
pub const LOOP_C: f64 = 33.0;
/// Readings of the contents gauge between which the patency check is timed, bar (common practice, no source).
pub const DEFAULT_CONTENTS_BAR: (f64, f64) = (150.0, 130.0);
/// Coverage factor of what stands after a `±`.
const COVERAGE: f64 = 2.0;
/// Surface pressures at which people dive, bar: the highest lakes to the lowest shores (common practice, no source).
const PLAUSIBLE_AMBIENT_BAR: (f64, f64) = (0.45, 1.12);
/// Deepest maximum depth that is taken for one, m (common practice, no source: deeper than any dive so far).
const DEEPEST_M: f64 = 350.0;

/// Whether the intermediate pressure follows depth.
#[derive(Debug, Clone, Copy, PartialEq, Eq, Default)]
pub enum FirstStageKind {
    /// It does not: the first stage is blanked, its absolute pressure stays what it was where it was set.
    #[default]
    Uncompensated,
    /// It does: its pressure over ambient stays.
    Compensated,
}

/// A place by its altitude or by a barometer read there.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum PlaceGiven {
    /// Altitude; the weather is not known.
    Altitude(Length),
    /// Barometer; the ± is expanded, k = 2.
    Barometer(Uncertain<AbsolutePressure, PressureDifference>),
}

/// What is known of the gas between the shut cylinder valve and the orifice.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Trapped {
    /// Its volume; the ± is expanded, k = 2.
    Volume(Uncertain<Volume>),
    /// The fall of the contents gauge observed with a good orifice; the ± is expanded, k = 2.
    Fall(Uncertain<PressureRate>),
}

/// What a setting is asked with; what is left out takes the default named beside each constant.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct SettingOptions {
    /// Kind of first stage.
    pub first_stage: FirstStageKind,
    /// Deepest depth of the dive; without it a compensated first stage has no setting.
    pub max_depth: Option<Length>,
    /// Lowest and highest intermediate pressure the first stage can be set to; else what the bench measured.
    pub ip_range: Option<(GaugePressure, GaugePressure)>,
    /// Highest intermediate pressure the maker allows.
    pub max_ip: Option<GaugePressure>,
    /// Division of the gauge it is set by.
    pub gauge_division: Option<PressureDifference>,
    /// Full scale of that gauge.
    pub gauge_scale: Option<GaugePressure>,
    /// Error of that gauge, expanded, k = 2.
    pub gauge_error: Option<PressureDifference>,
    /// Upward bound of creep, lock-up and supply pressure.
    pub ip_spread: Option<PressureDifference>,
    /// Repeatability, expanded, k = 2.
    pub ip_repeat: Option<PressureDifference>,
    /// Largest probability of overfeed, 0 to 1.
    pub chance: Option<f64>,
    /// Least shortfall as a share of the uptake, 0 to 1.
    pub shortfall: Option<f64>,
    /// Water dived in; sea water when not said.
    pub water: Option<Water>,
    /// Its temperature; the ± is expanded, k = 2.
    pub water_temperature: Option<Uncertain<Temperature, TemperatureDifference>>,
    /// Where the intermediate pressure is set.
    pub set_at: Option<PlaceGiven>,
    /// Where the dive is.
    pub dive_at: Option<PlaceGiven>,
    /// Loop and lungs; without it no drift is known. The ± is expanded, k = 2.
    pub loop_volume: Option<Uncertain<Volume>>,
    /// Diluent; air when not said.
    pub diluent: Option<Diluent>,
    /// Upper PO2 of the drift table.
    pub po2_high: Option<AbsolutePressure>,
    /// Lower PO2 of the drift table.
    pub po2_low: Option<AbsolutePressure>,
    /// Uptake at work.
    pub work: Option<StpdFlow>,
    /// Purity of the oxygen.
    pub oxygen: Option<Purity>,
    /// An intermediate pressure to judge.
    pub judge: Option<GaugePressure>,
    /// Why to go on with an orifice or an uptake that would be refused.
    pub despite: Option<String>,
    /// A meter whose reading is to be foretold.
    pub meter: Option<Meter>,
    /// For the patency check.
    pub trapped: Option<Trapped>,
    /// Two readings of the contents gauge, higher first.
    pub contents: Option<(GaugePressure, GaugePressure)>,
}

impl SettingOptions {
    /// Takes from a registered first stage whatever is not given already; its kind is always taken.
    #[must_use]
    pub fn with_first_stage(mut self, stage: &FirstStage) -> Self {
        self.first_stage =
            if stage.compensated { FirstStageKind::Compensated } else { FirstStageKind::Uncompensated };
        self.ip_range = self.ip_range.or(Some(stage.ip_range));
        self.max_ip = self.max_ip.or(stage.max_ip);
        self.gauge_division = self.gauge_division.or(Some(stage.division));
        self.gauge_scale = self.gauge_scale.or(stage.gauge_scale);
        self.gauge_error = self.gauge_error.or(stage.gauge_error);
        self.ip_spread = self.ip_spread.or(stage.ip_spread);
        self.ip_repeat = self.ip_repeat.or(stage.ip_repeat);
        self.trapped = self
            .trapped
            .or(stage.trapped_volume.map(Trapped::Volume))
            .or(stage.fall_observed.map(Trapped::Fall));
        self
    }
}

/// An option that was not given and took its default.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Defaulted {
    /// The IP range is what each orifice's bench run spans.
    IpRange,
    /// Division of the IP gauge.
    GaugeDivision,
    /// Scale of the IP gauge (only where its error is taken from it).
    GaugeScale,
    /// Error of the IP gauge.
    GaugeError,
    /// Upward spread of the IP.
    IpSpread,
    /// Repeatability of the IP.
    IpRepeat,
    /// Chance of overfeed.
    Chance,
    /// Least shortfall.
    Shortfall,
    /// Sea water.
    Water,
    /// The water temperature is not known: overfeed at [`COLDEST_C`], leanness at [`WARMEST_C`].
    WaterTemperature,
    /// Barometer where set.
    SetAt,
    /// Barometer where dived.
    DiveAt,
    /// Air as diluent.
    Diluent,
    /// Upper PO2.
    Po2High,
    /// Lower PO2.
    Po2Low,
    /// Uptake at work.
    Work,
    /// Purity of the oxygen.
    Oxygen,
    /// Readings of the contents gauge.
    Contents,
}

/// Every number a setting was worked out with.
#[derive(Debug, Clone, PartialEq)]
pub struct Used {
    /// Kind of first stage.
    pub first_stage: FirstStageKind,
    /// Deepest depth, m.
    pub max_depth_m: Option<f64>,
    /// IP range as given, bar gauge; none means the bench span of each orifice.
    pub ip_range_bar_gauge: Option<(f64, f64)>,
    /// Highest IP the maker allows, bar gauge.
    pub max_ip_bar_gauge: Option<f64>,
    /// Division of the IP gauge, bar.
    pub gauge_division_bar: f64,
    /// Expanded error of the IP gauge, bar, k = 2.
    pub gauge_error_expanded_bar: f64,
    /// Upward spread of the IP, bar.
    pub ip_spread_bar: f64,
    /// Expanded repeatability of the IP, bar, k = 2.
    pub ip_repeat_expanded_bar: f64,
    /// Largest probability of overfeed.
    pub chance: f64,
    /// Least shortfall, share of the uptake.
    pub shortfall: f64,
    /// Water.
    pub water: Water,
    /// Temperature of the gas at the orifice for the best estimate, K.
    pub nominal_k: f64,
    /// Temperature at which overfeed is judged, K.
    pub coldest_k: f64,
    /// Temperature at which leanness is judged, K.
    pub warmest_k: f64,
    /// Standard uncertainty of the water temperature, K; zero where its two ends are judged instead.
    pub temperature_u_k: f64,
    /// Ambient pressure where set, bar absolute.
    pub set_at_bar_abs: f64,
    /// Its standard uncertainty, bar.
    pub set_at_u_bar: f64,
    /// Ambient pressure at the surface where dived, bar absolute.
    pub dive_at_bar_abs: f64,
    /// Its standard uncertainty, bar.
    pub dive_at_u_bar: f64,
    /// Loop volume, L.
    pub loop_volume_l: Option<f64>,
    /// Oxygen fraction of the diluent.
    pub diluent_fraction: f64,
    /// Upper PO2, bar.
    pub po2_high_bar: f64,
    /// Lower PO2, bar.
    pub po2_low_bar: f64,
    /// Uptake at work, L/min STPD.
    pub work_l_min: f64,
    /// Share of oxygen in the oxygen.
    pub purity: f64,
    /// Its standard uncertainty.
    pub purity_u: f64,
    /// Two readings of the contents gauge, bar gauge, higher first.
    pub contents_bar_gauge: (f64, f64),
    /// Which of these were not given.
    pub defaulted: Vec<Defaulted>,
}

impl Used {
    /// Checks the options and fills in the defaults.
    ///
    /// # Errors
    /// As [`SettingError`] lists.
    pub fn of(options: &SettingOptions) -> Result<Self, SettingError> {
        let mut defaulted = Vec::new();
        let mut or = |given: Option<f64>, default: f64, which| {
            given.unwrap_or_else(|| {
                defaulted.push(which);
                default
            })
        };
        let bar = |d: Option<PressureDifference>| d.map(PressureDifference::as_bar);
        let division = or(bar(options.gauge_division), DEFAULT_GAUGE_DIVISION_BAR, Defaulted::GaugeDivision);
        let gauge_error = match bar(options.gauge_error) {
            Some(error) => error,
            None => {
                let scale = or(
                    options.gauge_scale.map(GaugePressure::as_bar),
                    DEFAULT_GAUGE_SCALE_BAR,
                    Defaulted::GaugeScale,
                );
                or(None, DEFAULT_GAUGE_ERROR_OF_SCALE * scale, Defaulted::GaugeError)
            }
        };
        let spread = or(bar(options.ip_spread), DEFAULT_IP_SPREAD_BAR, Defaulted::IpSpread);
        let repeat = or(bar(options.ip_repeat), DEFAULT_IP_REPEAT_BAR, Defaulted::IpRepeat);
        let chance = or(options.chance, DEFAULT_CHANCE, Defaulted::Chance);
        let shortfall = or(options.shortfall, DEFAULT_SHORTFALL, Defaulted::Shortfall);
        let po2 = |p: Option<AbsolutePressure>| p.map(AbsolutePressure::as_bar);
        let po2_high = or(po2(options.po2_high), DEFAULT_PO2_HIGH_BAR, Defaulted::Po2High);
        let po2_low = or(po2(options.po2_low), DEFAULT_PO2_LOW_BAR, Defaulted::Po2Low);
        let work = or(options.work.map(StpdFlow::as_l_min), DEFAULT_WORK_L_MIN, Defaulted::Work);
        let purity = options.oxygen.unwrap_or(DEFAULT_PURITY);
        let contents =
            options.contents.map_or(DEFAULT_CONTENTS_BAR, |(from, to)| (from.as_bar(), to.as_bar()));
        for (given, which) in [
            (options.ip_range.is_some(), Defaulted::IpRange),
            (options.water.is_some(), Defaulted::Water),
            (options.water_temperature.is_some(), Defaulted::WaterTemperature),
            (options.set_at.is_some(), Defaulted::SetAt),
            (options.dive_at.is_some(), Defaulted::DiveAt),
            (options.diluent.is_some(), Defaulted::Diluent),
            (options.oxygen.is_some(), Defaulted::Oxygen),
            (options.contents.is_some() || options.trapped.is_none(), Defaulted::Contents),
        ] {
            if !given {
                defaulted.push(which);
            }
        }
        let (set_at_bar_abs, set_at_u_bar) = ambient(options.set_at);
        let (dive_at_bar_abs, dive_at_u_bar) = ambient(options.dive_at);
        let temperature = Temperatures::of(options);
        let used = Self {
            first_stage: options.first_stage,
            max_depth_m: options.max_depth.map(Length::as_m),
            ip_range_bar_gauge: options.ip_range.map(|(low, high)| (low.as_bar(), high.as_bar())),
            max_ip_bar_gauge: options.max_ip.map(GaugePressure::as_bar),
            gauge_division_bar: division,
            gauge_error_expanded_bar: gauge_error,
            ip_spread_bar: spread,
            ip_repeat_expanded_bar: repeat,
            chance,
            shortfall,
            water: options.water.unwrap_or(Water::Sea),
            nominal_k: temperature.nominal_k,
            coldest_k: temperature.coldest_k,
            warmest_k: temperature.warmest_k,
            temperature_u_k: temperature.u_k,
            set_at_bar_abs,
            set_at_u_bar,
            dive_at_bar_abs,
            dive_at_u_bar,
            loop_volume_l: options.loop_volume.map(|v| v.value.as_l()),
            diluent_fraction: match options.diluent {
                None | Some(Diluent::Air) => AIR_OXYGEN,
                Some(Diluent::Oxygen(share)) => share.as_ratio(),
            },
            po2_high_bar: po2_high,
            po2_low_bar: po2_low,
            work_l_min: work,
            purity: purity.fraction,
            purity_u: purity.expanded / COVERAGE,
            contents_bar_gauge: contents,
            defaulted,
        };
        used.checked()
    }

    /// Standard uncertainty of the IP gauge, bar.
    #[must_use]
    pub fn gauge_u_bar(&self) -> f64 {
        self.gauge_error_expanded_bar / COVERAGE
    }

    /// Standard uncertainty of the IP from its repeatability, bar.
    #[must_use]
    pub fn repeat_u_bar(&self) -> f64 {
        self.ip_repeat_expanded_bar / COVERAGE
    }

    /// The depth at which the chance of overfeed is held, m: where the injection is largest.
    #[must_use]
    pub fn held_at_m(&self) -> f64 {
        match self.first_stage {
            FirstStageKind::Uncompensated => 0.0,
            FirstStageKind::Compensated => self.max_depth_m.unwrap_or(0.0),
        }
    }

    /// Ambient pressure at a depth where dived, bar absolute.
    #[must_use]
    pub fn ambient_at(&self, depth_m: f64) -> f64 {
        let surface = AbsolutePressure::from_bar(self.dive_at_bar_abs);
        gas::at_depth(surface, Length::from_m(depth_m), self.water).as_bar()
    }

    /// Depth at which the ambient pressure where dived is `bar_abs`, m; negative above the surface.
    #[must_use]
    pub fn depth_of(&self, bar_abs: f64) -> f64 {
        let surface = AbsolutePressure::from_bar(self.dive_at_bar_abs);
        gas::depth_of(surface, AbsolutePressure::from_bar(bar_abs), self.water).as_m()
    }

    fn checked(self) -> Result<Self, SettingError> {
        let within = |value: f64, low: f64, high: f64| value > low && value < high;
        if self.first_stage == FirstStageKind::Compensated && self.max_depth_m.is_none() {
            return Err(SettingError::CompensatedWithoutMaxDepth);
        }
        if let Some(depth) = self.max_depth_m.filter(|d| !(0.0..=DEEPEST_M).contains(d)) {
            return Err(SettingError::MaxDepth(depth));
        }
        if !within(self.chance, 0.0, 0.5) {
            return Err(SettingError::Chance(100.0 * self.chance));
        }
        if !within(self.shortfall, 0.0, LARGEST_SHORTFALL) {
            return Err(SettingError::Shortfall(100.0 * self.shortfall));
        }
        if !within(self.gauge_division_bar, 0.0, f64::INFINITY) {
            return Err(SettingError::Division(self.gauge_division_bar));
        }
        if let Some((low, high)) = self.ip_range_bar_gauge
            && !(low >= 0.0 && high >= low && high.is_finite())
        {
            return Err(SettingError::IpRange(low, high));
        }
        for (what, value) in [
            ("gauge error", self.gauge_error_expanded_bar),
            ("IP spread", self.ip_spread_bar),
            ("IP repeatability", self.ip_repeat_expanded_bar),
            ("uncertainty of the oxygen's purity", self.purity_u),
            ("uncertainty of the barometer", self.set_at_u_bar.min(self.dive_at_u_bar)),
            ("uncertainty of the water temperature", self.temperature_u_k),
        ] {
            if !(value >= 0.0 && value.is_finite()) {
                return Err(SettingError::Negative { what, value });
            }
        }
        for bar in [self.set_at_bar_abs, self.dive_at_bar_abs] {
            if !(PLAUSIBLE_AMBIENT_BAR.0..=PLAUSIBLE_AMBIENT_BAR.1).contains(&bar) {
                return Err(SettingError::Place(1000.0 * bar));
            }
        }
        if !(-2.0..=45.0).contains(&(self.nominal_k - 273.15)) {
            return Err(SettingError::WaterTemperature(self.nominal_k - 273.15));
        }
        if !(self.purity > 0.5 && self.purity <= 1.0) {
            return Err(SettingError::Purity(100.0 * self.purity));
        }
        if !(0.0..1.0).contains(&self.diluent_fraction) {
            return Err(SettingError::Diluent(100.0 * self.diluent_fraction));
        }
        if !(self.po2_low_bar > super::drift::HYPOXIA_BAR
            && self.po2_high_bar > self.po2_low_bar
            && self.po2_high_bar.is_finite())
        {
            return Err(SettingError::Po2(self.po2_high_bar, self.po2_low_bar));
        }
        if !within(self.work_l_min, 0.0, f64::INFINITY) {
            return Err(SettingError::Work(self.work_l_min));
        }
        if let Some(volume) = self.loop_volume_l.filter(|v| !within(*v, 0.0, f64::INFINITY)) {
            return Err(SettingError::LoopVolume(volume));
        }
        let (from, to) = self.contents_bar_gauge;
        if !(from > to && to >= 0.0 && from.is_finite()) {
            return Err(SettingError::Contents(from, to));
        }
        Ok(self)
    }
}

/// Oxygen fraction of dry air (ICAO standard atmosphere), as a session takes it.
const AIR_OXYGEN: f64 = 0.209_476;

/// The temperatures of the gas at the orifice.
struct Temperatures {
    nominal_k: f64,
    coldest_k: f64,
    warmest_k: f64,
    u_k: f64,
}

impl Temperatures {
    fn of(options: &SettingOptions) -> Self {
        let kelvin = |c: f64| Temperature::from_c(c).as_k();
        match options.water_temperature {
            Some(water) => {
                let k = water.value.as_k();
                let expanded =
                    water.expanded.map_or(DEFAULT_TEMPERATURE_EXPANDED_K, TemperatureDifference::as_k);
                Self { nominal_k: k, coldest_k: k, warmest_k: k, u_k: expanded / COVERAGE }
            }
            None => Self {
                nominal_k: kelvin(NOMINAL_C),
                coldest_k: kelvin(COLDEST_C),
                warmest_k: kelvin(WARMEST_C),
                u_k: 0.0,
            },
        }
    }
}

/// Ambient pressure and its standard uncertainty, bar.
fn ambient(place: Option<PlaceGiven>) -> (f64, f64) {
    match place {
        None => (DEFAULT_BAROMETER_BAR, WEATHER_EXPANDED_BAR / COVERAGE),
        Some(PlaceGiven::Altitude(altitude)) => {
            (gas::at_altitude(altitude).as_bar(), WEATHER_EXPANDED_BAR / COVERAGE)
        }
        Some(PlaceGiven::Barometer(read)) => {
            let expanded = read.expanded.map_or(BAROMETER_EXPANDED_BAR, PressureDifference::as_bar);
            (read.value.as_bar(), expanded / COVERAGE)
        }
    }
}
