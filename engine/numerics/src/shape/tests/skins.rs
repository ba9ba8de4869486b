//! Reference states under loads that lie on areas.

use std::ops::ControlFlow;
use std::sync::Arc;

use nalgebra::Vector3;

use crate::equilibrium::{Analysis, Settings};
use crate::load::{Action, Load};
use crate::model::{Area, Net, PanelGiven, Skin, fan, mesh};
use crate::shape::{Prestress, find, first_shape};
use crate::test_nets::{courtyard, courtyard_prestress};

/// Meshes between the ropes of the net proper and its edges, at these positions.
fn meshes(net: &Net, positions: &[Vector3<f64>]) -> mesh::Meshes {
    let between = |name: &str| ["c", "b", "e"].iter().any(|kind| name.starts_with(kind));
    let ropes = net.cables().iter().filter(|cable| between(&cable.name));
    let edges: Vec<_> = ropes
        .flat_map(|cable| cable.path.windows(2).map(|pair| [pair[0], pair[1]]))
        .collect();
    let plan: Vec<_> = positions.iter().map(|x| x.xy()).collect();
    mesh::meshes(&edges, &plan).expect("a planar net")
}

fn clothed(mass_per_area: f64) -> (Arc<Net>, Prestress) {
    let net = Arc::new(courtyard().net());
    let prestress = courtyard_prestress(&net);
    let first = first_shape(&net, &prestress).expect("a first shape");
    let panels: Vec<PanelGiven> = (meshes(&net, &first).corners.into_iter().enumerate())
        .map(|(index, corners)| PanelGiven {
            name: format!("p{index}"),
            corners,
        })
        .collect();
    let skin = Skin {
        name: "cloth".to_owned(),
        mass_per_area,
        panels: (0..panels.len()).collect(),
    };
    let net = (*net).clone().with_surface(panels, vec![skin], Vec::new());
    (Arc::new(net.expect("valid panels")), prestress)
}

#[test]
fn the_courtyard_has_sixteen_panels_before_and_after_its_shape_is_known() {
    let (net, prestress) = clothed(1.1);
    assert_eq!(net.panels().len(), 16);
    let actions = [Action {
        name: "self".to_owned(),
        loads: vec![
            Load::OwnWeight {
                gravity: Vector3::new(0.0, 0.0, -9.80665),
            },
            Load::OnPlan {
                on: vec![Area::Skin(0)],
                pressure: 100.0,
            },
        ],
    }];
    let settings = Settings::default();
    let observe = &mut |_: &_| ControlFlow::Continue(());
    let analysis = Analysis::new(Arc::clone(&net));
    let found = find(&analysis, &prestress, &actions, &settings, observe).expect("a reference state");
    // The search itself balances the loads on areas: nothing was left to correct.
    assert!(!found.report.polished);
    assert!(found.report.imbalance < 1e-8 * found.report.largest_force);
    let again = meshes(&net, &found.state.positions);
    let known: Vec<_> = net.panels().iter().map(|panel| panel.corners.clone()).collect();
    assert_eq!(again.corners, known);
    // Half of what hangs between N and K bounds nothing.
    assert_eq!(again.loose.len(), 1);

    let total: f64 = found.case.nodal_forces.iter().map(|p| p.z).sum();
    let (mut area, mut on_plan) = (0.0, 0.0);
    for panel in net.panels() {
        let corners = panel.places(&found.state.positions);
        assert!(fan::signed_area_on_plan(&corners) > 0.0);
        area += fan::area(&corners);
        on_plan += fan::signed_area_on_plan(&corners);
    }
    let ropes: f64 = net
        .segments()
        .iter()
        .map(|segment| segment.section.mass_per_length * found.state.unstressed_lengths[segment.length])
        .sum();
    let expected = -9.80665 * (ropes + 1.1 * area) - 100.0 * on_plan;
    assert!((total - expected).abs() < 1e-10 * expected.abs());
    assert!((100.0..120.0).contains(&on_plan), "{on_plan}");
}
