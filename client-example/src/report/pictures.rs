//! The sections that the script fills with pictures: their titles, choices and legends.

use crate::colour::{self, Scale};
use crate::draw;
use crate::escape::markup;
use crate::number::percent;
use crate::run::{Run, State};
use crate::sheet;

use super::data;

/// The turning shape.
pub(super) fn shape(run: &Run, scale: &Scale) -> String {
    if run
        .reference()
        .is_none_or(|state| state.vectors("position_m").is_none())
    {
        return "<section><h2>Shape</h2><p class=\"note\">No state was found, so there is nothing to show.</p></section>\n".to_owned();
    }
    let options = options(run);
    let ticks: String = scale
        .ticks()
        .iter()
        .map(|(tick, text)| format!("<i style=\"left:{:.2}%\">{text}</i>", scale.share(tick * 1e3) * 100.0))
        .collect();
    let stops: Vec<String> = (0..=16).map(|step| colour::at(f64::from(step) / 16.0)).collect();
    let kind = if scale.logarithmic {
        "tension, kN, log scale"
    } else {
        "tension, kN"
    };
    format!(
        "<section id=\"shape\"><h2>Shape</h2>\n<div class=\"tools\">\
         <label>state <select id=\"state\">{options}</select></label>\
         <label>movements <select id=\"times\"><option>1</option><option>2</option><option>5</option><option>10</option>\
         <option>20</option></select> times</label>\
         <span class=\"views\"><button type=\"button\" data-view=\"askew\">askew</button><button type=\"button\" data-view=\"plan\">plan</button>\
         <button type=\"button\" data-view=\"x\">along x</button><button type=\"button\" data-view=\"y\">along y</button></span>\
         <label><input type=\"checkbox\" id=\"pulls\" checked> anchor pulls</label></div>\n\
         <p id=\"acting\" class=\"note\"></p>\n\
         <div class=\"stage\"><canvas id=\"net\" tabindex=\"0\" aria-label=\"Shape of the net in space. Drag or use the arrow keys to turn it, plus and minus to zoom.\"></canvas>\
         <output id=\"told\"></output></div>\n\
         <div class=\"legend\"><span>{kind}</span><div class=\"bar\" style=\"background:linear-gradient(to right,{})\"></div><div class=\"ticks\">{ticks}</div></div>\n\
         <p class=\"note key\"><span class=\"slack\"></span> slack <span class=\"strut\"></span> strut <span class=\"held\"></span> support \
         <span class=\"before\"></span> reference state. Drag to turn, two fingers or wheel to zoom, shift and drag to move; \
         arrow keys, + and − do the same. Point at a rope for its numbers.</p>\n</section>\n",
        stops.join(",")
    )
}

/// Choices of a state: the reference state, then those of the case ledger in its order.
fn options(run: &Run) -> String {
    let ordered = sheet::by_need(run);
    let shown: Vec<&State> = run
        .reference()
        .into_iter()
        .chain(ordered.into_iter().filter(|state| state.id != "reference"))
        .collect();
    shown
        .iter()
        .filter_map(|state| {
            let position = run.states.iter().position(|other| other.id == state.id)?;
            let told = match state.summary.worst_ratio {
                _ if !state.answered() => " (no answer)".to_owned(),
                Some(ratio) => format!(" ({} %)", percent(ratio)),
                None => String::new(),
            };
            Some(format!(
                "<option value=\"{position}\">{}{told}</option>",
                markup(&state.id)
            ))
        })
        .collect()
}

/// The tension map.
pub(super) fn tension_map(run: &Run) -> String {
    if !has_shape(run) {
        return String::new();
    }
    let top = data::top_share(run);
    let legend = if top > 0.0 {
        // The scale ends at a whole tenth.
        let ticks: String = (0..=10)
            .map(|step| f64::from(step) / 10.0)
            .take_while(|share| *share < top + 0.05)
            .map(|share| format!("<i style=\"left:{:.1}%\">{}</i>", share / top * 100.0, percent(share)))
            .collect();
        format!(
            "<div class=\"legend\"><span>share of the breaking force with end fittings, %</span><div class=\"bar\" \
             style=\"background:linear-gradient(to right,{})\"></div><div class=\"ticks\">{ticks}</div></div>\n",
            stops()
        )
    } else {
        "<p class=\"note\">No rope has a breaking force, so that no share can be told: all are grey, not judged.</p>\n"
            .to_owned()
    };
    format!(
        "<section id=\"tension-map\"><h2>Tension map</h2>\n<div class=\"tools\"><label>state <select id=\"map-state\">\
         <option value=\"worst\">worst of all</option>{}</select></label>\
         <label><input type=\"checkbox\" id=\"map-pulls\" checked> anchor pulls</label></div>\n\
         <p id=\"map-words\" class=\"note\"></p>\n<div class=\"stage\"><canvas id=\"map\" class=\"picture\" role=\"img\" \
         aria-label=\"Plan of the net: width tells tension, colour the share of the breaking force.\"></canvas>\
         <output id=\"map-told\" class=\"told\"></output></div>\n{legend}\
         <p class=\"note key\"><span class=\"slack\"></span> slack <span class=\"strut\"></span> strut <span class=\"held\"></span> anchor. \
         Width grows with the root of the tension; numbers: % of breaking where each rope works hardest; over 100 % red. In the worst \
         of all a white dashed core marks what is slack in some state. Point at a rope or an anchor for its numbers.</p>\n</section>\n",
        options(run)
    )
}

/// Pulls that act together, one state at a time.
pub(super) fn together(run: &Run) -> String {
    if !has_shape(run) {
        return String::new();
    }
    format!(
        "<section id=\"together\"><h2>Anchors together</h2>\n<p class=\"note\">Pulls of one state act together; those of different \
         states never do. Signs as in the anchor sheet: along x, along y, up.</p>\n<div class=\"tools\"><label>state \
         <select id=\"together-state\">{}</select></label></div>\n<p id=\"together-words\" class=\"note\"></p>\n\
         <div class=\"wide\"><table><thead><tr><th scope=\"col\">anchor</th>\
         <th scope=\"col\" class=\"r\">Hx <small>kN</small></th><th scope=\"col\" class=\"r\">Hy <small>kN</small></th>\
         <th scope=\"col\" class=\"r\">V up <small>kN</small></th><th scope=\"col\" class=\"r\">pull <small>kN</small></th>\
         <th scope=\"col\" class=\"r\">plan angle <small>deg</small></th><th scope=\"col\" class=\"r\">upward angle <small>deg</small></th>\
         </tr></thead><tbody id=\"together-rows\"></tbody></table></div></section>\n",
        options(run)
    )
}

/// What each action does to each panel.
pub(super) fn load_picture(run: &Run) -> String {
    if !has_shape(run) {
        return String::new();
    }
    // Begins with an action that has a picture.
    let first = run.loads.iter().position(|picture| picture.loaded_panels > 0);
    let actions: String = (run.loads.iter().enumerate())
        .map(|(at, picture)| {
            let chosen = if Some(at) == first { " selected" } else { "" };
            let open = match picture.without_value_total {
                0 => String::new(),
                count => format!(" ({count} panels without value)"),
            };
            format!(
                "<option value=\"{at}\"{chosen}>{}{open}</option>",
                markup(&picture.action)
            )
        })
        .collect();
    format!(
        "<section id=\"load-picture\"><h2>Load picture</h2>\n<div class=\"tools\"><label>action <select id=\"loads-action\">{actions}\
         </select></label></div>\n<p id=\"loads-words\" class=\"note\"></p>\n<div class=\"stage\"><canvas id=\"loads-plan\" \
         class=\"picture\" role=\"img\" aria-label=\"Plan of the panels with the pressure of the action on each\"></canvas>\
         <output id=\"loads-told\" class=\"told\"></output></div>\n<p class=\"note\">Numbers: kPa, ▼ presses on the outer side or down, ▲ \
         lifts off it; darker is more. The cross marks where the sum acts. Forces on single nodes and along ropes are in the sum, \
         not in the picture.</p>\n</section>\n"
    )
}

/// A section along a picked rope.
pub(super) fn section(run: &Run) -> String {
    let segments = run.cable_segments();
    let first = draw::picked_ropes(run).first().copied();
    let mut ropes: Vec<usize> = (0..run.cables.len())
        .filter(|&cable| segments[cable].len() > 1)
        .collect();
    // The rope that says most stands first; the others follow in brief order.
    ropes.sort_by_key(|&cable| (Some(cable) != first, cable));
    if ropes.is_empty() || !has_shape(run) {
        return String::new();
    }
    let ropes: String = ropes
        .iter()
        .map(|&cable| format!("<option value=\"{cable}\">{}</option>", markup(&run.cables[cable])))
        .collect();
    let moved = first.map(|cable| draw::moved_cases(run, cable)).unwrap_or_default();
    let case = |number: usize| -> String {
        let picked = moved.get(number).map(|state| state.id.as_str());
        let options: String = (0..run.states.len())
            .filter(|&at| run.states[at].answered() && run.states[at].id != "reference")
            .map(|at| {
                let id = &run.states[at].id;
                let chosen = if Some(id.as_str()) == picked { " selected" } else { "" };
                format!("<option value=\"{at}\"{chosen}>{}</option>", markup(id))
            })
            .collect();
        format!(
            "<label><span class=\"look look-{0}\"></span> <select id=\"cut-case-{0}\"><option value=\"\">none</option>{options}\
             </select></label>",
            number + 1
        )
    };
    format!(
        "<section id=\"section\"><h2>Section along a rope</h2>\n<div class=\"tools\"><label>rope <select id=\"cut-rope\">{ropes}\
         </select></label><span><span class=\"look look-0\"></span> reference</span>{}{}{}<label>movements <select id=\"cut-times\">\
         <option>1</option><option>2</option><option>5</option><option>10</option></select> times</label></div>\n\
         <p id=\"cut-words\" class=\"note\"></p>\n<div class=\"wide\"><svg id=\"cut\" viewBox=\"0 0 980 560\" role=\"img\" \
         aria-label=\"Section along the picked rope: heights, movements and falls\" font-size=\"13\"></svg></div></section>\n",
        case(0),
        case(1),
        case(2)
    )
}

fn has_shape(run: &Run) -> bool {
    run.reference()
        .is_some_and(|state| state.vectors("position_m").is_some())
}

/// The colours of the map, from pale to dark.
fn stops() -> String {
    (0..=16)
        .map(|step| colour::at(f64::from(step) / 16.0))
        .collect::<Vec<_>>()
        .join(",")
}
