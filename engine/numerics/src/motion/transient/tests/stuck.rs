//! What a motion says that can not go on.

use super::*;

fn stuck(start: &Start, motion: &Motion) -> Stuck {
    match start.run(motion).ending {
        Ending::StepTooSmall(stuck) => stuck,
        other => panic!("{other:?}"),
    }
}

#[test]
fn an_error_that_can_not_be_kept() {
    for scheme in [
        Scheme::GeneralisedAlpha {
            spectral_radius: 0.8,
            error: Some(1e-300),
        },
        Scheme::Conserving { error: Some(1e-300) },
    ] {
        let start = saddle(1.01);
        let mut motion = start.motion(scheme, 1.0, 1e-3);
        motion.case.nodal_forces[6].z = -5e3;
        let found = stuck(&start, &motion);
        assert_eq!((found.time, found.segment), (0.0, None));
        assert!(found.step < 1e-8, "{found:?}");
        match found.why {
            StuckBy::ErrorNotKept { error, allowed } => assert!(error > allowed && allowed == 1e-300, "{found:?}"),
            other => panic!("{other:?}"),
        }
    }
}

#[test]
fn numbers_beyond_use() {
    for scheme in [AVERAGE, CONSERVING] {
        let start = single_of(1e-300);
        let mut motion = start.motion(scheme, 1.0, 0.5);
        motion.case.nodal_forces[1] = Vector3::x() * 1e6;
        let found = stuck(&start, &motion);
        assert_eq!(found.why, StuckBy::BeyondUse, "{scheme:?}");
        assert_eq!((found.node, found.time), (NodeId::new(1), 0.0));
    }
}
