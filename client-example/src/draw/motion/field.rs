//! A quantity along a rope over time, laid on a grid that a drawing can hold, and the way of waves over it.

use ropewalk_api::ropewalk::v1;

use crate::number::three;
use crate::run::MotionRun;

/// Columns and rows of a grid.
pub(super) const COLUMNS: usize = 110;
pub(super) const ROWS: usize = 150;

/// Numbers on a grid: the rope's unstressed length across, time down.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Grid {
    /// Ends of the rope (m).
    pub(super) material: [f64; 2],
    /// First and last time (s).
    pub(super) time: [f64; 2],
    /// Row by row, each as long as the grid has columns.
    pub(super) rows: Vec<Vec<f64>>,
}

impl Grid {
    #[cfg(test)]
    fn columns(&self) -> usize {
        self.rows.first().map_or(0, Vec::len)
    }

    /// Unstressed length in the middle of a column (m).
    #[cfg(test)]
    pub(super) fn material_at(&self, column: usize) -> f64 {
        middle(self.material, self.columns(), column)
    }

    /// Time in the middle of a row (s).
    #[cfg(test)]
    pub(super) fn time_at(&self, row: usize) -> f64 {
        middle(self.time, self.rows.len(), row)
    }
}

#[allow(clippy::cast_precision_loss, reason = "a grid is small")]
fn middle([low, high]: [f64; 2], parts: usize, part: usize) -> f64 {
    low + (high - low) * (part as f64 + 0.5) / parts as f64
}

/// Tension of each segment over the frames (N), none where the rope is not drawn.
pub(super) fn tension(motion: &MotionRun, rope: usize) -> Option<Grid> {
    let material = &motion.shown.ropes.get(rope)?.material_m;
    let moments: Vec<&[f64]> = motion
        .frames
        .iter()
        .map(|frame| frame.ropes[rope].tension_n.as_slice())
        .collect();
    grid(motion, material, &moments, |numbers, at| numbers[segment(material, at)])
}

/// Movement from where points start, across the rope, along the direction in which most of it happens.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Sideways {
    /// In m, positive along `along`.
    pub(super) grid: Grid,
    pub(super) along: [f64; 3],
    /// Share of the squared movement across the rope that is along it (-).
    pub(super) share: f64,
}

pub(super) fn sideways(motion: &MotionRun, rope: usize) -> Option<Sideways> {
    let material = &motion.shown.ropes.get(rope)?.material_m;
    let start = points(&motion.frames.first()?.ropes[rope]);
    let tangents = tangents(&start);
    let moves: Vec<Vec<[f64; 3]>> = (motion.frames.iter())
        .map(|frame| {
            let now = points(&frame.ropes[rope]);
            let moved = now.iter().zip(&start).zip(&tangents).map(|((now, start), tangent)| {
                let by = [now[0] - start[0], now[1] - start[1], now[2] - start[2]];
                let lengthwise = dot(by, *tangent);
                std::array::from_fn(|axis| by[axis] - lengthwise * tangent[axis])
            });
            moved.collect()
        })
        .collect();
    let (along, share) = main_direction(moves.iter().flatten().copied());
    let numbers: Vec<Vec<f64>> = (moves.iter())
        .map(|moves| moves.iter().map(|by| dot(*by, along)).collect())
        .collect();
    let moments: Vec<&[f64]> = numbers.iter().map(Vec::as_slice).collect();
    let grid = grid(motion, material, &moments, |numbers, at| {
        let segment = segment(material, at);
        let (from, to) = (material[segment], material[segment + 1]);
        let share = if to > from { (at - from) / (to - from) } else { 0.0 };
        numbers[segment] + share * (numbers[segment + 1] - numbers[segment])
    })?;
    Some(Sideways { grid, along, share })
}

/// Numbers of the frames on a grid. A row that has several frames keeps, place by place, the number that is farthest from
/// where it began; a row without one has the frame that is nearest in time.
fn grid(motion: &MotionRun, material: &[f64], moments: &[&[f64]], number: impl Fn(&[f64], f64) -> f64) -> Option<Grid> {
    let times = motion.times();
    let (first, last) = (*times.first()?, *times.last()?);
    let ends = [*material.first()?, *material.last()?];
    if last <= first || ends[1] <= ends[0] || material.len() < 2 {
        return None;
    }
    let n_rows = times.len().min(ROWS);
    let lines: Vec<Vec<f64>> = (moments.iter())
        .map(|numbers| {
            (0..COLUMNS)
                .map(|column| number(numbers, middle(ends, COLUMNS, column)))
                .collect()
        })
        .collect();
    #[allow(
        clippy::cast_precision_loss,
        clippy::cast_possible_truncation,
        clippy::cast_sign_loss,
        reason = "a share of a small count"
    )]
    let row_of = |time: f64| (((time - first) / (last - first) * n_rows as f64) as usize).min(n_rows - 1);
    let mut rows: Vec<Option<Vec<f64>>> = vec![None; n_rows];
    for (time, line) in times.iter().zip(&lines) {
        match &mut rows[row_of(*time)] {
            empty @ None => *empty = Some(line.clone()),
            Some(kept) => {
                for ((kept, new), began) in kept.iter_mut().zip(line).zip(&lines[0]) {
                    if (new - began).abs() > (*kept - began).abs() {
                        *kept = *new;
                    }
                }
            }
        }
    }
    let rows = rows.into_iter().enumerate().map(|(row, line)| {
        line.unwrap_or_else(|| {
            let time = middle([first, last], n_rows, row);
            let near = (0..times.len()).min_by(|&a, &b| (times[a] - time).abs().total_cmp(&(times[b] - time).abs()));
            lines[near.expect("there are frames")].clone()
        })
    });
    Some(Grid {
        material: ends,
        time: [first, last],
        rows: rows.collect(),
    })
}

/// The segment that holds a place (m).
fn segment(material: &[f64], at: f64) -> usize {
    let after = material.partition_point(|point| *point <= at);
    after.clamp(1, material.len() - 1) - 1
}

fn points(rope: &v1::RopeFrame) -> Vec<[f64; 3]> {
    rope.positions_m
        .chunks_exact(3)
        .map(|at| [at[0], at[1], at[2]])
        .collect()
}

fn dot(a: [f64; 3], b: [f64; 3]) -> f64 {
    a.iter().zip(b).map(|(a, b)| a * b).sum()
}

fn unit(vector: [f64; 3]) -> Option<[f64; 3]> {
    let size = dot(vector, vector).sqrt();
    (size > 0.0).then(|| vector.map(|part| part / size))
}

/// Direction of a rope at each of its points.
fn tangents(points: &[[f64; 3]]) -> Vec<[f64; 3]> {
    (0..points.len())
        .map(|at| {
            let (a, b) = (points[at.saturating_sub(1)], points[(at + 1).min(points.len() - 1)]);
            unit([b[0] - a[0], b[1] - a[1], b[2] - a[2]]).unwrap_or([0.0; 3])
        })
        .collect()
}

/// The direction along which squares of vectors have their largest sum, by the power method, and its share of all; upwards,
/// or else along x or y. Upwards where nothing moves.
fn main_direction(vectors: impl Iterator<Item = [f64; 3]>) -> ([f64; 3], f64) {
    let mut sums = [[0.0; 3]; 3];
    for vector in vectors {
        for (row, sums) in sums.iter_mut().enumerate() {
            for (column, sum) in sums.iter_mut().enumerate() {
                *sum += vector[row] * vector[column];
            }
        }
    }
    let all = sums[0][0] + sums[1][1] + sums[2][2];
    if all <= 0.0 {
        return ([0.0, 0.0, 1.0], 1.0);
    }
    let times = |vector: [f64; 3]| sums.map(|row| dot(row, vector));
    // The column of the largest entry is never across the direction that is sought.
    let largest = (0..3)
        .max_by(|&a, &b| sums[a][a].total_cmp(&sums[b][b]))
        .expect("three");
    let mut along = unit(sums[largest]).expect("its diagonal is positive");
    for _ in 0..200 {
        along = unit(times(along)).unwrap_or(along);
    }
    let share = dot(times(along), along) / all;
    let part = [along[2], along[0], along[1]]
        .into_iter()
        .find(|part| part.abs() > 1e-6);
    let sign = part.unwrap_or(1.0).signum();
    (along.map(|part| sign * part), share)
}

/// Where and when something first happens to a rope: its first event; else the first event of the motion, where its member
/// ends on the rope. None where neither is told.
pub(super) fn origin(motion: &MotionRun, rope: usize) -> Option<([f64; 2], &v1::MotionEvent)> {
    let shown = motion.shown.ropes.get(rope)?;
    let place = |node: &str| {
        let at = shown.nodes.iter().position(|known| known == node && !node.is_empty())?;
        Some(shown.material_m[at])
    };
    motion.events.iter().find_map(|event| {
        let at = match (place(&event.from), place(&event.to)) {
            (Some(from), Some(to)) if event.member == shown.cable => f64::midpoint(from, to),
            (Some(at), _) | (None, Some(at)) => at,
            (None, None) => return None,
        };
        Some(([at, event.time_s], event))
    })
}

/// Where and when waves are drawn to begin.
#[derive(Clone, Debug, PartialEq)]
pub(super) struct Start {
    /// Unstressed length (m) and time (s).
    pub(super) at: [f64; 2],
    pub(super) words: String,
}

/// Share of the largest movement that counts as moving.
const MOVES: f64 = 0.05;

/// Where something first happens to a rope; where no event tells, where it first moves, if that is in one place.
pub(super) fn start(motion: &MotionRun, rope: usize, sideways: &Grid) -> Option<Start> {
    if let Some((at, event)) = origin(motion, rope) {
        let what = match event.kind() {
            v1::MotionEventKind::Break => "begins to break",
            v1::MotionEventKind::Slack => "goes slack",
            _ => "snatches",
        };
        return Some(Start {
            at,
            words: format!("{} {what}, {} s", event.member, three(event.time_s)),
        });
    }
    let largest = |row: &[f64]| row.iter().map(|by| by.abs()).fold(0.0, f64::max);
    let all = sideways.rows.iter().map(|row| largest(row)).fold(0.0, f64::max);
    let moves = |row: &&Vec<f64>| largest(row) > MOVES * all;
    let (row, line) = sideways.rows.iter().enumerate().find(|(_, row)| moves(row))?;
    let here = largest(line);
    let along = line.iter().filter(|by| by.abs() > 0.5 * here).count();
    if 3 * along > line.len() {
        return None;
    }
    let column = (0..line.len()).max_by(|&a, &b| line[a].abs().total_cmp(&line[b].abs()))?;
    let time = middle(sideways.time, sideways.rows.len(), row);
    Some(Start {
        at: [middle(sideways.material, line.len(), column), time],
        words: format!("first moves here, about {} s", three(time)),
    })
}

/// The way of a wave from a place and time, both ways and turned back at the ends of the rope, until time ends or it has been
/// turned back so often. Points (m, s).
pub(super) fn way(from: [f64; 2], speed: f64, [low, high]: [f64; 2], until: f64, turns: usize) -> [Vec<[f64; 2]>; 2] {
    [-1.0, 1.0].map(|direction: f64| {
        let mut points = vec![from];
        let (mut at, mut time, mut direction) = (from[0], from[1], direction);
        if speed <= 0.0 || !speed.is_finite() {
            return points;
        }
        for _ in 0..=turns {
            let end = if direction > 0.0 { high } else { low };
            let arrives = time + (end - at).abs() / speed;
            if arrives >= until {
                points.push([at + direction * speed * (until - time), until]);
                break;
            }
            points.push([end, arrives]);
            (at, time, direction) = (end, arrives, -direction);
        }
        points
    })
}

#[cfg(test)]
mod tests {
    use super::*;
    use crate::run::motion_sample;

    #[test]
    fn the_ridge_of_a_travelling_wave_is_where_its_speed_takes_it() {
        let run = motion_sample::run_named("gust");
        let motion = &run.motions[0];
        let field = sideways(motion, 0).unwrap();
        assert!(field.along[2] > 0.999_999 && field.share > 0.999_999, "{field:?}");
        let grid = &field.grid;
        assert_eq!((grid.rows.len(), grid.columns()), (ROWS, COLUMNS));
        let ([from, at], event) = origin(motion, 0).unwrap();
        assert_eq!((from, at), (9.9, 0.0));
        assert_eq!(event.member, "tie");
        let [_, right] = way([from, at], motion_sample::speed(), grid.material, grid.time[1], 4);
        let mut looked_at = 0;
        for (row, line) in grid.rows.iter().enumerate() {
            let time = grid.time_at(row);
            // After it has been let in, and before it comes to the far end.
            if !(0.02..0.13).contains(&time) {
                continue;
            }
            let ahead = (0..line.len()).filter(|&column| grid.material_at(column) > from);
            let ridge = ahead.max_by(|&a, &b| line[a].total_cmp(&line[b])).unwrap();
            let expected = from + motion_sample::speed() * time;
            // Half a row of time and half a column are what the grid can tell, and frames are 2 ms apart.
            let allowed = motion_sample::speed() * 0.0025 + 0.5 * 39.6 / 110.0;
            assert!(
                (grid.material_at(ridge) - expected).abs() < allowed,
                "{time} s: {} {expected}",
                grid.material_at(ridge)
            );
            let share = time / right[1][1];
            let on_line = from + share * (right[1][0] - from);
            assert!(
                (on_line - expected).abs() < 1e-9,
                "the drawn line is the way of the wave"
            );
            looked_at += 1;
        }
        assert!(looked_at > 30, "{looked_at}");
    }

    #[test]
    fn without_an_event_waves_begin_where_the_rope_first_moves_if_that_is_one_place() {
        let mut run = motion_sample::run_named("gust");
        let grid = sideways(&run.motions[0], 0).unwrap().grid;
        let told = start(&run.motions[0], 0, &grid).unwrap();
        assert_eq!((told.at, told.words.as_str()), ([9.9, 0.0], "tie begins to break, 0 s"));
        run.motions[0].events.clear();
        let found = start(&run.motions[0], 0, &grid).unwrap();
        assert!((found.at[0] - 9.9).abs() < 0.5 && found.at[1] < 0.005, "{found:?}");
        let mut even = grid;
        even.rows.iter_mut().flatten().for_each(|by| *by = 1.0);
        assert_eq!(start(&run.motions[0], 0, &even), None);
    }

    #[test]
    fn a_wave_is_turned_back_at_the_ends() {
        let [left, right] = way([1.0, 0.5], 2.0, [0.0, 4.0], 4.0, 9);
        assert_eq!(left, [[1.0, 0.5], [0.0, 1.0], [4.0, 3.0], [2.0, 4.0]]);
        assert_eq!(right, [[1.0, 0.5], [4.0, 2.0], [0.0, 4.0]]);
        assert_eq!(way([1.0, 0.5], 2.0, [0.0, 4.0], 4.0, 0)[0], [[1.0, 0.5], [0.0, 1.0]]);
        assert_eq!(way([1.0, 0.5], 0.0, [0.0, 4.0], 4.0, 3)[0].len(), 1);
    }

    #[test]
    fn tensions_stand_over_their_segments() {
        let run = motion_sample::run_named("gust");
        let motion = &run.motions[0];
        let grid = tension(motion, 0).unwrap();
        for column in 0..COLUMNS {
            let material = grid.material_at(column);
            let segment = (0..40)
                .filter(|at| f64::from(*at) * motion_sample::PIECE_M <= material)
                .count()
                - 1;
            assert_eq!(grid.rows[0][column], {
                let began = motion.frames[0].ropes[0].tension_n[segment];
                let next = motion.frames[1].ropes[0].tension_n[segment];
                // The first row holds one frame or two, and keeps what differs.
                if motion.frames[1].time_s < grid.time[1] / 150.0 {
                    next
                } else {
                    began
                }
            });
        }
    }

    #[test]
    fn the_main_direction_is_that_of_most_movement() {
        let (along, share) = main_direction([[3.0, 0.0, 4.0], [-1.5, 0.0, -2.0], [0.4, 0.0, -0.3]].into_iter());
        assert!(
            (along[0] - 0.6).abs() < 1e-9 && (along[2] - 0.8).abs() < 1e-9,
            "{along:?}"
        );
        assert!((share - 31.25 / 31.5).abs() < 1e-9, "{share}");
    }
}
