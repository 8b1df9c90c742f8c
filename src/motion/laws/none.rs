//! No loss: the sinusoid with γ held at 0.

use super::{Law, viscous};

/// The law's row in the table.
pub(super) const LAW: Law = Law {
    key: "none",
    described: "without loss",
    nested_in: Some("viscous"),
    fit: |weighted| viscous::fit(weighted, Some(0.0)),
};
