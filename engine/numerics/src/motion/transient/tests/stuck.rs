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

/// A panel under huge pressure between weak ropes: pressure is left out of the tangent, and only inertia holds the node. Its
/// slope, `p/6` times the cross product with the opposite edge, is ten times `4 m/h²` even at the smallest step.
#[test]
fn newton_that_does_not_converge() {
    let mut sketch = Sketch::default();
    sketch.node("m", [0.1, 0.2, 0.3]).attached_mass = 1e-3;
    let corners = [[-2.0, -2.0], [2.0, -2.0], [2.0, 2.0], [-2.0, 2.0]];
    for (k, [x, y]) in corners.iter().enumerate() {
        sketch.held(&k.to_string(), [*x, *y, 0.0]);
        sketch.cable(&format!("c{k}"), section(1.0, 0.0), &format!("m {k}"));
    }
    sketch.given.panels.push(PanelGiven {
        name: "panel".to_owned(),
        corners: [0, 1, 2].map(NodeId::new).to_vec(),
    });
    let start = Start::new(sketch.net(), vec![3.1; 4]);
    for scheme in [AVERAGE, CONSERVING] {
        let mut motion = start.motion(scheme, 1.0, 0.5);
        motion.case.pressures = vec![10.0 * 4e-3 / (0.5 / f64::from(1 << 20)).powi(2) * 6.0 / 4.0];
        let found = stuck(&start, &motion);
        match found.why {
            StuckBy::NotConverged { residual, allowed } => assert!(residual > allowed && allowed > 0.0, "{found:?}"),
            other => panic!("{scheme:?} {other:?}"),
        }
        assert_eq!((found.node, found.time), (NodeId::new(0), 0.0));
        assert!(found.step < 1e-6, "{found:?}");
        // The node was thrown so far that a rope came taut.
        assert!(found.segment.is_some(), "{found:?}");
    }
}
