//! How the program ends.

use ropewalk_api::ropewalk::v1;

/// Every way to end, with its exit code; those above 60 are the numbers of BSD's `sysexits.h`.
#[derive(Clone, Copy, Debug, PartialEq, Eq)]
pub(crate) enum End {
    Passes,
    Exceeds,
    NotJudged,
    NoAnswer,
    /// What was compared is not the same.
    Differs,
    BriefHasErrors,
    EngineAway,
    EngineFailed,
    CannotWrite,
    Interrupted,
}

impl End {
    pub(crate) fn code(self) -> u8 {
        match self {
            Self::Passes => 0,
            Self::Exceeds | Self::Differs => 1,
            Self::NotJudged => 2,
            Self::NoAnswer => 3,
            Self::BriefHasErrors => 64,
            Self::EngineAway => 69,
            Self::EngineFailed => 70,
            Self::CannotWrite => 73,
            Self::Interrupted => 130,
        }
    }

    pub(crate) fn of(verdict: v1::Verdict) -> Self {
        match verdict {
            v1::Verdict::Passes => Self::Passes,
            v1::Verdict::NotJudged => Self::NotJudged,
            v1::Verdict::Exceeds => Self::Exceeds,
            v1::Verdict::NoAnswer | v1::Verdict::Unspecified => Self::NoAnswer,
        }
    }
}

/// Why a command stopped: what to tell, and how to end.
#[derive(Clone, Debug, PartialEq)]
pub(crate) struct Stop {
    pub(crate) end: End,
    /// Lines for standard error.
    pub(crate) told: String,
}

impl Stop {
    pub(crate) fn new(end: End, told: impl Into<String>) -> Self {
        Self { end, told: told.into() }
    }
}
