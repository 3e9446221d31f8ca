//! The evidence tables, made from the findings.

use super::run::Findings;
use crate::conductor::Side;
use crate::evidence::Table;

/// Name of a side in tables.
pub(super) fn side_name(side: Side) -> &'static str {
    match side {
        Side::Conductor => "conductors",
        Side::Resistor => "resistors",
    }
}

impl Findings {
    /// All tables, in the order in which they are shown.
    pub(super) fn tables(&self) -> Vec<Table> {
        let mut tables = vec![self.coincidence_table(), self.profile_table(), self.bodies_table(Side::Conductor)];
        if self.plan.study.conductivity.resistors.is_some() {
            tables.push(self.bodies_table(Side::Resistor));
        }
        tables.push(self.contacts_table());
        if !self.units.is_empty() {
            tables.push(self.units_table());
        }
        if !self.deposits.is_empty() {
            tables.push(self.deposits_table());
        }
        tables.push(self.layers_table());
        tables
    }
}
