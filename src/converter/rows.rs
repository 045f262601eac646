//! Rows of the outputs that every stage's netlist answers with.

/// Rows of the outputs every stage answers with.
#[derive(Clone, Debug)]
pub(super) struct Rows {
    /// The regulated voltage, where divider and control sense it.
    pub(super) output_voltage: usize,
    /// The voltage at the load's terminals.
    pub(super) load_voltage: usize,
    /// The voltage of the bank, ahead of a second stage.
    pub(super) bank_voltage: usize,
    pub(super) input_current: usize,
    /// The voltage across the primary winding of a transformer that stores nothing.
    pub(super) primary_voltage: Option<usize>,
    /// Switches and rectifiers.
    pub(super) switches: Vec<SwitchRow>,
    /// The inductors that carry switched current.
    pub(super) inductors: Vec<WindingRow>,
    pub(super) branch_currents: Vec<usize>,
    /// Name and current of the filters' inductors, which carry no switched current.
    pub(super) filter_inductors: Vec<(&'static str, usize)>,
    /// Name, slot and current of the resistances of input network and output filter.
    pub(super) filter_losses: Vec<(&'static str, usize, usize)>,
}

/// A switch or rectifier and the row of its current.
#[derive(Clone, Copy, Debug)]
pub(super) struct SwitchRow {
    /// Its name in the netlist.
    pub(super) name: &'static str,
    pub(super) row: usize,
    /// Row of the voltage across it: of a rectifier, what it blocks.
    pub(super) voltage: usize,
    /// Row of the voltage against ground of its end that is neither ground nor supply.
    pub(super) node: usize,
    /// Slot of its resistance.
    pub(super) ohms: usize,
    /// Whether it has a diode's drop.
    pub(super) diode: bool,
}

/// An inductor that carries switched current and the row of that.
#[derive(Clone, Copy, Debug)]
pub(super) struct WindingRow {
    pub(super) name: &'static str,
    /// Name of its loss.
    pub(super) loss: &'static str,
    pub(super) row: usize,
    /// Slot of its resistance.
    pub(super) ohms: usize,
}

impl Rows {
    /// The switch or rectifier of this name.
    pub(super) fn switch(&self, name: &str) -> Option<SwitchRow> {
        self.switches.iter().copied().find(|switch| switch.name == name)
    }
}
