//! Over two thousand simulated sessions of mixed kinds, or a part of them (`studies`), the intervals hold what they promise and are narrow, and each of the
//! mistakes people make breaks that. The simulator is independent of the estimator (see `loop_simulator`).

#![allow(clippy::unwrap_used, reason = "a test may panic, also in what it calls")]
#![allow(clippy::print_stdout, reason = "a study tells what it found")]

use crate::loop_simulator::{Dice, Extra, Kind, Scene, scene_of, truth};
use crate::studies::{cases, full, room};
use ebbline::entry::{Feeds, Injection, Session, What};
use ebbline::quantity::{Span, StpdFlow, Temperature, Volume};
use ebbline::uptake::{Estimate, SessionInput, WhyNot, uptake};

/// What a study comes to.
#[derive(Debug, Clone, Copy)]
struct Tally {
    sessions: usize,
    answered: usize,
    covered: f64,
    mean_error: f64,
    /// Two standard deviations of the mean error where only a part of the sessions was drawn.
    room: f64,
    median_half_width: f64,
}

impl Tally {
    /// The limits of the method: 93-98 %, mean error under 1 %, median half-width under 9 %.
    fn holds(&self) -> bool {
        let room = |limit| room(limit, self.answered);
        (0.93 - room(0.93)..=0.98 + room(0.98)).contains(&self.covered)
            && self.mean_error.abs() < 0.01 + self.room
            && self.median_half_width < 0.09
    }
}

/// What single sessions came to.
#[derive(Debug, Default)]
struct Found {
    sessions: usize,
    covered: usize,
    /// Relative errors of the estimates, and half-widths of their intervals, over the truth.
    errors: Vec<f64>,
    half_widths: Vec<f64>,
}

impl Found {
    /// Takes in what a session with this true uptake came to; none, where there was no answer.
    fn take(&mut self, estimate: Option<&Estimate>, truth: f64) {
        self.sessions += 1;
        let Some(estimate) = estimate else { return };
        let (low, high) = estimate.interval_95;
        self.covered += usize::from(low <= truth && truth <= high);
        self.errors.push(estimate.uptake_l_min / truth - 1.0);
        self.half_widths.push(0.5 * (high - low) / truth);
    }

    fn add(&mut self, other: Self) {
        self.sessions += other.sessions;
        self.covered += other.covered;
        self.errors.extend(other.errors);
        self.half_widths.extend(other.half_widths);
    }

    fn tally(&self) -> Tally {
        let n = self.errors.len() as f64;
        let mut half_widths = self.half_widths.clone();
        half_widths.sort_by(f64::total_cmp);
        let mean = self.errors.iter().sum::<f64>() / n;
        let square = self.errors.iter().map(|e| (e - mean).powi(2)).sum::<f64>() / n;
        Tally {
            sessions: self.sessions,
            answered: self.errors.len(),
            covered: self.covered as f64 / n,
            mean_error: mean,
            room: if full() { 0.0 } else { 2.0 * (square / n).sqrt() },
            median_half_width: half_widths[half_widths.len() / 2],
        }
    }
}

fn estimate(scene: &Scene) -> Result<Estimate, WhyNot> {
    let input = SessionInput { session: &scene.session, line: scene.line.as_ref() };
    uptake(&[input]).unwrap().places.remove(0).answer
}

/// Sessions to draw where a full study has `all`.
fn part(all: u64) -> u64 {
    cases(all as usize / 4, all as usize) as u64
}

/// A study over `per_kind` sessions of each kind (a part of them where it is not a full one), each record changed by
/// `mistake` before it is worked out.
fn study(kinds: &[Kind], per_kind: u64, mistake: impl Fn(&mut Session)) -> Tally {
    found(kinds, per_kind, &Extra::default(), mistake).tally()
}

fn found(kinds: &[Kind], per_kind: u64, extra: &Extra, mistake: impl Fn(&mut Session)) -> Found {
    let mut found = Found::default();
    for kind in kinds {
        for seed in 0..part(per_kind) {
            let mut dice = Dice::new(1000 * seed + *kind as u64);
            let truth = truth(&mut dice);
            let mut scene = scene_of(*kind, truth, extra, &mut dice);
            mistake(&mut scene.session);
            found.take(estimate(&scene).as_ref().ok(), scene.truth.uptake);
        }
    }
    found
}

fn assert_breaks(what: &str, right: Tally, wrong: Tally) {
    println!("{what}: right {right:?}\n  wrong {wrong:?}");
    assert!(wrong.covered < 0.93 || wrong.mean_error.abs() > 0.01, "{what} goes unnoticed: {wrong:?}");
    assert!(
        wrong.covered < right.covered && wrong.mean_error.abs() > right.mean_error.abs(),
        "{what} is no worse: {right:?}, {wrong:?}"
    );
}

#[test]
fn intervals_cover_the_days_uptake_and_are_narrow() {
    let mut all = Found::default();
    for kind in Kind::ALL {
        let found = found(&[kind], 200, &Extra::default(), |_| {});
        let one = found.tally();
        println!("{kind:?}: {one:?}");
        // Of 200 sessions 95 % ± 1.5 %: no kind may be much worse than the whole.
        let low = 0.90 - room(0.90, one.answered);
        assert!(one.covered >= low && one.mean_error.abs() < 0.015 + one.room, "{kind:?}: {one:?}");
        all.add(found);
    }
    let all = all.tally();
    println!("all: {all:?}");
    assert!(all.sessions as u64 == part(2000) && all.answered * 100 >= all.sessions * 99, "{all:?}");
    assert!(all.holds(), "{all:?}");
}

#[test]
fn a_20_degree_flow_taken_as_stpd_breaks_the_study() {
    let kinds = [Kind::HeldTwice, Kind::Null, Kind::Topped];
    let wrong = study(&kinds, 150, |session| {
        for event in &mut session.events {
            if let What::Injection(Injection::Flow(flow)) = &mut event.what {
                // Litres at 20 °C and 101.325 kPa are 293.15/273.15 as many.
                flow.value = StpdFlow::from_m3_s(flow.value.as_m3_s() * 293.15 / 273.15);
            }
        }
    });
    assert_breaks("20 °C flow as STPD", study(&kinds, 150, |_| {}), wrong);
}

#[test]
fn inert_gas_set_anew_for_every_sealed_segment_breaks_the_study() {
    // A mark at every change claims that the loop is back at its volume, so that inert gas is set by the fraction there.
    let kinds = [Kind::SealedTwice];
    let wrong = study(&kinds, 300, |session| {
        let anew = What::MakeUp { kept: None, mark: true };
        let changes: Vec<f64> = session.events.iter().map(|e| e.at_s).filter(|at| *at > 0.0).collect();
        session.events.extend(changes.iter().map(|at_s| ebbline::entry::Event { at_s: *at_s, what: anew }));
    });
    assert_breaks("inert gas anew", study(&kinds, 300, |_| {}), wrong);
}

#[test]
fn vapour_forgotten_breaks_the_study() {
    // Sealed from PO2 0.6 with little injected: 1/(1 − f) is then nearly all uptake. Vapour is forgotten by claiming so cold a loop that there is none, with the volume scaled so that
    // temperature itself changes nothing.
    let kinds = [Kind::Sealed];
    let extra = Extra { share: Some(0.3), minutes: -13.0, ..Extra::default() };
    let wrong = found(&kinds, 300, &extra, |session| {
        session.conditions.loop_temperature.value = Some(Temperature::from_c(-20.0));
        let volume = session.loop_volume.as_mut().unwrap();
        volume.value = Volume::from_m3(volume.value.as_m3() * 253.15 / 306.15);
        volume.expanded = volume.expanded.map(|d| Volume::from_m3(d.as_m3() * 253.15 / 306.15));
    });
    let wrong = wrong.tally();
    assert_breaks("vapour forgotten", found(&kinds, 300, &extra, |_| {}).tally(), wrong);
}

#[test]
fn a_cylinders_drop_counted_together_with_the_injection_breaks_the_study() {
    let kinds = [Kind::Cylinder];
    let wrong = study(&kinds, 150, |session| {
        session.cylinder.as_mut().unwrap().feeds = Feeds::Adds;
    });
    assert_breaks("drop and injection", study(&kinds, 150, |_| {}), wrong);
}

#[test]
fn nitrogen_forgotten_breaks_the_study() {
    // Sealed, from minute zero on the loop, oxygen fraction 0.65: W·f/(1 − f) is twice the nitrogen.
    let forgotten = |forget: bool| {
        let mut found = Found::default();
        for seed in 0..part(300) {
            let mut dice = Dice::new(77_000 + seed);
            let mut truth = truth(&mut dice);
            truth.on_loop_min = 0.0;
            let extra = Extra { po2: Some(0.65 * (truth.ambient_bar - 0.05)), ..Extra::default() };
            let mut scene = scene_of(Kind::Sealed, truth, &extra, &mut dice);
            if forget {
                scene.session.assumptions.washout = (StpdFlow::from_l_min(0.0), StpdFlow::from_l_min(0.0));
            }
            found.take(estimate(&scene).as_ref().ok(), scene.truth.uptake);
        }
        found.tally()
    };
    assert_breaks("nitrogen forgotten", forgotten(false), forgotten(true));
}

#[test]
fn ordinary_slopes_and_no_wander_break_the_coverage_of_slopes() {
    // What the slope would have been had the diver not wandered and the cells been still: the same loop, simulated so.
    let (mut ours, mut ordinary, mut noise_alone, mut segments) = (0.0, 0.0, 0.0, 0.0);
    for kind in [Kind::Held, Kind::Sealed, Kind::SealedTwice] {
        for seed in 0..part(100) {
            let mut dice = Dice::new(55_000 + 1000 * seed + kind as u64);
            let real = truth(&mut dice);
            let mut still = real.clone();
            (still.wander, still.cell_noise, still.last_digit) = (0.0, 1e-6, 1e-9);
            still.puff_l = 0.01;
            let extra = Extra::default();
            let of = |truth, dice: &mut Dice| {
                let scene = scene_of(kind, truth, &extra, dice);
                let input = SessionInput { session: &scene.session, line: None };
                uptake(&[input]).unwrap().places.remove(0).sessions.remove(0).segments
            };
            let (mut a, mut b) = (Dice::new(seed), Dice::new(seed));
            for (got, want) in of(real, &mut a).iter().zip(&of(still, &mut b)) {
                let off = (got.slope_per_min - want.slope_per_min).abs();
                segments += 1.0;
                ours += f64::from(u8::from(off <= 2.1 * got.slope_u));
                noise_alone += f64::from(u8::from(off <= 2.1 * got.slope_u_noise));
                ordinary += f64::from(u8::from(off <= 1.96 * got.slope_u_ordinary.unwrap()));
            }
        }
    }
    (ours, ordinary, noise_alone) = (ours / segments, ordinary / segments, noise_alone / segments);
    println!("of {segments} slopes: ours {ours}, noise alone {noise_alone}, ordinary {ordinary}");
    let room = |limit| room(limit, segments as usize);
    assert!((0.93 - room(0.93)..=0.99 + room(0.99)).contains(&ours), "{ours}");
    assert!(noise_alone < 0.7 && ordinary < 0.3, "noise alone {noise_alone}, ordinary {ordinary}");
    let kinds = [Kind::Held, Kind::Topped];
    let without = study(&kinds, 150, |session| session.assumptions.wander = 0.0);
    println!("without wander: {without:?}");
    assert!(without.covered < 0.93, "{without:?}");
}

#[test]
fn another_day_is_covered_only_with_the_spread_from_day_to_day() {
    // 5 % spread from day to day, one session or three, and then the day of the dive.
    for days in [1, 3] {
        let (mut covered, mut above, mut bare, mut answered) = (0.0, 0.0, 0.0, 0.0);
        for seed in 0..part(400) {
            let mut dice = Dice::new(31_000 + 7 * seed + days);
            let usual = truth(&mut dice);
            let mut scenes = Vec::new();
            for day in 0..days {
                let mut today = usual.clone();
                today.uptake = usual.uptake * (1.0 + dice.normal(0.0, 0.05));
                let mut scene = scene_of(Kind::Held, today, &Extra::default(), &mut dice);
                scene.session.taken += chrono::Duration::days(day as i64);
                scenes.push(scene);
            }
            let that_day = usual.uptake * (1.0 + dice.normal(0.0, 0.05));
            let mut next = |spread: f64| {
                for scene in &mut scenes {
                    scene.session.assumptions.day_spread = spread;
                }
                let inputs: Vec<_> =
                    scenes.iter().map(|s| SessionInput { session: &s.session, line: None }).collect();
                uptake(&inputs).unwrap().places.remove(0).answer.map(|e| e.next_day)
            };
            let (Ok(with), Ok(without)) = (next(0.05), next(0.0)) else { continue };
            assert_eq!(with.days, days as usize);
            let holds = |interval: (f64, f64)| interval.0 <= that_day && that_day <= interval.1;
            answered += 1.0;
            covered += f64::from(u8::from(holds(with.interval_95)));
            above += f64::from(u8::from(that_day < with.interval_95.0));
            bare += f64::from(u8::from(holds(without.interval_95)));
        }
        (covered, above, bare) = (covered / answered, above / answered, bare / answered);
        println!(
            "{days} days: covered {covered}, uptake below the interval {above}, without the spread {bare}"
        );
        let room = |limit| room(limit, answered as usize);
        assert!((0.93 - room(0.93)..=0.99 + room(0.99)).contains(&covered), "{days} days: {covered}");
        // The stated chance of 2.5 % and three standard deviations of so many draws.
        assert!(above <= 0.025 + 3.0 * (0.025_f64 * 0.975 / answered).sqrt(), "{days} days: {above}");
        assert!(bare < 0.9, "{days} days: {bare}");
    }
}

#[test]
fn a_warming_scrubber_mimics_uptake_unless_it_is_left_out_or_measured() {
    // Vapour rises from 20 to 33 °C; the scrubber was not warm, and the diver went on the loop just before.
    let mut errors = [0.0; 3];
    let sessions = 60;
    for seed in 0..sessions {
        let mut dice = Dice::new(90_000 + seed);
        let mut truth = truth(&mut dice);
        (truth.on_loop_min, truth.warming_min, truth.wander) = (0.0, 4.0, 0.0);
        let extra = Extra { minutes: 10.0, po2: Some(0.8), ..Extra::default() };
        let scene = scene_of(Kind::Held, truth, &extra, &mut dice);
        let said = |warm: Option<bool>, column: bool| {
            let mut session = scene.session.clone();
            session.conditions.scrubber_warm = warm;
            session.conditions.time_on_loop = Some(Span::from_s(0.0));
            session.readings.loop_temperature_k =
                column.then(|| scene.log.loop_c.iter().map(|c| c + 273.15).collect());
            // The volume at the first reading is the true one here, so that only the warming shows.
            session.loop_volume.as_mut().unwrap().value = Volume::from_m3(scene.truth.volume_l / 1e3);
            let input = SessionInput { session: &session, line: None };
            uptake(&[input]).unwrap().places.remove(0).answer.unwrap().uptake_l_min / scene.truth.uptake - 1.0
        };
        for (error, got) in
            errors.iter_mut().zip([said(Some(true), false), said(None, false), said(None, true)])
        {
            *error += got / sessions as f64;
        }
    }
    let [ignored, left_out, measured] = errors;
    println!("mean error: ignored {ignored}, left out {left_out}, with a column {measured}");
    assert!(ignored.abs() > 0.01, "{ignored}");
    assert!(left_out.abs() < 0.02 && measured.abs() < 0.02, "{left_out} {measured}");
    assert!(left_out.abs() < ignored.abs() && measured.abs() < ignored.abs());
}
