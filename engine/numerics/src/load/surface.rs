//! Panels in the reference state: how large they are, in which zones they lie, and what a load gives to each.

use nalgebra::Vector3;

use crate::model::{Area, Net, fan, mesh};

/// The panels of a net at the reference positions.
#[derive(Clone, Debug, Default, PartialEq)]
pub struct Surface {
    /// Skin of each panel, by index; none for a panel that belongs to no skin.
    pub skins: Vec<Option<usize>>,
    /// Zones in which the centre of each panel lies, by index.
    pub zones: Vec<Vec<usize>>,
    /// Area of each panel (m²).
    pub areas: Vec<f64>,
    /// Area of each panel on plan (m²), not negative.
    pub areas_on_plan: Vec<f64>,
}

impl Surface {
    /// The panels at `positions` (m), one a node.
    #[must_use]
    pub fn new(net: &Net, positions: &[Vector3<f64>]) -> Self {
        let panels = net.panels();
        let mut surface = Self {
            skins: vec![None; panels.len()],
            zones: vec![Vec::new(); panels.len()],
            areas: Vec::with_capacity(panels.len()),
            areas_on_plan: Vec::with_capacity(panels.len()),
        };
        for (index, skin) in net.skins().iter().enumerate() {
            skin.panels.iter().for_each(|panel| surface.skins[*panel] = Some(index));
        }
        for (index, panel) in panels.iter().enumerate() {
            let corners = panel.places(positions);
            surface.areas.push(fan::area(&corners));
            surface.areas_on_plan.push(fan::signed_area_on_plan(&corners).abs());
            if net.zones().is_empty() {
                continue;
            }
            let centre = fan::centre(&corners).xy();
            let zones = net.zones().iter().enumerate();
            let around = zones
                .filter(|(_, zone)| surface.skins[index] == Some(zone.skin) && mesh::is_within(&centre, &zone.outline));
            surface.zones[index] = around.map(|(zone, _)| zone).collect();
        }
        surface
    }

    /// Whether a panel belongs to an area.
    #[must_use]
    pub fn is_in(&self, panel: usize, area: Area) -> bool {
        match area {
            Area::Skin(skin) => self.skins[panel] == Some(skin),
            Area::Zone(zone) => self.zones[panel].contains(&zone),
        }
    }

    /// Panels of any of these areas, each once.
    pub fn panels_of<'a>(&'a self, areas: &'a [Area]) -> impl Iterator<Item = usize> + 'a {
        (0..self.areas.len()).filter(|panel| areas.iter().any(|area| self.is_in(*panel, *area)))
    }

    /// The coefficient that holds for a panel: that of the first zone around it, else that of its skin, else
    /// `elsewhere`.
    #[must_use]
    pub fn coefficient(&self, panel: usize, coefficients: &[(Area, f64)], elsewhere: Option<f64>) -> Option<f64> {
        let of = |is_zone: bool| {
            let of_kind = coefficients
                .iter()
                .filter(|(area, _)| matches!(area, Area::Zone(_)) == is_zone);
            of_kind
                .into_iter()
                .find(|(area, _)| self.is_in(panel, *area))
                .map(|(_, c)| *c)
        };
        of(true).or_else(|| of(false)).or(elsewhere)
    }

    /// Panels that lie in several zones with different coefficients, each with two of these zones.
    #[must_use]
    pub fn contradictions(&self, coefficients: &[(Area, f64)]) -> Vec<(usize, [usize; 2])> {
        let of = |zone: &usize| {
            let found = coefficients.iter().find(|(area, _)| *area == Area::Zone(*zone));
            found.map(|(_, c)| (*zone, *c))
        };
        let mut found = Vec::new();
        for (panel, zones) in self.zones.iter().enumerate().filter(|(_, zones)| zones.len() > 1) {
            let given: Vec<(usize, f64)> = zones.iter().filter_map(of).collect();
            if let Some(other) = given.iter().find(|(_, c)| *c != given[0].1) {
                found.push((panel, [given[0].0, other.0]));
            }
        }
        found
    }
}

#[cfg(test)]
mod tests {
    use nalgebra::Vector2;

    use super::*;
    use crate::load::{Action, Case, Load, Scope};
    use crate::model::{PanelGiven, ReferenceState, Section, Skin, Zone};
    use crate::test_nets::Sketch;

    /// Two square panels of 2 m side on plan, west and east of x = 0; the eastern one rises as 3 to 4, so that its area is
    /// 5 m² on 4 m². The rope `rise` runs up there.
    fn net() -> Net {
        let mut sketch = Sketch::default();
        let section = Section {
            axial_stiffness: 1e6,
            diameter: Some(0.02),
            ..Section::default()
        };
        for (name, x, z) in [("a", -2.0, 0.0), ("b", 0.0, 0.0), ("c", 2.0, 1.5)] {
            sketch.held(name, [x, -1.0, z]);
            sketch.held(&format!("{name}'"), [x, 1.0, z]);
        }
        sketch.cable("south", section, "a b");
        sketch.cable("rise", section, "b c");
        sketch.cable("north", section, "a' b' c'");
        let panel = |sketch: &mut Sketch, name: &str, corners: [&str; 4]| PanelGiven {
            name: name.to_owned(),
            corners: corners.map(|corner| sketch.id(corner)).to_vec(),
        };
        let west = panel(&mut sketch, "west", ["a", "b", "b'", "a'"]);
        let east = panel(&mut sketch, "east", ["b", "c", "c'", "b'"]);
        sketch.given.panels = vec![west, east];
        sketch.given.skins = vec![Skin {
            name: "cloth".to_owned(),
            mass_per_area: 2.0,
            panels: vec![0, 1],
        }];
        let outline = [[0.0, -9.0], [9.0, -9.0], [9.0, 9.0], [0.0, 9.0]].map(Vector2::from);
        sketch.given.zones = vec![Zone {
            name: "lee".to_owned(),
            skin: 0,
            outline: outline.to_vec(),
        }];
        Net::new(sketch.given).expect("a valid net")
    }

    fn case(net: &Net, load: Load, factor: f64) -> Case {
        let reference = ReferenceState {
            positions: net.nodes().iter().map(|n| n.position.expect("given")).collect(),
            unstressed_lengths: vec![2.0; net.n_lengths()],
            axial_forces: vec![0.0; net.segments().len()],
        };
        let action = Action {
            name: "a".to_owned(),
            loads: vec![load],
        };
        Case::new(net, &reference, &[action], &[(0, factor)])
    }

    fn sum(case: &Case) -> Vector3<f64> {
        case.nodal_forces.iter().sum()
    }

    #[test]
    fn panels_have_areas_and_zones() {
        let net = net();
        let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
        let surface = Surface::new(&net, &positions);
        assert!((surface.areas[0] - 4.0).abs() < 1e-15 && (surface.areas[1] - 5.0).abs() < 1e-14);
        assert!((surface.areas_on_plan[1] - 4.0).abs() < 1e-14);
        assert_eq!(surface.zones, [vec![], vec![0]]);
        let of = |areas: &[Area]| surface.panels_of(areas).collect::<Vec<_>>();
        assert_eq!(of(&[Area::Zone(0)]), [1]);
        assert_eq!(of(&[Area::Zone(0), Area::Skin(0)]), [0, 1]);
    }

    #[test]
    fn snow_acts_on_the_plan_area_and_cloth_weighs_by_its_own() {
        let net = net();
        let snow = |on: Vec<Area>| Load::OnPlan { on, pressure: 500.0 };
        assert!((sum(&case(&net, snow(vec![Area::Skin(0)]), 1.5)) + Vector3::z() * 1.5 * 500.0 * 8.0).norm() < 1e-11);
        let drift = case(&net, snow(vec![Area::Zone(0)]), 1.0);
        for (node, expected) in ["b", "b'", "c", "c'"].into_iter().zip([-500.0; 4]) {
            let index = net.nodes().iter().position(|n| n.name == node).expect("a node");
            assert!((drift.nodal_forces[index].z - expected).abs() < 1e-12);
        }
        let weight = Load::OwnWeight {
            gravity: Vector3::new(0.0, 0.0, -10.0),
        };
        assert!((sum(&case(&net, weight, 1.0)) + Vector3::z() * 10.0 * 2.0 * 9.0).norm() < 1e-11);
    }

    #[test]
    fn pressures_add_up_with_factors_and_a_zone_wins_over_its_skin() {
        let net = net();
        let load = |coefficients: Vec<(Area, f64)>, elsewhere| Load::OnSurface {
            pressure: 400.0,
            coefficients,
            elsewhere,
        };
        let both = vec![(Area::Skin(0), 0.5), (Area::Zone(0), -0.8)];
        assert_eq!(case(&net, load(both, None), 1.5).pressures, [300.0, -480.0]);
        assert_eq!(
            case(&net, load(vec![(Area::Zone(0), 1.0)], Some(0.25)), 1.0).pressures,
            [100.0, 400.0]
        );
        assert_eq!(
            case(&net, load(vec![(Area::Zone(0), 1.0)], None), 1.0).pressures,
            [0.0, 400.0]
        );
    }

    /// The rope rises as 3 to 4 along x. Wind along x: `w⊥ = (0.36, 0, −0.48)`, of length 0.6.
    #[test]
    fn wind_acts_across_a_rope_and_ice_along_it() {
        let net = net();
        let scope = || Scope::Segments(vec![crate::model::SegmentId::new(1)]);
        let wind = |along: Vector3<f64>| Load::WindOnRopes {
            scope: scope(),
            pressure: 800.0,
            along,
            drag_coefficient: 1.2,
        };
        let force = sum(&case(&net, wind(Vector3::x()), 1.0));
        let expected: Vector3<f64> = Vector3::new(0.36, 0.0, -0.48) * (800.0 * 1.2 * 0.02 * 2.5 * 0.6);
        assert!((force - expected).norm() < 1e-12);
        let across: Vector3<f64> = sum(&case(&net, wind(Vector3::y()), 1.0));
        assert!((across - Vector3::y() * 800.0 * 1.2 * 0.02 * 2.5).norm() < 1e-12);
        let ice = Load::Ice {
            scope: scope(),
            thickness: 0.01,
            density: 900.0,
            gravity: Vector3::new(0.0, 0.0, -10.0),
        };
        // Between circles of 10 mm and 20 mm radius, along 2 m of unstressed rope.
        let ring = std::f64::consts::PI * (0.02_f64.powi(2) - 0.01_f64.powi(2));
        assert!((sum(&case(&net, ice, 1.0)).z + 10.0 * 900.0 * ring * 2.0).abs() < 1e-12);
    }

    #[test]
    fn where_a_segment_hangs_the_load_goes_along_it() {
        let mut sketch = Sketch::default();
        sketch.held("a", [0.0, 0.0, 0.0]);
        sketch.held("b", [2.0, 0.0, 0.0]);
        let section = Section {
            axial_stiffness: 1e6,
            mass_per_length: 3.0,
            ..Section::default()
        };
        sketch.cable("hanging", section, "a b");
        sketch.cable("straight", section, "a b");
        sketch.given.cables[0].hangs = true;
        let net = Net::new(sketch.given).expect("a valid net");
        let weight = Load::OwnWeight {
            gravity: Vector3::new(0.0, 0.0, -10.0),
        };
        let case = case(&net, weight, 2.0);
        assert_eq!(case.segments[0].per_length, Vector3::new(0.0, 0.0, -60.0));
        assert_eq!(case.segments[1].per_length, Vector3::zeros());
        assert!((sum(&case).z + 120.0).abs() < 1e-12);
    }
}
