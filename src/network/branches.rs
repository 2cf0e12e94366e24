//! Branches of the network from the records of the draft: constructions, regulator banks, transformers.

use std::collections::HashMap;

use super::build::{Builder, Joined};
use super::conductor::{Conductor, Conductors};
use super::draft::{Across, Construction, LineRecord, Name, RegulatorRecord, SwitchState, TransformerRecord};
use super::graph::{RawKind, place};
use super::model::{Branch, BranchId, BranchKind, ConstructionId, Line, NodeId};
use super::regulator::{Regulator, RegulatorUnit, TapMode};
use super::transformer::{NeutralPoint, Transformer};
use crate::diagnostic::{Code, nearest};

/// The closed, fed branches with their new indices.
pub(super) struct Branches {
    pub(super) branches: Vec<Branch>,
    pub(super) new_branch: Vec<Option<BranchId>>,
    pub(super) constructions: Vec<Construction>,
    /// Branch of each line record by name.
    pub(super) lines: HashMap<Name, usize>,
}

impl Builder<'_> {
    /// Which construction each line uses; a missing one, or one for other conductors, is an error.
    pub(super) fn line_constructions(&mut self) -> Vec<Option<usize>> {
        let mut known: HashMap<&str, Vec<usize>> = HashMap::new();
        for (i, c) in self.draft.constructions.iter().enumerate() {
            known.entry(&c.name).or_default().push(i);
        }
        let draft = self.draft;
        let mut chosen = Vec::with_capacity(draft.lines.len());
        for line in &draft.lines {
            let Some(choices) = known.get(&*line.construction) else {
                if draft.unread.constructions {
                    chosen.push(None);
                    continue;
                }
                let cure = match nearest(&line.construction, known.keys().copied()) {
                    Some(near) => format!("did you mean {near:?}?"),
                    None => "define it in matrices.csv or constructions.csv".to_string(),
                };
                self.diagnostics.error(
                    Code::UnknownConstruction,
                    place(draft, line.origin, "construction", &line.construction),
                    format!(
                        "line {} uses construction {:?}, which is not defined",
                        line.line, line.construction
                    ),
                    cure,
                );
                chosen.push(None);
                continue;
            };
            let fitting =
                choices.iter().copied().find(|&i| fits(draft.constructions[i].conductors, line.conductors));
            if fitting.is_none() {
                self.conductor_mismatch(line, choices);
            }
            chosen.push(fitting);
        }
        chosen
    }

    fn conductor_mismatch(&mut self, line: &LineRecord, choices: &[usize]) {
        let has: Vec<String> =
            choices.iter().map(|&i| self.draft.constructions[i].conductors.to_string()).collect();
        self.diagnostics.error(
            Code::ConductorMismatch,
            place(self.draft, line.origin, "phases", &line.conductors.to_string()),
            format!(
                "line {} carries {}, but construction {} is given for {}",
                line.line,
                line.conductors,
                line.construction,
                has.join(" and ")
            ),
            format!("choose a construction with just the conductors {}, or give its matrix", line.conductors),
        );
    }

    pub(super) fn branches(&mut self, joined: &Joined, new_node: &[Option<NodeId>]) -> Option<Branches> {
        let graph = &joined.graph;
        let mut parts = Branches {
            branches: Vec::with_capacity(graph.branches.len()),
            new_branch: vec![None; graph.branches.len()],
            constructions: Vec::new(),
            lines: HashMap::new(),
        };
        let mut used: HashMap<usize, ConstructionId> = HashMap::new();
        for (b, raw) in graph.branches.iter().enumerate() {
            if matches!(raw.kind, RawKind::Line(_)) {
                parts.lines.insert(raw.name.clone(), b);
            }
            let (Some(from), Some(to)) = (new_node[raw.from], new_node[raw.to]) else { continue };
            if raw.state == SwitchState::Open {
                continue;
            }
            let mut rating_amps = None;
            let kind = match raw.kind {
                RawKind::Line(i) => {
                    let Some(c) = joined.given.line_constructions[i] else { continue };
                    let record = &self.draft.lines[i];
                    let sets = f64::from(record.sets);
                    rating_amps =
                        record.rating_amps.or(self.draft.constructions[c].rating_amps.map(|a| a * sets));
                    let construction = *used.entry(c).or_insert_with(|| {
                        parts.constructions.push(self.draft.constructions[c].clone());
                        ConstructionId(parts.constructions.len() as u32 - 1)
                    });
                    BranchKind::Line(Line { construction, length_m: record.length_m, sets: record.sets })
                }
                RawKind::Switch(_) => BranchKind::Switch,
                RawKind::Bank(bank) => BranchKind::Regulator(self.bank(&graph.banks[bank])),
                RawKind::Transformer(i) => {
                    let neutrals = joined.carried.neutrals[b];
                    let mut units =
                        graph.units_of(i).map(|i| transformer(&self.draft.transformers[i], neutrals));
                    let Some(first) = units.next() else { continue };
                    BranchKind::Transformer(Transformer { mates: units.collect(), ..first })
                }
            };
            let [from_conductors, to_conductors] = joined.carried.ends[b];
            let id = BranchId(parts.branches.len() as u32);
            parts.new_branch[b] = Some(id);
            parts.branches.push(Branch {
                name: raw.name.clone(),
                from,
                to,
                from_conductors,
                to_conductors,
                rating_amps,
                kind,
            });
        }
        Some(parts)
    }

    /// The units of one bank; a phase regulated twice, or an automatic one without settings, is an error.
    fn bank(&mut self, records: &[usize]) -> Regulator {
        let mut units: Vec<RegulatorUnit> = Vec::new();
        for &i in records {
            let record = &self.draft.regulators[i];
            let phases = record.phases.to_string();
            for phase in record.phases.phases().iter() {
                let at = || place(self.draft, record.origin, "phases", &phases);
                if units.iter().any(|u| u.phase == phase) {
                    self.diagnostics.error(
                        Code::RegulatorBank,
                        at(),
                        format!(
                            "phase {phase} is regulated twice between nodes {} and {}",
                            record.from, record.to
                        ),
                        "keep one unit a phase in a bank",
                    );
                    continue;
                }
                if record.across == Across::Phase(phase) {
                    self.diagnostics.error(
                        Code::RegulatorBank,
                        place(self.draft, record.origin, "across", phase.letter()),
                        format!("regulator {} regulates phase {phase} against itself", record.regulator),
                        "give another phase, or n",
                    );
                    continue;
                }
                let (tap, mode) = match record.taps[phase.slot()] {
                    Some(tap) => (tap, TapMode::Held),
                    None if self.has_settings(record, phase) => (0, TapMode::Automatic),
                    None => continue,
                };
                units.push(RegulatorUnit {
                    name: record.regulator.clone(),
                    phase,
                    across: record.across,
                    tap,
                    mode,
                    step_pu: record.step_pu,
                    steps: record.steps,
                    control: record.control,
                });
            }
        }
        Regulator { units }
    }

    /// An automatic unit needs its set point, band and potential-transformer ratio, and with
    /// line-drop compensation its current-transformer rating.
    fn has_settings(&mut self, record: &RegulatorRecord, phase: Conductor) -> bool {
        let control = &record.control;
        let compensated = control.r_volts != 0.0 || control.x_volts != 0.0;
        let needed = [
            ("set_v", control.set_volts.is_some()),
            ("band_v", control.band_volts.is_some()),
            ("pt_ratio", control.pt_ratio.is_some()),
            ("ct_a", !compensated || control.ct_amps.is_some()),
        ];
        let missing: Vec<&str> =
            needed.into_iter().filter(|(_, given)| !given).map(|(name, _)| name).collect();
        if missing.is_empty() {
            return true;
        }
        self.diagnostics.error(
            Code::MissingValue,
            place(self.draft, record.origin, missing[0], ""),
            format!(
                "regulator {} is automatic on phase {phase} (tap_{phase} is blank), but {} {} not given",
                record.regulator,
                missing.join(", "),
                if missing.len() == 1 { "is" } else { "are" }
            ),
            format!("give {}, or the tap to hold in tap_{phase} (0 is neutral)", missing.join(", ")),
        );
        false
    }
}

/// A construction serves the conductors it is given for; behind a centre tap s1, s2 take the places of a, b.
fn fits(given: Conductors, wanted: Conductors) -> bool {
    given == wanted || wanted.is_split() && given == wanted.in_slots()
}

fn transformer(record: &TransformerRecord, neutrals: [NeutralPoint; 2]) -> Transformer {
    Transformer {
        group: record.group,
        terminals: record.terminals,
        rated_va: record.rated_va,
        from_volts: record.from_volts,
        to_volts: record.to_volts,
        r_pu: record.r_pu,
        x_pu: record.x_pu,
        no_load_watts: record.no_load_watts,
        magnetizing_pu: record.magnetizing_pu,
        tap_pu: record.tap_pu,
        from_tap_pu: record.from_tap_pu,
        from_neutral: neutrals[0],
        to_neutral: neutrals[1],
        mates: Vec::new(),
    }
}
