"""Many surfaces in time: nodes, capacitance, conduction, march."""
