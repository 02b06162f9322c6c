//! Is it still the same orifice? The flow against the run accepted before.
//!
//! `E_n = (q − q_before) / sqrt(U² + U_before²)` (ISO/IEC 17043:2010, B.3.1.3). A meter or transducer that was on
//! the bench both times under the same certificate errs the same way both times, so its rows are left out of both U
//! (else a small blockage hides behind an error that is not there). Left out: drift of an instrument between two
//! runs of one certificate.

use super::correct::Source;
use super::instruments::Instrument;
use super::line::{FlowAt, Part};
use crate::gas::Species;
use crate::stats::coverage::{coverage_factor, welch_satterthwaite};

/// The flow of a run at its nominal pressure, as the next run is compared with it.
#[derive(Debug, Clone, PartialEq)]
pub struct Accepted {
    /// The run, for a reader.
    pub name: String,
    /// Gas of that run.
    pub gas: Species,
    /// Its flow with the budget.
    pub flow: FlowAt,
    /// Certificate of its flow meter.
    pub meter_certificate: Option<String>,
    /// Certificate of its transducer.
    pub transducer_certificate: Option<String>,
}

/// The comparison.
#[derive(Debug, Clone, Copy, PartialEq)]
pub struct Comparison {
    /// E_n.
    pub en: f64,
    /// Change of the flow, as a share of the earlier one.
    pub change: f64,
}

/// Compares this run's flow with an earlier one at the same pressure.
#[must_use]
pub fn compare(
    flow: &FlowAt,
    meter_certificate: Option<&str>,
    transducer_certificate: Option<&str>,
    before: &Accepted,
) -> Comparison {
    let same = |now: Option<&str>, then: &Option<String>| now.is_some() && now == then.as_deref();
    let same_meter = same(meter_certificate, &before.meter_certificate);
    let same_transducer = same(transducer_certificate, &before.transducer_certificate);
    let shared = |part: &Part| match papers_of(*part) {
        Some(Instrument::Meter) => same_meter,
        Some(Instrument::Transducer) => same_transducer,
        None => false,
    };
    let expanded = |flow: &FlowAt| {
        let own: Vec<(f64, f64)> =
            flow.parts.iter().filter(|(part, ..)| !shared(part)).map(|(_, u, dof)| (u.abs(), *dof)).collect();
        let u = own.iter().map(|(u, _)| u * u).sum::<f64>().sqrt();
        u * coverage_factor(super::line::COVERAGE_PROBABILITY, welch_satterthwaite(own))
    };
    let (now, then) = (expanded(flow), expanded(&before.flow));
    let difference = flow.flow_l_min - before.flow.flow_l_min;
    Comparison {
        en: difference / (now * now + then * then).sqrt(),
        change: difference / before.flow.flow_l_min,
    }
}

/// The instrument whose calibration a part of a budget comes from; none when it is the run's own.
pub(super) const fn papers_of(part: Part) -> Option<Instrument> {
    match part {
        Part::Common(Source::MeterGain | Source::MeterZero | Source::GasFactor | Source::FloatLaw) => {
            Some(Instrument::Meter)
        }
        Part::Common(Source::TransducerGain | Source::TransducerZero) => Some(Instrument::Transducer),
        _ => None,
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    fn flow(value: f64) -> FlowAt {
        let parts = vec![
            (Part::Random, 0.001, f64::INFINITY),
            (Part::Common(Source::MeterGain), 0.01, f64::INFINITY),
            (Part::Common(Source::Barometer), 0.001, f64::INFINITY),
        ];
        FlowAt::new(11.0, value, parts)
    }

    fn accepted(value: f64, certificate: &str) -> Accepted {
        Accepted {
            name: "before".into(),
            gas: Species::Oxygen,
            flow: flow(value),
            meter_certificate: Some(certificate.into()),
            transducer_certificate: None,
        }
    }

    #[test]
    fn a_shared_certificate_does_not_hide_a_small_blockage() {
        // 2 % less: within the meter's own gain error, far outside what differs between two runs on one meter.
        let shared = compare(&flow(0.49), Some("A"), None, &accepted(0.50, "A"));
        let other = compare(&flow(0.49), Some("A"), None, &accepted(0.50, "B"));
        let own = 2.0_f64.sqrt() * 0.001 * 1.959_964;
        assert!((shared.en + 0.01 / (2.0_f64.sqrt() * own)).abs() < 1e-6, "{}", shared.en);
        assert!(shared.en < -1.0 && other.en.abs() < 1.0, "{} {}", shared.en, other.en);
        assert!((shared.change + 0.02).abs() < 1e-12);
    }

    #[test]
    fn an_unnamed_certificate_is_not_the_same_certificate() {
        let mut before = accepted(0.50, "A");
        before.meter_certificate = None;
        assert!(compare(&flow(0.49), None, None, &before).en.abs() < 1.0);
    }
}
