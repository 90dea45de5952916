"""The capacitor node: what its slopes, its first pulse and its rest say of the board."""

from benchtool.node.early import find_early_tau
from benchtool.node.esr import esr_ohm
from benchtool.node.first_pulse import judge_first_pulse
from benchtool.node.fit import fit_node
from benchtool.node.loading import Load, remove_probe
from benchtool.node.readings import node_readings
from benchtool.node.resting import read_resting_node
from benchtool.node.schmitt import solve_schmitt
from benchtool.node.terms import Terms

__all__ = [
    "Load",
    "Terms",
    "esr_ohm",
    "find_early_tau",
    "fit_node",
    "judge_first_pulse",
    "node_readings",
    "read_resting_node",
    "remove_probe",
    "solve_schmitt",
]
