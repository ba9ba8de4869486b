//! Motions as CSV files, in SI units with all digits: what frames show, extremes over all steps, spectra.

use std::collections::BTreeSet;
use std::fmt::Write as _;

use ropewalk_api::ropewalk::v1;

use crate::escape::{csv_text, free_file_name};
use crate::run::{Column, MotionRun, Run};

/// Name and content of each file of a motion; those of its sheets are not among them.
pub(crate) fn tables(run: &Run, motion: &MotionRun) -> Vec<(String, String)> {
    let base = format!("motion-{}", motion.name);
    let mut files = Vec::new();
    if !motion.frames.is_empty() {
        files.push((format!("{base}-frames.csv"), frames(motion)));
        if !motion.shown.nodes.is_empty() {
            files.push((format!("{base}-nodes.csv"), nodes(motion)));
        }
    }
    let mut taken = BTreeSet::new();
    for (number, rope) in motion.shown.ropes.iter().enumerate() {
        let name = free_file_name(&rope.cable, &mut taken);
        files.push((format!("{base}-rope-{name}.csv"), rope_over_time(motion, number)));
    }
    let ranges = [
        (v1::Range::Node, "nodes"),
        (v1::Range::RopeSegment, "ropes"),
        (v1::Range::Strut, "struts"),
        (v1::Range::Support, "supports"),
    ];
    for (range, name) in ranges {
        if let Some(text) = peaks(run, motion, range) {
            files.push((format!("{base}-peaks-{name}.csv"), text));
        }
    }
    if let Some(text) = spectrum(motion) {
        files.push((format!("{base}-spectrum.csv"), text));
    }
    files
}

/// Numbers of a row behind what names it.
fn line(text: &mut String, names: &[&str], numbers: impl IntoIterator<Item = f64>) {
    text.push_str(&names.join(","));
    for (at, number) in numbers.into_iter().enumerate() {
        let comma = if at == 0 && names.is_empty() { "" } else { "," };
        write!(text, "{comma}{number}").expect("a string takes every text");
    }
    text.push_str("\r\n");
}

/// Every frame: time, energies, slack segments, watched quantities in the units of the contract.
fn frames(motion: &MotionRun) -> String {
    let mut text = String::from(
        "step,time_s,kinetic_j,elastic_j,potential_j,work_j,dissipated_j,released_j,error_j,slack_segments",
    );
    for quantity in &motion.shown.watched {
        text.push(',');
        text.push_str(&csv_text(&format!("{} ({})", quantity.id, quantity.unit)));
    }
    text.push_str("\r\n");
    for frame in &motion.frames {
        let energy = frame.energy.unwrap_or_default();
        let step = frame.step.to_string();
        let ledger = [
            frame.time_s,
            energy.kinetic_j,
            energy.elastic_j,
            energy.potential_j,
            energy.work_j,
            energy.dissipated_j,
            energy.released_j,
            energy.error_j,
            frame.slack_segments.into(),
        ];
        line(
            &mut text,
            &[&step],
            ledger.into_iter().chain(frame.watched.iter().copied()),
        );
    }
    text
}

/// The shown nodes in every frame.
fn nodes(motion: &MotionRun) -> String {
    let mut text = String::from("time_s,node,x_m,y_m,z_m,vx_m_per_s,vy_m_per_s,vz_m_per_s\r\n");
    let ids: Vec<String> = motion.shown.nodes.iter().map(|id| csv_text(id)).collect();
    for frame in &motion.frames {
        let time = frame.time_s.to_string();
        let states = frame
            .positions_m
            .chunks_exact(3)
            .zip(frame.velocities_m_per_s.chunks_exact(3));
        for (id, (place, velocity)) in ids.iter().zip(states) {
            line(&mut text, &[&time, id], place.iter().chain(velocity).copied());
        }
    }
    text
}

/// A shown rope in every frame, point by point; stretch and tension are those of the segment that begins at the point, and
/// stay empty at the last.
fn rope_over_time(motion: &MotionRun, number: usize) -> String {
    let mut text =
        String::from("time_s,material_m,node,x_m,y_m,z_m,vx_m_per_s,vy_m_per_s,vz_m_per_s,stretch,tension_n\r\n");
    let shown = &motion.shown.ropes[number];
    let names: Vec<[String; 2]> = (shown.material_m.iter().zip(&shown.nodes))
        .map(|(material, node)| [material.to_string(), csv_text(node)])
        .collect();
    for frame in &motion.frames {
        let time = frame.time_s.to_string();
        let rope = &frame.ropes[number];
        let states = rope
            .positions_m
            .chunks_exact(3)
            .zip(rope.velocities_m_per_s.chunks_exact(3));
        for (at, ([material, node], (place, velocity))) in names.iter().zip(states).enumerate() {
            let of_segment = rope.stretch.get(at).into_iter().chain(rope.tension_n.get(at));
            let numbers = place.iter().chain(velocity).chain(of_segment);
            line(&mut text, &[&time, material, node], numbers.copied());
            if at + 1 == names.len() {
                // Two empty cells, so that every row has all columns.
                text.truncate(text.len() - 2);
                text.push_str(",,\r\n");
            }
        }
    }
    text
}

/// Extremes over all steps, all arrays over one range beside each other; none where there are none.
fn peaks(run: &Run, motion: &MotionRun, over: v1::Range) -> Option<String> {
    let columns: Vec<(&String, &Column)> = motion
        .columns
        .iter()
        .filter(|(_, column)| column.over == over)
        .collect();
    if columns.is_empty() {
        return None;
    }
    let of_segment = |at: usize| {
        let [from, to] = run.segments[at].nodes.map(|node| csv_text(&run.nodes[node]));
        format!("{},{from},{to}", csv_text(run.member_id(at)))
    };
    let (head, names): (&str, Vec<String>) = match over {
        v1::Range::Node => ("node", run.nodes.iter().map(|id| csv_text(id)).collect()),
        v1::Range::RopeSegment => ("rope,from,to", (0..run.n_rope_segments()).map(of_segment).collect()),
        v1::Range::Strut => ("strut", run.struts.iter().map(|id| csv_text(id)).collect()),
        _ => (
            "support",
            run.supports.iter().map(|&node| csv_text(&run.nodes[node])).collect(),
        ),
    };
    let mut text = head.to_owned();
    for (name, column) in &columns {
        match column.components {
            1 => text.push_str(&format!(",{name}")),
            _ => (0..column.components).for_each(|part| {
                let axis = ["x", "y", "z"]
                    .get(part)
                    .map_or(part.to_string(), |axis| (*axis).to_owned());
                text.push_str(&format!(",{name}_{axis}"));
            }),
        }
    }
    text.push_str("\r\n");
    for (at, name) in names.iter().enumerate() {
        let numbers = columns.iter().flat_map(|(_, column)| {
            let width = column.components;
            column.values[at * width..(at + 1) * width].iter().copied()
        });
        line(&mut text, &[name], numbers);
    }
    Some(text)
}

/// Lines of the spectra, in the units of the contract; none where there are none.
fn spectrum(motion: &MotionRun) -> Option<String> {
    let apart = motion.spectra.first()?.resolution_hz;
    let column = motion.columns.get("spectrum_amplitude")?;
    let mut text = String::from("frequency_hz");
    for quantity in &motion.shown.watched {
        text.push(',');
        text.push_str(&csv_text(&format!("{} ({})", quantity.id, quantity.unit)));
    }
    text.push_str("\r\n");
    for (number, line) in (0_u32..).zip(column.values.chunks_exact(column.components)) {
        let frequency = (f64::from(number) * apart).to_string();
        self::line(&mut text, &[&frequency], line.iter().copied());
    }
    Some(text)
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::run::motion_sample;

    fn table(run: &Run, name: &str) -> Vec<Vec<String>> {
        let files = tables(run, &run.motions[0]);
        let names: Vec<&String> = files.iter().map(|(name, _)| name).collect();
        let found = files.iter().find(|(known, _)| known == name);
        let (_, text) = found.unwrap_or_else(|| panic!("no {name} among {names:?}"));
        let rows = text.split("\r\n").filter(|row| !row.is_empty());
        rows.map(|row| row.split(',').map(str::to_owned).collect()).collect()
    }

    #[test]
    fn tables_have_all_frames_and_all_digits() {
        let run = motion_sample::run_named("gust");
        let frames = table(&run, "motion-gust-frames.csv");
        assert_eq!(frames.len(), 202);
        assert_eq!(
            frames[0][9..],
            ["slack_segments", "middle (m)", "first-piece (N)", "speed (m/s)"]
        );
        assert_eq!(frames[201][..2], ["2000", "0.4"]);
        let height = motion_sample::height(20.0 * motion_sample::PIECE_M, 0.1);
        assert_eq!(frames[51][10].parse::<f64>().unwrap(), height);
        let rope = table(&run, "motion-gust-rope-main.csv");
        assert_eq!(rope.len(), 1 + 201 * 41);
        assert!(rope.iter().all(|row| row.len() == 11), "{:?}", rope[41]);
        assert_eq!(
            (rope[41][2].as_str(), rope[41][9].as_str(), rope[41][10].as_str()),
            ("n40", "", "")
        );
        assert_eq!(table(&run, "motion-gust-nodes.csv").len(), 202);
        let peaks = table(&run, "motion-gust-peaks-ropes.csv");
        assert_eq!(peaks[0], ["rope", "from", "to", "tension_max_n", "tension_max_time_s"]);
        assert_eq!(peaks[40], ["main", "n39", "n40", "28140", "0.014"]);
        let spectrum = table(&run, "motion-gust-spectrum.csv");
        assert_eq!((spectrum.len(), spectrum[0].len()), (81, 4));
    }
}
