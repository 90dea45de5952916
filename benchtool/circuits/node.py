"""The timing node: a drive, what loads it, and the exponential that follows."""

from __future__ import annotations

import numpy as np

from benchtool.circuits.circuit import Circuit, Value
from benchtool.frozen import frozen_record
from benchtool.model.arrays import BoolArray


@frozen_record(eq=False)
class Drive:
    """What drives the timing node in one state: a source behind a resistance.

    Attributes:
        voc: Open-circuit voltage, volts.
        rs: Source resistance, ohms.
        until_v: Node voltage up to which it holds, volts; None where it holds throughout.
    """

    voc: Value
    rs: Value
    until_v: Value | None = None


@frozen_record(eq=False)
class Settling:
    """The loaded node: where it settles and how fast.

    Attributes:
        v: Voltage at which the node settles, volts.
        r: Resistance that the capacitor sees, ohms.
        tau: Time constant, seconds.
        esr_share: Series resistance of the capacitor as a share of ``r``.
        until_v: Node voltage up to which it holds, volts; None where it holds throughout.
    """

    v: Value
    r: Value
    tau: Value
    esr_share: Value
    until_v: Value | None = None

    def inside(self, node_v: Value) -> Value:
        """Return the voltage inside the capacitor when the node is at ``node_v``, volts."""
        return node_v + (node_v - self.v) * self.esr_share

    def after(self, inside_v: Value, wait_s: Value) -> Value:
        """Return the voltage inside the capacitor ``wait_s`` seconds later, volts."""
        with np.errstate(all="ignore"):
            decay: Value = np.exp(-wait_s / self.tau)
        return self.v + (inside_v - self.v) * decay

    def rise_time(self, start_v: Value, node_v: Value) -> Value:
        """Return seconds from ``start_v`` inside until the node rises to ``node_v``.

        Returns:
            0 where the node is there already, NaN where it settles below.
        """
        return self._time(start_v, node_v, self.v > node_v)

    def fall_time(self, start_v: Value, node_v: Value) -> Value:
        """Return seconds from ``start_v`` inside until the node falls to ``node_v``.

        Returns:
            0 where the node is there already, NaN where it settles above.
        """
        return self._time(start_v, node_v, self.v < node_v)

    def _time(self, start_v: Value, node_v: Value, reached: bool | BoolArray) -> Value:
        with np.errstate(all="ignore"):
            logs = np.log(np.divide(self.v - start_v, self.v - self.inside(node_v)))
            # No logarithm: the start is beyond where it settles, and so beyond the target.
            turns: Value = np.where(reached, np.fmax(logs, 0.0), np.nan)
            return self.tau * turns


def settle(circuit: Circuit, drive: Drive, sunk_a: Value) -> Settling:
    """Load a drive with all that hangs on the timing node.

    Args:
        circuit: Gives the capacitor, the probe and the leaks.
        drive: What the topology drives the node with.
        sunk_a: Current drawn out of the node, amperes.

    References:
        Superposition at the node: R = Rs ∥ Rp ∥ Rx, V = (Voc/Rs + Vx/Rx - I)·R,
        tau = (R + r)·C + R·Cp; exact for r = 0 and for Cp = 0.
    """
    to_ground = 1 / circuit.probe_r + 1 / circuit.shunt_ohm
    to_rail = 1 / circuit.leak_ohm
    r = 1 / (1 / drive.rs + to_ground + to_rail)
    v = (drive.voc / drive.rs + circuit.leak_to_v * to_rail - sunk_a) * r
    tau = (r + circuit.esr) * circuit.C + r * circuit.probe_c
    return Settling(v=v, r=r, tau=tau, esr_share=circuit.esr / r, until_v=drive.until_v)
