//! What can go wrong with an instrument on its line, and when it shall.

use super::RigError;

/// A text that stands where a number was too large, or none.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub enum Overflow {
    /// `OL`.
    Ol,
    /// `----`.
    Dashes,
    /// `9.9E37`, as SCPI instruments say it.
    Huge,
}

impl Overflow {
    /// The text itself.
    #[must_use]
    pub const fn text(self) -> &'static str {
        match self {
            Self::Ol => "OL",
            Self::Dashes => "----",
            Self::Huge => "9.9E37",
        }
    }
}

/// Something that goes wrong.
#[derive(Debug, Clone, PartialEq)]
pub enum Fault {
    /// One to sixteen bytes of any value before the message.
    Garbage,
    /// The message breaks off and the rest never comes.
    HalfLine,
    /// Nothing is sent.
    Silence,
    /// The reading stays what it was when the fault began.
    Frozen,
    /// NaN, as text or as a number; an integer shows the value such devices keep for it.
    NotANumber,
    /// An overflow; a device with numbers shows 9.9E37 or the largest integer.
    Overflow(Overflow),
    /// The plug is out, of every device on its port: end of file for whoever reads; the line is new when it is in again.
    Unplugged,
    /// The number is in another unit; a device that says its unit says so.
    WrongUnit(String),
    /// The command comes back before the answer, or the line is sent twice by an instrument that is not asked.
    Echo,
    /// Messages are held back and come all at once.
    Burst,
    /// The clock of whoever reads is set on by so many seconds (or back).
    ClockJump(f64),
    /// A Modbus frame whose check sum does not fit.
    BadCrc,
    /// A Modbus answer from another address; a line with the reading of the rig's next instrument.
    WrongDevice,
    /// The message comes so many seconds late.
    Late(f64),
}

impl Fault {
    /// The word for it in commands and in the log.
    #[must_use]
    pub const fn name(&self) -> &'static str {
        match self {
            Self::Garbage => "garbage",
            Self::HalfLine => "half-line",
            Self::Silence => "silence",
            Self::Frozen => "frozen",
            Self::NotANumber => "nan",
            Self::Overflow(_) => "overflow",
            Self::Unplugged => "unplugged",
            Self::WrongUnit(_) => "wrong-unit",
            Self::Echo => "echo",
            Self::Burst => "burst",
            Self::ClockJump(_) => "clock-jump",
            Self::BadCrc => "bad-crc",
            Self::WrongDevice => "wrong-device",
            Self::Late(_) => "late",
        }
    }

    /// Every word, for a sentence that lists them.
    pub const NAMES: &'static [&'static str] = &[
        "garbage",
        "half-line",
        "silence",
        "frozen",
        "nan",
        "overflow OL|----|9.9E37",
        "unplugged",
        "wrong-unit UNIT",
        "echo",
        "burst",
        "clock-jump SECONDS",
        "bad-crc",
        "wrong-device",
        "late SECONDS",
    ];

    /// A fault by its word and what follows it.
    ///
    /// # Errors
    /// [`RigError::Fault`] for a word that is none, [`RigError::FaultNeeds`] when what must follow is missing or wrong.
    pub fn parse(word: &str, argument: Option<&str>) -> Result<Self, RigError> {
        let needs = |what: &'static str| RigError::FaultNeeds { fault: word.to_owned(), what };
        let seconds = || {
            let number = argument.and_then(|text| text.parse::<f64>().ok());
            number.filter(|s| s.is_finite()).ok_or_else(|| needs("a number of seconds"))
        };
        Ok(match word {
            "garbage" => Self::Garbage,
            "half-line" => Self::HalfLine,
            "silence" => Self::Silence,
            "frozen" => Self::Frozen,
            "nan" => Self::NotANumber,
            "overflow" => Self::Overflow(match argument {
                None | Some("OL") => Overflow::Ol,
                Some("----") => Overflow::Dashes,
                Some("9.9E37") => Overflow::Huge,
                Some(_) => return Err(needs("OL, ---- or 9.9E37")),
            }),
            "unplugged" => Self::Unplugged,
            "wrong-unit" => Self::WrongUnit(argument.ok_or_else(|| needs("a unit"))?.to_owned()),
            "echo" => Self::Echo,
            "burst" => Self::Burst,
            "clock-jump" => Self::ClockJump(seconds()?),
            "bad-crc" => Self::BadCrc,
            "wrong-device" => Self::WrongDevice,
            "late" => Self::Late(seconds()?.max(0.0)),
            other => return Err(RigError::Fault(other.to_owned())),
        })
    }

    /// Whether it takes a word of its own in a command.
    pub(super) fn takes_argument(word: &str) -> bool {
        matches!(word, "overflow" | "wrong-unit" | "clock-jump" | "late")
    }

    /// Whether it befalls messages, and not the plug or the clock.
    fn of_messages(&self) -> bool {
        !matches!(self, Self::Unplugged | Self::ClockJump(_))
    }
}

impl std::fmt::Display for Fault {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        f.write_str(self.name())?;
        match self {
            Self::Overflow(overflow) => write!(f, " {}", overflow.text()),
            Self::WrongUnit(unit) => write!(f, " {unit}"),
            Self::ClockJump(s) | Self::Late(s) => write!(f, " {s}"),
            _ => Ok(()),
        }
    }
}

/// How long a fault lasts.
#[derive(Debug, Clone, Copy, PartialEq)]
pub enum Lasts {
    /// One message.
    Once,
    /// So many seconds.
    For(f64),
    /// Until it is cleared.
    UntilCleared,
}

/// A fault with its time.
#[derive(Debug, Clone, PartialEq)]
pub struct Planned {
    /// From when on, seconds since the rig began.
    pub from_s: f64,
    /// How long. A plug that is out for one message, and a clock, are out until cleared and jump once.
    pub lasts: Lasts,
    /// What.
    pub fault: Fault,
}

/// The faults of one device.
#[derive(Debug, Clone, PartialEq, Default)]
pub struct FaultPlan {
    planned: Vec<Planned>,
}

impl FaultPlan {
    /// A plan of these.
    #[must_use]
    pub fn new(planned: Vec<Planned>) -> Self {
        let mut plan = Self::default();
        for one in planned {
            plan.add(one);
        }
        plan
    }

    /// Adds one.
    pub fn add(&mut self, mut planned: Planned) {
        if planned.fault == Fault::Unplugged && planned.lasts == Lasts::Once {
            planned.lasts = Lasts::UntilCleared;
        }
        self.planned.push(planned);
    }

    /// Takes out everything that has begun by `t_s`; what is planned for later stays.
    pub fn clear(&mut self, t_s: f64) {
        self.planned.retain(|one| one.from_s > t_s);
    }

    /// Takes out everything.
    pub fn clear_all(&mut self) {
        self.planned.clear();
    }

    /// The faults of messages that are in force at `t_s`, in the order they were added.
    #[must_use]
    pub fn in_force(&self, t_s: f64) -> Vec<Fault> {
        self.now(t_s).filter(|one| one.fault.of_messages()).map(|one| one.fault.clone()).collect()
    }

    /// Whether the plug is out at `t_s`.
    #[must_use]
    pub fn unplugged(&self, t_s: f64) -> bool {
        self.now(t_s).any(|one| one.fault == Fault::Unplugged)
    }

    fn now(&self, t_s: f64) -> impl Iterator<Item = &Planned> {
        self.planned.iter().filter(move |one| one.in_force(t_s))
    }

    /// A message at `t_s` has had its faults: those that were for one message are over.
    pub(super) fn spend(&mut self, t_s: f64) {
        self.planned
            .retain(|one| !(one.lasts == Lasts::Once && one.fault.of_messages() && one.in_force(t_s)));
    }

    /// The jumps of the clock that have come due; they do so once.
    pub(super) fn take_jumps(&mut self, t_s: f64) -> Vec<f64> {
        let mut jumps = Vec::new();
        self.planned.retain(|one| match one.fault {
            Fault::ClockJump(by_s) if one.from_s <= t_s => {
                jumps.push(by_s);
                false
            }
            _ => true,
        });
        jumps
    }
}

impl Planned {
    fn in_force(&self, t_s: f64) -> bool {
        self.from_s <= t_s
            && match self.lasts {
                Lasts::For(s) => t_s < self.from_s + s,
                Lasts::Once | Lasts::UntilCleared => true,
            }
    }
}
