//! What control asks of the audio context, and the log of what was done.

use core::fmt;
use core::str::FromStr;

use modal_core::{Coefficients, Gain, Onset};

/// A prepared change of one string: a plain value, carried by a queue.
#[derive(Clone, Debug)]
pub struct Command<const M: usize> {
    /// Index of the string.
    pub string: u8,
    /// What changes.
    pub action: Action<M>,
}

/// What changes on a string.
#[derive(Clone, Debug)]
pub enum Action<const M: usize> {
    /// A pluck is added to what sounds.
    Pluck {
        /// Its share of the hardest pluck, for the log.
        gain: Gain,
        /// The pluck itself.
        onset: Onset<M>,
    },
    /// The string rings freely from now on.
    Release(Coefficients<M>),
    /// A hand rests on the string from now on.
    Mute(Coefficients<M>),
}

/// The kind of an [`Action`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub enum Kind {
    /// See [`Action::Pluck`].
    Pluck,
    /// See [`Action::Release`].
    Release,
    /// See [`Action::Mute`].
    Mute,
}

impl Kind {
    const ALL: [Self; 3] = [Self::Pluck, Self::Release, Self::Mute];

    const fn name(self) -> &'static str {
        match self {
            Self::Pluck => "pluck",
            Self::Release => "release",
            Self::Mute => "mute",
        }
    }
}

/// A command that took effect: from these, and the design of the instrument,
/// every word can be computed again.
///
/// As text: `frame string kind gain headroom`, the gains in Q15.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
#[cfg_attr(feature = "defmt-1", derive(defmt::Format))]
pub struct Applied {
    /// First frame that it is heard in.
    pub frame: u32,
    /// Index of the string.
    pub string: u8,
    /// What was done.
    pub kind: Kind,
    /// Share of the hardest pluck; unity for other kinds.
    pub gain: Gain,
    /// Unity unless the sound had to be made weaker to fit.
    pub headroom: Gain,
}

impl fmt::Display for Applied {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        let Self {
            frame,
            string,
            kind,
            gain,
            headroom,
        } = self;
        let (kind, gain, headroom) = (kind.name(), gain.q15(), headroom.q15());
        write!(f, "{frame} {string} {kind} {gain} {headroom}")
    }
}

/// A line that is not an [`Applied`].
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub struct NotApplied;

impl fmt::Display for NotApplied {
    fn fmt(&self, f: &mut fmt::Formatter<'_>) -> fmt::Result {
        f.write_str("expected: frame string kind gain headroom")
    }
}

impl core::error::Error for NotApplied {}

impl FromStr for Applied {
    type Err = NotApplied;

    fn from_str(line: &str) -> Result<Self, NotApplied> {
        fn number<T: FromStr>(word: Option<&str>) -> Result<T, NotApplied> {
            word.and_then(|word| word.parse().ok()).ok_or(NotApplied)
        }
        let mut words = line.split_ascii_whitespace();
        let frame = number(words.next())?;
        let string = number(words.next())?;
        let name = words.next();
        let kind = Kind::ALL.into_iter().find(|kind| Some(kind.name()) == name);
        let gain = Gain::from_q15(number(words.next())?);
        let headroom = Gain::from_q15(number(words.next())?);
        match (kind, words.next()) {
            (Some(kind), None) => Ok(Self {
                frame,
                string,
                kind,
                gain,
                headroom,
            }),
            _ => Err(NotApplied),
        }
    }
}
