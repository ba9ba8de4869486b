use super::*;
use crate::colour::Scale;
use crate::run::motion_sample;
use crate::run::sample::{self, Names};

fn nasty() -> crate::run::Run {
    sample::run_named(Names {
        middle: "m\"><script>alert(1)</script>",
        rope: "r'&<b>",
        case: "<script>alert('x')</script>",
        title: "</title><script>x</script>",
    })
}

#[test]
fn drawings_hold_no_markup_from_ids() {
    let run = nasty();
    let scale = Scale::over([1e3, 3e4]);
    let mut drawings: Vec<String> = run
        .states
        .iter()
        .filter_map(|state| plan(&run, state, &scale))
        .collect();
    assert_eq!(drawings.len(), 3);
    drawings.push(sections(&run).unwrap());
    drawings.push(convergence(&run).unwrap());
    for drawing in drawings {
        assert!(!drawing.contains("<script") && !drawing.contains("<b>"), "{drawing}");
        assert!(drawing.contains("&lt;"));
        assert!(!drawing.contains("NaN") && !drawing.contains("inf"), "{drawing}");
    }
}

#[test]
fn a_plan_tells_tensions_and_pulls() {
    let run = sample::run();
    let scale = Scale::over([19_615.0, 24_820.0]);
    let drawing = plan(&run, &run.states[1], &scale).unwrap();
    assert_eq!(drawing.matches("data-rope=").count(), 4);
    assert!(drawing.contains("data-axial-force-n=\"24820\""));
    assert_eq!(drawing.matches("class=\"pull\"").count(), 4);
    // 24.820 kN along (4.5, 4.5, -1.52259) of length 6.54357 m: 5.775 kN down.
    assert!(
        drawing.contains(">24.8 kN<") && drawing.contains(">5.78 down<"),
        "no pull on A"
    );
    assert!(
        drawing.contains(">14.5 kN<") && drawing.contains(" up<"),
        "no pull on B"
    );
}

#[test]
fn a_case_without_answer_is_drawn_as_such() {
    let run = sample::run();
    let drawing = plan(&run, &run.states[2], &Scale::over([1e3])).unwrap();
    assert!(drawing.contains("No answer") && drawing.contains("nothing holds the lamp"));
    assert!(
        !drawing.contains("data-rope="),
        "numbers of another state would mislead"
    );
}

#[test]
fn a_load_path_marks_both_rules_and_says_where_a_rope_goes_slack() {
    let mut run = sample::run_named(Names {
        middle: "m",
        rope: "<rope>",
        case: "full-snow",
        title: "t",
    });
    sample::give_path(&mut run, &[0.0, 0.5, 1.0, 1.5]);
    let state = &run.states[1];
    let drawn = doubling(&run, state, &run.load_path(state).unwrap());
    assert!(
        drawn.contains("data-on-action=\"29\"") && drawn.contains("data-on-effect=\"39\""),
        "{drawn}"
    );
    assert!(drawn.contains("slack from 0.500 F"));
    assert!(!drawn.contains("<rope>"));
}

#[test]
fn modes_are_drawn_with_their_frequencies() {
    let mut run = nasty();
    assert!(modes(&run, &run.states[0]).is_empty());
    assert!(!sections(&run).unwrap().contains("f1 "));
    let nodes = run.nodes.clone();
    sample::give_modes(&mut run, &nodes[nodes.len() - 1..]);
    let pages = modes(&run, &run.states[0]);
    assert_eq!(pages.len(), 1);
    let page = &pages[0];
    assert!(
        page.contains("mode 1 · 2.50 Hz · period 0.400 s") && page.contains("data-frequency-hz=\"4\""),
        "{page}"
    );
    assert!(page.contains("mode 3 · does not vibrate") && page.contains("takes part: x 0 %, y 25 %, z 100 %"));
    assert!(!page.contains("<script") && page.contains("&lt;") && !page.contains("NaN") && !page.contains("inf"));
    assert!(modes(&run, &run.states[1]).is_empty(), "another state has none");
    let drawn = sections(&run).unwrap();
    assert!(drawn.contains("f1 2.50 Hz") && drawn.contains("data-f1-hz=\"2.5\""));
    // Shapes that do not fit the modes are not drawn.
    run.states[0].columns.get_mut("mode_shape").unwrap().components = 6;
    assert!(modes(&run, &run.states[0]).is_empty());
}

fn drawing(run: &crate::run::Run, name: &str) -> String {
    let drawings = motion(run, &run.motions[0]);
    let names: Vec<String> = drawings.iter().map(|(name, _)| name.clone()).collect();
    let found = drawings.into_iter().find(|(known, _)| known == name);
    found.unwrap_or_else(|| panic!("no {name} among {names:?}")).1
}

#[test]
fn a_rope_over_time_says_which_way_time_runs_and_how_fast_a_wave_is() {
    let mut run = motion_sample::run_named("<b>");
    let drawn = drawing(&run, "rope-main");
    assert!(
        drawn.contains("time, downwards") && drawn.contains("transverse wave, 211 m/s"),
        "{drawn}"
    );
    // On the tension too: an axial wave passes 39.6 m in 10 ms of 400, too fast to be followed by eye.
    assert!(!drawn.contains("axial wave"));
    assert!(drawn.contains("positive along (0, 0, 1.00)") && !drawn.contains("<b>"));
    run.motions[0].waves[0].axial_m_per_s = 900.0;
    assert!(drawing(&run, "rope-main").contains("axial wave, 900 m/s"));
    // Where it cannot be followed, or nobody knows where it begins, that is said and nothing is drawn.
    assert!(drawn.contains("from where the dashed waves run: tie begins to break, 0 s"));
    run.motions[0].waves[0].transverse_most_m_per_s = 3000.0;
    let fast = drawing(&run, "rope-main");
    assert!(
        fast.contains("passes the rope in 0.0132 s, too fast") && !fast.contains("data-speed-m-per-s"),
        "{fast}"
    );
    run.motions[0].waves.clear();
    assert!(drawing(&run, "rope-main").contains("no mass per length"));
    // A slack rope is white, and the scale says so.
    assert!(!drawn.contains("white: slack"));
    run.motions[0].frames[20].ropes[0].tension_n[5] = 0.0;
    run.motions[0].frames[20].ropes[0].tension_n[6] = 90.0;
    let slack = drawing(&run, "rope-main");
    assert!(slack.contains("kN, log scale; white: slack") && slack.contains("data-what=\"slack\""));
}

#[test]
fn quantities_have_units_and_extremes() {
    let run = motion_sample::run_named("gust");
    let drawn = drawing(&run, "watched-1");
    let heights = run.motions[0].watched(0);
    let largest = heights.iter().copied().fold(0.0, f64::max);
    assert!(
        drawn.contains(&format!("{} mm at ", crate::number::three(largest * 1e3))),
        "{drawn}"
    );
    assert!(drawn.contains("(kN)") && drawn.contains("(m/s)") && drawn.contains("tie breaks, 0 s"));
    let drawn = drawing(&run, "energy");
    for label in [">kinetic ", ">elastic change ", ">dissipated ", ">released "] {
        assert!(drawn.contains(label), "{label}");
    }
    assert!(drawn.contains("Zero throughout: potential, work done."));
    let drawn = drawing(&run, "spectra-1");
    assert!(drawn.contains("data-natural-hz") && drawn.contains(">f1<") && drawn.contains(" Hz</text>"));
}
