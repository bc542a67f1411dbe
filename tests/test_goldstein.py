"""Goldstein's factor and the laws of end loss, against computations and closed forms from elsewhere."""

from __future__ import annotations

import numpy as np
import pytest

from bemt.errors import InputError
from bemt.rotor import kernels as k
from bemt.rotor.elements import cosine_spaced
from bemt.rotor.end_loss import LAWS, NO_LOSS, EndLossTables, loss_tables, prandtl_root
from bemt.rotor.goldstein import DATA, goldstein_factor, pitch_at, prandtl_factor

# Computed apart from this program from S. Goldstein's 1929 helicoidal-sheet problem (On the vortex theory of screw
# propellers, Proc. R. Soc. A 123), grid-converged below 0.08 %. Blades, wake pitch: factor at each r/R.
RADII = (0.2, 0.5, 0.8, 0.95, 0.99)
REFERENCE = {
    (2, 0.05): (0.98749, 0.99957, 0.98687, 0.75236, 0.38335),
    (2, 0.125): (0.96731, 0.97108, 0.85084, 0.51258, 0.24071),
    (2, 0.25): (1.07186, 0.83841, 0.63953, 0.35088, 0.16070),
    (2, 0.5): (1.27384, 0.66270, 0.42361, 0.21975, 0.09935),
    (2, 2): (1.51660, 0.55482, 0.25476, 0.11579, 0.05072),
    (3, 0.05): (0.99448, 0.99985, 0.99823, 0.85255, 0.46441),
    (3, 0.125): (0.97619, 0.99241, 0.93454, 0.61727, 0.29788),
    (3, 0.25): (1.06955, 0.93323, 0.77127, 0.44366, 0.20571),
    (3, 0.5): (1.30777, 0.81402, 0.55690, 0.29576, 0.13446),
    (3, 2): (1.60406, 0.72200, 0.35339, 0.16334, 0.07180),
    (4, 0.05): (0.99705, 0.99992, 0.99976, 0.91124, 0.52880),
    (4, 0.125): (0.98232, 0.99681, 0.97089, 0.69434, 0.34442),
    (4, 0.25): (1.04993, 0.96927, 0.85187, 0.51475, 0.24187),
    (4, 0.5): (1.25906, 0.89874, 0.65579, 0.35742, 0.16351),
    (4, 2): (1.54548, 0.83773, 0.43707, 0.20552, 0.09068),
}

SINES = np.concatenate([np.geomspace(1e-6, 0.01, 300), np.linspace(0.01, 1.0, 3000)[1:]])


def test_the_factor_is_that_of_goldsteins_problem() -> None:
    errors = [
        goldstein_factor(blades, np.array(RADII), pitch) / np.array(wanted) - 1.0
        for (blades, pitch), wanted in REFERENCE.items()
    ]
    worst = np.abs(errors).max()
    print(f"\nworst of {np.size(errors)} figures: {100 * worst:.3f} %")
    assert worst < 1e-3  # what the reference itself may be off


def test_endless_pitch_with_two_blades_is_a_turning_plate() -> None:
    """A flat plate turning about its middle has the jump of potential omega x sqrt(R^2 - x^2) (H. Lamb, Hydrodynamics).

    With w / (lambda R) for omega, K = B Gamma / (2 pi lambda w R) over its limit mu^2 is sqrt(1 - x^2) / (pi x).
    """
    x = np.linspace(0.06, 0.999, 200)
    wanted = np.sqrt(1.0 - x**2) / (np.pi * x)
    assert goldstein_factor(2, x, np.inf) == pytest.approx(wanted, rel=1e-3)
    assert goldstein_factor(2, x, 1e7) == pytest.approx(wanted, rel=1e-3)


def test_no_pitch_is_no_loss_and_small_pitch_is_prandtl() -> None:
    x = np.linspace(0.3, 0.99, 70)
    for blades in (2, 3, 6, 12):
        assert goldstein_factor(blades, x, 0.0) == pytest.approx(np.ones(x.size), abs=2e-6)
        sine = 0.02 / np.hypot(0.02, x)
        assert goldstein_factor(blades, x, 0.02) == pytest.approx(prandtl_factor(blades, x, sine), rel=0.012)


def test_the_factor_is_smooth_and_ends_at_the_tip() -> None:
    place = np.linspace(0.001, 0.999, 2001)
    for blades in (1, 2, 5, 12):
        for x in (0.1, 0.4, 0.9, 0.995):
            pitch = pitch_at(place)
            ratio = goldstein_factor(blades, x, pitch) / prandtl_factor(blades, x, pitch / np.hypot(pitch, x))
            # Second and third differences, step 0.0005: a kink would leave its change of slope times the step.
            assert np.abs(np.diff(ratio, 2)).max() < 1.5e-5
            assert np.abs(np.diff(ratio, 3)).max() < 1.5e-7
        assert goldstein_factor(blades, 1.0, 0.3) == 0.0
    assert goldstein_factor(2, 0.01, 0.3) == goldstein_factor(2, 0.05, 0.3)


def test_blades_beyond_the_table_are_refused() -> None:
    for blades in (0, 13):
        with pytest.raises(InputError, match="1 to 12 blades"):
            goldstein_factor(blades, 0.7, 0.2)


def test_the_shipped_table_is_what_its_generator_makes() -> None:
    from importlib.resources import files

    from bemt.rotor.goldstein_data import ratio_at

    with files("bemt.rotor").joinpath(DATA).open("rb") as stream, np.load(stream) as data:
        for blades, column in ((2, 8), (5, 20)):
            made = ratio_at(blades, float(data["wake_pitch"][column]), data["r_over_R"])
            assert data["ratio"][blades - 1, :, column] == pytest.approx(made, rel=1e-6, abs=1e-8)


@pytest.mark.parametrize("name", list(LAWS))
def test_no_law_rises_with_the_helix_angle(name: str) -> None:
    """What the solver's proofs of a root rest on: F never rises, F |sin phi| never falls with |sin phi|."""
    x = np.concatenate([np.linspace(0.02, 0.98, 33), 1.0 - np.geomspace(0.02, 1e-6, 9)])[:, None]
    for blades in range(1, 13):
        factor = LAWS[name](blades, x, 0.1, SINES)
        assert (factor > 0).all()
        assert factor.max() <= 1.0
        assert np.diff(factor).max() < 3e-6
        product = factor * SINES
        assert (np.maximum.accumulate(product, axis=1) - product).max() < 3e-6


def test_goldsteins_law_is_his_factor_outboard() -> None:
    x = np.linspace(0.6, 0.99, 14)[:, None]
    sine = np.linspace(0.02, 0.6, 50)
    pitch = x * np.tan(np.arcsin(sine))
    for blades in (2, 3, 4):
        assert LAWS["goldstein"](blades, x, 0.1, sine) == pytest.approx(goldstein_factor(blades, x, pitch), abs=2e-3)


def read(tables: EndLossTables, element: int, sine: np.ndarray) -> np.ndarray:
    """Factor for the tip as the compiled solver looks it up."""
    own = tables.tables.reshape(-1, k.LOSS_CELLS, 5)[tables.table_index[element]]
    place = tables.tip_scale[element] / np.sqrt(sine) * own[0, 4]
    cell = np.minimum(place.astype(int), k.LOSS_CELLS - 1)
    t = place - cell
    value = own[cell, 0] + t * (own[cell, 1] + t * (own[cell, 2] + t * own[cell, 3]))
    return np.where(place < k.LOSS_CELLS, value, 1.0)


@pytest.mark.parametrize("blades", [1, 2, 3, 5, 12])
def test_tables_of_goldsteins_law(blades: int) -> None:
    x, _ = cosine_spaced(0.12, 40)
    tables = loss_tables("goldstein", ("tip", "root"), blades, x, 0.12)
    worst = np.zeros(3)
    for i in range(x.size):
        made, wanted = read(tables, i, SINES), LAWS["goldstein"](blades, x[i : i + 1], 0.12, SINES)
        error = np.abs(made - wanted)
        parts = SINES < 0.02, (SINES >= 0.02) & (SINES < 0.93), SINES >= 0.93
        worst = np.maximum(worst, [error[part].max() for part in parts])
        assert np.diff(made).max() < 1e-6
        product = made * SINES
        assert (np.maximum.accumulate(product) - product).max() < 2e-5
    print(f"\n{blades} blades: errors {worst[0]:.1e} (flattest), {worst[1]:.1e}, {worst[2]:.1e} (steepest)")
    assert (worst < [2e-4, 3e-4, 3e-4]).all()


def test_tables_of_prandtls_law_and_of_either_end() -> None:
    x, _ = cosine_spaced(0.15, 40)
    for name in ("prandtl", "goldstein"):
        both = loss_tables(name, ("tip", "root"), 3, x, 0.15)
        for sine in (0.05, 0.3, 0.9):
            at_root = both.root_scale / np.sqrt(sine)
            looked_up = 2.0 / np.pi * np.arccos(np.exp(-(at_root**2)))
            assert prandtl_root(3, x, 0.15, np.array(sine)) == pytest.approx(looked_up, rel=1e-12)
        tip_only, root_only = loss_tables(name, ("tip",), 3, x, 0.15), loss_tables(name, ("root",), 3, x, 0.15)
        assert (tip_only.root_scale == NO_LOSS).all()
        assert (tip_only.tip_scale == both.tip_scale).all()
        assert (root_only.tip_scale == NO_LOSS).all()
        assert (root_only.table_index == 0).all()
    plain = loss_tables("prandtl", ("tip", "root"), 3, x, 0.15)
    assert plain.tables.shape == (k.LOSS_CELLS, 5)
    for i in range(0, 40, 7):
        wanted = LAWS["prandtl"](3, x[i : i + 1], 0.15, SINES)
        assert read(plain, i, SINES) == pytest.approx(wanted, abs=1e-9)
    none = loss_tables("none", ("tip", "root"), 3, x, 0.15)
    assert (none.tip_scale == NO_LOSS).all()
    assert (none.root_scale == NO_LOSS).all()
