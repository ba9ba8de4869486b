//! Message to domain: reads a brief once, tells everything that is wrong or odd about it, and resolves every name,
//! default and rule, so that the kernel gets plain numbers.
//!
//! | file | family |
//! |---|---|
//! | `reading`, `work` | the whole brief, and what comes of it |
//! | `findings`, `reasons`, `numbers`, `names` | what is told, where, and why |
//! | `net`, `places`, `sections`, `supports`, `stretch`, `slides`, `adjusters`, `scope`, `surface` | the net |
//! | `prestress`, `wish`, `actions`, `coefficients`, `factors`, `combinations`, `cases`, `solving` | what is wanted of it |
//! | `motions`, `driven`, `histories`, `breaks`, `motion_start`, `watched`, `motion_net`, `motion_words`, `covered` | motions in time |
//! | `checks`, `check_kinds`, `editions`, `diagnosis`, `modes`, `sizing` | what it is judged and sized by |
//! | `plausible`, `frozen`, `accepted` | doubts |
//! | `limits`, `not_served` | what is refused |
//!
//! No raw message passes on from here, but for the echo in `Work`.

mod accepted;
mod actions;
mod adjusters;
mod breaks;
mod cases;
mod check_kinds;
mod checks;
mod coefficients;
mod combinations;
mod covered;
mod diagnosis;
mod digest;
mod driven;
mod editions;
mod factors;
mod findings;
mod frozen;
mod histories;
mod keep;
mod limits;
mod modes;
mod motion_net;
mod motion_start;
mod motion_words;
mod motions;
mod names;
mod net;
mod not_served;
mod numbers;
mod places;
mod plausible;
mod prestress;
mod reading;
pub mod reasons;
mod resolved;
mod scope;
mod sections;
mod sizing;
mod slides;
mod solving;
mod stretch;
mod supports;
mod surface;
mod targets;
mod watched;
mod wish;
mod work;

pub(crate) use cases::{ENVELOPE, REFERENCE};
pub(crate) use check_kinds::field as check_field;
pub use digest::digest;
pub(crate) use editions::of as edition_of;
pub use keep::Kept;
pub(crate) use net::STANDARD_GRAVITY;
pub use not_served::{NOT_SERVED, SERVED};
pub use reading::{Reading, read};
pub use sizing::SizingWork;
pub(crate) use surface::WithoutValue;
pub use work::{Selected, Work};
