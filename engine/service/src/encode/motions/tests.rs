//! How frames and shown ropes are cut into messages.

use nalgebra::Vector3;
use prost::Message as _;
use ropewalk_numerics::model::CableId;

use super::*;

/// Numbers of a test, each unlike any other.
struct Numbers(f64);

impl Numbers {
    fn next(&mut self) -> f64 {
        self.0 += 1.0;
        self.0
    }

    fn some(&mut self, count: usize) -> Vec<f64> {
        (0..count).map(|_| self.next()).collect()
    }

    fn vectors(&mut self, count: usize) -> Vec<Vector3<f64>> {
        (0..count).map(|_| Vector3::from_fn(|_, _| self.next())).collect()
    }
}

/// A frame with so many watched quantities and nodes, and ropes with so many points.
fn frame(watched: usize, nodes: usize, ropes: &[usize]) -> Frame {
    let mut numbers = Numbers(0.0);
    let cables = ropes.iter().enumerate().map(|(place, points)| RopeField {
        cable: CableId::new(place),
        material: numbers.some(*points),
        positions: numbers.vectors(*points),
        velocities: numbers.vectors(*points),
        stretches: numbers.some(points - 1),
        tensions: numbers.some(points - 1),
    });
    let cables = cables.collect();
    Frame {
        step: 7,
        time: 0.7,
        positions: numbers.vectors(nodes),
        velocities: numbers.vectors(nodes),
        cables,
        slack: 3,
        ledger: Ledger::default(),
        watched: numbers.some(watched),
    }
}

/// Cuts a frame, and checks that nothing is lost, doubled or out of order; how many numbers each message has.
#[track_caller]
fn cut(frame: &Frame) -> Vec<usize> {
    let messages = moment("gust", frame);
    let parts: Vec<v1::MotionFrame> = (messages.iter())
        .map(|message| match &message.event {
            Some(Event::Motion(v1::MotionPart {
                motion,
                part: Some(Part::Frame(frame)),
            })) if motion == "gust" => frame.clone(),
            other => panic!("{other:?}"),
        })
        .collect();
    for (place, (part, message)) in parts.iter().zip(&messages).enumerate() {
        assert_eq!((part.step, part.time_s, part.continues), (7, 0.7, place > 0));
        assert_eq!(part.energy.is_some(), place == 0);
        assert!(message.encoded_len() < 256 * 1024, "{}", message.encoded_len());
    }
    let joined = |of: fn(&v1::MotionFrame) -> &Vec<f64>| parts.iter().flat_map(of).copied().collect::<Vec<f64>>();
    assert_eq!(joined(|part| &part.watched), frame.watched);
    assert_eq!(parts[0].watched, frame.watched);
    assert_eq!(joined(|part| &part.positions_m), flat(&frame.positions));
    assert_eq!(joined(|part| &part.velocities_m_per_s), flat(&frame.velocities));
    for (place, field) in frame.cables.iter().enumerate() {
        let mut whole = v1::RopeFrame::default();
        let ropes = parts.iter().flat_map(|part| &part.ropes);
        for part in ropes.filter(|part| part.rope as usize == place) {
            assert_eq!(whole.positions_m.len(), 3 * part.from as usize, "rope {place}");
            whole.positions_m.extend(&part.positions_m);
            whole.velocities_m_per_s.extend(&part.velocities_m_per_s);
            whole.stretch.extend(&part.stretch);
            whole.tension_n.extend(&part.tension_n);
        }
        assert_eq!(whole.positions_m, flat(&field.positions), "rope {place}");
        assert_eq!(whole.velocities_m_per_s, flat(&field.velocities));
        assert_eq!((&whole.stretch, &whole.tension_n), (&field.stretches, &field.tensions));
    }
    let order: Vec<u32> = parts
        .iter()
        .flat_map(|part| &part.ropes)
        .map(|rope| rope.rope)
        .collect();
    assert!(order.is_sorted(), "{order:?}");
    let of_rope = |rope: &v1::RopeFrame| {
        assert!(!rope.positions_m.is_empty());
        rope.positions_m.len() + rope.velocities_m_per_s.len() + rope.stretch.len() + rope.tension_n.len()
    };
    let numbers = parts.iter().map(|part| {
        let ropes: usize = part.ropes.iter().map(of_rope).sum();
        part.watched.len() + part.positions_m.len() + part.velocities_m_per_s.len() + ropes
    });
    let numbers: Vec<usize> = numbers.collect();
    assert!(numbers.iter().all(|count| *count <= NUMBERS_OF_FRAME), "{numbers:?}");
    numbers
}

#[test]
fn a_small_frame_is_one_message() {
    assert_eq!(cut(&frame(0, 0, &[])), [0]);
    assert_eq!(cut(&frame(2, 3, &[2, 5])), [2 + 18 + (12 + 2) + (30 + 8)]);
}

#[test]
fn frames_are_cut_where_a_message_is_full() {
    let fits = NUMBERS_OF_FRAME / PER_NODE;
    assert_eq!(cut(&frame(0, fits, &[])), [NUMBERS_OF_FRAME]);
    assert_eq!(cut(&frame(0, fits + 1, &[])), [NUMBERS_OF_FRAME, PER_NODE]);
    // One watched quantity takes the room of a node.
    assert_eq!(cut(&frame(1, fits, &[])), [1 + NUMBERS_OF_FRAME - PER_NODE, PER_NODE]);
    assert_eq!(cut(&frame(1000, 3 * fits, &[])).len(), 4);
}

#[test]
fn ropes_are_cut_in_their_midst() {
    let fits = NUMBERS_OF_FRAME / PER_POINT;
    // The last point has no segment that begins there.
    assert_eq!(cut(&frame(0, 0, &[fits])), [NUMBERS_OF_FRAME - 2]);
    assert_eq!(cut(&frame(0, 0, &[fits + 1])), [NUMBERS_OF_FRAME, PER_POINT - 2]);
    assert_eq!(cut(&frame(0, 0, &[3 * fits + 5])).len(), 4);
    // One after the other in the room that is left, down to less than a point.
    for left in 0..=2 * PER_POINT {
        let watched = NUMBERS_OF_FRAME % PER_NODE + left;
        let nodes = (NUMBERS_OF_FRAME - watched) / PER_NODE;
        assert!(cut(&frame(watched, nodes, &[3, 2, fits + 1, 4])).len() >= 2);
    }
    // Many short ropes.
    assert!(cut(&frame(0, 0, &vec![2; 5000])).len() > 3);
}

#[test]
fn a_shown_rope_with_many_points_comes_in_parts() {
    for (points, id) in [(2, 4), (16_383, 0), (16_384, 0), (100_001, 0), (2000, 512)] {
        let material: Vec<f64> = (0..points).map(f64::from).collect();
        let nodes: Vec<String> = (0..points).map(|_| "n".repeat(id)).collect();
        let parts = shown_rope("main", &material, nodes.clone());
        assert_eq!(
            parts.len() > 1,
            points > 16_383 || id > 4,
            "{points} points of {id} letters"
        );
        let mut at = 0;
        for part in &parts {
            assert_eq!((part.cable.as_str(), part.from as usize), ("main", at));
            assert_eq!(part.material_m, material[at..at + part.material_m.len()]);
            assert_eq!(part.nodes, nodes[at..at + part.nodes.len()]);
            assert_eq!(part.nodes.len(), part.material_m.len());
            assert!(part.encoded_len() < 256 * 1024, "{} bytes", part.encoded_len());
            at += part.nodes.len();
        }
        assert_eq!(at, material.len());
    }
}
