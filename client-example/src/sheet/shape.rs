//! What was wanted of the reference state, and what came of it.

use ropewalk_api::ropewalk::v1;

use super::{Cell, Mark, Row, Sheet, head, page_head};
use crate::run::Run;

/// Every wish, the largest deviation first, then wishes that fight and forces that nothing balances; none where the engine
/// told of none.
pub(crate) fn shape(run: &Run) -> Option<Sheet> {
    let report = run.shape_report.as_ref()?;
    let mut rows: Vec<Row> = report.wishes.iter().map(wish).collect();
    rows.extend(report.fights.iter().map(|fight| fight_row(report, fight)));
    rows.extend(report.left.iter().map(left));
    (!rows.is_empty()).then(|| Sheet {
        file: "shape".into(),
        title: "Shape report: what was wanted of the reference state".into(),
        heads: vec![
            head("of", ""),
            head("what", ""),
            head("wanted", ""),
            head("found", ""),
            head("unit", ""),
            head("off", "%"),
            head("met", ""),
            page_head("remark", ""),
            page_head("place in the brief", ""),
        ],
        rows,
        note: "The largest deviation first. Two wishes that fight cannot be met together: the remark tells what each would come to without \
               the other. A force left over is what the wanted tensions would leave at a node; the state itself is in balance.",
    })
}

/// A quantity in words, its unit for eyes, and how many of it make one of the contract's.
fn quantity(of: v1::TargetQuantity) -> (String, &'static str, f64) {
    let name = of
        .as_str_name()
        .trim_start_matches("TARGET_QUANTITY_")
        .to_lowercase()
        .replace('_', " ");
    let force = ["tension", "force"].iter().any(|word| name.contains(word));
    let (unit, scale) = if force { ("kN", 1e-3) } else { ("m", 1.0) };
    (name, unit, scale)
}

fn wish(wish: &v1::WishResult) -> Row {
    let (what, unit, scale) = quantity(wish.quantity());
    let rule = if wish.path.is_empty() { "wanted by a rule" } else { "" };
    // Within 0.2 % is near enough for eyes to pass over, and said to be only near.
    let met = match (wish.met, wish.miss.abs() <= 2e-3) {
        (true, _) => "yes",
        (false, true) => "within 0.2 %",
        (false, false) => "no",
    };
    Row {
        cells: vec![
            Cell::text(&wish.on),
            Cell::text(what),
            Cell::three(wish.wanted * scale),
            Cell::three(wish.found * scale),
            Cell::text(unit),
            Cell::three(wish.miss * 100.0),
            Cell::text(met),
            Cell::text(rule),
            Cell::text(&wish.path),
        ],
        mark: if met == "no" { Mark::Bad } else { Mark::Plain },
        group: "wishes".to_owned(),
    }
}

fn fight_row(report: &v1::ShapeReport, fight: &v1::WishFight) -> Row {
    let of = |at: u32| {
        let known = usize::try_from(at).ok().and_then(|at| report.wishes.get(at));
        known.map_or_else(
            || format!("wish {}", at + 1),
            |wish| format!("{} of {}", quantity(wish.quantity()).0, wish.on),
        )
    };
    let size = |at: u32, number: f64| {
        let known = usize::try_from(at).ok().and_then(|at| report.wishes.get(at));
        let (unit, scale) = known.map_or(("", 1.0), |wish| {
            let (_, unit, scale) = quantity(wish.quantity());
            (unit, scale)
        });
        format!("{} {unit}", crate::number::three(number * scale))
    };
    let remark = format!(
        "without the other the first comes to {}, the second to {}; left out themselves to {} and {}",
        size(fight.first, fight.first_alone),
        size(fight.second, fight.second_alone),
        size(fight.first, fight.first_left_out),
        size(fight.second, fight.second_left_out)
    );
    let mut row = remark_row(
        format!("{} against {}", of(fight.first), of(fight.second)),
        "cannot both be met",
        remark,
    );
    row.mark = Mark::Open;
    row.group = "wishes that fight".to_owned();
    row
}

fn left(force: &v1::ForceLeftOver) -> Row {
    let size = force.force_n.iter().map(|part| part * part).sum::<f64>().sqrt();
    let towards = if force.towards.is_empty() {
        String::new()
    } else {
        format!(" towards {}", force.towards)
    };
    let mut row = remark_row(
        force.node.clone(),
        "force left over",
        format!("{} kN{towards}", crate::number::three(size / 1e3)),
    );
    row.group = "forces left over".to_owned();
    row
}

fn remark_row(of: String, what: &str, remark: String) -> Row {
    Row {
        cells: vec![
            Cell::text(of),
            Cell::text(what),
            Cell::Empty,
            Cell::Empty,
            Cell::Empty,
            Cell::Empty,
            Cell::Empty,
            Cell::text(remark),
            Cell::Empty,
        ],
        mark: Mark::Plain,
        group: String::new(),
    }
}
