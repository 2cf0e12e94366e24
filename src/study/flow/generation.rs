//! What generators deliver, and what holds them back.

use serde::Serialize;

use super::element_volts;
use crate::math::Complex64;
use crate::network::{Generator, LoadModel, Name, Network};
use crate::solver::{Solution, generator_pu, load_current};

/// One generator as it delivers.
#[derive(Debug, Clone, PartialEq, Serialize)]
pub struct GeneratorRun {
    /// Generator.
    pub generator: Name,
    /// Node.
    pub node: Name,
    /// Active power delivered, kilowatts.
    pub kw: f64,
    /// Reactive power delivered, kilovars; negative where taken in.
    pub kvar: f64,
    /// Active power it could deliver, kilowatts.
    pub available_kw: f64,
    /// Rating, kilovolt-amperes, where given.
    pub kva: Option<f64>,
    /// Mean voltage across it, per unit of nominal.
    pub pu: f64,
    /// True where its volt-watt curve holds active power back.
    pub by_volt_watt: bool,
    /// True where its rating is reached.
    pub by_rating: bool,
}

/// Every generator in service.
pub(super) fn generators(network: &Network, solution: &Solution) -> Vec<GeneratorRun> {
    let floor = network.study.constant_power_floor_percent / 100.0;
    let row = |g: &Generator| {
        let node = network.node(g.node);
        let each = -g.delivering / g.connection.elements().max(1) as f64;
        let nominal = node.nominal_across(g.connection);
        let power = element_volts(network, solution, g.node, g.connection)
            .map(|u| u * load_current(LoadModel::Power, each, nominal, floor, u).conj());
        let delivered = -power.sum::<Complex64>() / 1e3;
        let pu = generator_pu(network, solution, g);
        let limited = g.output(pu).limited;
        GeneratorRun {
            generator: g.name.clone(),
            node: node.name.clone(),
            kw: delivered.re,
            kvar: delivered.im,
            available_kw: g.watts / 1e3,
            kva: g.rated_va.is_finite().then_some(g.rated_va / 1e3),
            pu,
            by_volt_watt: limited.by_volt_watt,
            by_rating: limited.by_rating,
        }
    };
    network.generators.iter().map(row).collect()
}
