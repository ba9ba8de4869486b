//! What each action does to the net, by its sums, and panel by panel.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, Show, head, page_head};
use crate::run::Run;

/// One row for each action; none where the engine told of none.
pub(crate) fn loads(run: &Run) -> Option<Sheet> {
    (!run.loads.is_empty()).then(|| Sheet {
        file: "loads".into(),
        title: "Load pictures: sums of each action".into(),
        heads: vec![
            head("action", ""),
            head("Fx", "kN"),
            head("Fy", "kN"),
            head("Fz", "kN"),
            head("acts at x", "m"),
            head("y", "m"),
            head("z", "m"),
            page_head("moment along it", "kNm"),
            head("panels", ""),
            head("area", "m²"),
            head("on plan", "m²"),
            head("mean", "kPa"),
            head("no value", "m²"),
            page_head("panels without value", ""),
        ],
        rows: run.loads.iter().map(row).collect(),
        note: "With the factor 1, on the reference state; forces on the net, z upwards. Acts at: the point of the line of action in the \
               plane of the loaded nodes. Mean: size of the sum over the area on plan, for actions on panels alone a check of its \
               units. What states carry, against their supports, stands in the sheet of sums.",
    })
}

fn row(picture: &v1::LoadPicture) -> Row {
    let size = picture.force_n.iter().map(|part| part * part).sum::<f64>().sqrt();
    let [fx, fy, fz] = Cell::components(
        [0, 1, 2].map(|axis| picture.force_n.get(axis).map_or(0.0, |part| part / 1e3)),
        size / 1e3,
    );
    let point = |axis: usize| {
        let part = picture.point_m.get(axis);
        Cell::maybe(part.map(|part| Cell::Number(*part, Show::Decimals(2))))
    };
    let panels = picture.loaded_panels > 0;
    let if_panels = |cell: Cell| if panels { cell } else { Cell::Empty };
    let area = picture.loaded_area_on_plan_m2;
    let more = match usize::try_from(picture.without_value_total)
        .unwrap_or(0)
        .saturating_sub(picture.without_value.len())
    {
        0 => String::new(),
        count => format!(" and {count} more"),
    };
    Row {
        cells: vec![
            Cell::text(&picture.action),
            fx,
            fy,
            fz,
            point(0),
            point(1),
            point(2),
            if size > 0.0 {
                Cell::Number(picture.moment_along_nm / 1e3, Show::Decimals(2))
            } else {
                Cell::Empty
            },
            Cell::Count(picture.loaded_panels.into()),
            if_panels(Cell::three(picture.loaded_area_m2)),
            if_panels(Cell::three(area)),
            if area > 0.0 {
                Cell::three(size / area / 1e3)
            } else {
                Cell::Empty
            },
            if picture.without_value_total > 0 {
                Cell::three(picture.without_value_area_m2)
            } else {
                Cell::Empty
            },
            Cell::text(format!("{}{more}", picture.without_value.join(", "))),
        ],
        mark: if picture.without_value_total > 0 {
            Mark::Open
        } else {
            Mark::Plain
        },
        group: String::new(),
    }
}

/// Each action on each panel, and the panels themselves.
pub(crate) fn panel_loads(run: &Run) -> Option<Sheet> {
    let mut rows = Vec::new();
    for picture in run.loads.iter().filter(|picture| !picture.pressure_pa.is_empty()) {
        for (at, panel) in run.panels.iter().enumerate() {
            let of = |list: &[f64]| list.get(at).copied().unwrap_or(0.0);
            rows.push(Row {
                cells: vec![
                    Cell::text(&picture.action),
                    Cell::text(&panel.id),
                    Cell::text(&panel.skin),
                    Cell::text(panel.zones.join(", ")),
                    Cell::three(panel.area_m2),
                    Cell::three(panel.area_on_plan_m2),
                    Cell::three(of(&picture.pressure_pa)),
                    Cell::three(of(&picture.on_plan_pa)),
                ],
                mark: Mark::Plain,
                group: String::new(),
            });
        }
    }
    (!rows.is_empty()).then(|| Sheet {
        file: "panel-loads".into(),
        title: "Actions panel by panel".into(),
        heads: vec![
            head("action", ""),
            head("panel", ""),
            head("skin", ""),
            head("zones", ""),
            head("area", "m2"),
            head("area on plan", "m2"),
            head("normal pressure, outer side positive", "Pa"),
            head("pressure on plan, downward positive", "Pa"),
        ],
        rows,
        note: "",
    })
}
