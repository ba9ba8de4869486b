//! The net as it is given, valid and immutable, and the states it can be in.

mod error;
pub mod fan;
mod ids;
mod material;
pub mod mesh;
mod net;
mod state;
mod support;
mod surface;
mod violations;

pub use error::NetError;
pub use ids::{CableId, NodeId, ReachId, SegmentId, StrutId};
pub use material::Section;
pub use net::{
    AxialLaw, Cable, CableGiven, Member, Net, NetGiven, Node, NodeGiven, Panel, PanelGiven, Reach, Segment, Slide,
    Strut, StrutGiven,
};
pub use state::ReferenceState;
pub use support::{ElasticSupport, ElasticSupportGiven, Support, SupportGiven};
pub use surface::{Area, Skin, Zone};
