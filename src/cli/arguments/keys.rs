//! The keys of an entry's file as flags: `--meter-made-for` says what `made_for` in the table `[meter]` says.
//!
//! The flags stand in tables, one for each register, and are handed on as they were typed: what they mean is read where
//! files are read, in the same way.

use std::marker::PhantomData;

use clap::{Arg, ArgAction, ArgMatches, Args, Command, FromArgMatches};

use crate::work::registers::flag_of;

/// A flag: the key of the file, its value's name, what it says.
pub(super) type Key = (&'static str, &'static str, &'static str);

/// The keys of a register.
pub trait Keys: std::fmt::Debug {
    /// The keys under a heading of the help.
    const KEYS: &'static [(&'static str, &'static [Key])];
}

/// The flags that were given, in the order of the keys: each with its text.
#[derive(Debug, Clone)]
pub struct Flags<K> {
    /// Keys and texts; a key may come several times.
    pub given: Vec<(String, String)>,
    of: PhantomData<K>,
}

/// The name of a flag among the arguments; no other argument has a colon in its name.
fn name(key: &str) -> String {
    format!("key:{key}")
}

impl<K: Keys> FromArgMatches for Flags<K> {
    fn from_arg_matches(matches: &ArgMatches) -> Result<Self, clap::Error> {
        let mut given = Vec::new();
        for (key, ..) in K::KEYS.iter().flat_map(|(_, keys)| *keys) {
            for text in matches.get_many::<String>(&name(key)).into_iter().flatten() {
                given.push(((*key).to_owned(), text.clone()));
            }
        }
        Ok(Self { given, of: PhantomData })
    }

    fn update_from_arg_matches(&mut self, matches: &ArgMatches) -> Result<(), clap::Error> {
        *self = Self::from_arg_matches(matches)?;
        Ok(())
    }
}

impl<K: Keys> Args for Flags<K> {
    fn augment_args(command: Command) -> Command {
        let flags = K::KEYS.iter().flat_map(|(heading, keys)| keys.iter().map(move |key| (*heading, *key)));
        flags.fold(command, |command, (heading, (key, value, says))| {
            let flag = flag_of(key);
            command.arg(
                Arg::new(name(key))
                    .long(flag.trim_start_matches('-').to_owned())
                    .value_name(value)
                    .help(says)
                    .help_heading(heading)
                    .allow_hyphen_values(true)
                    .action(ArgAction::Append),
            )
        })
    }

    fn augment_args_for_update(command: Command) -> Command {
        Self::augment_args(command)
    }
}

macro_rules! keys {
    ($(#[$about:meta] $name:ident { $($heading:literal: [$(($key:literal, $value:literal, $says:literal)),+ $(,)?])+ })+) => {
        $(
            #[$about]
            #[derive(Debug, Clone)]
            pub struct $name;

            impl Keys for $name {
                const KEYS: &'static [(&'static str, &'static [Key])] =
                    &[$(($heading, &[$(($key, $value, $says)),+])),+];
            }
        )+
    };
}

keys! {
    /// Keys of an orifice.
    OrificeKeys {
        "Orifice": [
            ("id", "ID", "Its name: 1-32 letters, digits, -, _ or ."),
            ("description", "TEXT", "What it is"),
            ("serial", "TEXT", "Serial number"),
            ("maker", "TEXT", "Maker"),
            ("customer", "TEXT", "Whose it is"),
            ("build", "WORDS", "thin plate | short tube | nozzle | unknown"),
            ("length", "LENGTH", "Length of the hole, as in \"0.2 mm\""),
            ("nominal_diameter", "LENGTH", "Diameter the maker states, as in \"76 µm\""),
            ("acceptance", "ID", "The acceptance it is judged by where a run names none"),
        ]
    }
    /// Keys of a first stage.
    FirstStageKeys {
        "First stage": [
            ("id", "ID", "Its name: 1-32 letters, digits, -, _ or ."),
            ("compensated", "true|false", "Whether its IP follows depth"),
            ("ip_range", "RANGE", "IP it can be set to, as in \"7 bar to 13 bar\""),
            ("division", "PRESSURE", "Division of the gauge it is set by, as in \"0.1 bar\""),
            ("gauge_scale", "PRESSURE", "Full scale of that gauge, as in \"20 bar\""),
            ("gauge_error", "PRESSURE", "Error of that gauge, k = 2, as in \"0.3 bar\""),
            ("ip_spread", "PRESSURE", "How far the IP may rise by itself: creep and supply"),
            ("ip_repeat", "PRESSURE", "How well it comes back, k = 2"),
            ("max_ip", "PRESSURE", "The IP the maker allows at most"),
            ("trapped_volume", "VOLUME", "Volume between the shut valve and the orifice, as in \"12 mL ± 3 mL\""),
            ("fall_observed", "RATE", "Fall of the IP with the valve shut, as in \"2.1 bar/min ± 0.2 bar/min\""),
            ("maker", "TEXT", "Maker"),
            ("serial", "TEXT", "Serial number"),
        ]
    }
    /// Keys of a diver.
    DiverKeys {
        "Diver (personal: diver forget takes all of it away)": [
            ("id", "ID", "The name in the register: 1-32 letters, digits, -, _ or ."),
            ("name", "TEXT", "The diver's own name"),
            ("mass", "MASS", "Body mass, for plausibility only, as in \"82 kg\""),
            ("loop_volume", "VOLUME", "Loop and lungs, as in \"7.5 L ± 1.0 L\""),
            ("diluent", "GAS", "air, or oxygen with its share, as in \"oxygen 18 %\""),
        ]
    }
    /// Keys of an acceptance.
    AcceptanceKeys {
        "Acceptance": [
            ("id", "ID", "Its name: 1-32 letters, digits, -, _ or ."),
            ("ip", "PRESSURE", "Nominal IP, as in \"10 bar\""),
            ("flow", "FLOW", "Nominal flow, STPD, as in \"0.48 L/min\""),
            ("gas", "GAS", "The gas that flow is meant for: oxygen | air | nitrogen | helium"),
            ("tolerance", "SHARE|FLOW", "How far the flow may be off, as in \"5 %\""),
            ("rule", "RULE", "guarded | simple"),
        ]
        "Limits of the checks": [
            ("straight", "SHARE", "Bend of the line, as in \"0.5 %\""),
            ("hysteresis", "SHARE", "Rising against falling sweep"),
            ("repeat", "SHARE", "Scatter of repeated points"),
            ("steady", "SHARE", "Drift over the run"),
            ("significance", "NUMBER", "Significance level of the tests"),
            ("crossing", "RANGE", "Where the line may cross the pressure axis, as in \"0 kPa to 25 kPa\""),
            ("en", "NUMBER", "Largest |E_n| against the run before"),
            ("leak", "RATE", "Largest leak with the outlet blanked, as in \"0.01 bar/min\""),
        ]
    }
    /// Keys of the shop.
    ShopKeys {
        "Shop": [
            ("name", "TEXT", "Its name"),
            ("address", "TEXT", "Its address; a line break parts its lines"),
            ("contact", "TEXT", "How to reach it"),
            ("logo", "FILE", "A picture for the letterhead, .png or .svg"),
            ("accent", "COLOUR", "Accent colour, as in \"#0B6E7A\""),
            ("number_pattern", "PATTERN", "How certificates are numbered, as in \"{year}-{n:4}\""),
            ("signatories", "NAME", "Who may sign; repeat. Roles are given in a file"),
            ("statements", "TEXT", "A sentence for every certificate; repeat"),
        ]
    }
    /// Keys of an instrument.
    InstrumentKeys {
        "Instrument": [
            ("id", "ID", "Its name: 1-32 letters, digits, -, _ or ."),
            ("measures", "WHAT", "flow | pressure | temperature | barometer | cell | depth"),
            ("port", "PORT", "The serial port it is on"),
            ("usb", "DEVICE", "Or its USB device, which survives re-plugging: \"0403:6001:SERIAL\""),
            ("baud", "NUMBER", "Bits per second"),
            ("frame", "FRAME", "Data bits, parity, stop bits, as in 8N1"),
            ("unit", "UNIT", "Unit of the numbers it sends"),
        ]
        "How it speaks": [
            ("protocol.kind", "KIND", "lines | modbus-rtu"),
            ("protocol.ask", "TEXT", "lines: what asks for a reading, as in 'READ?\\n'; none when it streams"),
            ("protocol.every", "TIME", "How often it is asked, as in \"200 ms\""),
            ("protocol.ends", "TEXT", "lines: what ends a line, as in '\\r\\n'"),
            ("protocol.pattern", "REGEX", "lines: regular expression with a group (?P<value>…), optionally (?P<unit>…)"),
            ("protocol.stale_after", "TIME", "Age from which a reading is stale"),
            ("protocol.device", "NUMBER", "modbus-rtu: its address"),
            ("protocol.table", "TABLE", "modbus-rtu: input | holding"),
            ("protocol.register", "NUMBER", "modbus-rtu: first register, from 0"),
            ("protocol.type", "TYPE", "modbus-rtu: f32 | i16 | u16 | i32 | u32"),
            ("protocol.word_order", "ORDER", "modbus-rtu: big | little"),
            ("protocol.scale", "NUMBER", "modbus-rtu: what the number is multiplied by"),
        ]
        "Papers of a flow meter": [
            ("meter.kind", "KIND", "mass | volumetric | timed | float"),
            ("meter.reads_at", "CONDITIONS", "Its reference conditions, as in \"20 °C, 101.325 kPa\""),
            ("meter.made_for", "GAS", "The gas it was made for"),
            ("meter.gas_factor", "FACTOR", "The maker's factor for the gas of the runs"),
            ("meter.wet", "true|false", "Whether the gas passes over water"),
            ("meter.scale", "SCALE", "float: actual | reference litres"),
            ("meter.made_at", "CONDITIONS", "float: the working state a scale of reference litres was drawn for"),
            ("meter.gain", "SHARE", "Error common to all readings"),
            ("meter.zero", "FLOW", "Error of its zero"),
            ("meter.noise", "SHARE|FLOW", "Scatter of one reading"),
            ("meter.resolution", "FLOW", "Its last digit"),
            ("meter.coverage", "NUMBER", "Coverage factor of gain, zero and noise"),
            ("meter.range", "RANGE", "Lowest to highest reading"),
            ("meter.certificate", "TEXT", "Number of its calibration certificate"),
            ("meter.due", "DATE", "Last day its calibration is in date"),
        ]
        "Papers of a transducer": [
            ("transducer.gain", "SHARE", "Error common to all readings"),
            ("transducer.zero", "PRESSURE", "Error of its zero"),
            ("transducer.noise", "SHARE|PRESSURE", "Scatter of one reading"),
            ("transducer.resolution", "PRESSURE", "Its last digit"),
            ("transducer.coverage", "NUMBER", "Coverage factor of gain, zero and noise"),
            ("transducer.range", "RANGE", "Lowest to highest reading"),
            ("transducer.certificate", "TEXT", "Number of its calibration certificate"),
            ("transducer.due", "DATE", "Last day its calibration is in date"),
        ]
    }
}
