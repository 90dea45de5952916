"""From the trace of a capacitor node to its figures."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from benchtool.model.arrays import middle
from benchtool.model.capture import Waveform
from benchtool.model.node import NodeFit, SlopeFit
from benchtool.model.quantity import Contribution, Notice
from benchtool.model.timing import Edges, Levels
from benchtool.node.effects import Bent, find_bends
from benchtool.node.shown import Shown, n_cycles, show_course
from benchtool.node.slopes import cut_slopes, take_points, too_short
from benchtool.node.terms import Terms, volts
from benchtool.node.thresholds import add_thresholds
from benchtool.timing import find_levels, find_turning_points, require_states
from benchtool.uncertainty import combine

_UNCLEAR = 0.3  # of the time constant: an exponential with more uncertainty is none
_U_MEMORY = 0.3  # of what taking memory into account moves: its course is a model


def fit_node(
    trace: Waveform,
    levels: Levels | None = None,
    edges: Edges | None = None,
    *,
    terms: Terms | None = None,
) -> NodeFit:
    """Fit exponentials to both slopes of a capacitor node.

    Args:
        trace: The waveform of the node.
        levels: Its levels, where they are known already.
        edges: Its turning points, where they are known already.
        terms: What is known of instrument and IC.

    Returns:
        Asymptotes, time constants, thresholds and what bends the slopes, with uncertainties that
        hold where the noise is correlated.

    Raises:
        MeasurementError: ``flat-trace`` or ``noise-only`` where the node does not move,
            ``node-too-short`` where it shows too little of a slope, ``fit-failed``.

    References:
        v = V + (v0 - V)·e^(-t/tau) in each state; the covariance is that of ``judge_noise``.
    """
    terms = terms or Terms()
    levels = levels or find_levels(trace)
    require_states(levels)
    edges = edges or find_turning_points(trace, levels)
    usual_s = _usual_s(edges)
    points = take_points(trace, usual_s)
    plain = show_course(points, cut_slopes(points, edges))
    swing_v = float(np.ptp(points.volts))
    bent = find_bends(plain, swing_v)
    shown = bent.shown
    found = NodeFit(
        charge=_slope(shown, plain, "charge", terms),
        discharge=_slope(shown, plain, "discharge", terms),
        bow=bent.bow,
        memory=bent.memory,
        memory_s=_memory_s(bent),
        noise_v=shown.noise.sd,
        correlation_s=shown.noise.length * _bin_s(shown),
        inflation=float(shown.noise.inflation[0]),
        n_cycles=n_cycles(edges),
    )
    if found.charge is None and found.discharge is None:
        raise too_short("the slopes of the node are too short or too noisy")
    found = add_thresholds(found, shown, terms, levels.step_v)
    return replace(found, warnings=_notices(found, shown, terms))


def _usual_s(edges: Edges) -> float:
    gaps = [np.diff(edges.times_s[run.first : run.stop]) for run in edges.runs]
    joined = np.concatenate(gaps) if gaps else np.empty(0)
    if joined.size:
        return middle(joined)
    return max((run.end_s - run.start_s for run in edges.runs), default=0.0)


def _bin_s(shown: Shown) -> float:
    profile = shown.profiles[0]
    return float(profile.times_s[-1] - profile.times_s[0]) / max(1.0, float(profile.places[-1]))


def _memory_s(bent: Bent) -> float | None:
    log_tau = bent.shown.value("memory-tau")
    return None if log_tau is None else math.exp(log_tau)


def _shape(shown: Shown, plain: Shown, name: str, scale: float) -> Contribution:
    """Return what a memory, which is seldom one exponential, leaves uncertain of its share."""
    moved = (shown.value(name) or 0.0) - (plain.value(name) or 0.0)
    u = _U_MEMORY * moved * scale if shown.value("memory") is not None else 0.0
    return Contribution(source="memory", u=u, note="its course is a model")


def _slope(shown: Shown, plain: Shown, kind: str, terms: Terms) -> SlopeFit | None:
    end_v, log_tau = shown.value(f"end-{kind}"), shown.value(f"tau-{kind}")
    if end_v is None or log_tau is None:
        return None
    end, tau = f"end-{kind}", f"tau-{kind}"
    u_end = math.sqrt(shown.covariance(end, end))
    u_tau = math.sqrt(shown.covariance(tau, tau))
    if not (math.isfinite(u_tau) and u_tau < _UNCLEAR):
        return None
    profiles = [p for p in shown.profiles if p.rises is (kind == "charge")]
    n = sum(p.n_slopes for p in profiles)
    tau_s = math.exp(log_tau)
    dof = shown.dof(end)
    return SlopeFit(
        end=volts(
            end_v,
            [
                Contribution(source="noise", u=u_end, dof=dof),
                _shape(shown, plain, end, 1.0),
            ],
            n,
            terms,
        ),
        tau=combine(
            tau_s,
            "s",
            [
                Contribution(source="noise", u=u_tau * tau_s, dof=shown.dof(tau)),
                _shape(shown, plain, tau, tau_s),
                Contribution(
                    source="timebase", u=tau_s * terms.timebase_rel / math.sqrt(3), common=True
                ),
            ],
            n=n,
        ),
        correlation=shown.covariance(end, tau) / (u_end * u_tau) if u_end * u_tau else 0.0,
        n_slopes=n,
        n_points=int(sum(float(p.counts.sum()) for p in profiles)) * shown.points.n_averaged,
    )


def _notices(found: NodeFit, shown: Shown, terms: Terms) -> tuple[Notice, ...]:
    notices: list[Notice] = []
    for kind, rises in (("charge", True), ("discharge", False)):
        if getattr(found, kind) is None and any(p.rises is rises for p in shown.profiles):
            text = f"the {'rise' if rises else 'fall'} of the node is too short to be fitted"
            notices.append(Notice(code="node-slope-unclear", text=text))
    if found.n_cycles < 3:
        text = f"the record holds {found.n_cycles} whole cycles: the noise is judged within slopes"
        notices.append(Notice(code="node-few-cycles", text=text))
    if terms.delay_upper is None and terms.delay_lower is None and found.upper is not None:
        text = "no delay of the IC was given: the thresholds are taken where the node turns"
        notices.append(Notice(code="assumed-no-delay", text=text))
    if shown.points.is_part:
        text = "the record is long: its first part was fitted"
        notices.append(Notice(code="node-part-used", text=text))
    return tuple(notices)
