//! One printed number with everything that makes it one: unit, reference conditions, uncertainty, place in the document.

use crate::certificate::rounding;
use crate::report::number::{fixed, shortest};

/// A number of the certificate.
#[derive(Debug, Clone, PartialEq)]
pub struct Figure {
    /// Its place in the content, the same in every certificate: `results/flow_at/3`.
    pub path: String,
    /// What it is, in words.
    pub name: String,
    /// The value, not rounded.
    pub value: f64,
    /// Its unit.
    pub unit: Unit,
    /// The reference conditions it is stated at, where the number depends on them.
    pub reference: Option<Reference>,
    /// How well it is known.
    pub uncertainty: Uncertainty,
    /// Decimals to print it with; fewer than none before the point.
    pub decimals: i32,
}

/// How well a figure is known.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Uncertainty {
    /// Expanded, with its coverage factor and probability.
    Expanded {
        /// Expanded uncertainty in the unit of the value, not rounded.
        expanded: f64,
        /// Coverage factor.
        k: f64,
        /// Coverage probability.
        p: f64,
    },
    /// An interval that need not be symmetric.
    Interval {
        /// Standard uncertainty.
        standard: f64,
        /// Lower end.
        low: f64,
        /// Upper end.
        high: f64,
        /// Coverage probability.
        p: f64,
    },
    /// None, and why.
    None(NoUncertainty),
}

/// Why a figure carries no uncertainty.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum NoUncertainty {
    /// It was set or agreed: a nominal value, a limit, a pressure the line is read at.
    Stated,
    /// It is part of an uncertainty itself.
    OfAnUncertainty,
    /// It describes the fit or a check and is no result.
    Descriptive,
    /// Nobody stated one.
    NotStated,
}

impl NoUncertainty {
    /// In words.
    #[must_use]
    pub const fn says(self) -> &'static str {
        match self {
            Self::Stated => "a stated value, without uncertainty",
            Self::OfAnUncertainty => "part of an uncertainty",
            Self::Descriptive => "describes the fit, no measurement result",
            Self::NotStated => "no uncertainty was stated",
        }
    }
}

/// Reference conditions, by name.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Reference {
    /// STPD, gas of 20 °C at the orifice; for a gauge pressure, at 1.01325 bar ambient.
    StpdAtStandardAmbient,
    /// STPD, gas of 20 °C at the orifice; against absolute pressure.
    Stpd,
    /// The conditions of ISO 6358 (ANR).
    Anr,
    /// Over the standard atmosphere.
    GaugeAtStandardAmbient,
    /// Absolute.
    Absolute,
}

impl Reference {
    /// In words.
    #[must_use]
    pub const fn says(self) -> &'static str {
        match self {
            Self::StpdAtStandardAmbient => {
                "STPD (0 °C, 101.325 kPa, dry), gas of 20 °C at the orifice, 1.01325 bar ambient"
            }
            Self::Stpd => "STPD (0 °C, 101.325 kPa, dry), gas of 20 °C at the orifice",
            Self::Anr => "ANR (ISO 6358: 20 °C, 100 kPa, 65 % relative humidity)",
            Self::GaugeAtStandardAmbient => "gauge, over an ambient pressure of 1.01325 bar",
            Self::Absolute => "absolute",
        }
    }
}

/// Units a certificate prints.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Unit {
    /// None.
    One,
    /// Hundredth part.
    Percent,
    /// L/min.
    LitrePerMinute,
    /// bar.
    Bar,
    /// kPa.
    KiloPascal,
    /// hPa.
    HectoPascal,
    /// L/min per bar.
    LitrePerMinuteBar,
    /// (L/min)².
    FlowSquared,
    /// (L/min)² per bar.
    FlowSquaredPerBar,
    /// (L/min)² per bar².
    FlowSquaredPerBarSquared,
    /// dm³/(s·bar).
    LitrePerSecondBar,
    /// µm.
    MicroMetre,
    /// °C.
    DegreeCelsius,
}

/// A unit of the D-SI and what a number in ours is multiplied by, as a power of ten.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub struct Dsi {
    /// The unit string.
    pub unit: &'static str,
    /// Power of ten.
    pub power: i32,
}

const fn dsi(unit: &'static str, power: i32) -> Dsi {
    Dsi { unit, power }
}

impl Unit {
    /// Every unit.
    pub const ALL: [Self; 13] = [
        Self::One,
        Self::Percent,
        Self::LitrePerMinute,
        Self::Bar,
        Self::KiloPascal,
        Self::HectoPascal,
        Self::LitrePerMinuteBar,
        Self::FlowSquared,
        Self::FlowSquaredPerBar,
        Self::FlowSquaredPerBarSquared,
        Self::LitrePerSecondBar,
        Self::MicroMetre,
        Self::DegreeCelsius,
    ];

    /// Its symbol; empty for none.
    #[must_use]
    pub const fn symbol(self) -> &'static str {
        match self {
            Self::One => "",
            Self::Percent => "%",
            Self::LitrePerMinute => "L/min",
            Self::Bar => "bar",
            Self::KiloPascal => "kPa",
            Self::HectoPascal => "hPa",
            Self::LitrePerMinuteBar => "L/min per bar",
            Self::FlowSquared => "(L/min)²",
            Self::FlowSquaredPerBar => "(L/min)² per bar",
            Self::FlowSquaredPerBarSquared => "(L/min)² per bar²",
            Self::LitrePerSecondBar => "dm³/(s·bar)",
            Self::MicroMetre => "µm",
            Self::DegreeCelsius => "°C",
        }
    }

    /// Its forms in the D-SI, the preferred one first: a unit with bar, which the D-SI discourages, stands beside one with
    /// kilopascal.
    #[must_use]
    pub const fn dsi(self) -> &'static [Dsi] {
        match self {
            Self::One => const { &[dsi(r"\one", 0)] },
            Self::Percent => const { &[dsi(r"\percent", 0)] },
            Self::LitrePerMinute => const { &[dsi(r"\litre\minute\tothe{-1}", 0)] },
            Self::Bar => const { &[dsi(r"\kilo\pascal", 2), dsi(r"\bar", 0)] },
            Self::KiloPascal => const { &[dsi(r"\kilo\pascal", 0)] },
            Self::HectoPascal => const { &[dsi(r"\kilo\pascal", -1), dsi(r"\hecto\pascal", 0)] },
            Self::LitrePerMinuteBar => {
                const {
                    &[
                        dsi(r"\litre\minute\tothe{-1}\kilo\pascal\tothe{-1}", -2),
                        dsi(r"\litre\minute\tothe{-1}\bar\tothe{-1}", 0),
                    ]
                }
            }
            Self::FlowSquared => const { &[dsi(r"\litre\tothe{2}\minute\tothe{-2}", 0)] },
            Self::FlowSquaredPerBar => {
                const {
                    &[
                        dsi(r"\litre\tothe{2}\minute\tothe{-2}\kilo\pascal\tothe{-1}", -2),
                        dsi(r"\litre\tothe{2}\minute\tothe{-2}\bar\tothe{-1}", 0),
                    ]
                }
            }
            Self::FlowSquaredPerBarSquared => {
                const {
                    &[
                        dsi(r"\litre\tothe{2}\minute\tothe{-2}\kilo\pascal\tothe{-2}", -4),
                        dsi(r"\litre\tothe{2}\minute\tothe{-2}\bar\tothe{-2}", 0),
                    ]
                }
            }
            Self::LitrePerSecondBar => {
                const {
                    &[
                        dsi(r"\litre\second\tothe{-1}\kilo\pascal\tothe{-1}", -2),
                        dsi(r"\litre\second\tothe{-1}\bar\tothe{-1}", 0),
                    ]
                }
            }
            Self::MicroMetre => const { &[dsi(r"\micro\metre", 0)] },
            Self::DegreeCelsius => const { &[dsi(r"\degreecelsius", 0)] },
        }
    }
}

impl Figure {
    /// A result with its expanded uncertainty, which says to how many decimals it is printed. An uncertainty that is not
    /// above nought is none: the figure then has four significant figures.
    #[must_use]
    pub fn measured(
        path: impl Into<String>,
        name: impl Into<String>,
        (value, expanded, k): (f64, f64, f64),
        unit: Unit,
    ) -> Self {
        match rounding::decimals(expanded) {
            Some(decimals) => Self {
                path: path.into(),
                name: name.into(),
                value,
                unit,
                reference: None,
                uncertainty: Uncertainty::Expanded {
                    expanded,
                    k,
                    p: crate::bench::line::COVERAGE_PROBABILITY,
                },
                decimals,
            },
            None => {
                Self::plain(path, name, value, unit, decimals_of_figures(value, 4), NoUncertainty::NotStated)
            }
        }
    }

    /// A number without uncertainty.
    #[must_use]
    pub fn plain(
        path: impl Into<String>,
        name: impl Into<String>,
        value: f64,
        unit: Unit,
        decimals: i32,
        why: NoUncertainty,
    ) -> Self {
        Self {
            path: path.into(),
            name: name.into(),
            value,
            unit,
            reference: None,
            uncertainty: Uncertainty::None(why),
            decimals,
        }
    }

    /// A number that was set by somebody, with as few decimals as it was set with.
    #[must_use]
    pub fn stated(path: impl Into<String>, name: impl Into<String>, value: f64, unit: Unit) -> Self {
        let text = shortest(value, 7);
        let decimals = text.split_once('.').map_or(0, |(_, d)| i32::try_from(d.len()).unwrap_or(0));
        Self::plain(path, name, value, unit, decimals, NoUncertainty::Stated)
    }

    /// An uncertainty: two significant figures.
    #[must_use]
    pub fn of_uncertainty(path: impl Into<String>, name: impl Into<String>, value: f64, unit: Unit) -> Self {
        let decimals = rounding::decimals(value).unwrap_or(0);
        Self::plain(path, name, value, unit, decimals, NoUncertainty::OfAnUncertainty)
    }

    /// A number that describes something, with so many significant figures.
    #[must_use]
    pub fn descriptive(
        path: impl Into<String>,
        name: impl Into<String>,
        value: f64,
        unit: Unit,
        figures: i32,
    ) -> Self {
        Self::plain(path, name, value, unit, decimals_of_figures(value, figures), NoUncertainty::Descriptive)
    }

    /// The same at reference conditions.
    #[must_use]
    pub fn at(mut self, reference: Reference) -> Self {
        self.reference = Some(reference);
        self
    }

    /// The value as printed.
    #[must_use]
    pub fn printed(&self) -> String {
        rounding::value(self.value, self.decimals)
    }

    /// The expanded uncertainty as printed, where there is one.
    #[must_use]
    pub fn printed_expanded(&self) -> Option<String> {
        match self.uncertainty {
            Uncertainty::Expanded { expanded, .. } => rounding::expanded(expanded),
            _ => None,
        }
    }

    /// Coverage factor as printed.
    #[must_use]
    pub fn printed_k(&self) -> Option<String> {
        match self.uncertainty {
            Uncertainty::Expanded { k, .. } => Some(fixed(k, K_DECIMALS)),
            _ => None,
        }
    }

    /// Coverage probability as printed.
    #[must_use]
    pub fn printed_p(&self) -> Option<String> {
        match self.uncertainty {
            Uncertainty::Expanded { p, .. } | Uncertainty::Interval { p, .. } => Some(probability(p)),
            Uncertainty::None(_) => None,
        }
    }

    /// The ends of its interval as printed.
    #[must_use]
    pub fn printed_interval(&self) -> Option<(String, String)> {
        match self.uncertainty {
            Uncertainty::Interval { low, high, .. } => {
                Some((fixed(low, self.decimals), fixed(high, self.decimals)))
            }
            _ => None,
        }
    }

    /// Value, uncertainty and unit in one text: `0.4803 ± 0.0044 L/min`.
    #[must_use]
    pub fn text(&self) -> String {
        let space = if self.unit.symbol().is_empty() { "" } else { " " };
        let unit = self.unit.symbol();
        let value = self.printed();
        match (self.printed_expanded(), self.printed_interval()) {
            (Some(u), _) => format!("{value} ± {u}{space}{unit}"),
            (_, Some((low, high))) => format!("{value}{space}{unit} ({low} to {high})"),
            _ => format!("{value}{space}{unit}"),
        }
    }

    /// Whether every number of it is finite.
    #[must_use]
    pub fn is_finite(&self) -> bool {
        self.value.is_finite()
            && match self.uncertainty {
                Uncertainty::Expanded { expanded, k, p } => {
                    expanded.is_finite() && k.is_finite() && p.is_finite()
                }
                Uncertainty::Interval { standard, low, high, p } => {
                    [standard, low, high, p].iter().all(|x| x.is_finite())
                }
                Uncertainty::None(_) => true,
            }
    }
}

/// Decimals a coverage factor is printed with.
pub const K_DECIMALS: i32 = 2;

/// A coverage probability as printed: 0.95, 0.9545.
#[must_use]
pub fn probability(p: f64) -> String {
    shortest(p, 4)
}

/// Decimals that show so many significant figures.
#[must_use]
pub fn decimals_of_figures(value: f64, figures: i32) -> i32 {
    if !(value.is_finite() && value != 0.0) {
        return 0;
    }
    // The exponent of the rounded number: 9.96 to two figures is 10.
    let digits = usize::try_from((figures - 1).max(0)).unwrap_or(0);
    let text = format!("{:.digits$e}", value.abs());
    let exponent: i32 = text.rsplit('e').next().and_then(|e| e.parse().ok()).unwrap_or(0);
    (figures - 1 - exponent).clamp(-12, 15)
}
