//! Every reason that a finding can have. A reason never changes its meaning; a new meaning gets a new one.

macro_rules! reasons {
    ($($(#[doc = $doc:literal])+ $name:ident,)+) => {
        $($(#[doc = $doc])+ pub const $name: &str = stringify!($name);)+

        /// Every reason with its meaning.
        pub const ALL: &[(&str, &str)] = &[$((stringify!($name), concat!($($doc),+)),)+];
    };
}

reasons! {
    /// A number is NaN or infinite.
    NOT_FINITE,
    /// A number must be greater than zero.
    NOT_POSITIVE,
    /// A number must not be negative.
    NEGATIVE,
    /// A number lies outside the documented range.
    OUT_OF_RANGE,
    /// A list has the wrong number of entries.
    WRONG_COUNT,
    /// Something required is missing.
    MISSING,
    /// A direction is the zero vector.
    ZERO_DIRECTION,
    /// An id is empty, too long, or has characters that ids must not have.
    BAD_ID,
    /// An id stands twice where it must be unique.
    DUPLICATE_ID,
    /// An id is a reserved word.
    RESERVED_ID,
    /// An id names nothing.
    UNKNOWN_ID,
    /// An id names something of a kind that cannot stand here.
    WRONG_KIND,
    /// The same id stands twice in one list.
    REPEATED_IN_LIST,
    /// A list names things, but nothing comes of it.
    COVERS_NOTHING,
    /// A part of the brief that this server does not serve yet.
    NOT_SERVED,
    /// More than the server takes.
    TOO_MANY,
    /// One element of a list is larger than a message may be.
    TOO_LARGE,
    /// Findings of a kind that are left out, after very many of them.
    MORE_OF_THE_SAME,
    /// The net has no member.
    EMPTY_NET,
    /// A node is used by one end of one member only and has no coordinates.
    NODE_USED_ONCE,
    /// A node is used once, and its name looks like another's.
    NODE_LOOKS_LIKE,
    /// A supported node that no member uses.
    NODE_UNUSED,
    /// A free node that no member leads to.
    NODE_NOT_CONNECTED,
    /// A supported node has no coordinates.
    SUPPORT_WITHOUT_POSITION,
    /// A part of the net has no support.
    PART_NOT_HELD,
    /// A cable with fewer than two nodes.
    TOO_FEW_NODES,
    /// A path names the same node twice in a row.
    NODE_TWICE_IN_A_ROW,
    /// Two nodes at the ends of a segment lie in the same place.
    NO_LENGTH,
    /// Coordinates far away from the origin.
    FAR_FROM_ORIGIN,
    /// A member has no section.
    NO_SECTION,
    /// Axial stiffness and modulus times area disagree.
    STIFFNESS_DISAGREES,
    /// Parts of a cable overlap.
    PARTS_OVERLAP,
    /// A stretch of a cable that its path does not have.
    NO_SUCH_STRETCH,
    /// Groups that contain each other.
    GROUP_CYCLE,
    /// A support that holds nothing.
    SUPPORT_HOLDS_NOTHING,
    /// A direction is both released and on a spring.
    SUPPORT_CONTRADICTS,
    /// A stiffness matrix is not symmetric.
    NOT_SYMMETRIC,
    /// A stiffness matrix has a negative eigenvalue.
    NOT_SEMI_DEFINITE,
    /// A member that no prestress rule covers.
    NO_RULE,
    /// Two prestress rules of equal narrowness cover the same member.
    RULES_TIE,
    /// A cable is asked to push.
    CABLE_PUSHES,
    /// Members on balance, but no node to hold.
    BALANCE_WITHOUT_HOLD,
    /// A node to hold that no member on balance holds.
    HOLD_WITHOUT_BALANCE,
    /// A node to hold that is supported or has no coordinates.
    HOLD_NOT_FREE,
    /// An action under which the reference state is found is not a dead load.
    UNDER_NOT_DEAD,
    /// A share of a breaking force that is not known.
    NO_BREAKING_FORCE,
    /// Nodes without coordinates that no shape search finds.
    NO_COORDINATES,
    /// A target that wants nothing.
    TARGET_WITHOUT_WISH,
    /// A target for a node that the shape search does not place.
    TARGET_NOT_FREE,
    /// A force wanted of a member on balance.
    TARGET_ON_BALANCE,
    /// Targets, but no rule whose force density may be adjusted.
    NOTHING_ADJUSTABLE,
    /// A rule that cannot be adjusted, or whose bounds exclude its own force density.
    NOT_ADJUSTABLE,
    /// A node that is not between the ends of its chord.
    NOT_BETWEEN,
    /// Points that give no surface over plan.
    NO_SURFACE,
    /// A load moves a node that has no support.
    MOVE_WITHOUT_SUPPORT,
    /// A load moves a support along a direction in which it is free.
    MOVE_ALONG_FREE,
    /// Ropes of a skin cross, touch or lie above each other in plan, so that its meshes cannot be told apart.
    MESHES_UNCLEAR,
    /// A skin whose ropes enclose no mesh in plan, and that has no panels given one by one.
    SKIN_WITHOUT_PANELS,
    /// A rope that a skin names, of which a stretch bounds none of its panels.
    ROPE_BOUNDS_NO_PANEL,
    /// Two panels have the same corners.
    PANEL_TWICE,
    /// An outline in plan that crosses itself or encloses nothing.
    BAD_OUTLINE,
    /// A load gives different coefficients to a panel that lies in several zones.
    ZONES_CONTRADICT,
    /// A case asks for ponding and for a path.
    PONDING_WITH_PATH,
    /// A load needs a diameter that a section does not give.
    NO_DIAMETER,
    /// A prestress share takes away all of the tension.
    SHARE_TAKES_ALL,
    /// An action without loads.
    ACTION_WITHOUT_LOADS,
    /// An action that acts nowhere.
    ACTION_UNUSED,
    /// A case in which nothing acts.
    CASE_WITHOUT_ACTIONS,
    /// A factor of zero.
    FACTOR_ZERO,
    /// Own weight acts in no case.
    NO_OWN_WEIGHT,
    /// Nothing has a mass, or nothing at nodes that a motion moves.
    NO_MASS,
    /// A case leaves out an action under which the reference state was found.
    CASE_WITHOUT_DEAD_LOAD,
    /// Factors whose standard, edition and annex are not told.
    NO_SOURCE,
    /// A factor is smaller than one that is as a rule the smaller of the two.
    FACTORS_OUT_OF_ORDER,
    /// A class of actions that no action has.
    CLASS_WITHOUT_ACTIONS,
    /// An action that no rule combines, since its class has no factors.
    ACTION_NOT_COMBINED,
    /// A rule that finds nothing to combine.
    COMBINATION_WITHOUT_ACTIONS,
    /// How many cases and design effects a rule makes.
    CASES_MADE,
    /// A permanent action has a factor below 1 in every case.
    PERMANENT_BELOW_ONE,
    /// A permanent action has a factor above 1 in every case.
    NO_FAVOURABLE_CASE,
    /// A case takes out every member.
    REMOVES_ALL,
    /// A change of temperature from a temperature that is not stated.
    NO_REFERENCE_TEMPERATURE,
    /// A check over sets or cases that are not there.
    CHECK_WITHOUT_CASES,
    /// Members that a check covers but cannot judge.
    NOT_JUDGEABLE,
    /// A standard or edition whose factors are not known here, and not given.
    EDITION_UNKNOWN,
    /// A factor that the named edition does not recommend.
    FACTOR_NOT_OF_EDITION,
    /// A member that two choices of sizing cover.
    SIZED_TWICE,
    /// Cases, but no check.
    NOTHING_CHECKED,
    /// A rope is to slide where it can not.
    CAN_NOT_SLIDE,
    /// A rope is to slide and to hang.
    SLIDES_AND_HANGS,
    /// An adjuster is not at an end of its rope.
    NOT_AN_END,
    /// Turns of an adjuster whose travel a turn is not known.
    NO_TRAVEL_PER_TURN,
    /// A case asks more of an adjuster than its travel.
    ADJUSTER_TOO_SHORT,
    /// Times that do not rise, or an end that does not come after its beginning.
    TIMES_OUT_OF_ORDER,
    /// A table that gives times and an equal spacing.
    TIMES_TWICE,
    /// A table that ends before its motion does, or begins after it.
    HISTORY_SHORT,
    /// A break that lets go over more time than its motion has.
    RELEASE_TOO_LONG,
    /// A load that varies in time and is zero throughout.
    HISTORY_ZERO,
    /// An action that is to vary in time and changes more than forces, pressures and places of supports.
    NOT_DRIVABLE,
    /// A motion moves supports by a jump, or not from where they are.
    SUPPORT_JUMPS,
    /// An action that varies in a motion acts already in the state at its start.
    ACTS_TWICE,
    /// A part of a cable that is to be one segment and is several.
    NOT_ONE_SEGMENT,
    /// A segment that breaks twice in one motion.
    BREAKS_TWICE,
    /// A member that is to break is taken out at the start.
    BREAK_NOT_THERE,
    /// A motion without damping.
    NO_DAMPING,
    /// Damping by stiffness in a motion that moves supports.
    DAMPED_GROUND,
    /// A node is moved, or has a velocity, at the start along a direction in which its support holds it.
    START_ALONG_HELD,
    /// A rope that slides in a net that is to move in time.
    SLIDES_IN_MOTION,
    /// A motion that nothing sets going.
    NOTHING_MOVES,
    /// Steps of a motion too long for what they are to follow.
    STEPS_TOO_LONG,
    /// Fewer samples than a spectrum needs.
    TOO_FEW_SAMPLES,
    /// A force of a support is watched at a node that has none.
    NO_SUPPORT_FORCE,
    /// A value that looks as if it were in another unit.
    UNIT_SLIP,
    /// Prestress above the breaking force.
    PRESTRESS_OVER_BREAKING,
    /// A doubt is accepted whose reason is not known.
    ACCEPTED_UNKNOWN,
    /// An accepted doubt that was not found.
    ACCEPTED_NOT_FOUND,
    /// Data that no served part uses.
    DATA_NOT_USED,
    /// A frozen brief whose sections have changed since.
    FROZEN_SECTION_CHANGED,
    /// Nodes whose place slack ropes leave open.
    LOOSE_NODES,
    /// Ropes that are slack in the reference state.
    SLACK_IN_REFERENCE,
    /// Not everything wanted of the reference state can be met: it is the nearest that balances.
    TARGETS_UNMET,
    /// Tension above the breaking force in a solved state.
    OVER_BREAKING,
    /// A movement so large that units or loads are to be doubted.
    LARGE_MOVEMENT,
    /// A state with hardly any stiffness left against a movement, or none.
    LITTLE_STIFFNESS,
    /// A natural frequency so low that the wind is to be studied.
    LOW_FREQUENCY,
    /// A state without natural modes, where they are wanted.
    NO_MODES,
    /// Natural modes of which a count does not show that none is missed.
    MODES_NOT_PROVEN,
    /// A motion that could not begin or did not come to its end.
    MOTION_NOT_FINISHED,
    /// Energy that the steps of a motion make or lose.
    ENERGY_NOT_KEPT,
    /// A spectrum of too short a record for its largest peak.
    SHORT_SPECTRUM,
    /// Damping by the stiffness at the start, where ropes went slack or broke since.
    DAMPING_OF_START,
    /// Straight pieces of a hanging rope that are too long for what varies.
    PIECES_TOO_LONG,
    /// What was to break at a tension did not reach it.
    NOT_BROKEN,
    /// Panels that a pressure on the surface leaves without a value.
    PANELS_WITHOUT_VALUE,
    /// A panel that was found in plan has turned over in the reference state.
    PANEL_TURNED,
    /// The independent routine does not confirm a state.
    AUDIT_FAILED,
    /// A state without an answer.
    NO_ANSWER,
}

/// Reasons of doubts that only a run can find.
pub const OF_RESULTS: &[&str] = &[
    LOOSE_NODES,
    SLACK_IN_REFERENCE,
    TARGETS_UNMET,
    OVER_BREAKING,
    LARGE_MOVEMENT,
    LOW_FREQUENCY,
    MODES_NOT_PROVEN,
    STEPS_TOO_LONG,
    ENERGY_NOT_KEPT,
    SHORT_SPECTRUM,
    DAMPING_OF_START,
    PIECES_TOO_LONG,
    PANELS_WITHOUT_VALUE,
    PANEL_TURNED,
    ZONES_CONTRADICT,
    AUDIT_FAILED,
];

#[cfg(test)]
mod tests {
    use super::*;

    #[test]
    fn reasons_are_upper_snake_and_unique() {
        for (position, (reason, meaning)) in ALL.iter().enumerate() {
            assert!(reason.chars().all(|c| c.is_ascii_uppercase() || c == '_'), "{reason}");
            assert!(!meaning.trim().is_empty());
            assert!(ALL[..position].iter().all(|(other, _)| other != reason), "{reason}");
        }
    }
}
