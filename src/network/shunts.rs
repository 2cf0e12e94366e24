//! Loads of the network from the records of the draft, each checked against its node.

use super::branches::Branches;
use super::build::{Builder, Joined};
use super::conductor::{Conductors, Connection};
use super::draft::{GeneratorRecord, LoadSite, ReactiveRecord, SwitchState};
use super::generator::{Curve, Generator, Reactive};
use super::graph::place;
use super::load::{CapacitorBank, Load, LoadPlace};
use super::model::NodeId;
use super::motor::Motor;
use crate::diagnostic::{Code, Origin, nearest};
use crate::math::Complex64;

impl Builder<'_> {
    pub(super) fn shunts(
        &mut self,
        joined: &Joined,
        new_node: &[Option<NodeId>],
        parts: &Branches,
    ) -> (Vec<Load>, Vec<CapacitorBank>) {
        let mut loads = Vec::with_capacity(self.draft.loads.len());
        for record in &self.draft.loads {
            let origin = record.origin;
            let place = match &record.site {
                LoadSite::Node(name) => {
                    let who = format!("load {} is at", record.load);
                    let Some(node) = self.shunt_node(joined, name, &who, record.connection, origin) else {
                        continue;
                    };
                    new_node[node].map(LoadPlace::Node)
                }
                LoadSite::Line(name) => {
                    self.load_line(joined, parts, name, &record.load, record.connection, origin)
                }
            };
            let Some(place) = place else { continue };
            loads.push(Load {
                name: record.load.clone(),
                place,
                connection: record.connection,
                watts: record.watts,
                vars: record.vars,
                model: record.model,
            });
        }
        let capacitors = self.capacitors(joined, new_node, parts);
        if loads.is_empty()
            && self.draft.motors.is_empty()
            && !self.diagnostics.has_errors()
            && !self.draft.unread.may_draw()
        {
            self.diagnostics.warning(
                Code::NoLoad,
                None,
                "nothing on the feeder draws power",
                "give loads in loads.csv",
            );
        }
        (loads, capacitors)
    }

    /// Generators in service, each with its curves.
    pub(super) fn generators(&mut self, joined: &Joined, new_node: &[Option<NodeId>]) -> Vec<Generator> {
        let mut generators = Vec::with_capacity(self.draft.generators.len());
        for record in &self.draft.generators {
            let who = format!("generator {} is at", record.generator);
            let node = self.shunt_node(joined, &record.node, &who, record.connection, record.origin);
            let volt_watt = record.volt_watt.as_ref().map(|name| self.curve(record, "volt_watt", name));
            let reactive = match &record.reactive {
                ReactiveRecord::Held(vars) => Some(Reactive::Held(*vars)),
                ReactiveRecord::PerWatt(ratio) => Some(Reactive::PerWatt(*ratio)),
                ReactiveRecord::VoltVar(name) => self.curve(record, "volt_var", name).map(Reactive::VoltVar),
            };
            let (Some(node), Some(reactive)) = (node, reactive) else { continue };
            let (Some(id), SwitchState::Closed) = (new_node[node], record.state) else { continue };
            if volt_watt == Some(None) {
                continue;
            }
            let mut generator = Generator {
                name: record.generator.clone(),
                node: id,
                connection: record.connection,
                watts: record.watts,
                reactive,
                volt_watt: volt_watt.flatten(),
                rated_va: record.rated_va.unwrap_or(f64::INFINITY),
                priority: record.priority,
                delivering: Complex64::default(),
            };
            generator.delivering = generator.output(1.0).power;
            generators.push(generator);
        }
        generators
    }

    /// A curve by name; one that is not defined is an error.
    fn curve(&mut self, record: &GeneratorRecord, column: &str, name: &str) -> Option<Curve> {
        let found = self.draft.curves.iter().find(|c| *c.curve == *name);
        if let Some(found) = found {
            return Curve::new(found.curve.clone(), found.points.clone());
        }
        let cure = match nearest(name, self.draft.curves.iter().map(|c| &*c.curve)) {
            Some(near) => format!("did you mean {near:?}?"),
            None => "give its points in curves.csv".to_string(),
        };
        self.diagnostics.error(
            Code::UnknownCurve,
            place(self.draft, record.origin, column, name),
            format!("generator {} follows curve {name:?}, which is not defined", record.generator),
            cure,
        );
        None
    }

    /// Motors, each at a node with all three phases and near its rated voltage.
    pub(super) fn motors(&mut self, joined: &Joined, new_node: &[Option<NodeId>]) -> Vec<Motor> {
        let mut motors = Vec::with_capacity(self.draft.motors.len());
        for record in &self.draft.motors {
            let who = format!("motor {} is at", record.motor);
            let three = Connection::Delta(Conductors::ABC);
            let Some(node) = self.shunt_node(joined, &record.node, &who, three, record.origin) else {
                continue;
            };
            let Some(id) = new_node[node] else { continue };
            let nominal = joined.carried.nominal_volts[node];
            let rated = record.machine.volts;
            if !(0.75..=1.25).contains(&(rated / nominal)) {
                self.diagnostics.error(
                    Code::VoltageMismatch,
                    place(self.draft, record.origin, "volts", &rated.to_string()),
                    format!(
                        "motor {} is rated {rated} V, but node {} is at {:.0} V",
                        record.motor, record.node, nominal
                    ),
                    "check the voltage of its plate, and the node it stands at",
                );
            }
            motors.push(Motor {
                name: record.motor.clone(),
                node: id,
                count: record.count,
                machine: record.machine.clone(),
                starter: record.starter,
                state: record.state,
                slip: record.machine.circuit.slip(record.machine.rated_rad_s),
                starts_per_hour: record.starts_per_hour,
                locked_rotor_limit_s: record.locked_rotor_limit_s,
                filled: record.filled.clone(),
                fit: record.fit.clone(),
            });
        }
        motors
    }

    /// The graph node of a load or capacitor, its conductors checked; `None` where it cannot be placed.
    pub(super) fn shunt_node(
        &mut self,
        joined: &Joined,
        name: &str,
        who: &str,
        connection: Connection,
        origin: Option<Origin>,
    ) -> Option<usize> {
        let Some(&node) = joined.graph.index.get(name) else {
            self.unknown_node(&joined.graph, name, origin, who);
            return None;
        };
        if joined.tree.fed[node] {
            self.check_connection(joined, node, joined.carried.conductors[node], who, connection, origin);
        }
        Some(node)
    }

    fn check_connection(
        &mut self,
        joined: &Joined,
        node: usize,
        carried: Conductors,
        who: &str,
        connection: Connection,
        origin: Option<Origin>,
    ) {
        let missing = connection.phases().minus(carried);
        let name = &joined.graph.names[node];
        let text = connection.to_string();
        if !missing.is_empty() {
            self.diagnostics.error(
                Code::PhaseNotCarried,
                place(self.draft, origin, "phases", &text),
                format!("{who} node {name} on {text}, but that node carries only {carried}"),
                format!("use conductors of {carried}, or carry {missing} to node {name}"),
            );
            return;
        }
        if !matches!(connection, Connection::Star(_)) {
            return;
        }
        let head = joined.carried.side[node];
        let side = &joined.sides[head];
        let begins = &joined.graph.names[head];
        let (what, cure) = if side.unbalance_blocked {
            (
                format!(
                    "from phase to neutral, but the winding that feeds its side at node {begins} cannot carry unbalanced current: the star of its other side is not earthed"
                ),
                "join it phase to phase (ab, bc, ca, abc), or choose a transformer with YNyn or Dyn",
            )
        } else if side.reference_siemens > 0.0 && !carried.has_neutral() {
            (
                format!("from phase to earth, but nothing earths the side that begins at node {begins}"),
                "join it phase to phase (ab, bc, ca, abc), carry n there, or choose a winding with an earthed neutral",
            )
        } else {
            return;
        };
        self.diagnostics.error(
            Code::NoReturnPath,
            place(self.draft, origin, "phases", &text),
            format!("{who} node {name} {what}"),
            cure,
        );
    }

    fn load_line(
        &mut self,
        joined: &Joined,
        parts: &Branches,
        line: &str,
        load: &str,
        connection: Connection,
        origin: Option<Origin>,
    ) -> Option<LoadPlace> {
        let Some(&b) = parts.lines.get(line) else {
            if self.draft.unread.branches || self.draft.unread.lines.contains(line) {
                return None;
            }
            let cure = match nearest(line, parts.lines.keys().map(|n| &**n)) {
                Some(near) => format!("did you mean {near:?}?"),
                None => "give the name of a line in lines.csv, or a node".to_string(),
            };
            let message = format!("load {load} is spread along line {line:?}, which does not exist");
            self.diagnostics.error(Code::UnknownLine, place(self.draft, origin, "line", line), message, cure);
            return None;
        };
        let id = parts.new_branch[b]?;
        let raw = &joined.graph.branches[b];
        let who = format!("load {load} is spread along line {line}, at");
        let carried = joined.carried.ends[b][0];
        self.check_connection(joined, raw.to, carried, &who, connection, origin);
        Some(LoadPlace::Line(id))
    }
}
