"""Compute the shipped polar families and write them beside this file.

Run `python airfoils_demo/generate.py` with NeuralFoil 0.3.3 installed (P. Sharpe, MIT licence; it needs no network).
NeuralFoil is needed here only: the shapes below need numpy and scipy alone, and reading the families needs neither.
The result does not depend on time or machine beyond the last unit of the stored integers.
"""

from __future__ import annotations

import json
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
from numpy.typing import NDArray
from scipy.interpolate import CubicSpline

Floats = NDArray[np.float64]

GENERATOR_VERSION = 2
NEURALFOIL_VERSION = "0.3.3"
MODEL_SIZE = "xlarge"
CRITICAL_AMPLIFICATION = 7.5  # why: docs/sections.md, "Which amplification"
LIFT_SHARE = 0.92  # of the computed lift that sections have when measured; docs/sections.md, "Lift as measured"

ALPHA_DEG: Floats = np.arange(-15.0, 20.01, 0.5)
REYNOLDS: Floats = np.array(
    [1e4, 1.5e4, 2e4, 3e4, 4e4, 5e4, 6.5e4, 8e4, 1e5, 1.3e5, 1.7e5, 2.2e5, 3e5, 5e5, 1e6, 1.7e6, 3e6]
)
REYNOLDS_TRUSTED_FROM = 2e4
SEPARATED_DRAG = 0.12  # a section with more drag than this is taken as stalled, whatever its lift does
LEAST_SEPARATED_SHARE = 1.5  # of the least drag; matters for thick members at low Reynolds numbers
POST_STALL_LIFT_SLOPE = 0.004  # per degree: keeps the largest lift where the stall is

# Units of the stored 16-bit integers.
LIFT_UNIT = 1e-4
LN_DRAG_UNIT = 2e-4
MOMENT_UNIT = 2e-5

# Clark Y (V. E. Clark, 1922), percent of chord above the flat datum, in the form of the NACA reports of the 1920s
# and 30s (for instance TR 431); typed from memory.
# fmt: off
CLARK_Y_STATIONS = (0, 1.25, 2.5, 5, 7.5, 10, 15, 20, 30, 40, 50, 60, 70, 80, 90, 95, 100)
CLARK_Y_UPPER = (
    3.50, 5.45, 6.50, 7.90, 8.85, 9.60, 10.69, 11.36, 11.70, 11.40, 10.52, 9.15, 7.35, 5.22, 2.80, 1.49, 0.12,
)
CLARK_Y_LOWER = (3.50, 1.93, 1.47, 0.93, 0.63, 0.42, 0.15, 0.03, 0, 0, 0, 0, 0, 0, 0, 0, 0)
# fmt: on
CLARK_Y_THICKNESS = 0.117

# The thin plate: an elliptic nose this many thicknesses long, a trailing edge thinned over the last part of the chord.
PLATE_NOSE_LENGTH = 3.0
PLATE_THINNED_FROM = 0.6
PLATE_EDGE_SHARE = 0.25


def cosine_stations(count: int = 161) -> Floats:
    """Return `count` chordwise stations from 0 to 1, dense at both edges."""
    return np.asarray(0.5 * (1.0 - np.cos(np.linspace(0.0, np.pi, count))), dtype=np.float64)


def _outline(x: Floats, mean_line: Floats, slope: Floats, half_thickness: Floats) -> Floats:
    """Lay a half thickness on both sides of a mean line, from the upper trailing edge round the nose to the lower."""
    angle = np.arctan(slope)
    upper = np.column_stack((x - half_thickness * np.sin(angle), mean_line + half_thickness * np.cos(angle)))
    lower = np.column_stack((x + half_thickness * np.sin(angle), mean_line - half_thickness * np.cos(angle)))
    return np.vstack((upper[::-1], lower[1:]))


def four_digit(t_over_c: float, camber: float) -> Floats:
    """Return the outline of a NACA four-digit section with its largest camber at 40 % chord.

    Parameters
    ----------
    t_over_c, camber : float
        Thickness and camber as shares of the chord.

    Returns
    -------
    ndarray, shape (n, 2)
        Points in chords, from the upper trailing edge round the nose to the lower trailing edge.

    Notes
    -----
    E. N. Jacobs, K. E. Ward, R. M. Pinkerton, NACA TR 460, 1933: equations of the mean line and the thickness.
    """
    x = cosine_stations()
    place = 0.4
    half_thickness = 5.0 * t_over_c * (0.2969 * np.sqrt(x) - 0.1260 * x - 0.3516 * x**2 + 0.2843 * x**3 - 0.1015 * x**4)
    front = x < place
    scale = np.where(front, camber / place**2, camber / (1.0 - place) ** 2)
    mean_line = scale * np.where(front, 2.0 * place * x - x**2, 1.0 - 2.0 * place + 2.0 * place * x - x**2)
    return _outline(x, mean_line, scale * 2.0 * (place - x), half_thickness)


def thin_plate(t_over_c: float, camber: float) -> Floats:
    """Return the outline of a plate bent to a circular arc, its nose rounded and its trailing edge thinned.

    Parameters
    ----------
    t_over_c, camber : float
        Thickness of the plate and rise of the arc as shares of the chord.

    Returns
    -------
    ndarray, shape (n, 2)
        Points in chords, from the upper trailing edge round the nose to the lower trailing edge.
    """
    x = cosine_stations()
    nose = PLATE_NOSE_LENGTH * t_over_c
    half_thickness = 0.5 * t_over_c * np.sqrt(np.clip(1.0 - np.clip(1.0 - x / nose, 0.0, None) ** 2, 0.0, None))
    aft = np.clip((x - PLATE_THINNED_FROM) / (1.0 - PLATE_THINNED_FROM), 0.0, 1.0)
    half_thickness *= 1.0 - (1.0 - PLATE_EDGE_SHARE) * aft**2 * (3.0 - 2.0 * aft)
    if camber == 0.0:
        return _outline(x, np.zeros_like(x), np.zeros_like(x), half_thickness)
    radius = (0.25 + camber**2) / (2.0 * camber)
    depth = np.sqrt(radius**2 - (x - 0.5) ** 2)
    return _outline(x, depth - (radius - camber), -(x - 0.5) / depth, half_thickness)


def clark_y_from_chord_line() -> tuple[Floats, float]:
    """Return Clark Y turned to its chord line, and the angle its flat face makes with that line.

    Returns
    -------
    outline : ndarray, shape (n, 2)
        Points in chords, from the upper trailing edge round the nose to the lower trailing edge; the leading edge,
        the point farthest from the middle of the trailing edge, is (0, 0).
    angle : float
        By how much the chord line is steeper than the flat face [rad].
    """
    stations = np.array(CLARK_Y_STATIONS) / 100.0
    points = np.vstack(
        (
            np.column_stack((stations, np.array(CLARK_Y_UPPER) / 100.0))[::-1],
            np.column_stack((stations, np.array(CLARK_Y_LOWER) / 100.0))[1:],
        )
    )
    along = np.concatenate(([0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))))
    curve = CubicSpline(along, points)
    fine = curve(np.linspace(0.0, along[-1], 20001))
    trailing_edge = 0.5 * (points[0] + points[-1])
    distance = np.hypot(*(fine - trailing_edge).T)
    nose = int(distance.argmax())
    chord_vector = (trailing_edge - fine[nose]) / distance[nose]
    turn = np.array([chord_vector, [-chord_vector[1], chord_vector[0]]])
    outline = (fine - fine[nose]) @ turn.T / distance[nose]
    return outline, float(np.arctan2(-chord_vector[1], chord_vector[0]))


def flat_bottom(t_over_c: float) -> Floats:
    """Return the outline of Clark Y with all ordinates, measured from the chord line, scaled to a thickness.

    Parameters
    ----------
    t_over_c : float
        Thickness as a share of the chord.

    Returns
    -------
    ndarray, shape (n, 2)
        Points in chords, from the upper trailing edge round the nose to the lower trailing edge.
    """
    fine, _ = clark_y_from_chord_line()
    nose = int(np.hypot(*fine.T).argmin())
    x = cosine_stations()
    upper = np.interp(x, fine[nose::-1, 0], fine[nose::-1, 1])
    lower = np.interp(x, fine[nose:, 0], fine[nose:, 1])
    outline = np.vstack((np.column_stack((x, upper))[::-1], np.column_stack((x, lower))[1:]))
    outline[:, 1] *= t_over_c / np.max(upper - lower)
    return outline


def thickness_and_camber(outline: Floats) -> tuple[float, float]:
    """Return the largest thickness and the largest height of the middle line, both across the chord line."""
    upper, lower, _ = _faces(outline)
    return float(np.max(upper - lower)), float(np.max(np.abs(upper + lower)) / 2.0)


def _faces(outline: Floats) -> tuple[Floats, Floats, Floats]:
    nose = int(np.hypot(*outline.T).argmin())
    x = np.linspace(0.0, 1.0, 4001)
    upper = np.interp(x, outline[nose::-1, 0], outline[nose::-1, 1])
    lower = np.interp(x, outline[nose:, 0], outline[nose:, 1])
    return upper, lower, x


def flat_face_angle(outline: Floats) -> float:
    """Return by how much the chord line is steeper than a straight edge laid on the lower face.

    The edge is pressed on under the thickest part of the section, where a pitch gauge is held: it rests on the two
    points of the lower side's convex hull that enclose the place, or, where the face bulges there, touches it.

    Parameters
    ----------
    outline : ndarray, shape (n, 2)
        Points in chords, from the upper trailing edge round the nose to the lower trailing edge.

    Returns
    -------
    float
        Chord-line angle less face angle [rad]; 0 for a symmetric section.
    """
    upper, lower, _ = _faces(outline)
    if np.array_equal(upper, -lower):
        return 0.0
    thickness = upper - lower
    nose = int(np.hypot(*outline.T).argmin())
    hull: list[Any] = []
    for point in outline[nose:]:
        while len(hull) > 1 and (
            (hull[-1][0] - hull[-2][0]) * (point[1] - hull[-2][1])
            <= (hull[-1][1] - hull[-2][1]) * (point[0] - hull[-2][0])
        ):
            hull.pop()
        if not hull or point[0] > hull[-1][0]:
            hull.append(point)
    corners = np.array(hull)
    thickest = np.flatnonzero(thickness > (1.0 - 1e-9) * thickness.max()).mean() / (len(thickness) - 1)
    slopes = np.diff(corners[:, 1]) / np.diff(corners[:, 0])
    # A long edge is a straight line; between the middles of short ones the slope of a bulging face varies evenly.
    edge = int(np.clip(np.searchsorted(corners[:, 0], thickest) - 1, 0, len(slopes) - 1))
    if corners[edge + 1, 0] - corners[edge, 0] > 0.05:
        return float(np.arctan(slopes[edge]))
    middles = 0.5 * (corners[1:, 0] + corners[:-1, 0])
    return float(np.arctan(np.interp(thickest, middles, slopes)))


@dataclass(frozen=True)
class Recipe:
    """What a family is made of."""

    description: str
    shape: Callable[[float, float], Floats]
    thickness: tuple[float, ...]
    camber: tuple[float, ...]
    default_thickness: float
    default_camber: float


def recipes() -> dict[str, Recipe]:
    """Return the recipe of each family by its name."""
    clark_y_camber = round(thickness_and_camber(flat_bottom(CLARK_Y_THICKNESS))[1], 5)
    return {
        "flat-bottom": Recipe(
            "Clark Y, its ordinates from the chord line scaled to the thickness; the camber follows the thickness",
            lambda t_over_c, _: flat_bottom(t_over_c),
            (0.05, 0.065, 0.08, 0.10, 0.117, 0.14, 0.17, 0.21, 0.25),
            (clark_y_camber,),
            CLARK_Y_THICKNESS,
            clark_y_camber,
        ),
        "four-digit": Recipe(
            "NACA four-digit sections with the largest camber at 40 % chord",
            four_digit,
            (0.04, 0.06, 0.08, 0.10, 0.12, 0.15, 0.18),
            (0.0, 0.02, 0.04, 0.06, 0.08),
            0.11,
            0.04,
        ),
        "thin-plate": Recipe(
            "plates bent to a circular arc, nose rounded, trailing edge thinned",
            thin_plate,
            (0.03, 0.04, 0.05, 0.06),
            (0.0, 0.02, 0.04, 0.06, 0.08),
            0.04,
            0.06,
        ),
    }


def member(outline: Floats) -> tuple[Floats, Floats, Floats]:
    """Compute lift, drag and moment coefficients of one section over `REYNOLDS` and `ALPHA_DEG`.

    Returns
    -------
    lift, drag, moment : ndarray, shape (n_re, n_alpha)
        As the families carry them: lift times `LIFT_SHARE`, after `hold_past_stall` and `extrapolate_reynolds`.
    """
    import neuralfoil  # a generator-only dependency

    reynolds, alpha = np.meshgrid(REYNOLDS, ALPHA_DEG, indexing="ij")
    raw = neuralfoil.get_aero_from_coordinates(
        outline, alpha.ravel(), reynolds.ravel(), n_crit=CRITICAL_AMPLIFICATION, model_size=MODEL_SIZE
    )
    lift, drag, moment = (np.asarray(raw[key], dtype=np.float64).reshape(alpha.shape) for key in ("CL", "CD", "CM"))
    lift *= LIFT_SHARE
    lift = np.array([hold_past_stall(ALPHA_DEG, *row) for row in zip(lift, drag, strict=True)])
    extrapolate_reynolds(lift, drag, moment)
    return lift, drag, moment


def hold_past_stall(alpha_deg: Floats, lift: Floats, drag: Floats) -> Floats:
    """Keep lift past the stall from rising again.

    The largest lift is sought where the drag is below `SEPARATED_DRAG` (or `LEAST_SEPARATED_SHARE` times the least
    drag, where that is more), upwards and downwards from zero lift. Beyond it the computed lift of fully separated
    flow climbs on, past what a plate carries; there it is held under a line that falls by `POST_STALL_LIFT_SLOPE` per
    degree from the largest lift.

    Parameters
    ----------
    alpha_deg, lift, drag : ndarray, shape (n_alpha,)
        One polar; lift and drag coefficients.

    Returns
    -------
    ndarray, shape (n_alpha,)
        Lift coefficient.
    """
    attached = drag <= max(SEPARATED_DRAG, LEAST_SEPARATED_SHARE * drag.min())
    zero = int(np.where(attached, np.abs(lift), np.inf).argmin())
    top = zero + int(np.where(attached, lift, -np.inf)[zero:].argmax())
    bottom = int(np.where(attached, lift, np.inf)[: zero + 1].argmin())
    held = lift.copy()
    held[top:] = np.minimum(held[top:], held[top] - POST_STALL_LIFT_SLOPE * (alpha_deg[top:] - alpha_deg[top]))
    held[: bottom + 1] = np.maximum(
        held[: bottom + 1], held[bottom] + POST_STALL_LIFT_SLOPE * (alpha_deg[bottom] - alpha_deg[: bottom + 1])
    )
    return held


def extrapolate_reynolds(lift: Floats, drag: Floats, moment: Floats) -> None:
    """Fill the rows below `REYNOLDS_TRUSTED_FROM` in place: lift and moment held, attached drag as Re^-0.5.

    Only as much drag as a section has before it stalls grows so: the rest is pressure drag of separated flow.
    """
    base = int(np.flatnonzero(REYNOLDS == REYNOLDS_TRUSTED_FROM)[0])
    growth = np.sqrt(REYNOLDS_TRUSTED_FROM / REYNOLDS[:base]) - 1.0
    lift[:base] = lift[base]
    moment[:base] = moment[base]
    drag[:base] = drag[base] + growth[:, np.newaxis] * np.minimum(drag[base], SEPARATED_DRAG)


def _as_integers(values: Floats, unit: float) -> NDArray[np.int16]:
    scaled = np.rint(values / unit)
    if np.abs(scaled).max() > np.iinfo(np.int16).max:
        raise ValueError(f"a value of {np.abs(values).max()} does not fit a 16-bit integer in units of {unit}")
    return scaled.astype(np.int16)


def write(name: str, recipe: Recipe, folder: Path) -> Path:
    """Compute the family `name` and write it to `folder`; return the path."""
    outlines = [[recipe.shape(t_over_c, camber) for camber in recipe.camber] for t_over_c in recipe.thickness]
    polars = np.array([[member(outline) for outline in row] for row in outlines])
    provenance = {
        "family": name,
        "description": recipe.description,
        "generator": "airfoils_demo/generate.py",
        "generator_version": GENERATOR_VERSION,
        "method": "NeuralFoil",
        "method_version": NEURALFOIL_VERSION,
        "model_size": MODEL_SIZE,
        "critical_amplification": CRITICAL_AMPLIFICATION,
        "lift_share": LIFT_SHARE,
        "separated_drag": SEPARATED_DRAG,
    }
    path = folder / f"{name}.npz"
    np.savez_compressed(
        path,
        thickness=np.array(recipe.thickness),
        camber=np.array(recipe.camber),
        alpha_deg=ALPHA_DEG,
        reynolds=REYNOLDS,
        reynolds_trusted_from=np.array(REYNOLDS_TRUSTED_FROM),
        default_thickness=np.array(recipe.default_thickness),
        default_camber=np.array(recipe.default_camber),
        flat_face_angle=np.array([[round(flat_face_angle(outline), 5) for outline in row] for row in outlines]),
        lift=_as_integers(polars[:, :, 0], LIFT_UNIT),
        ln_drag=_as_integers(np.log(polars[:, :, 1]), LN_DRAG_UNIT),
        moment=_as_integers(polars[:, :, 2], MOMENT_UNIT),
        units=np.array([LIFT_UNIT, LN_DRAG_UNIT, MOMENT_UNIT]),
        provenance=np.array(json.dumps(provenance, sort_keys=True)),
    )
    return path


def main() -> None:
    """Write every family beside this file."""
    from importlib.metadata import version

    found = version("neuralfoil")
    if found != NEURALFOIL_VERSION:
        raise SystemExit(f"NeuralFoil {NEURALFOIL_VERSION} is needed to reproduce the families; {found} is installed")
    for name, recipe in recipes().items():
        path = write(name, recipe, Path(__file__).parent)
        sys.stdout.write(f"{path.name}: {path.stat().st_size / 1024:.0f} KiB\n")


if __name__ == "__main__":
    main()
