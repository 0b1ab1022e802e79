//! Which channel of a file is measured.

use std::str::FromStr;

/// What the user asked for.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Channel {
    /// Half the sum of the first two channels; the channel of a file that has only one.
    Mid,
    /// The first channel.
    Left,
    /// The second channel.
    Right,
    /// Half the difference of the first two channels.
    Side,
    /// A channel by its number, from 1.
    Number(usize),
}

impl FromStr for Channel {
    type Err = String;

    fn from_str(text: &str) -> Result<Self, Self::Err> {
        match text {
            "mid" => Ok(Self::Mid),
            "left" => Ok(Self::Left),
            "right" => Ok(Self::Right),
            "side" => Ok(Self::Side),
            _ => match text.parse() {
                Ok(number) if number >= 1 => Ok(Self::Number(number)),
                _ => Err("expected mid, left, right, side or a channel number from 1".to_owned()),
            },
        }
    }
}

impl std::fmt::Display for Channel {
    fn fmt(&self, f: &mut std::fmt::Formatter<'_>) -> std::fmt::Result {
        match self {
            Self::Mid => f.write_str("mid"),
            Self::Left => f.write_str("left"),
            Self::Right => f.write_str("right"),
            Self::Side => f.write_str("side"),
            Self::Number(number) => write!(f, "channel {number}"),
        }
    }
}

/// How the samples measured come from the channels (numbered from 0) of one file.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Mix {
    One(usize),
    HalfSum,
    HalfDifference,
}

impl Mix {
    /// Fits a choice to a file with that many channels.
    ///
    /// # Errors
    /// The file lacks the channel.
    pub(crate) fn new(choice: Channel, channels: usize) -> anyhow::Result<Self> {
        let needed = match choice {
            Channel::Mid | Channel::Left => 1,
            Channel::Right | Channel::Side => 2,
            Channel::Number(number) => number,
        };
        if needed > channels {
            let has = if channels == 1 {
                "one channel".to_owned()
            } else {
                format!("{channels} channels")
            };
            anyhow::bail!("has {has}: there is no {choice}");
        }
        Ok(match choice {
            Channel::Mid if channels == 1 => Self::One(0),
            Channel::Mid => Self::HalfSum,
            Channel::Left => Self::One(0),
            Channel::Right => Self::One(1),
            Channel::Side => Self::HalfDifference,
            Channel::Number(number) => Self::One(number - 1),
        })
    }

    /// The channels it reads.
    pub(crate) fn planes(self) -> std::ops::Range<usize> {
        match self {
            Self::One(channel) => channel..channel + 1,
            Self::HalfSum | Self::HalfDifference => 0..2,
        }
    }

    /// Mixes into `out`, whose old content goes.
    pub(crate) fn apply(self, planes: &[Vec<f32>], out: &mut Vec<f32>) {
        out.clear();
        match self {
            Self::One(channel) => out.extend_from_slice(&planes[channel]),
            Self::HalfSum => {
                out.extend(planes[0].iter().zip(&planes[1]).map(|(a, b)| 0.5 * (a + b)));
            }
            Self::HalfDifference => {
                out.extend(planes[0].iter().zip(&planes[1]).map(|(a, b)| 0.5 * (a - b)));
            }
        }
    }
}

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn channels_are_chosen_by_name_or_number() {
        let planes = vec![vec![1.0, 0.5], vec![0.5, -0.5], vec![0.25, 0.125]];
        for (text, expected) in [
            ("mid", [0.75, 0.0]),
            ("left", [1.0, 0.5]),
            ("right", [0.5, -0.5]),
            ("side", [0.25, 0.5]),
            ("3", [0.25, 0.125]),
        ] {
            let mut out = vec![9.0];
            let channel: Channel = text.parse().unwrap();
            Mix::new(channel, planes.len()).unwrap().apply(&planes, &mut out);
            assert_eq!(out, expected, "channel {text}");
        }
    }

    #[test]
    fn a_missing_channel_is_refused_and_mono_has_a_mid() {
        assert_eq!(Mix::new(Channel::Mid, 1).unwrap(), Mix::One(0));
        for (choice, channels) in [(Channel::Right, 1), (Channel::Side, 1), (Channel::Number(3), 2)]
        {
            assert!(Mix::new(choice, channels).is_err(), "{choice} of {channels} channels");
        }
        for text in ["0", "-1", "middle", ""] {
            assert!(text.parse::<Channel>().is_err(), "channel {text:?}");
        }
    }
}
