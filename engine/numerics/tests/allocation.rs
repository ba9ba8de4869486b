//! Response and tangent are filled without touching the heap.

use std::sync::Arc;

use nalgebra::{Matrix3, Vector3};
use ropewalk_numerics::assembly::{Loading, Response, Structure};
use ropewalk_numerics::load::{Case, SegmentLoads};
use ropewalk_numerics::model::{CableGiven, Net, NetGiven, NodeGiven, NodeId, Section, SupportGiven};

#[global_allocator]
static ALLOCATOR: dhat::Alloc = dhat::Alloc;

fn ladder(n: usize) -> Net {
    let node = |i: usize| NodeGiven {
        name: format!("n{i}"),
        position: Some(Vector3::new((i / 2) as f64, (i % 2) as f64, 0.1 * (i % 3) as f64)),
        support: match i {
            0 | 1 => Some(SupportGiven::default()),
            _ if i.is_multiple_of(7) => Some(SupportGiven {
                released: vec![Vector3::new(1.0, 0.2, 0.3)],
            }),
            _ => None,
        },
        attached_mass: 0.0,
    };
    let section = Section {
        axial_stiffness: 1e6,
        mass_per_length: 0.0,
        expansion: 0.0,
        breaking_force: None,
        ..Section::default()
    };
    let pairs = (0..n - 2).flat_map(|i| [(i, i + 1), (i, i + 2)]);
    let cable = |(a, b): (usize, usize)| CableGiven {
        name: format!("c{a}-{b}"),
        path: vec![NodeId::new(a), NodeId::new(b)],
        sections: vec![section],
        ..CableGiven::default()
    };
    Net::new(NetGiven {
        nodes: (0..n).map(node).collect(),
        cables: pairs.map(cable).collect(),
        ..NetGiven::default()
    })
    .expect("valid")
}

#[test]
fn assembly_does_not_allocate() {
    let net = Arc::new(ladder(100));
    let structure = Structure::new(Arc::clone(&net));
    let positions: Vec<_> = net.nodes().iter().filter_map(|n| n.position).collect();
    let n_segments = net.segments().len();
    let case = Case {
        nodal_forces: vec![Vector3::z(); positions.len()],
        unstressed_lengths: vec![0.9; net.n_lengths()],
        segments: vec![SegmentLoads::default(); n_segments],
        support_movements: vec![Vector3::zeros(); positions.len()],
        removed: vec![false; n_segments],
        ..Case::default()
    };
    let loading = Loading::new(&structure, &case, &case.unstressed_lengths, 1.0).expect("fits");
    let mut response = Response::new(&structure);
    let mut blocks = vec![Matrix3::zeros(); n_segments];
    let mut values = vec![0.0; structure.pattern().n_entries()];
    let profiler = dhat::Profiler::builder().testing().build();
    structure.response_into(&loading, &positions, &mut response);
    for ((block, bar), chord) in blocks.iter_mut().zip(&loading.bars).zip(&response.chords) {
        *block = bar.stiffness_block(chord);
    }
    structure.tangent_into(&blocks, &mut values);
    structure.add_elastic_supports(&mut values);
    let stats = dhat::HeapStats::get();
    drop(profiler);
    assert_eq!(stats.total_blocks, 0);
    assert!(values.iter().any(|v| *v > 0.0));
}
