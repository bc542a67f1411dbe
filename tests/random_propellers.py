"""Random propellers, models and operating points, as far out as a case may go: formulas, no real blade."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from bemt.blade.geometry import Propeller, SectionSpan, Stations
from bemt.rotor.model import (
    END_LOSS_LAWS,
    POST_STALL_LAWS,
    REYNOLDS_RULES,
    STALL_DELAY_LAWS,
    Model,
)
from bemt.section.family import family_names
from bemt.section.polar import PolarTable

FloatArray = NDArray[np.float64]

SOUND = 340.0
VISCOSITY = 1.5e-5


@dataclass(frozen=True, eq=False)
class Points:
    """Operating points: airspeed and angular speed, shape (n,)."""

    airspeed: FloatArray
    angular_speed: FloatArray


def model(rng: np.random.Generator) -> Model:
    """Any combination of the rival laws of the momentum solution."""
    ends = (("tip", "root"), ("tip",), ("root",), ())[rng.integers(4)]
    return Model(
        elements=40,
        end_loss=str(rng.choice(END_LOSS_LAWS)),
        end_loss_ends=ends,
        stall_delay=str(rng.choice(STALL_DELAY_LAWS)),
        stall_strength=float(rng.uniform(0, 1)),
        post_stall=str(rng.choice(POST_STALL_LAWS)),
        plate_drag=float(rng.uniform(1.0, 2.2)),
        reynolds_rule=str(rng.choice(REYNOLDS_RULES)),
        drag_scale=float(10 ** rng.uniform(-0.5, 0.5)),
    )


def polars(rng: np.random.Generator) -> PolarTable:
    """A table of a made-up section, one in three with a Mach axis of its own."""
    alpha = np.radians(np.arange(-12.0, 20.1, 0.5))
    reynolds = np.geomspace(10 ** rng.uniform(4.2, 5.0), 10 ** rng.uniform(5.2, 6.5), rng.integers(2, 7))
    zero, stall = np.radians(rng.uniform(-6, 1)), np.radians(rng.uniform(6, 15))
    width = np.radians(10 ** rng.uniform(-1, 0.6))
    mach = np.sort(rng.uniform(0.0, 0.9, 3)) if rng.random() < 0.33 else np.array([rng.uniform(0.0, 0.3)])
    lift, drag = [], []
    for number in mach:
        factor = 1.0 / np.sqrt(1.0 - number**2)
        for re in reynolds:
            away = np.abs(alpha - zero) - stall * (re / 1e5) ** 0.05
            separated = 0.5 * (1.0 + np.tanh(away / (2.0 * width)))
            attached = rng.uniform(5.0, 6.3) * factor * np.sin(alpha - zero)
            lift.append((1.0 - 0.5 * separated) * attached)
            drag.append(0.012 * (1e5 / re) ** 0.4 + 0.02 * number**4 + 0.3 * separated * (alpha - zero) ** 2)
    shape = (mach.size, reynolds.size, alpha.size) if mach.size > 1 else (reynolds.size, alpha.size)
    return PolarTable(
        alpha,
        reynolds,
        np.reshape(lift, shape),
        np.reshape(drag, shape),
        "made up",
        mach=mach if mach.size > 1 else float(mach[0]),
    )


def section(rng: np.random.Generator, start: float, end: float) -> SectionSpan:
    """A family or a made-up table."""
    if rng.random() < 0.5:
        return SectionSpan(start, end, family=str(rng.choice(family_names())))
    return SectionSpan(start, end, polars=polars(rng), t_over_c=float(rng.uniform(0.04, 0.2)))


def propeller(rng: np.random.Generator) -> Propeller:
    """A blade of random outline, twist and sections, within what a case accepts."""
    count = int(rng.integers(3, 9))
    root = rng.uniform(0.08, 0.25)
    x = np.linspace(root, 1.0, count)
    bend = np.cumsum(rng.normal(0.0, 0.15, count))
    pitch = rng.uniform(-0.3, 1.6)
    twist = np.clip(np.arctan(pitch / (np.pi * x)) + np.radians(rng.normal(0.0, 3.0, count)), -1.2, 1.4)
    stations = Stations(
        x,
        np.clip(10 ** rng.uniform(-1.3, -0.5) * np.exp(bend), 0.01, 0.6),
        twist,
        rng.uniform(0.03, 0.22, count),
        rng.uniform(0.0, 0.08, count),
    )
    cut = rng.uniform(root + 0.1, 0.9)
    spans = (section(rng, 0.0, 1.0),) if rng.random() < 0.6 else (section(rng, 0.0, cut), section(rng, cut, 1.0))
    return Propeller(int(rng.integers(1, 9)), float(10 ** rng.uniform(-1.0, 0.2)), stations, spans)


def points(rng: np.random.Generator, diameter: float, count: int) -> Points:
    """From standing still to a stopped propeller, tip Mach number up to 1 or so."""
    tip = np.minimum(10 ** rng.uniform(0.5, 2.5, count), SOUND)
    kind = rng.random(count)
    ratio = np.where(kind < 0.1, 0.0, np.where(kind < 0.4, 10 ** rng.uniform(-3, 1.5, count), rng.uniform(0, 1, count)))
    airspeed = np.minimum(ratio * tip, 0.9 * SOUND)
    stopped = kind > 0.97
    return Points(np.where(stopped, 0.1 * tip, airspeed), np.where(stopped, 0.0, 2.0 * tip / diameter))
