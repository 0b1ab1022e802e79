//! What the tap tells the worker beside the samples.

use crate::controls::Controls;
use crate::session::Transport;

/// Something that happens between two samples.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) struct Mark {
    /// How many samples went into the ring before it.
    pub(crate) after: u64,
    pub(crate) event: Event,
}

/// What happens there.
#[derive(Debug, Clone, Copy, PartialEq)]
pub(crate) enum Event {
    /// A new stream begins at position 0: the tap's first, second and so on.
    Start { stream: u64 },
    /// The parameters have these values from here on.
    Controls(Controls),
    /// The transport stands like this.
    Transport(Transport),
    /// The transport jumped: what follows does not continue what was.
    Jump,
    /// Samples that did not come through.
    Missed { samples: u64, cause: Cause },
    /// Nobody listens from here on.
    Pause,
    /// A key of the note input went down or up.
    Note { key: u8, down: bool },
    /// The stream ends here.
    End {
        /// Whether it was rendered offline.
        bounce: bool,
    },
}

/// Why samples did not come through.
#[derive(Debug, Clone, Copy, PartialEq, Eq)]
pub(crate) enum Cause {
    /// The worker fell behind and the ring was full.
    Overrun,
    /// No editor was open and no check armed.
    Unwatched,
}
