//! Message to domain: reads a brief once, tells everything that is wrong or odd about it, and resolves every name,
//! default and rule, so that the kernel gets plain numbers.
//!
//! | file | family |
//! |---|---|
//! | `reading`, `work` | the whole brief, and what comes of it |
//! | `findings`, `reasons`, `numbers`, `names` | what is told, where, and why |
//! | `net`, `places`, `sections`, `supports`, `stretch`, `scope` | the net |
//! | `prestress`, `wish`, `actions`, `factors`, `combinations`, `cases`, `checks`, `solving` | what is wanted of it |
//! | `plausible`, `frozen`, `accepted` | doubts |
//! | `limits`, `not_served` | what is refused |
//!
//! No raw message passes on from here, but for the echo in `Work`.

mod accepted;
mod actions;
mod cases;
mod checks;
mod combinations;
mod digest;
mod factors;
mod findings;
mod frozen;
mod limits;
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
mod solving;
mod stretch;
mod supports;
mod wish;
mod work;

pub(crate) use cases::{ENVELOPE, REFERENCE};
pub use digest::digest;
pub(crate) use net::STANDARD_GRAVITY;
pub use not_served::{NOT_SERVED, SERVED};
pub use reading::{Reading, read};
pub use work::Work;
