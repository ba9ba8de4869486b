//! What is wanted of each segment: the narrowest rule wins.

use ropewalk_api::ropewalk::v1;
use ropewalk_api::ropewalk::v1::adjust::Unknowns;
use ropewalk_api::ropewalk::v1::prestress_rule::Rule;
use ropewalk_numerics::model::NodeId;
use ropewalk_numerics::shape::{Adjustable, Prestress, PrestressRule};

use super::actions::Actions;
use super::findings::{Findings, Path};
use super::names::Thing;
use super::net::{MemberDraft, NetDraft};
use super::reasons;
use super::resolved::Resolved;
use super::scope::{MEMBERS, Narrowness, Scopes, tell_repeated};
use super::sections::Sections;
use super::supports::Supports;
use super::targets::Readers;
use super::wish::{check_adjust, check_wish, in_words, read_part};
use crate::words::{Quoted, quoted_list};

/// A rule that covers a segment, and the family of segments that shares a mean tension under it.
#[derive(Clone, Copy, Debug)]
struct Wish {
    rule: usize,
    narrowness: Narrowness,
    family: usize,
}

/// Everything that rules are read against.
pub(crate) struct Context<'c, 'a> {
    pub(crate) net: &'c NetDraft<'a>,
    pub(crate) scopes: &'c Scopes,
    pub(crate) sections: &'c Sections<'a>,
    pub(crate) supports: &'c Supports,
    pub(crate) actions: &'c Actions<'a>,
}

/// Reads how the reference state arises.
pub(crate) fn read(
    prestress: Option<&v1::Prestress>,
    context: &Context<'_, '_>,
    findings: &mut Findings,
    resolved: &mut Resolved,
) -> Prestress {
    let mut read = Prestress::default();
    let Some(prestress) = prestress.filter(|prestress| !prestress.rules.is_empty()) else {
        let path = if prestress.is_some() {
            "prestress.rules"
        } else {
            "prestress"
        };
        findings.error(
            reasons::MISSING,
            &Path::root(path),
            "",
            "the brief does not say how its ropes are tensioned",
            "give prestress.rules that cover every cable and strut",
        );
        return read;
    };
    read.under = read_under(prestress, context, findings);
    let hold = read_hold(prestress, context, findings);
    let rules = Rules::read(prestress, context, findings);
    rules.tell_uncovered(context, findings);
    rules.tell_in_force(context, resolved);
    rules.check_balance(&hold, context, findings);
    rules.check_coordinates(context, findings);
    rules.resolve(context, &mut read, findings);
    rules.check_adjustable(findings);
    let readers = Readers {
        context,
        hold: &hold,
        on_balance: &|segment| rules.is_on_balance(segment),
    };
    read.targets = readers.read(&prestress.targets, findings, resolved);
    read.hold = hold.into_iter().map(NodeId::new).collect();
    read
}

fn read_under(prestress: &v1::Prestress, context: &Context<'_, '_>, findings: &mut Findings) -> Vec<usize> {
    let field = Path::root("prestress.under");
    tell_repeated(&prestress.under, &field, findings);
    let mut under = Vec::new();
    for (number, id) in prestress.under.iter().enumerate() {
        let at = field.number(number);
        let Some(action) = context.actions.names.find(findings, &at, "action", id) else {
            continue;
        };
        if let Some(kind) = context.actions.not_dead(action) {
            findings
                .error(
                    reasons::UNDER_NOT_DEAD,
                    &at,
                    id,
                    format!(
                        "action {} has a {kind}: the reference state is found under dead loads only",
                        Quoted(id)
                    ),
                    "name only actions of forces and own weight here; put the rest into an action of its own",
                )
                .value(id);
        }
        under.push(action);
    }
    under
}

fn read_hold(prestress: &v1::Prestress, context: &Context<'_, '_>, findings: &mut Findings) -> Vec<usize> {
    let field = Path::root("prestress.hold");
    tell_repeated(&prestress.hold, &field, findings);
    let mut hold = Vec::new();
    for (number, id) in prestress.hold.iter().enumerate() {
        let at = field.number(number);
        match context.net.names.find(findings, &at, "node", id) {
            Some(Thing::Node(node)) => {
                let why = if context.supports.of_node[node].is_some() {
                    "it is supported"
                } else if !context.net.nodes[node].is_placed() {
                    "it has no coordinates"
                } else {
                    hold.push(node);
                    continue;
                };
                findings.error(
                    reasons::HOLD_NOT_FREE,
                    &at,
                    id,
                    format!(
                        "node {} cannot be held in place while the shape is found: {why}",
                        Quoted(id)
                    ),
                    "hold free nodes that are listed with xyz_m",
                );
            }
            Some(other) => {
                findings.error(
                    reasons::WRONG_KIND,
                    &at,
                    id,
                    format!("{} is a {}, and only nodes can be held", Quoted(id), other.kind()),
                    "name free nodes that are listed with xyz_m",
                );
            }
            None => {}
        }
    }
    hold
}

/// The rule in force for each segment.
struct Rules<'m> {
    message: &'m v1::Prestress,
    /// `None`: no rule covers it, or rules tie.
    of_segment: Vec<Option<Wish>>,
    /// Whether rules tie for it.
    tied: Vec<bool>,
    n_families: usize,
    /// Whether each name in the rules could be read.
    complete: bool,
}

impl<'m> Rules<'m> {
    fn read(message: &'m v1::Prestress, context: &Context<'_, '_>, findings: &mut Findings) -> Self {
        let n_segments = context.net.segments.len();
        let mut rules = Self {
            message,
            of_segment: vec![None; n_segments],
            tied: vec![false; n_segments],
            n_families: 0,
            complete: true,
        };
        let list = Path::root("prestress.rules");
        for (index, rule) in message.rules.iter().enumerate() {
            rules.read_rule(index, rule, &list.number(index), context, findings);
        }
        rules
    }

    fn read_rule(
        &mut self,
        index: usize,
        rule: &v1::PrestressRule,
        at: &Path<'_>,
        context: &Context<'_, '_>,
        findings: &mut Findings,
    ) {
        let net = context.net;
        if rule.on.is_empty() && rule.parts.is_empty() {
            findings.error(
                reasons::COVERS_NOTHING,
                &at.field("on"),
                "",
                format!("prestress rule {index} names no member"),
                "name cables, struts, roles or groups in on, or stretches in parts",
            );
        }
        let scope = context.scopes.of(net, &rule.on, &at.field("on"), MEMBERS, findings);
        self.complete &= scope.complete;
        let mut covered = Vec::new();
        for one in &scope.covered {
            let segments: Vec<usize> = match one.thing {
                Thing::Cable(cable) => {
                    let draft = &net.cables[cable];
                    (draft.first_segment..draft.first_segment + draft.n_segments()).collect()
                }
                Thing::Strut(strut) => net.struts[strut]
                    .ends
                    .map(|_| net.struts[strut].segment)
                    .into_iter()
                    .collect(),
                _ => Vec::new(),
            };
            covered.push((segments, one.narrowness));
        }
        let parts = at.field("parts");
        for (number, part) in rule.parts.iter().enumerate() {
            let at = parts.number(number);
            match read_part(part, net, &at, findings) {
                Some(segments) => covered.push((segments, Narrowness::Part)),
                None => self.complete = false,
            }
        }
        check_wish(rule, &covered, at, net, findings);
        check_adjust(rule, at, findings);
        for (segments, narrowness) in covered {
            let family = self.n_families;
            self.n_families += 1;
            let mut told = false;
            for segment in segments {
                let wish = Wish {
                    rule: index,
                    narrowness,
                    family,
                };
                told |= self.add(segment, wish, told, at, net, findings);
            }
        }
    }

    /// Lets a wish compete for a segment. Answers whether it ties with another one.
    fn add(
        &mut self,
        segment: usize,
        wish: Wish,
        told: bool,
        at: &Path<'_>,
        net: &NetDraft<'_>,
        findings: &mut Findings,
    ) -> bool {
        let Some(other) = self.of_segment[segment].filter(|other| other.narrowness >= wish.narrowness) else {
            self.of_segment[segment] = Some(wish);
            self.tied[segment] = false;
            return false;
        };
        let means = |rule: usize| matches!(self.message.rules[rule].rule, Some(Rule::MeanTensionN(_)));
        let same = other.rule == wish.rule && !means(wish.rule);
        if other.narrowness > wish.narrowness || same {
            return false;
        }
        self.tied[segment] = true;
        if !told {
            let id = net.member_id(net.segments[segment].1);
            findings
                .error(
                    reasons::RULES_TIE,
                    at,
                    id,
                    format!(
                        "prestress rules {} and {} cover {} equally narrowly",
                        other.rule,
                        wish.rule,
                        Quoted(id)
                    ),
                    "name the member in only one of them; a part is narrower than a member, a member than its role, a role \
                     than a group",
                )
                .value(format!("prestress.rules[{}]", other.rule));
        }
        true
    }

    fn tell_uncovered(&self, context: &Context<'_, '_>, findings: &mut Findings) {
        let net = context.net;
        if !self.complete {
            // A name that could not be read may have been meant for these.
            return;
        }
        let mut told: Option<MemberDraft> = None;
        for (segment, (ends, member)) in net.segments.iter().enumerate() {
            if self.of_segment[segment].is_some() || told == Some(*member) {
                continue;
            }
            told = Some(*member);
            let id = net.member_id(*member);
            let partly = net
                .segments
                .iter()
                .zip(&self.of_segment)
                .any(|((_, of), wish)| of == member && wish.is_some());
            let message = if partly {
                format!(
                    "no prestress rule covers {} between {}",
                    Quoted(id),
                    quoted_list(ends.iter().map(|end| net.nodes[*end].id))
                )
            } else {
                format!("no prestress rule covers {}", Quoted(id))
            };
            findings.error(
                reasons::NO_RULE,
                &Path::root("prestress.rules"),
                id,
                message,
                "cover it by a rule: its force density, tension or unstressed length, or balance {}",
            );
        }
    }

    fn tell_in_force(&self, context: &Context<'_, '_>, resolved: &mut Resolved) {
        let net = context.net;
        let (cables, struts) = (Path::root("net.cables"), Path::root("net.struts"));
        let list = Path::root("prestress.rules");
        let mut first = 0;
        while first < net.segments.len() {
            let (ends, member) = net.segments[first];
            let rule = self.of_segment[first].map(|wish| wish.rule);
            let last = (first..net.segments.len())
                .take_while(|s| net.segments[*s].1 == member && self.of_segment[*s].map(|wish| wish.rule) == rule)
                .last()
                .unwrap_or(first);
            let whole = (first == 0 || net.segments[first - 1].1 != member)
                && net.segments.get(last + 1).is_none_or(|next| next.1 != member);
            if let Some(rule) = rule {
                let words = in_words(&self.message.rules[rule]);
                let words = if whole {
                    words
                } else {
                    let end = net.segments[last].0[1];
                    format!("{} to {}: {words}", net.nodes[ends[0]].id, net.nodes[end].id)
                };
                let at = match member {
                    MemberDraft::Cable(index) => cables.element(net.member_id(member), index),
                    MemberDraft::Strut(index) => struts.element(net.member_id(member), index),
                };
                resolved.inherited(&at, words, &list.number(rule));
            }
            first = last + 1;
        }
    }

    fn is_on_balance(&self, segment: usize) -> bool {
        self.of_segment[segment]
            .is_some_and(|wish| matches!(self.message.rules[wish.rule].rule, Some(Rule::Balance(_))))
    }

    /// Targets need force densities that may change.
    fn check_adjustable(&self, findings: &mut Findings) {
        let may_change = |rule: &v1::PrestressRule| {
            let wanted = matches!(
                rule.rule,
                Some(Rule::TensionN(_) | Rule::MeanTensionN(_) | Rule::ShareOfBreaking(_))
            );
            wanted || rule.adjust.is_some()
        };
        let mut in_force = self.of_segment.iter().flatten().map(|wish| wish.rule);
        if !self.message.targets.is_empty() && !in_force.any(|rule| may_change(&self.message.rules[rule])) {
            findings.error(
                reasons::NOTHING_ADJUSTABLE,
                &Path::root("prestress.targets"),
                "",
                "there are targets, and no rule lets the search change a force density",
                "give rules with force_density_n_per_m an adjust {}",
            );
        }
    }

    fn check_balance(&self, hold: &[usize], context: &Context<'_, '_>, findings: &mut Findings) {
        let net = context.net;
        let on_balance = |segment: usize| self.is_on_balance(segment);
        if self.message.hold.is_empty() {
            if let Some(segment) = (0..net.segments.len()).find(|segment| on_balance(*segment)) {
                let rule = self.of_segment[segment].map_or(0, |wish| wish.rule);
                let list = Path::root("prestress.rules");
                let id = net.member_id(net.segments[segment].1);
                findings.error(
                    reasons::BALANCE_WITHOUT_HOLD,
                    &list.number(rule).field("balance"),
                    id,
                    format!(
                        "{} is to balance nodes that stay in place, and no node does",
                        Quoted(id)
                    ),
                    "name these nodes in prestress.hold",
                );
            }
            return;
        }
        let mut balanced = vec![false; net.nodes.len()];
        for (segment, (ends, _)) in net.segments.iter().enumerate() {
            if on_balance(segment) {
                for end in ends {
                    balanced[*end] = true;
                }
            }
        }
        for node in hold.iter().filter(|node| self.complete && !balanced[**node]) {
            let id = net.nodes[*node].id;
            findings.error(
                reasons::HOLD_WITHOUT_BALANCE,
                &Path::root("prestress.hold"),
                id,
                format!(
                    "node {} is to stay in place, and no member at it is on balance",
                    Quoted(id)
                ),
                "put a guy or a strut at it on balance {}, or do not hold it",
            );
        }
    }

    /// Without a shape search every free node needs coordinates.
    fn check_coordinates(&self, context: &Context<'_, '_>, findings: &mut Findings) {
        let all_lengths = self.of_segment.iter().all(|wish| {
            wish.is_some_and(|wish| matches!(self.message.rules[wish.rule].rule, Some(Rule::UnstressedLengthM(_))))
        });
        if !all_lengths {
            return;
        }
        let missing: Vec<&str> = context
            .net
            .nodes
            .iter()
            .filter(|n| !n.is_placed())
            .map(|n| n.id)
            .collect();
        if !missing.is_empty() {
            findings
                .error(
                    reasons::NO_COORDINATES,
                    &Path::root("net.nodes"),
                    missing[0],
                    format!(
                        "every unstressed length is given, so that no shape is searched for, and these nodes have no \
                         coordinates: {}",
                        quoted_list(missing.iter().copied())
                    ),
                    "list them in net.nodes with xyz_m, about where they hang",
                )
                .value(missing.len());
        }
    }

    fn resolve(&self, context: &Context<'_, '_>, read: &mut Prestress, findings: &mut Findings) {
        let list = Path::root("prestress.rules");
        let mut families: Vec<Option<usize>> = vec![None; self.n_families];
        let mut together: Vec<Option<usize>> = vec![None; self.message.rules.len()];
        let mut told = vec![false; self.message.rules.len()];
        for (segment, wish) in self.of_segment.iter().enumerate() {
            let (Some(wish), false) = (wish, self.tied[segment]) else {
                // Told as an error already; the entry keeps one rule a segment.
                read.rules.push(PrestressRule::Balance);
                continue;
            };
            let rule = match self.message.rules[wish.rule].rule {
                Some(Rule::ForceDensityNPerM(density)) => match &self.message.rules[wish.rule].adjust {
                    None => PrestressRule::ForceDensity(density),
                    Some(adjust) => {
                        let known = match adjust.unknowns {
                            None | Some(Unknowns::EachMember(_)) => &mut families[wish.family],
                            Some(Unknowns::Together(_)) => &mut together[wish.rule],
                            Some(Unknowns::EachSegment(_)) => &mut None,
                        };
                        PrestressRule::Adjustable(*known.get_or_insert_with(|| {
                            read.adjustables.push(Adjustable {
                                density,
                                least: adjust.least_n_per_m.unwrap_or(0.0),
                                most: adjust.most_n_per_m.unwrap_or(f64::INFINITY),
                            });
                            read.adjustables.len() - 1
                        }))
                    }
                },
                Some(Rule::TensionN(tension)) => PrestressRule::Tension(tension),
                Some(Rule::MeanTensionN(tension)) => {
                    let family = *families[wish.family].get_or_insert_with(|| {
                        read.mean_tensions.push(tension);
                        read.mean_tensions.len() - 1
                    });
                    PrestressRule::MeanTension(family)
                }
                Some(Rule::UnstressedLengthM(length)) => PrestressRule::UnstressedLength(length),
                Some(Rule::ShareOfBreaking(share)) => {
                    let section = context.sections.of_segment[segment].map(|(section, _)| section);
                    let force = context
                        .sections
                        .section(segment)
                        .and_then(|section| section.breaking_force);
                    if let (Some(section), None, false) = (section, force, told[wish.rule]) {
                        told[wish.rule] = true;
                        let draft = &context.sections.list[section];
                        if draft.message.breaking_force_n.is_none() {
                            let id = net_id(context, segment);
                            findings.error(
                                reasons::NO_BREAKING_FORCE,
                                &list.number(wish.rule).field("share_of_breaking"),
                                id,
                                format!(
                                    "{} is to have a share of its breaking force, and section {} has none",
                                    Quoted(id),
                                    Quoted(&draft.message.id)
                                ),
                                "give breaking_force_n of the section, or a tension",
                            );
                        }
                    }
                    PrestressRule::Tension(share * force.unwrap_or(1.0))
                }
                Some(Rule::Balance(_)) | None => PrestressRule::Balance,
            };
            read.rules.push(rule);
        }
    }
}

fn net_id<'a>(context: &Context<'_, 'a>, segment: usize) -> &'a str {
    context.net.member_id(context.net.segments[segment].1)
}
