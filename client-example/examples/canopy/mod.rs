//! The canopy, line by line: a lattice `|i| + |j| <= HALF` of crossing ropes between two mast heads and two low brackets.
//!
//! Carrying ropes run along x (constant `j`) and sag between the masts; bracing ropes run along y (constant `i`) and arch
//! down to the brackets; each rope ends on an edge rope. Beside the canopy a line of lanterns crosses the lane on a prop
//! that stands between its two halves and is held by nothing else: the weak spot that one case finds.

/// Meshes between the middle and a corner.
const HALF: i32 = 11;
/// Half the span between the mast heads, and between the brackets (m).
const REACH_M: f64 = 15.4;

/// Id of the lattice node `(i, j)`; the corners have names of their own.
fn node(i: i32, j: i32) -> String {
    match (i, j) {
        (i, 0) if i == -HALF => "W".to_owned(),
        (i, 0) if i == HALF => "E".to_owned(),
        (0, j) if j == -HALF => "S".to_owned(),
        (0, j) if j == HALF => "N".to_owned(),
        (0, 0) => "middle".to_owned(),
        (0, j) => mark(j, 'n', 's'),
        (i, 0) => mark(i, 'e', 'w'),
        (i, j) => format!("{}{}", mark(i, 'e', 'w'), mark(j, 'n', 's')),
    }
}

/// A lattice line as a letter for its side and its distance from the middle.
fn mark(line: i32, ahead: char, behind: char) -> String {
    match line {
        0 => "0".to_owned(),
        line if line > 0 => format!("{ahead}{line}"),
        line => format!("{behind}{}", -line),
    }
}

fn quoted(ids: impl IntoIterator<Item = String>) -> String {
    ids.into_iter()
        .map(|id| format!("\"{id}\""))
        .collect::<Vec<_>>()
        .join(", ")
}

fn cable(id: &str, role: &str, nodes: impl IntoIterator<Item = String>) -> String {
    format!(
        r#"      {{"id": "{id}", "role": "{role}", "nodes": [{}]}}"#,
        quoted(nodes)
    )
}

fn net_ropes() -> Vec<String> {
    let mut lines = Vec::new();
    for j in 1 - HALF..HALF {
        let end = HALF - j.abs();
        lines.push(cable(
            &format!("c{}", mark(j, 'n', 's')),
            "carrying",
            (-end..=end).map(|i| node(i, j)),
        ));
    }
    for i in 1 - HALF..HALF {
        let end = HALF - i.abs();
        lines.push(cable(
            &format!("b{}", mark(i, 'e', 'w')),
            "bracing",
            (-end..=end).map(|j| node(i, j)),
        ));
    }
    for (id, x, y) in [("eSW", -1, -1), ("eSE", 1, -1), ("eNE", 1, 1), ("eNW", -1, 1)] {
        lines.push(cable(id, "edge", (0..=HALF).map(|k| node(x * (HALF - k), y * k))));
    }
    lines
}

/// Inner lattice nodes, or those on the edge ropes, that a condition picks.
fn lattice(on_edge: bool, pick: impl Fn(i32, i32) -> bool) -> String {
    let mut ids = Vec::new();
    for j in -HALF..=HALF {
        for i in -HALF..=HALF {
            let steps = i.abs() + j.abs();
            let corner = i.abs() == HALF || j.abs() == HALF;
            if !corner && (if on_edge { steps == HALF } else { steps < HALF }) && pick(i, j) {
                ids.push(node(i, j));
            }
        }
    }
    quoted(ids)
}

fn group(id: &str, of: &str) -> String {
    format!(r#"      {{"id": "{id}", "of": [{of}]}}"#)
}

/// The whole brief as JSON, one thing a line.
pub(crate) fn brief() -> String {
    let ropes = net_ropes().join(",\n");
    let groups = [
        group("field-west", &lattice(false, |i, _| i <= 0)),
        group("field-east", &lattice(false, |i, _| i > 0)),
        group("field", r#""field-west", "field-east""#),
        group("rim-west", &lattice(true, |i, _| i < 0)),
        group("rim-east", &lattice(true, |i, _| i > 0)),
        group("rim", r#""rim-west", "rim-east""#),
        group("gust", &lattice(false, |i, j| i <= -2 && j <= -1)),
        group("walls", r#""S", "N""#),
        group("ground", r#""GW1", "GW2", "GE1", "GE2""#),
    ]
    .join(",\n");
    let reach = REACH_M;
    let foot = REACH_M - 0.9;
    format!(
        r#"{{
  "id": "market-square",
  "title": "Market square canopy",
  "note": "Invented. Ropes, loads and factors are examples: replace them by certificates and by your code. Written by examples/market_square.rs.",
  "net": {{
    "reference_temperature_deg_c": 10,
    "nodes": [
      {{"id": "W", "xyz_m": [-{reach}, 0, 9], "note": "mast head, free"}},
      {{"id": "E", "xyz_m": [{reach}, 0, 9], "note": "mast head, free"}},
      {{"id": "S", "xyz_m": [0, -{reach}, 3.2], "support": {{}}, "note": "bracket at the town hall"}},
      {{"id": "N", "xyz_m": [0, {reach}, 3.2], "support": {{"springs": [{{"along": [0, 1, 0], "stiffness_n_per_m": 15e6}}]}}, "note": "bracket at the corn hall, gives along y"}},
      {{"id": "FW", "xyz_m": [-{foot}, 0, 0], "support": {{}}, "note": "mast foot"}},
      {{"id": "FE", "xyz_m": [{foot}, 0, 0], "support": {{}}, "note": "mast foot"}},
      {{"id": "GW1", "xyz_m": [-23, -6, 0], "support": {{}}}},
      {{"id": "GW2", "xyz_m": [-23, 6, 0], "support": {{}}}},
      {{"id": "GE1", "xyz_m": [23, -6, 0], "support": {{}}}},
      {{"id": "GE2", "xyz_m": [23, 6, 0], "support": {{}}}},
      {{"id": "LW", "xyz_m": [-12, -19, 6.5], "support": {{}}, "note": "wall hook of the lantern line"}},
      {{"id": "LE", "xyz_m": [12, -19, 6.5], "support": {{}}, "note": "wall hook of the lantern line"}},
      {{"id": "P", "xyz_m": [0, -19, 6], "note": "head of the prop, free"}},
      {{"id": "PF", "xyz_m": [0, -19, 0], "support": {{}}, "note": "foot of the prop"}}
    ],
    "sections": [
      {{"id": "r6", "axial_stiffness_n": 2.3e6, "mass_kg_per_m": 0.14, "breaking_force_n": 22e3, "breaking_force_origin": "example value", "diameter_m": 0.006}},
      {{"id": "r14", "axial_stiffness_n": 17.5e6, "mass_kg_per_m": 0.98, "breaking_force_n": 161e3, "breaking_force_origin": "example value", "diameter_m": 0.014}},
      {{"id": "r28", "axial_stiffness_n": 70e6, "mass_kg_per_m": 4.0, "breaking_force_n": 650e3, "breaking_force_origin": "example value", "diameter_m": 0.028}},
      {{"id": "r36", "axial_stiffness_n": 116e6, "mass_kg_per_m": 6.6, "breaking_force_n": 1080e3, "breaking_force_origin": "example value", "diameter_m": 0.036}},
      {{"id": "tube76", "axial_stiffness_n": 140e6, "mass_kg_per_m": 5.2}},
      {{"id": "tube273", "axial_stiffness_n": 2100e6, "mass_kg_per_m": 80}}
    ],
    "roles": [
      {{"id": "carrying", "section": "r14"}},
      {{"id": "bracing", "section": "r14"}},
      {{"id": "edge", "section": "r28", "end_fitting": {{"strength_factor": 0.9}}}},
      {{"id": "guy", "section": "r36"}},
      {{"id": "lantern", "section": "r6"}},
      {{"id": "mast", "section": "tube273"}},
      {{"id": "prop", "section": "tube76"}}
    ],
    "cables": [
{ropes},
      {{"id": "gW1", "role": "guy", "nodes": ["W", "GW1"]}},
      {{"id": "gW2", "role": "guy", "nodes": ["W", "GW2"]}},
      {{"id": "gE1", "role": "guy", "nodes": ["E", "GE1"]}},
      {{"id": "gE2", "role": "guy", "nodes": ["E", "GE2"]}},
      {{"id": "lanterns", "role": "lantern", "nodes": ["LW", "l1", "l2", "l3", "P", "l4", "l5", "l6", "LE"]}}
    ],
    "struts": [
      {{"id": "mast W", "role": "mast", "nodes": ["FW", "W"]}},
      {{"id": "mast E", "role": "mast", "nodes": ["FE", "E"]}},
      {{"id": "lantern prop", "role": "prop", "nodes": ["PF", "P"], "note": "stands in the line, without side guys"}}
    ],
    "groups": [
{groups}
    ]
  }},
  "prestress": {{
    "under": ["self", "cloth"],
    "hold": ["W", "E", "P"],
    "rules": [
      {{"on": ["carrying"], "force_density_n_per_m": 11000}},
      {{"on": ["bracing"], "force_density_n_per_m": 11000}},
      {{"on": ["edge"], "mean_tension_n": 200000}},
      {{"on": ["lantern"], "force_density_n_per_m": 500}},
      {{"on": ["guy", "mast", "prop"], "balance": {{}}}}
    ]
  }},
  "actions": [
    {{"id": "self", "class": "permanent", "loads": [{{"own_weight": {{}}}}]}},
    {{"id": "cloth", "class": "permanent", "loads": [
      {{"nodes": {{"on": ["field"], "force_n": [0, 0, -22]}}}},
      {{"nodes": {{"on": ["rim"], "force_n": [0, 0, -11]}}}},
      {{"nodes": {{"on": ["l1", "l2", "l3", "l4", "l5", "l6"], "force_n": [0, 0, -60]}}}}], "note": "cloth of 1.1 kg/m2 over meshes of 1.4 m, and six lanterns"}},
    {{"id": "snow", "class": "snow", "loads": [
      {{"nodes": {{"on": ["field"], "force_n": [0, 0, -900]}}}},
      {{"nodes": {{"on": ["rim"], "force_n": [0, 0, -450]}}}}], "note": "about 0.46 kN/m2"}},
    {{"id": "drift", "class": "snow", "loads": [
      {{"nodes": {{"on": ["field-west"], "force_n": [0, 0, -900]}}}},
      {{"nodes": {{"on": ["rim-west"], "force_n": [0, 0, -450]}}}},
      {{"nodes": {{"on": ["field-east"], "force_n": [0, 0, -300]}}}},
      {{"nodes": {{"on": ["rim-east"], "force_n": [0, 0, -150]}}}}]}},
    {{"id": "uplift", "class": "wind", "loads": [
      {{"nodes": {{"on": ["field"], "force_n": [0, 0, 600]}}}},
      {{"nodes": {{"on": ["rim"], "force_n": [0, 0, 300]}}}}]}},
    {{"id": "gusts", "class": "wind", "loads": [
      {{"nodes": {{"on": ["field-west"], "force_n": [90, 0, 400]}}}},
      {{"nodes": {{"on": ["field-east"], "force_n": [40, 0, 180]}}}},
      {{"nodes": {{"on": ["gust"], "force_n": [90, 70, 450]}}}}], "note": "uneven suction, strongest in the south-west"}},
    {{"id": "hot", "class": "temperature", "loads": [{{"temperature": {{"change_k": 35}}}}]}},
    {{"id": "cold", "class": "temperature", "loads": [{{"temperature": {{"change_k": -30}}}}]}},
    {{"id": "settle", "class": "movement", "loads": [{{"move": {{"node": "S", "by_m": [0, 0.04, -0.02]}}}}]}},
    {{"id": "creep", "class": "pull", "loads": [{{"prestress": {{"share": -0.15, "on": ["carrying", "bracing", "edge"]}}}}]}},
    {{"id": "star", "class": "imposed", "loads": [{{"nodes": {{"on": ["P"], "force_n": [0, 0, -2400]}}}}], "note": "the fair's star, 245 kg, hung from the head of the prop"}}
  ],
  "cases": [
    {{"id": "full-snow", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "snow": 1}}}},
    {{"id": "drifted-snow", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "drift": 1}}}},
    {{"id": "uplift", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "uplift": 1}}}},
    {{"id": "gusty-suction", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "gusts": 1}}}},
    {{"id": "hot-and-crept", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "hot": 1, "creep": 1}}, "note": "least tension"}},
    {{"id": "cold-snap", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "cold": 1, "snow": 0.5}}}},
    {{"id": "bracket-settles", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "settle": 1}}}},
    {{"id": "star-on-prop", "sets": ["service"], "factors": {{"self": 1, "cloth": 1, "star": 1}}, "note": "the prop has no side guys"}},
    {{"id": "design-snow", "sets": ["ultimate"], "factors": {{"self": 1.35, "cloth": 1.35, "snow": 1.5}}}},
    {{"id": "design-drift", "sets": ["ultimate"], "factors": {{"self": 1.35, "cloth": 1.35, "drift": 1.5, "cold": 0.9}}}},
    {{"id": "design-uplift", "sets": ["ultimate"], "factors": {{"self": 1, "cloth": 1, "uplift": 1.5, "hot": 0.9}}}}
  ],
  "checks": [
    {{"safety": {{"factor": 1.5}}, "over": ["ultimate"]}},
    {{"safety": {{"factor": 1.9}}, "over": ["service"]}},
    {{"slackness": {{"min_share_of_reference": 0.1}}, "on": ["carrying", "bracing", "edge", "guy"], "over": ["service"]}},
    {{"movement": {{"limit_m": 0.35}}, "on": ["field", "rim"], "over": ["service"]}},
    {{"anchor_pull": {{"limit_n": 600000}}, "on": ["walls"], "over": ["ultimate"]}},
    {{"anchor_pull": {{"limit_n": 550000}}, "on": ["ground"], "over": ["ultimate"]}}
  ]
}}
"#
    )
}
