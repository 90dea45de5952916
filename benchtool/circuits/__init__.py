"""The one circuit model: topologies as data, forward, inverse, sensitivities and faults."""

from benchtool.circuits.circuit import Circuit, Value
from benchtool.circuits.coordinates import Coordinate, circuit_at, coordinates, term_origin
from benchtool.circuits.families import FAMILIES, TERM_UNITS, Family, Term, find_family
from benchtool.circuits.fault_entry import Fault
from benchtool.circuits.faults import (
    FAULTS,
    apply_fault,
    faults_of,
    find_fault,
    size_range,
)
from benchtool.circuits.inverse import solve, solve_without_design
from benchtool.circuits.prediction import Prediction, States, predict, settle_states
from benchtool.circuits.sensitivity import Sensitivity, sensitivities
from benchtool.circuits.stuck import Stuck
from benchtool.circuits.taus import Products, products
from benchtool.circuits.topologies import TOPOLOGIES, Topology, find_topology

__all__ = [
    "FAMILIES",
    "FAULTS",
    "TERM_UNITS",
    "TOPOLOGIES",
    "Circuit",
    "Coordinate",
    "Family",
    "Fault",
    "Prediction",
    "Products",
    "Sensitivity",
    "States",
    "Stuck",
    "Term",
    "Topology",
    "Value",
    "apply_fault",
    "circuit_at",
    "coordinates",
    "faults_of",
    "find_family",
    "find_fault",
    "find_topology",
    "predict",
    "products",
    "sensitivities",
    "settle_states",
    "size_range",
    "solve",
    "solve_without_design",
    "term_origin",
]
