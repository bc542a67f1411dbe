"""The compiled blade-element momentum solution. All compiled functions of the solver live in this one file.

Formulation. An element sees the undisturbed speed W0 = sqrt(V^2 + (Omega r)^2) at the angle phi0 = atan2(V, Omega r)
from the plane of rotation. Its unknown is psi = phi - phi0, the angle by which the induced velocity turns the flow.
Blade-element forces equal to annulus momentum, swirl kept and w, v eliminated (Glauert 1935; single unknown after
Stahlhut & Leishman 2012), reads

    G(psi) = sigma (cl cos psi - cd sin psi) - 4 F |sin phi| sin psi = 0,
    W / W0 = cos psi / (1 + sigma cd / (4 F |sin phi|)).

W > 0 confines every solution to |psi| < pi/2, and with cd > 0

    G(0) = sigma cl(theta - phi0),   G(pi/2) < 0,   G(-pi/2) > 0,

so the sign of the unloaded lift chooses the side and the bracket on that side cannot fail, from standing still to a
stopped propeller in the wind. Where several roots exist (a lift that falls steeply beyond stall), the first one going
out from psi = 0, the least induction, is taken and said.

Which root is found never depends on a starting value. `solve_lanes` solves elements and points together in batches of
`LANES` by Newton steps of second order, a form that the compiler turns into vector instructions; a lane's root stands
only if a few bounds of the polar prove it to be the first one. `prove_roots` takes the harder ones and proves them
interval by interval, or walks from where the proof ends; `search_roots` walks outward from psi = 0 for the rest, among
them Buhl's branch. The proofs work on

    h(psi) = G / (sigma cos psi) = cl - tan psi (cd + X),   X = 4 F |sin phi| / sigma,

whose slope is -cl' - (cd + X) / cos^2 psi + tan psi (cd' - X'): X does not fall as |sin phi| grows, so h has one root
where the lift rises at least as fast as the drag, or where X outweighs the steepest fall of the lift.

Windmill (unloaded lift negative, axial flow kept): where the axial induction factor a = -w/V exceeds 0.4 the annulus
thrust follows Buhl 2005 (NREL/TP-500-36834) instead, which joins the momentum parabola with equal slope.

Conventions of this file: floats and contiguous float64 arrays only, no defaults, no globals but literal constants,
nothing raises; every result carries a status (0 not run, 1 converged, 2 several roots, 3 flow reversed,
4 not converged).
"""

from __future__ import annotations

import math
import os

import numba
import numpy as np

# `nnan` and `ninf` stay out: they would make isnan lie. These only let products and sums be fused and regrouped.
# Without the runtime's reference counts (`_nrt`), array arguments cost nothing; so nothing here may allocate.
_jit = numba.njit(  # type: ignore[call-overload]
    nogil=True,
    _nrt=False,
    cache=os.environ.get("BEMT_NO_KERNEL_CACHE", "") == "",
    error_model="numpy",
    fastmath={"contract", "arcp", "nsz", "reassoc"},
)

# Columns of the element array.
E_RADIUS = 0  # r [m]
E_WIDTH = 1  # dr [m]
E_CHORD = 2  # c [m]
E_TWIST = 3  # chord line from the plane of rotation [rad]
E_SOLIDITY = 4  # B c / (2 pi r)
E_TIP = 5  # sqrt of (B/2)(R - r)/r, large where there is no loss: starting values come from it
E_ROOT = 6  # sqrt of (B/2)(r - r_root)/r_root, large where there is no loss
E_DIVERGENCE = 7  # Korn's kappa less thickness: drag-divergence Mach number at no lift
E_TABLE_BETA = 8  # sqrt(1 - M^2) at the Mach number of the polar itself
E_LN_RE_LOW = 9  # trusted range of ln Re
E_LN_RE_HIGH = 10
E_OUTSIDE = 11  # 1 where thickness or camber leave the section data
E_POLAR = 12  # index of the element's polar
E_LOSS = 13  # index of the element's table of the loss at the tip
E_LOSS_SCALE = 14  # the argument of that table is this over sqrt|sin phi|; E_TIP for Prandtl's law
E_MACH_LOW = 15  # trusted range of the Mach number
E_MACH_HIGH = 16
E_COLUMNS = 17

# Columns of the bounds array, per polar and Reynolds number [rad].
B_RISE_LOW = 0  # lift rises at least as fast as drag changes between these angles
B_RISE_HIGH = 1
B_FALL_HIGH = 2  # steepest fall of lift (and change of drag) above the rise [1/rad]
B_FALL_LOW = 3  # the same below it
B_STALL_LOW = 4  # angles of least and largest two-dimensional lift
B_STALL_HIGH = 5
B_DATA_LOW = 6  # angles that the data cover
B_DATA_HIGH = 7
B_CLIMB_HIGH = 8  # steepest climb of lift (and change of drag) above the rise [1/rad]
B_TROUGH_FROM = 9  # above the rise, lift is least at an end of any interval that leaves out these angles
B_TROUGH_TO = 10
B_TROUGH_LIFT = 11  # least lift between them
B_PEAK_LIFT = 12  # largest lift above the rise
B_CALM_FROM = 13  # above this angle, well past stall, ...
B_CALM_FALL = 14  # ... -dcl/dalpha + |dcd/dalpha|/2 is no more than this [1/rad]
B_PEAK_AT = 15  # angle of the largest lift above the rise, below 45 deg
B_CLIMB_LOW = 16  # steepest climb of lift (and change of drag) below the rise [1/rad]
B_RISE_LIFT = 17  # lift at the upper end of the rise
B_COLUMNS = 18

# Columns of the point array.
P_AIRSPEED = 0  # V at the disk [m/s]
P_OMEGA = 1  # angular speed [rad/s]
P_INVERSE_VISCOSITY = 2  # 1 / kinematic viscosity [s/m2]
P_INVERSE_SOUND = 3  # 1 / speed of sound [s/m]
P_COLUMNS = 4

# Rows of the state array, one value a pair of point and element; forces per unit density.
S_PSI = 0  # phi - phi0 [rad]
S_SPEED = 1  # W/W0
S_LIFT = 2
S_DRAG = 3
S_X4 = 4  # 4 F |sin phi|
S_INDUCTION = 5  # axial induction factor where Buhl's law rules, else NaN
S_STATUS = 6  # 1 to 4; on the way -1 for a root without proof, 0 for none
S_THRUST = 7  # of the annulus [m4/s2]
S_TORQUE = 8  # [m5/s2]
S_STALLED = 9  # 1 where beyond the stall, outside the data, below Re 60 000
S_OUTSIDE = 10
S_LOW_RE = 11
S_DIVERGED = 12  # 1 above the drag-divergence Mach number
S_EVALUATIONS = 13
S_LOW = 14  # bracket of a root that has not been reached
S_HIGH = 15
S_ROWS = 16

_RESIDUAL_TOLERANCE = 1e-11  # of the sum of the residual's terms
_SPEED_TOLERANCE = 1e-5  # of W: Reynolds and Mach number lag by no more, worth 1e-6 of the forces
LOSS_CELLS = 512  # of each table of the loss at an end
_LOSS_FLOOR = 1e-4
CRITICAL_BELOW_DIVERGENCE = 0.10772173450159418  # (0.1/80)^(1/3): Lock's critical below the drag-divergence Mach number
LOWEST_DIVERGENCE = 0.3
_FADE_START = math.radians(30.0)
_FADE_END = math.radians(50.0)
_LN_60000 = math.log(60000.0)


@_jit
def _sine_cosine(x):
    """Sine and cosine; Taylor sums to the 15th order within 0.8 rad, absolute error below 2e-15."""
    if abs(x) > 0.8:
        return math.sin(x), math.cos(x)
    y = x * x
    sine = x * (
        1.0
        + y
        * (
            -1.0 / 6.0
            + y
            * (
                1.0 / 120.0
                + y
                * (
                    -1.0 / 5040.0
                    + y * (1.0 / 362880.0 + y * (-1.0 / 39916800.0 + y * (1.0 / 6227020800.0 - y / 1307674368000.0)))
                )
            )
        )
    )
    cosine = 1.0 + y * (
        -0.5
        + y
        * (
            1.0 / 24.0
            + y
            * (
                -1.0 / 720.0
                + y
                * (
                    1.0 / 40320.0
                    + y
                    * (-1.0 / 3628800.0 + y * (1.0 / 479001600.0 + y * (-1.0 / 87178291200.0 + y / 20922789888000.0)))
                )
            )
        )
    )
    return sine, cosine


@_jit
def _end_loss(k, inverse_root_sine, table, loss):
    """Loss factor of one end and its slope d ln P / d ln |sin phi|.

    P over x = k / sqrt|sin phi| comes from a table of cubics over uniform cells, the first of which is Prandtl's
    P(x) = (2/pi) acos(exp(-x^2)); tables end where P is 1 to rounding.
    """
    x = k * inverse_root_sine
    position = x * loss[0, 4]
    if position >= LOSS_CELLS:
        return 1.0, 0.0
    cell = int(position)
    t = position - cell
    cell += int(table) * LOSS_CELLS
    c1 = loss[cell, 1]
    c2 = loss[cell, 2]
    c3 = loss[cell, 3]
    value = loss[cell, 0] + t * (c1 + t * (c2 + t * c3))
    slope = (c1 + t * (2.0 * c2 + t * 3.0 * c3)) * loss[0, 4]
    return value, -0.5 * slope * x / max(value, 1e-300)


@_jit
def _loss_factor(absolute_sine, k_tip, table, k_root, loss):
    """F of both ends with a floor, and d ln F / d ln |sin phi|."""
    s = max(absolute_sine, 1e-15)
    inverse_root = 1.0 / math.sqrt(s)
    tip, tip_slope = _end_loss(k_tip, inverse_root, table, loss)
    root, root_slope = _end_loss(k_root, inverse_root, 0.0, loss)
    factor = tip * root
    if factor < _LOSS_FLOOR:
        return _LOSS_FLOOR, 0.0
    return factor, tip_slope + root_slope


@_jit
def _section(alpha, polar, row, weight, pg):
    """Lift and drag coefficient and their slopes [1/rad] at an angle of attack.

    Lift linear, drag logarithmic between the rows of two Reynolds numbers; `pg` is Prandtl and Glauert's factor, which
    fades out where the flow is separated anyway.
    """
    last = polar.shape[1] - 1
    step = last / (2.0 * math.pi)
    position = (alpha + math.pi) * step
    if position < 0.0:
        position += last
    elif position > last:
        position -= last
    cell = min(max(int(position), 0), last - 1)
    t = position - cell
    lift_0 = polar[row, cell, 0] + weight * (polar[row + 1, cell, 0] - polar[row, cell, 0])
    log_0 = polar[row, cell, 1] + weight * (polar[row + 1, cell, 1] - polar[row, cell, 1])
    lift_1 = polar[row, cell + 1, 0] + weight * (polar[row + 1, cell + 1, 0] - polar[row, cell + 1, 0])
    log_1 = polar[row, cell + 1, 1] + weight * (polar[row + 1, cell + 1, 1] - polar[row, cell + 1, 1])
    lift_slope = (lift_1 - lift_0) * step
    log_slope = (log_1 - log_0) * step
    lift = lift_0 + t * (lift_1 - lift_0)
    drag = math.exp(log_0 + t * (log_1 - log_0))
    drag_slope = drag * log_slope
    gain = pg - 1.0
    if gain > 0.0:
        away = abs(alpha)
        if away <= _FADE_START:
            lift *= pg
            lift_slope *= pg
        elif away < _FADE_END:
            fade = (_FADE_END - away) / (_FADE_END - _FADE_START)
            lift_slope = lift_slope * (1.0 + gain * fade) - math.copysign(1.0, alpha) * lift * gain / (
                _FADE_END - _FADE_START
            )
            lift *= 1.0 + gain * fade
    return lift, drag, lift_slope, drag_slope


@_jit
def _row(ln_re, ln_reynolds, hint):
    """Row below a Reynolds number and the weight of the next one, held at both ends."""
    row = hint
    while row > 0 and ln_re < ln_reynolds[row]:
        row -= 1
    while row < ln_reynolds.shape[0] - 2 and ln_re >= ln_reynolds[row + 1]:
        row += 1
    weight = (ln_re - ln_reynolds[row]) / (ln_reynolds[row + 1] - ln_reynolds[row])
    return row, min(max(weight, 0.0), 1.0)


@_jit
def _compressibility(mach, lift, element):
    """Prandtl and Glauert's factor and the drag rise.

    The Mach number is held at drag divergence (Korn: kappa - t/c - |cl|/10) for the lift; the drag rise
    20 (M - Mcr)^4 starts at Mcr = Mdd - (0.1/80)^(1/3) (Lock).
    """
    divergence = max(element[E_DIVERGENCE] - 0.1 * min(abs(lift), 2.0), LOWEST_DIVERGENCE)
    held = min(mach, divergence)
    pg = max(element[E_TABLE_BETA] / math.sqrt(1.0 - held * held), 1.0)
    above = mach - (divergence - CRITICAL_BELOW_DIVERGENCE)
    rise = 20.0 * above * above * above * above if above > 0.0 else 0.0
    return pg, min(rise, 0.5)


@_jit
def _residual(psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss):
    """G(psi) and what belongs to it.

    Returns G, dG/dpsi, lift, drag, 4 F |sin phi|, sin phi, cos phi, the scale of G's terms, W/W0, d ln W/dpsi,
    dlift/dpsi, ddrag/dpsi and d(4 F |sin phi|)/dpsi.
    """
    sine, cosine = _sine_cosine(psi)
    s = s0 * cosine + c0 * sine
    c = c0 * cosine - s0 * sine
    factor, loss_slope = _loss_factor(abs(s), element[E_LOSS_SCALE], element[E_LOSS], element[E_ROOT], loss)
    lift, drag, lift_slope, drag_slope = _section(alpha_0 - psi, polar, row, weight, pg)
    drag += rise
    sigma = element[E_SOLIDITY]
    x4 = 4.0 * factor * abs(s)
    # d(4 F |s|)/d phi = 4 F (1 + d ln F/d ln|s|) d|s|/d phi
    x4_slope = 4.0 * factor * (1.0 + loss_slope) * math.copysign(c, s * c)
    value = sigma * (lift * cosine - drag * sine) - x4 * sine
    slope = (
        sigma * (drag_slope * sine - lift_slope * cosine - lift * sine - drag * cosine) - x4_slope * sine - x4 * cosine
    )
    scale = sigma * (abs(lift * cosine) + drag) + x4 * abs(sine)
    brake = sigma * drag / max(x4, 1e-300)
    speed = max(cosine, 1e-12) / (1.0 + brake)
    ln_slope = -sine / max(cosine, 1e-12) + (sigma * drag_slope + brake * x4_slope) / (max(x4, 1e-300) * (1.0 + brake))
    return value, slope, lift, drag, x4, s, c, scale, speed, ln_slope, -lift_slope, -drag_slope, x4_slope


@_jit
def _high_induction(kappa, factor):
    """Axial induction factor from kappa = -sigma cn / (4 F sin^2 phi), Buhl's law above 2/3, momentum below."""
    if kappa <= 2.0 / 3.0:
        return kappa / (1.0 + kappa)
    doubled = 2.0 * factor * kappa
    gamma_1 = doubled - (10.0 / 9.0 - factor)
    gamma_2 = doubled - factor * (4.0 / 3.0 - factor)
    gamma_3 = doubled - (25.0 / 9.0 - 2.0 * factor)
    if abs(gamma_3) < 1e-6:
        return 1.0 - 0.5 / math.sqrt(gamma_2)
    return (gamma_1 - math.sqrt(gamma_2)) / gamma_3


@_jit
def _windmill_residual(psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss):
    """G(psi) on the windmill side, for phi within (0, phi0): momentum up to a = 0.4, Buhl's branch above.

    Returns G, lift, drag, 4 F sin phi, the scale of G's terms, W/W0 and the axial induction factor.
    """
    value, _, lift, drag, x4, s, c, scale, speed, _, _, _, _ = _residual(
        psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
    )
    sigma = element[E_SOLIDITY]
    if s < 1e-12:  # the plane of rotation, where Buhl's branch ends: G -> sigma cd sin phi0
        return sigma * drag * s0, lift, drag, x4, scale, speed, 1.0
    kappa = -sigma * (lift * c - drag * s) / (x4 * s)
    if kappa <= 2.0 / 3.0:
        return value, lift, drag, x4, scale, speed, kappa / (1.0 + kappa)
    a = _high_induction(min(kappa, 1e10), 0.25 * x4 / s)
    turned = c0 * x4 * s / (1.0 - a)
    value = s0 * (x4 * c + sigma * (lift * s + drag * c)) - turned
    scale = s0 * (x4 * c + sigma * (abs(lift * s) + drag)) + turned
    return value, lift, drag, x4, scale, max(s0 * (1.0 - a) / s, 1e-12), a


@_jit
def _bound(bounds, row, column, larger):
    """Return a bound that holds for every blend of two Reynolds rows: the larger or the smaller of theirs."""
    if larger:
        return max(bounds[row, column], bounds[row + 1, column])
    return min(bounds[row, column], bounds[row + 1, column])


@_jit
def _falls_between(alpha_0, near, far, drag_weight, least, polar, row, weight, pg):
    """Whether -cl' + drag_weight |cd'| stays below `least` in every cell of the polar between two values of psi."""
    cell = 2.0 * math.pi / (polar.shape[1] - 1)
    low = math.floor((alpha_0 - max(near, far) + math.pi) / cell)
    high = math.ceil((alpha_0 - min(near, far) + math.pi) / cell)
    if high - low > 30.0:
        return False
    middle = (low + 0.5) * cell - math.pi
    for _ in range(int(high - low)):
        _, _, lift_slope, drag_slope = _section(middle, polar, row, weight, pg)
        if drag_weight * abs(drag_slope) - lift_slope > least:
            return False
        middle += cell
    return True


@_jit
def _clear_beyond_stall(
    reach, alpha_0, s0, c0, sigma, rise, x4, flat, at, n_alpha, weight, trough_from, trough_to, trough_lift
):
    """How far h stays positive from psi = 0 towards `reach`, all of it beyond stall.

    Interval by interval, each by the least lift in it, the drag at its stalled end, which is the largest, and the
    smaller of two bounds of 4 F |sin phi|: that without loss at the ends, and `x4`, its value further out.
    """
    scale = (n_alpha - 1) / (2.0 * math.pi)
    here, here_0, here_1, drag = 0.0, -1.0, -1.0, 0.0
    width = 0.0
    for k in range(24):
        angle = min(here + width, reach)
        place = (alpha_0 - angle + math.pi) * scale
        cell = int(place)
        t = place - cell
        j = at + 2 * cell
        u = j + 2 * n_alpha
        there_0 = flat[j] + t * (flat[j + 2] - flat[j])
        there_1 = flat[u] + t * (flat[u + 2] - flat[u])
        if k > 0:
            least = (1.0 - weight) * min(here_0, there_0) + weight * min(here_1, there_1)
            if alpha_0 - here >= trough_from and alpha_0 - angle <= trough_to:
                least = min(least, trough_lift)
            # tan x <= x + 0.44 x^3 below 0.78; sin(phi0 + psi) <= s0 + c0 psi
            tangent = angle * (1.0 + 0.44 * angle * angle)
            if least * sigma <= tangent * (sigma * drag + min(4.0 * (s0 + c0 * angle), x4)):
                width *= 0.4
                if width < 0.004:
                    return here
                continue
            if angle >= reach:
                return reach
        drag = rise + math.exp(max(max(flat[j + 1], flat[j + 3]), max(flat[u + 1], flat[u + 3])))
        here, here_0, here_1 = angle, there_0, there_1
        if k == 0:
            width = 0.5 * reach
    return here


@_jit
def _dead_beyond(psi, end, alpha_0, s0, c0, sigma, pg, x4_end, peak, peak_from, peak_to, flat, at, n_alpha, weight):
    """Whether h stays negative from psi to `end`, lift beyond stall being largest at an interval's ends or its peak.

    Interval by interval, each by the largest lift in it and the least of tan psi X, with the loss at `end` (`x4_end`
    over sin phi there), which is the strongest, and no drag.
    """
    scale = (n_alpha - 1) / (2.0 * math.pi)
    sine, cosine = _sine_cosine(end)
    lossy = x4_end / (s0 * cosine + c0 * sine)
    here, here_0, here_1 = psi, 0.0, 0.0
    width = 0.0
    for k in range(24):
        angle = min(here + width, end)
        place = (alpha_0 - angle + math.pi) * scale
        cell = int(place)
        t = place - cell
        j = at + 2 * cell
        u = j + 2 * n_alpha
        there_0 = flat[j] + t * (flat[j + 2] - flat[j])
        there_1 = flat[u] + t * (flat[u + 2] - flat[u])
        if k > 0:
            most = (1.0 - weight) * max(here_0, there_0) + weight * max(here_1, there_1)
            if alpha_0 - here >= peak_from and alpha_0 - angle <= peak_to:
                most = max(most, peak)
            # tan x >= x; sin(phi0 + psi) >= s0 + (c0 - s0 psi/2) psi - psi^3/6
            s = s0 + here * (c0 - 0.5 * s0 * here - here * here / 6.0)
            if pg * most * sigma >= here * lossy * s:
                width *= 0.4
                if width < 0.004:
                    return False
                continue
            if angle >= end:
                return True
        here, here_0, here_1 = angle, there_0, there_1
        if k == 0:
            width = 0.3 * (end - psi)
    return False


@_jit
def _too_small(angle, s0, c0, sigma, peak, k_tip, table, k_root, loss):
    """Whether even the largest lift cannot hold h up from a value of psi on."""
    if angle > 0.78:
        return False
    sine, cosine = _sine_cosine(angle)
    s = s0 * cosine + c0 * sine
    factor, _ = _loss_factor(s, k_tip, table, k_root, loss)
    return sine * 4.0 * factor * s > cosine * sigma * peak


@_jit
def _first_and_alone(
    psi, tangent, s, c, alpha_0, s0, c0, x4, lift, drag, element, polar, bounds, row, weight, pg, rise, loss
):
    """Prove that a root of G is the first one going out from psi = 0.

    Returns 1 where it is and no other can follow, 2 where it is and others may follow, 0 where there is no proof and
    -1 where none can be; and how far out from psi = 0 there is no root for certain.
    """
    sigma = element[E_SOLIDITY]
    if not (s > 0.0 and c > 0.0 and abs(psi) < 0.25 * math.pi):
        return -1, 0.0
    if -sigma * (lift * c - drag * s) > 2.0 / 3.0 * x4 * s:
        return -1, 0.0  # a > 0.4: Buhl's branch
    rise_low = _bound(bounds, row, B_RISE_LOW, True)
    rise_high = _bound(bounds, row, B_RISE_HIGH, False)
    gain = 4.0 * (pg - 1.0)
    if psi <= 0.0:
        if alpha_0 >= rise_low and alpha_0 - psi <= rise_high:
            return 1, psi
        tangent = abs(tangent)
        steadied = x4 * (1.0 + tangent * tangent - tangent * c / s) / sigma
        fall = _bound(bounds, row, B_FALL_LOW, True)
        if alpha_0 - psi > rise_high:
            fall = max(fall, _bound(bounds, row, B_FALL_HIGH, True))
        if steadied >= pg * fall + gain or _falls_between(
            alpha_0, 0.0, psi, tangent, steadied - gain, polar, row, weight, pg
        ):
            return 1, psi
        return -1, 0.0
    if alpha_0 < rise_low:
        return -1, 0.0
    if alpha_0 <= rise_high:
        return 1, psi
    fall = pg * _bound(bounds, row, B_FALL_HIGH, True) + gain
    last = 1 if x4 >= fall * sigma or alpha_0 - psi <= rise_high else 2
    # Beyond stall h must stay positive up to where lift rises again, or nearly to the root and fall from there.
    reach = min(alpha_0 - rise_high, 0.8 * psi)
    n_alpha = polar.shape[1]
    clear = _clear_beyond_stall(
        reach,
        alpha_0,
        s0,
        c0,
        sigma,
        rise,
        x4,
        polar.reshape(-1),
        2 * row * n_alpha,
        n_alpha,
        weight,
        _bound(bounds, row, B_TROUGH_FROM, False),
        _bound(bounds, row, B_TROUGH_TO, True),
        _bound(bounds, row, B_TROUGH_LIFT, False),
    )
    if clear < reach:
        return 0, clear
    if alpha_0 - reach <= rise_high:
        return last, psi
    calm = _bound(bounds, row, B_CALM_FROM, True)
    calm_fall = pg * _bound(bounds, row, B_CALM_FALL, True) + gain
    if alpha_0 - psi >= calm and 0.8 * x4 >= sigma * calm_fall and alpha_0 - calm < 0.46:
        # sin(phi0 + 0.8 psi) >= 0.8 sin(phi0 + psi) and tan psi < 0.5: h falls on to the root, and from it to `calm`.
        peak = pg * _bound(bounds, row, B_PEAK_LIFT, True)
        return 1 if _too_small(
            alpha_0 - calm, s0, c0, sigma, peak, element[E_LOSS_SCALE], element[E_LOSS], element[E_ROOT], loss
        ) else last, psi
    sine, cosine = _sine_cosine(reach)
    near = s0 * cosine + c0 * sine
    factor, _ = _loss_factor(near, element[E_LOSS_SCALE], element[E_LOSS], element[E_ROOT], loss)
    if _falls_between(alpha_0, reach, psi, tangent, 4.0 * factor * near / sigma - gain, polar, row, weight, pg):
        return last, psi
    return 0, reach


@_jit
def _any_residual(windmill, psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss):
    """G, drag, 4 F |sin phi| and W/W0 on either branch."""
    if windmill:
        value, _, drag, x4, _, speed, _ = _windmill_residual(
            psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
        )
        return value, drag, x4, speed
    value, _, _, drag, x4, _, _, _, speed, _, _, _, _ = _residual(
        psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
    )
    return value, drag, x4, speed


@_jit
def _search(side, windmill, start, end, alpha_0, s0, c0, element, polar, bounds, row, weight, pg, rise, loss):
    """Walk outward from one value of psi towards another to the first change of sign of G.

    From knot to knot of the polar, between which lift is linear; half a cell where h is small and the lift falls
    steeply, since only there could a cell hold two roots. Away
    from Buhl's branch longer steps are taken where the slope of h allows without missing a root.

    Returns psi before and behind the first root, whether one was found, and evaluations.
    """
    cell = 2.0 * math.pi / (polar.shape[1] - 1)
    sigma = element[E_SOLIDITY]
    fall = pg * max(_bound(bounds, row, B_FALL_LOW, True), _bound(bounds, row, B_FALL_HIGH, True)) + 4.0 * (pg - 1.0)
    climb = pg * _bound(bounds, row, B_CLIMB_HIGH, True) + 4.0 * (pg - 1.0)
    climb_low = pg * _bound(bounds, row, B_CLIMB_LOW, True) + 4.0 * (pg - 1.0)
    rise_high = _bound(bounds, row, B_RISE_HIGH, False)
    rise_low = _bound(bounds, row, B_RISE_LOW, True)
    here = start
    value, drag, x4, _ = _any_residual(windmill, here, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss)
    evaluations = 1
    while here != end and evaluations < 2000:
        knot = (alpha_0 - here + math.pi) / cell
        knot = math.floor(knot - 1e-6) if side > 0 else math.ceil(knot + 1e-6)
        step = abs(alpha_0 + math.pi - cell * knot - here)
        x = x4 / sigma
        sine, cosine = math.sin(here), math.cos(here)
        s = s0 * cosine + c0 * sine
        if side < 0 and s * x > 6.5:
            # Far from Buhl's branch for any force a section can have. Outward alpha rises and X falls, so -h grows by
            # no more than cl' + (1 + tan^2)(cd + X) + |tan| (|cd'| + X cot phi).
            tangent = (abs(sine) + 0.1 * cosine) / (cosine - 0.1 * abs(sine))
            deep = rise_low - alpha_0 + here
            steep = (climb_low if deep > 0.0 else 8.0 * pg) + 1.05 * (1.0 + tangent * tangent) * (x + drag)
            steep += tangent * (x * max(c0 * cosine - s0 * sine, 0.0) / s + 2.0)
            reach = min(0.8 * abs(value) / (sigma * cosine * steep), 0.1)
            step = max(step, min(reach, deep) if deep > 0.0 else reach)
        elif not windmill:
            separated = side > 0 and alpha_0 - here > rise_high
            steep = (climb if separated else 8.0 * pg) + 2.0 * (drag + x + 1.0) / (cosine * cosine)
            reach = 0.5 * abs(value) / (sigma * cosine * steep)
            if separated:
                reach = min(reach, max(alpha_0 - here - rise_high, 0.0))
            step = max(step, reach)
        if abs(value) < 0.05 * sigma and x < 2.0 * fall and 0.51 * cell < step < 1.01 * cell:
            step *= 0.5
        there = here + side * step
        if abs(there) >= abs(end):
            there = end
        beyond, drag, x4, _ = _any_residual(
            windmill, there, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
        )
        evaluations += 1
        if (beyond > 0.0) != (value > 0.0):
            return here, there, True, evaluations
        here = there
        value = beyond
    return here, here, False, evaluations


@_jit
def _another_beyond(side, windmill, psi, alpha_0, phi_0, s0, c0, element, polar, bounds, row, weight, pg, rise, loss):
    """Whether G changes sign again further out: the stall offers several roots.

    On the propeller side h cannot return where even the largest lift is too small, nor beyond where it must fall;
    elsewhere it is tried every few cells of the polar. Returns the answer and evaluations.
    """
    cell = 2.0 * math.pi / (polar.shape[1] - 1)
    sigma = element[E_SOLIDITY]
    end = -phi_0 if windmill and side < 0 else 0.5 * math.pi * side
    gain = 4.0 * (pg - 1.0)
    fall = pg * _bound(bounds, row, B_FALL_HIGH, True) + gain
    peak = pg * _bound(bounds, row, B_PEAK_LIFT, True)
    rise_high = _bound(bounds, row, B_RISE_HIGH, False)
    propeller = side > 0 and not windmill
    here = psi
    evaluations = 0
    first = True
    while abs(here) < abs(end):
        step = 4.0 * cell if propeller else max(4.0 * cell, 0.15 * abs(end - psi))
        if propeller and phi_0 + here < 0.5 * math.pi and here < 0.25 * math.pi:
            sine, cosine = _sine_cosine(here)
            s = s0 * cosine + c0 * sine
            factor, _ = _loss_factor(s, element[E_LOSS_SCALE], element[E_LOSS], element[E_ROOT], loss)
            x = 4.0 * factor * s / sigma
            if x >= fall or alpha_0 - here <= rise_high:
                return False, evaluations
            if not first and peak * cosine < sine * x:
                return False, evaluations
            step = 2.0 * cell
            if alpha_0 - here - step < rise_high:
                step = alpha_0 - here - rise_high + 1e-9
            if first and _falls_between(
                alpha_0, here, here + step, math.tan(here + step), x - gain, polar, row, weight, pg
            ):
                here += step
                first = False
                continue
        first = False
        here += side * step
        if abs(here) > abs(end):
            break
        value, _, _, _ = _any_residual(windmill, here, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss)
        evaluations += 1
        if value * side > 0.0:
            return True, evaluations
    return False, evaluations


@_jit
def _follow(
    windmill,
    frozen,
    psi,
    low,
    high,
    speed,
    lift,
    mach_0,
    ln_re_0,
    row,
    alpha_0,
    s0,
    c0,
    element,
    polar,
    ln_reynolds,
    loss,
):
    """Newton steps to the root between two angles while Reynolds and Mach number follow the local speed, or held.

    G falls through the root. The bracket guards each step and is opened, each time by more, when the moving Reynolds
    number has carried the root across an end.

    Returns done, psi, W/W0, lift, drag, 4 F |sin phi|, induction factor, row, weight, Prandtl and Glauert's factor,
    drag rise and evaluations.
    """
    cell = 2.0 * math.pi / (polar.shape[1] - 1)
    inner, outer = low, high
    opened = 0.25 * cell
    drag, x4, a = 0.0, 0.0, math.nan
    weight, pg, rise = 0.0, 1.0, 0.0
    for count in range(60):
        row, weight = _row(ln_re_0 + math.log(speed), ln_reynolds, row)
        pg, rise = _compressibility(mach_0 * speed, lift, element)
        if windmill:
            value, lift, drag, x4, scale, now, a = _windmill_residual(
                psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
            )
            tiny = 1e-7 if psi < -1e-7 else -1e-7
            shifted, _, _, _, _, speed_shifted, _ = _windmill_residual(
                psi + tiny, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
            )
            slope = (shifted - value) / tiny
            ln_slope = (speed_shifted / now - 1.0) / tiny
        else:
            value, slope, lift, drag, x4, _, _, scale, now, ln_slope, _, _, _ = _residual(
                psi, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss
            )
        near = frozen or abs(now - speed) <= _SPEED_TOLERANCE * speed
        if near and abs(value) <= _RESIDUAL_TOLERANCE * scale:
            return True, psi, now, lift, drag, x4, a, row, weight, pg, rise, count + 1
        if value > 0.0:
            inner = psi
        else:
            outer = psi
        if outer - inner < 1e-13 or (count > 3 and not near and outer - inner < 1e-6):
            # The bracket has closed on an older Reynolds number's root: open it again.
            inner, outer = psi - opened, psi + opened
            if low >= 0.0:
                inner = max(inner, 0.0)
            if high <= 0.0:
                outer = min(outer, 0.0)
            opened *= 2.0
        step = psi - value / slope
        if not (slope < 0.0 and inner <= step <= outer):
            step = 0.5 * (inner + outer)
        if not frozen:
            ln_move = ln_slope * (step - psi)
            speed = now * (1.0 + ln_move) if abs(ln_move) < 0.1 else now
        psi = step
    return False, psi, speed, lift, drag, x4, a, row, weight, pg, rise, 60


@_jit
def _branch(alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss):
    """Side of the root and whether Buhl's law may have a part in it, from the unloaded element.

    The unloaded lift chooses the side, unless drag alone already holds the flow up beyond a = 0.4 (a nearly stopped
    propeller of high solidity), where Buhl's residual does. With the unloaded lift negative the axial flow keeps its
    direction unless the blade asks for a thrust coefficient of the annulus above 2, where Buhl's law ends at a = 1,
    and momentum allows a reversed flow at all.
    """
    lift, drag, _, _ = _section(alpha_0, polar, row, weight, pg)
    sigma = element[E_SOLIDITY]
    if s0 > 0.0:
        factor, _ = _loss_factor(s0, element[E_LOSS_SCALE], element[E_LOSS], element[E_ROOT], loss)
        if sigma * ((drag + rise) * s0 - lift * c0) > 2.0 / 3.0 * 4.0 * factor * s0 * s0:
            value = _windmill_residual(0.0, alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss)[0]
            if value > 0.0:
                return 1, True
            lift = min(lift, 0.0)
    if lift > 0.0:
        return 1, False
    lift_plane, drag_plane, _, _ = _section(element[E_TWIST], polar, row, weight, pg)
    reversed_flow = s0 <= 0.0 or (
        c0 * lift_plane + s0 * (drag_plane + rise) < 0.0 and -c0 * c0 * sigma * lift_plane > 2.0 * s0 * s0
    )
    return -1, not reversed_flow


@_jit
def solve_element(airspeed, turning, element, inverse_viscosity, inverse_sound, polar, bounds, ln_reynolds, loss):
    """Solve one blade element by walking outward from its undisturbed inflow.

    Parameters
    ----------
    airspeed, turning : float
        V and Omega r [m/s], neither negative, not both 0.
    element : array (E_COLUMNS,)
    inverse_viscosity, inverse_sound : float
        1/nu [s/m2], 1/a [s/m].
    polar : array (n_re, n_alpha, 2)
        Lift and ln drag over a uniform grid of angles from -pi to pi.
    bounds : array (n_re, B_COLUMNS)
    ln_reynolds : array (n_re,)
    loss : array (n_tables LOSS_CELLS, 5)
        Tables of the loss at an end, Prandtl's first.

    Returns
    -------
    psi, speed, lift, drag, x4, induction, status, evaluations
        Angle [rad]; W/W0; coefficients; 4 F |sin phi|; axial induction factor where Buhl's law rules, else NaN.
    """
    speed_0 = math.sqrt(airspeed * airspeed + turning * turning)
    s0 = airspeed / speed_0
    c0 = turning / speed_0
    phi_0 = math.atan2(airspeed, turning)
    alpha_0 = element[E_TWIST] - phi_0
    ln_re_0 = math.log(speed_0 * element[E_CHORD] * inverse_viscosity)
    mach_0 = speed_0 * inverse_sound

    # Which root is decided at the undisturbed speed first; then Reynolds and Mach number follow the local speed.
    frozen = 1.0
    several = False
    evaluations = 0
    row = 0
    psi, speed, lift, drag, x4, a = 0.0, 1.0, 0.0, 0.0, 1.0, math.nan
    side, windmill = 1, False
    done = False
    attempt = 0
    for attempt in range(12):
        row, weight = _row(ln_re_0 + math.log(frozen), ln_reynolds, row)
        pg, rise = _compressibility(mach_0 * frozen, lift, element)
        side, windmill = _branch(alpha_0, s0, c0, element, polar, row, weight, pg, rise, loss)
        end = -phi_0 if windmill and side < 0 else 0.5 * math.pi * side
        before, behind, found, used = _search(
            side, windmill, 0.0, end, alpha_0, s0, c0, element, polar, bounds, row, weight, pg, rise, loss
        )
        evaluations += used
        if not found:
            break
        done, psi, speed, lift, drag, x4, a, row, weight, pg, rise, used = _follow(
            windmill,
            attempt == 11,
            0.5 * (before + behind),
            min(before, behind),
            max(before, behind),
            frozen,
            lift,
            mach_0,
            ln_re_0,
            row,
            alpha_0,
            s0,
            c0,
            element,
            polar,
            ln_reynolds,
            loss,
        )
        evaluations += used
        if done:
            another, used = _another_beyond(
                side, windmill, psi, alpha_0, phi_0, s0, c0, element, polar, bounds, row, weight, pg, rise, loss
            )
            evaluations += used
            several = several or another
            break
        # Following has lost the root: a fold. Choose it again at a speed nearer to its own; where none settles, the
        # Reynolds number decides between roots, and the last one is taken at the Reynolds number that chose it.
        frozen += (min(max(speed, 0.05), 2.0) - frozen) * (0.5 if attempt > 2 else 1.0)
        several = True
    induction = math.nan
    if not done or (abs(speed - frozen) > 0.2 * frozen and attempt == 11):
        return psi, speed, lift, drag, x4, induction, 4, evaluations
    if windmill and a > 0.4:
        induction = a
    if math.sin(phi_0 + psi) < 0.0 or math.cos(phi_0 + psi) < -1e-12:
        status = 3
    elif several:
        status = 2
    else:
        status = 1
    return psi, speed, lift, drag, x4, induction, status, evaluations


# The batch: where each row of the work array starts, LANES values a row. One flat array at constant offsets, so that
# the compiler sees that nothing overlaps; look-ups alone in loops of their own.
LANES = 64
(
    _W_S0,
    _W_C0,
    _W_PHI_0,
    _W_ALPHA_0,
    _W_LN_RE_0,
    _W_MACH_0,
    _W_SIGMA,
    _W_TIP,
    _W_LOSS_SCALE,
    _W_LOSS,
    _W_ROOT,
    _W_DIVERGENCE,
    _W_BETA,
    _W_PSI,
    _W_SPEED,
    _W_LIFT,
    _W_SINE,
    _W_COSINE,
    _W_S,
    _W_C,
    _W_TIP_X,
    _W_ROOT_X,
    _W_PLACE,
    _W_LN_RE,
    _W_PG,
    _W_RISE,
    _W_TIP_LOSS,
    _W_TIP_STEP,
    _W_ROOT_LOSS,
    _W_ROOT_STEP,
    _W_LN_RE_ROW,
    _W_PER_LN_RE,
    _W_LIFT_LEFT,
    _W_LIFT_STEP,
    _W_LOG_LEFT,
    _W_LOG_STEP,
    _W_CELL_SHARE,
    _W_WEIGHT,
    _W_VALUE,
    _W_SLOPE,
    _W_DRAG,
    _W_X4,
    _W_SCALE,
    _W_NOW,
    _W_LN_SLOPE,
    _W_LIFT_SLOPE,
    _W_DRAG_SLOPE,
    _W_X4_SLOPE,
    _W_X4_SECOND,
    _W_DONE,
    _W_MOVE,
    _W_AIRSPEED,
    _W_TURNING,
    _W_TIP_SQUARE,
    _W_LOW,
    _W_HIGH,
    _W_LIFT_0,
    _W_RISE_LIFT,
    _W_RISE_LOW,
    _W_FALL_LOW,
    _W_FALL_HIGH,
    _W_STALL_LOW,
    _W_STALL_HIGH,
    _W_DATA_LOW,
    _W_DATA_HIGH,
    _W_LN_RE_LOW,
    _W_LN_RE_HIGH,
    _W_STRIP,
    _W_RADIUS,
    _W_PLAIN,
    _W_STALLED,
    _W_OUTSIDE,
    _W_LOW_RE,
    _W_MACH_LOW,
    _W_MACH_HIGH,
    _W_DIVERGED,
    _W_THRUST,
    _W_TORQUE,
    _W_RISE_HIGH,
    _W_END,
) = range(0, 80 * LANES, LANES)


@_jit
def _lanes_start(n, w):
    """Undisturbed inflow of every lane from its airspeed and rotation.

    phi0 = 8 atan(t) after three halvings of the angle, error below 1e-13; ln W0 from the ratio of its square to the
    tip's, 16 artanh((x^1/8 - 1)/(x^1/8 + 1)), error below 1e-9.
    """
    for i in range(n):
        airspeed = w[_W_AIRSPEED + i]
        turning = w[_W_TURNING + i]
        square = airspeed * airspeed + turning * turning
        speed = math.sqrt(square)
        w[_W_S0 + i] = airspeed / speed
        w[_W_C0 + i] = turning / speed
        t = airspeed / (turning + speed)
        t = t / (1.0 + math.sqrt(1.0 + t * t))
        t = t / (1.0 + math.sqrt(1.0 + t * t))
        y = t * t
        phi_0 = (
            8.0
            * t
            * (
                1.0
                - y
                * (
                    1.0 / 3.0
                    - y
                    * (1.0 / 5.0 - y * (1.0 / 7.0 - y * (1.0 / 9.0 - y * (1.0 / 11.0 - y * (1.0 / 13.0 - y / 15.0)))))
                )
            )
        )
        w[_W_PHI_0 + i] = phi_0
        w[_W_ALPHA_0 + i] -= phi_0
        eighth = math.sqrt(math.sqrt(math.sqrt(square / w[_W_TIP_SQUARE + i])))
        z = (eighth - 1.0) / (eighth + 1.0)
        y = z * z
        w[_W_LN_RE_0 + i] += (
            8.0
            * z
            * (
                1.0
                + y
                * (
                    1.0 / 3.0
                    + y
                    * (1.0 / 5.0 + y * (1.0 / 7.0 + y * (1.0 / 9.0 + y * (1.0 / 11.0 + y * (1.0 / 13.0 + y / 15.0)))))
                )
            )
        )
        w[_W_MACH_0 + i] *= speed
        w[_W_PSI + i] = 0.0
        w[_W_SPEED + i] = 1.0
        w[_W_LIFT + i] = 0.0
        w[_W_DONE + i] = 0.0


@_jit
def _lanes_flow(n, w, loss_scale, angle_scale, last):
    """Angles, speeds and places in the tables of every lane at its psi and W/W0."""
    for i in range(n):
        x = w[_W_PSI + i]
        y = x * x
        sine = x * (
            1.0
            + y
            * (
                -1.0 / 6.0
                + y
                * (
                    1.0 / 120.0
                    + y
                    * (
                        -1.0 / 5040.0
                        + y
                        * (1.0 / 362880.0 + y * (-1.0 / 39916800.0 + y * (1.0 / 6227020800.0 - y / 1307674368000.0)))
                    )
                )
            )
        )
        cosine = 1.0 + y * (
            -0.5
            + y
            * (
                1.0 / 24.0
                + y
                * (
                    -1.0 / 720.0
                    + y
                    * (
                        1.0 / 40320.0
                        + y
                        * (
                            -1.0 / 3628800.0
                            + y * (1.0 / 479001600.0 + y * (-1.0 / 87178291200.0 + y / 20922789888000.0))
                        )
                    )
                )
            )
        )
        s0 = w[_W_S0 + i]
        c0 = w[_W_C0 + i]
        s = s0 * cosine + c0 * sine
        w[_W_SINE + i] = sine
        w[_W_COSINE + i] = cosine
        w[_W_S + i] = s
        w[_W_C + i] = c0 * cosine - s0 * sine
        inverse_root = loss_scale / math.sqrt(max(abs(s), 1e-15))
        w[_W_TIP_X + i] = w[_W_LOSS_SCALE + i] * inverse_root
        w[_W_ROOT_X + i] = w[_W_ROOT + i] * inverse_root
        place = (w[_W_ALPHA_0 + i] - x + math.pi) * angle_scale
        w[_W_PLACE + i] = place + last if place < 0.0 else place
    for i in range(n):
        # ln u = 2 artanh((u - 1)/(u + 1)): absolute error below 1e-7 for u from 0.4 to 2.5, where lanes end up.
        speed = w[_W_SPEED + i]
        z = (speed - 1.0) / (speed + 1.0)
        y = z * z
        series = z * (
            1.0
            + y
            * (
                1.0 / 3.0
                + y * (1.0 / 5.0 + y * (1.0 / 7.0 + y * (1.0 / 9.0 + y * (1.0 / 11.0 + y * (1.0 / 13.0 + y / 15.0)))))
            )
        )
        ln_re = w[_W_LN_RE_0 + i] + 2.0 * series
        w[_W_LN_RE + i] = ln_re
        w[_W_WEIGHT + i] = (ln_re - w[_W_LN_RE_ROW + i]) * w[_W_PER_LN_RE + i]
        mach = w[_W_MACH_0 + i] * speed
        divergence = max(w[_W_DIVERGENCE + i] - 0.1 * min(abs(w[_W_LIFT + i]), 2.0), LOWEST_DIVERGENCE)
        held = min(mach, divergence)
        w[_W_PG + i] = max(w[_W_BETA + i] / math.sqrt(1.0 - held * held), 1.0)
        above = max(mach - (divergence - CRITICAL_BELOW_DIVERGENCE), 0.0)
        square = above * above
        w[_W_RISE + i] = min(20.0 * square * square, 0.5)


@_jit
def _lanes_look_up(n, w, index, polars, ln_reynolds, loss):
    """Loss factor and the cell of the polar of every lane. Unsigned indices need no test for negative ones."""
    n_alpha = polars.shape[2]
    flat = polars.reshape(-1)
    cells = loss.reshape(-1)
    end = float(LOSS_CELLS)
    last_cell = float(n_alpha - 2)
    one, two, three, five = np.uint64(1), np.uint64(2), np.uint64(3), np.uint64(5)
    to_next_row = np.uint64(2 * n_alpha)
    for i in range(n):
        place = w[_W_TIP_X + i]
        value, step = 1.0, 0.0
        if place < end:
            cell = np.int64(place)
            t = place - cell
            at = five * np.uint64(cell + LOSS_CELLS * np.int64(w[_W_LOSS + i]))
            c1, c2, c3 = cells[at + one], cells[at + two], cells[at + three]
            value = cells[at] + t * (c1 + t * (c2 + t * c3))
            step = c1 + t * (2.0 * c2 + t * 3.0 * c3)
        w[_W_TIP_LOSS + i] = value
        w[_W_TIP_STEP + i] = step
    for i in range(n):
        place = w[_W_ROOT_X + i]
        value, step = 1.0, 0.0
        if place < end:
            cell = np.int64(place)
            t = place - cell
            at = five * np.uint64(cell)
            c1, c2, c3 = cells[at + one], cells[at + two], cells[at + three]
            value = cells[at] + t * (c1 + t * (c2 + t * c3))
            step = c1 + t * (2.0 * c2 + t * 3.0 * c3)
        w[_W_ROOT_LOSS + i] = value
        w[_W_ROOT_STEP + i] = step
    for i in range(n):
        weight = w[_W_WEIGHT + i]
        if weight < 0.0 or weight > 1.0:
            row, weight = _row(w[_W_LN_RE + i], ln_reynolds, index[LANES + i])
            index[LANES + i] = row
            w[_W_WEIGHT + i] = weight
            w[_W_LN_RE_ROW + i] = ln_reynolds[row]
            w[_W_PER_LN_RE + i] = 1.0 / (ln_reynolds[row + 1] - ln_reynolds[row])
        row = index[LANES + i]
        place = min(w[_W_PLACE + i], last_cell + 0.999999999)
        cell = np.int64(place)
        at = np.uint64(2 * ((index[i] * polars.shape[1] + row) * n_alpha + cell))
        up = at + to_next_row
        left = flat[at] + weight * (flat[up] - flat[at])
        log_left = flat[at + one] + weight * (flat[up + one] - flat[at + one])
        w[_W_LIFT_LEFT + i] = left
        w[_W_LOG_LEFT + i] = log_left
        w[_W_LIFT_STEP + i] = flat[at + two] + weight * (flat[up + two] - flat[at + two]) - left
        w[_W_LOG_STEP + i] = flat[at + three] + weight * (flat[up + three] - flat[at + three]) - log_left
        w[_W_CELL_SHARE + i] = place - cell


@_jit
def _lanes_residual(n, w, angle_scale):
    """`_residual` for every lane."""
    for i in range(n):
        t = w[_W_CELL_SHARE + i]
        lift = w[_W_LIFT_LEFT + i] + t * w[_W_LIFT_STEP + i]
        lift_slope = w[_W_LIFT_STEP + i] * angle_scale
        # exp(x) = exp(x/64)^64: Taylor to the 8th order, relative error below 1e-12 for drag from 0.001 to 5.
        x = (w[_W_LOG_LEFT + i] + t * w[_W_LOG_STEP + i]) * (1.0 / 64.0)
        e = 1.0 + x * (
            1.0
            + x
            * (
                0.5
                + x
                * (
                    1.0 / 6.0
                    + x * (1.0 / 24.0 + x * (1.0 / 120.0 + x * (1.0 / 720.0 + x * (1.0 / 5040.0 + x / 40320.0))))
                )
            )
        )
        e = e * e
        e = e * e
        e = e * e
        e = e * e
        e = e * e
        drag = e * e
        drag_slope = drag * w[_W_LOG_STEP + i] * angle_scale
        drag += w[_W_RISE + i]
        alpha = w[_W_ALPHA_0 + i] - w[_W_PSI + i]
        gain = w[_W_PG + i] - 1.0
        ramp = (_FADE_END - abs(alpha)) * (1.0 / (_FADE_END - _FADE_START))
        fade = min(max(ramp, 0.0), 1.0)
        ramp_slope = -math.copysign(1.0 / (_FADE_END - _FADE_START), alpha)
        fade_slope = ramp_slope if 0.0 < ramp < 1.0 else 0.0
        lift_slope = lift_slope * (1.0 + gain * fade) + lift * gain * fade_slope
        lift *= 1.0 + gain * fade
        sigma = w[_W_SIGMA + i]
        sine = w[_W_SINE + i]
        cosine = w[_W_COSINE + i]
        s = w[_W_S + i]
        c = w[_W_C + i]
        tip = w[_W_TIP_LOSS + i]
        root = w[_W_ROOT_LOSS + i]
        factor = tip * root
        # d ln F / d ln |s|, since both places go as |s|^-1/2
        steep = (
            -0.5
            * (w[_W_TIP_X + i] * w[_W_TIP_STEP + i] * root + w[_W_ROOT_X + i] * w[_W_ROOT_STEP + i] * tip)
            / max(factor, _LOSS_FLOOR)
        )
        steep = steep if factor > _LOSS_FLOOR else 0.0
        factor = 4.0 * max(factor, _LOSS_FLOOR)
        x4 = factor * abs(s)
        x4_slope = factor * (1.0 + steep) * (c if s > 0.0 else -c)
        w[_W_VALUE + i] = sigma * (lift * cosine - drag * sine) - x4 * sine
        w[_W_SLOPE + i] = (
            sigma * (drag_slope * sine - lift_slope * cosine - lift * sine - drag * cosine)
            - x4_slope * sine
            - x4 * cosine
        )
        w[_W_SCALE + i] = sigma * (abs(lift * cosine) + drag) + x4 * abs(sine)
        inverse = 1.0 / max(x4, 1e-300)
        brake = sigma * drag * inverse
        both = 1.0 / (cosine * (1.0 + brake))
        w[_W_NOW + i] = cosine * cosine * both
        w[_W_LN_SLOPE + i] = both * (cosine * (sigma * drag_slope + brake * x4_slope) * inverse - sine * (1.0 + brake))
        w[_W_LIFT + i] = lift
        w[_W_DRAG + i] = drag
        w[_W_X4 + i] = x4
        w[_W_LIFT_SLOPE + i] = -lift_slope
        w[_W_DRAG_SLOPE + i] = -drag_slope
        w[_W_X4_SLOPE + i] = x4_slope


@_jit
def _lanes_guess(n, w, index, polars, bounds, ln_reynolds, angle_scale, last):
    """Start of every lane from its unloaded state.

    The quadratic in psi that h is for small angles; from beyond stall, the angle at which the lift rises again, which
    parts a stalled root from an attached one.
    """
    for i in range(n):
        place = (w[_W_ALPHA_0 + i] + math.pi) * angle_scale
        w[_W_PLACE + i] = min(place + last if place < 0.0 else place, last - 1e-9)
    n_alpha = polars.shape[2]
    flat = polars.reshape(-1)
    two = np.uint64(2)
    to_next_row = np.uint64(2 * n_alpha)
    for i in range(n):
        row, weight = _row(w[_W_LN_RE_0 + i], ln_reynolds, index[LANES + i])
        index[LANES + i] = row
        w[_W_LN_RE_ROW + i] = ln_reynolds[row]
        w[_W_PER_LN_RE + i] = 1.0 / (ln_reynolds[row + 1] - ln_reynolds[row])
        place = w[_W_PLACE + i]
        cell = np.int64(place)
        at = np.uint64(2 * ((index[i] * polars.shape[1] + row) * n_alpha + cell))
        up = at + to_next_row
        left = flat[at] + weight * (flat[up] - flat[at])
        w[_W_LIFT_LEFT + i] = left
        w[_W_LIFT_STEP + i] = flat[at + two] + weight * (flat[up + two] - flat[at + two]) - left
        w[_W_CELL_SHARE + i] = place - cell
        bound = index[i]
        w[_W_RISE_HIGH + i] = min(bounds[bound, row, B_RISE_HIGH], bounds[bound, row + 1, B_RISE_HIGH])
        w[_W_RISE_LIFT + i] = bounds[bound, row, B_RISE_LIFT]
    for i in range(n):
        sigma = w[_W_SIGMA + i]
        lift = w[_W_LIFT_LEFT + i] + w[_W_CELL_SHARE + i] * w[_W_LIFT_STEP + i]
        climb = max(w[_W_LIFT_STEP + i] * angle_scale, 0.0)
        w[_W_LIFT + i] = lift
        w[_W_LIFT_0 + i] = lift
        s0 = w[_W_S0 + i]
        c0 = w[_W_C0 + i]
        # Loss at an inflow angle turned by a third of the lift's share, roughly: x (0.9 - 0.14 x^2 + 0.015 x^4).
        turned = s0 + c0 * min(0.1 * abs(lift), 0.12)
        inverse = 1.0 / turned
        tip = min(w[_W_TIP + i] * math.sqrt(inverse), 1.6)
        root = min(w[_W_ROOT + i] * math.sqrt(inverse), 1.6)
        tip_square = tip * tip
        root_square = root * root
        loss = min(tip * (0.9 - tip_square * (0.14 - 0.015 * tip_square)), 1.0)
        loss *= min(root * (0.9 - root_square * (0.14 - 0.015 * root_square)), 1.0)
        x4 = 4.0 * loss * s0
        # Beyond stall: the line on which lift would fall from where it stops rising, should the root be attached.
        stalled = w[_W_ALPHA_0 + i] - w[_W_RISE_HIGH + i]
        beyond = stalled > 0.0 and lift > 0.0
        climb = 5.5 if beyond else climb
        line = w[_W_RISE_LIFT + i] + 5.5 * stalled if beyond else lift
        b = sigma * (climb + 0.03) + x4
        root = math.sqrt(max(b * b + 16.0 * loss * c0 * sigma * line, 0.25 * b * b))
        psi = 2.0 * sigma * line / (b + root)
        psi = stalled if beyond and psi < stalled < 0.7 else psi
        w[_W_PSI + i] = min(max(psi, -0.7), 0.7)
        w[_W_SPEED + i] = max(1.0 - 0.5 * psi * psi, 0.75)
        w[_W_LOW + i] = 0.0 if lift > 0.0 else -0.78
        w[_W_HIGH + i] = 0.78 if lift > 0.0 else 0.0


@_jit
def _lanes_step(n, w):
    """Halt the lanes that have arrived, move the others by a guarded Newton step; returns how many have arrived.

    Steps are of second order: G'' from lift linear and drag exponential within a cell of the polar, and from
    4 F |sin phi| as a power of |sin phi|. A lane that has arrived stays where it is, and MOVE tells the last step, too
    small to be worth an evaluation: what it leaves out is of the order of its cube, below the tolerance.
    """
    arrived = 0.0
    for i in range(n):
        psi = w[_W_PSI + i]
        speed = w[_W_SPEED + i]
        now = w[_W_NOW + i]
        value = w[_W_VALUE + i]
        slope = w[_W_SLOPE + i]
        # Negative where the lift rises again: the root is a stalled one, and the slope says nothing about it.
        unloaded = w[_W_SIGMA + i] * w[_W_LIFT_0 + i]
        marker = abs(psi - (w[_W_ALPHA_0 + i] - w[_W_RISE_HIGH + i])) < 1e-12 and value < 0.0 < unloaded
        inverse = 1.0 / (unloaded - value if marker else slope)
        move = (psi * value if marker else -value) * inverse
        s = w[_W_S + i]
        x4 = max(w[_W_X4 + i], 1e-12)
        x4_slope = w[_W_X4_SLOPE + i]
        c = w[_W_C + i]
        drag = w[_W_DRAG + i]
        # One division for four reciprocals.
        s_c, x4_drag = (s + 1e-12) * (c + 1e-12), x4 * drag
        q = 1.0 / (s_c * x4_drag)
        tilt = c * q * (c + 1e-12) * x4_drag
        per_x4 = x4_slope * q * drag * s_c
        # d ln X / d psi = p cot phi, so X'' = X ((p cot phi)^2 - p cot^2 phi - p), and p = d ln X/d psi tan phi
        x4_second = x4 * (per_x4 * per_x4 - per_x4 * tilt) - x4_slope * s * q * (s + 1e-12) * x4_drag
        drag_slope = w[_W_DRAG_SLOPE + i]
        drag_second = drag_slope * drag_slope * q * s_c * x4
        sine = w[_W_SINE + i]
        cosine = w[_W_COSINE + i]
        second = (
            w[_W_SIGMA + i]
            * (
                -2.0 * w[_W_LIFT_SLOPE + i] * sine
                - w[_W_LIFT + i] * cosine
                - drag_second * sine
                - 2.0 * drag_slope * cosine
                + drag * sine
            )
            - x4_second * sine
            - 2.0 * x4_slope * cosine
            + x4 * sine
        )
        bend = 0.5 * second * move * inverse
        move *= 1.0 - min(max(bend, -0.3), 0.3) if not marker else 1.0
        near = abs(now - speed) <= _SPEED_TOLERANCE * speed
        closed = near and abs(value) <= _RESIDUAL_TOLERANCE * w[_W_SCALE + i]
        share = w[_W_CELL_SHARE + i]
        tiny = min(1e-5, 3e-5 * abs(s))
        closing = near and abs(move) < tiny and slope < 0.0 and 2e-3 < share < 1.0 - 2e-3
        w[_W_X4_SECOND + i] = x4_second
        done = closed or closing
        w[_W_DONE + i] = 1.0 if done else 0.0
        w[_W_MOVE + i] = move if closing and not closed else 0.0
        arrived += 1.0 if done else 0.0
        # G falls through the root. The slack leaves the last steps to Newton while the Reynolds number still moves.
        low = psi if value > 0.0 else w[_W_LOW + i]
        high = w[_W_HIGH + i] if value > 0.0 else psi
        w[_W_LOW + i] = low
        w[_W_HIGH + i] = high
        step = psi + move
        step = step if low - 1e-5 < step < high + 1e-5 else 0.5 * (low + high)
        change = 1.0 + w[_W_LN_SLOPE + i] * (step - psi)
        w[_W_PSI + i] = psi if done else step
        moved = min(max(now * min(max(change, 0.9), 1.1), 0.05), 2.0)
        w[_W_SPEED + i] = speed if done else moved
    return arrived


@_jit
def _lanes_finish(n, w, index, bounds):
    """Last step, forces and validity of every lane, and whether its root is plainly the first one.

    Plainly: the cheap part of `_first_and_alone`, that lift rises all the way or X outweighs its steepest fall. PLAIN
    becomes the status: 1 plainly, -1 a root without proof, 0 none yet.
    """
    flat = bounds.reshape(-1)
    columns = np.uint64(B_COLUMNS)
    for i in range(n):
        at = np.uint64((index[i] * bounds.shape[1] + index[LANES + i]) * B_COLUMNS)
        up = at + columns
        weight = w[_W_WEIGHT + i]
        w[_W_RISE_LOW + i] = max(flat[at + np.uint64(B_RISE_LOW)], flat[up + np.uint64(B_RISE_LOW)])
        w[_W_RISE_HIGH + i] = min(flat[at + np.uint64(B_RISE_HIGH)], flat[up + np.uint64(B_RISE_HIGH)])
        w[_W_FALL_LOW + i] = max(flat[at + np.uint64(B_FALL_LOW)], flat[up + np.uint64(B_FALL_LOW)])
        w[_W_FALL_HIGH + i] = max(flat[at + np.uint64(B_FALL_HIGH)], flat[up + np.uint64(B_FALL_HIGH)])
        left = flat[at + np.uint64(B_STALL_LOW)]
        w[_W_STALL_LOW + i] = left + weight * (flat[up + np.uint64(B_STALL_LOW)] - left)
        left = flat[at + np.uint64(B_STALL_HIGH)]
        w[_W_STALL_HIGH + i] = left + weight * (flat[up + np.uint64(B_STALL_HIGH)] - left)
        left = flat[at + np.uint64(B_DATA_LOW)]
        w[_W_DATA_LOW + i] = left + weight * (flat[up + np.uint64(B_DATA_LOW)] - left)
        left = flat[at + np.uint64(B_DATA_HIGH)]
        w[_W_DATA_HIGH + i] = left + weight * (flat[up + np.uint64(B_DATA_HIGH)] - left)
    for i in range(n):
        move = w[_W_MOVE + i]
        psi = w[_W_PSI + i] + move
        lift = w[_W_LIFT + i] + w[_W_LIFT_SLOPE + i] * move
        drag = w[_W_DRAG + i]
        drag += w[_W_DRAG_SLOPE + i] * move * (1.0 + 0.5 * w[_W_DRAG_SLOPE + i] * move / drag)
        x4 = w[_W_X4 + i] + move * (w[_W_X4_SLOPE + i] + 0.5 * move * w[_W_X4_SECOND + i])
        half = 0.5 * move * move
        s = w[_W_S + i] + w[_W_C + i] * move - w[_W_S + i] * half
        c = w[_W_C + i] - w[_W_S + i] * move - w[_W_C + i] * half
        cosine = w[_W_COSINE + i] - w[_W_SINE + i] * move - w[_W_COSINE + i] * half
        ratio = cosine / (1.0 + w[_W_SIGMA + i] * drag / max(x4, 1e-300))
        w[_W_PSI + i] = psi
        w[_W_LIFT + i] = lift
        w[_W_DRAG + i] = drag
        w[_W_X4 + i] = x4
        w[_W_NOW + i] = ratio
        w[_W_S + i] = s
        w[_W_C + i] = c
        sigma = w[_W_SIGMA + i]
        alpha_0 = w[_W_ALPHA_0 + i]
        alpha = alpha_0 - psi
        pg = w[_W_PG + i]
        normal = lift * c - drag * s
        sound = w[_W_DONE + i] == 1.0 and s > 0.0 and c > 0.0 and abs(psi) < 0.78
        sound = sound and -sigma * normal <= 2.0 / 3.0 * x4 * s
        above = alpha_0 >= w[_W_RISE_LOW + i]
        gain = 4.0 * (pg - 1.0)
        fall_high = w[_W_FALL_HIGH + i]
        # F falls as |sin phi| grows: X at psi = 0 is no less than X sin phi0 / sin phi.
        ahead = above and (alpha_0 <= w[_W_RISE_HIGH + i] or x4 * w[_W_S0 + i] >= s * sigma * (pg * fall_high + gain))
        tangent = abs(psi) * (1.0 + 0.44 * psi * psi)  # no less than tan(psi) below 0.78
        low = alpha <= w[_W_RISE_HIGH + i]
        fall = w[_W_FALL_LOW + i] if low else max(fall_high, w[_W_FALL_LOW + i])
        behind = (above and low) or x4 * (s - tangent * c) >= s * sigma * (pg * fall + gain)
        plain = sound and (ahead if psi > 0.0 else behind)
        w[_W_PLAIN + i] = 1.0 if plain else -w[_W_DONE + i]
        airspeed = w[_W_AIRSPEED + i]
        turning = w[_W_TURNING + i]
        pressure = 0.5 * ratio * ratio * (airspeed * airspeed + turning * turning) * w[_W_STRIP + i]
        w[_W_THRUST + i] = pressure * normal
        w[_W_TORQUE + i] = pressure * (lift * s + drag * c) * w[_W_RADIUS + i]
        stalled = alpha > w[_W_STALL_HIGH + i] or alpha < w[_W_STALL_LOW + i]
        w[_W_STALLED + i] = 1.0 if stalled else 0.0
        mach = w[_W_MACH_0 + i] * ratio
        divergence = max(w[_W_DIVERGENCE + i] - 0.1 * min(abs(lift), 2.0), LOWEST_DIVERGENCE)
        w[_W_DIVERGED + i] = 1.0 if mach > divergence else 0.0
        ln_re = w[_W_LN_RE + i]
        outside = alpha > w[_W_DATA_HIGH + i] or alpha < w[_W_DATA_LOW + i]
        outside = outside or mach < w[_W_MACH_LOW + i] or mach > w[_W_MACH_HIGH + i]
        outside = outside or ln_re < w[_W_LN_RE_LOW + i] or ln_re > w[_W_LN_RE_HIGH + i]
        w[_W_OUTSIDE + i] = 1.0 if outside else 0.0
        w[_W_LOW_RE + i] = 1.0 if ln_re < _LN_60000 else 0.0


@_jit
def _lanes_stalled(n, w, index, polars, bounds, loss):
    """Prove the first root of lanes whose undisturbed inflow is stalled, where a few bounds are enough."""
    flat = polars.reshape(-1)
    n_alpha = polars.shape[2]
    for i in range(n):
        psi = w[_W_PSI + i]
        reach = w[_W_ALPHA_0 + i] - w[_W_RISE_HIGH + i]
        if not (
            w[_W_PLAIN + i] == -1.0
            and w[_W_ALPHA_0 + i] >= w[_W_RISE_LOW + i]
            and 0.0 < psi < 0.78
            and reach > 0.0
            and w[_W_C + i] > 0.0
            and w[_W_THRUST + i] > 0.0
        ):
            continue
        at, row = index[i], index[LANES + i]
        if reach > psi:
            # A stalled root well past the fall of the lift, and lift too small for another one further out.
            angle = w[_W_ALPHA_0 + i] - max(bounds[at, row, B_CALM_FROM], bounds[at, row + 1, B_CALM_FROM])
            pg = w[_W_PG + i]
            fall = pg * max(bounds[at, row, B_CALM_FALL], bounds[at, row + 1, B_CALM_FALL]) + 4.0 * (pg - 1.0)
            if not (psi < angle < 0.46 and 0.8 * w[_W_X4 + i] >= w[_W_SIGMA + i] * fall):
                continue
            # From there on lift must stay too small for another root, until it rises or X outweighs its fall.
            sine, cosine = _sine_cosine(reach)
            s_end = w[_W_S0 + i] * cosine + w[_W_C0 + i] * sine
            factor, _ = _loss_factor(s_end, w[_W_LOSS_SCALE + i], w[_W_LOSS + i], w[_W_ROOT + i], loss)
            if reach > 0.78 or not _dead_beyond(
                angle,
                reach,
                w[_W_ALPHA_0 + i],
                w[_W_S0 + i],
                w[_W_C0 + i],
                w[_W_SIGMA + i],
                pg,
                4.0 * factor * s_end,
                max(bounds[at, row, B_PEAK_LIFT], bounds[at, row + 1, B_PEAK_LIFT]),
                min(bounds[at, row, B_PEAK_AT], bounds[at, row + 1, B_PEAK_AT]),
                max(bounds[at, row, B_PEAK_AT], bounds[at, row + 1, B_PEAK_AT]),
                flat,
                2 * (at * polars.shape[1] + row) * n_alpha,
                n_alpha,
                w[_W_WEIGHT + i],
            ):
                continue
            reach = 0.8 * psi
        clear = _clear_beyond_stall(
            reach,
            w[_W_ALPHA_0 + i],
            w[_W_S0 + i],
            w[_W_C0 + i],
            w[_W_SIGMA + i],
            w[_W_RISE + i],
            w[_W_X4 + i],
            flat,
            2 * (at * polars.shape[1] + row) * n_alpha,
            n_alpha,
            w[_W_WEIGHT + i],
            min(bounds[at, row, B_TROUGH_FROM], bounds[at, row + 1, B_TROUGH_FROM]),
            max(bounds[at, row, B_TROUGH_TO], bounds[at, row + 1, B_TROUGH_TO]),
            min(bounds[at, row, B_TROUGH_LIFT], bounds[at, row + 1, B_TROUGH_LIFT]),
        )
        if clear == reach:
            w[_W_PLAIN + i] = 1.0


@_jit
def _lanes_load(n, w, index, points, elements, ln_chord, tip_square, ln_re_per_chord, blades):
    """Put the point and the element of every lane in its place."""
    for i in range(n):
        p, e = index[2 * LANES + i], index[3 * LANES + i]
        w[_W_AIRSPEED + i] = points[p, P_AIRSPEED]
        w[_W_TURNING + i] = points[p, P_OMEGA] * elements[e, E_RADIUS]
        w[_W_TIP_SQUARE + i] = tip_square[p]
        w[_W_ALPHA_0 + i] = elements[e, E_TWIST]
        w[_W_LN_RE_0 + i] = ln_re_per_chord[p] + ln_chord[e]
        w[_W_MACH_0 + i] = points[p, P_INVERSE_SOUND]
        w[_W_SIGMA + i] = elements[e, E_SOLIDITY]
        w[_W_TIP + i] = elements[e, E_TIP]
        w[_W_LOSS_SCALE + i] = elements[e, E_LOSS_SCALE]
        w[_W_LOSS + i] = elements[e, E_LOSS]
        w[_W_ROOT + i] = elements[e, E_ROOT]
        w[_W_DIVERGENCE + i] = elements[e, E_DIVERGENCE]
        w[_W_BETA + i] = elements[e, E_TABLE_BETA]
        w[_W_RADIUS + i] = elements[e, E_RADIUS]
        w[_W_STRIP + i] = blades * elements[e, E_CHORD] * elements[e, E_WIDTH]
        w[_W_LN_RE_LOW + i] = elements[e, E_LN_RE_LOW]
        w[_W_LN_RE_HIGH + i] = elements[e, E_LN_RE_HIGH]
        w[_W_MACH_LOW + i] = elements[e, E_MACH_LOW]
        w[_W_MACH_HIGH + i] = elements[e, E_MACH_HIGH]
        index[i] = int(elements[e, E_POLAR])


@_jit
def _lanes_store(count, w, index, n_elements, rounds, state):
    """Put the result of the first lanes in its place in the state."""
    for i in range(count):
        pair = index[2 * LANES + i] * n_elements + index[3 * LANES + i]
        state[S_PSI, pair] = w[_W_PSI + i]
        # A lane that has not arrived goes on from its next step, not from the last one evaluated.
        state[S_SPEED, pair] = w[_W_NOW + i] if w[_W_DONE + i] == 1.0 else w[_W_SPEED + i]
        state[S_LIFT, pair] = w[_W_LIFT + i]
        state[S_DRAG, pair] = w[_W_DRAG + i]
        state[S_X4, pair] = w[_W_X4 + i]
        state[S_INDUCTION, pair] = math.nan
        state[S_STATUS, pair] = w[_W_PLAIN + i]
        state[S_THRUST, pair] = w[_W_THRUST + i]
        state[S_TORQUE, pair] = w[_W_TORQUE + i]
        state[S_STALLED, pair] = w[_W_STALLED + i]
        state[S_OUTSIDE, pair] = w[_W_OUTSIDE + i]
        state[S_LOW_RE, pair] = w[_W_LOW_RE + i]
        state[S_DIVERGED, pair] = w[_W_DIVERGED + i]
        state[S_EVALUATIONS, pair] = rounds
        state[S_LOW, pair] = w[_W_LOW + i]
        state[S_HIGH, pair] = w[_W_HIGH + i]


@_jit
def solve_lanes(points, elements, polars, bounds, ln_reynolds, loss, blades, state, scratch, index):
    """Solve every element at every point by Newton steps, and keep each root that is plainly the first one.

    Three steps are enough for most; the others are gathered into batches of their own and keep nobody waiting.

    Parameters
    ----------
    points : array (n_points, P_COLUMNS)
        Each solved by itself: neither order nor number matters.
    elements : array (n_elements, E_COLUMNS)
    polars : array (n_polars, n_re, n_alpha, 2)
    bounds : array (n_polars, n_re, B_COLUMNS)
    ln_reynolds : array (n_re,)
    loss : array (n_tables LOSS_CELLS, 5)
    blades : int
    state : array (S_ROWS, n_points * n_elements)
        Written; the elements of a point stand together. Status 1 where done, else for `prove_roots`.
    scratch : array (scratch_size(n_points, n_elements),)
    index : array of int64 (index_size(n_points, n_elements),)
        Working space, whatever it holds.
    """
    n_points = points.shape[0]
    n_elements = elements.shape[0]
    n_pairs = n_points * n_elements
    w = scratch[:_W_END]
    ln_chord = scratch[_W_END : _W_END + n_elements]
    free = _W_END + n_elements
    tip_square = scratch[free : free + n_points]
    ln_re_per_chord = scratch[free + n_points : free + 2 * n_points]
    queue = index[4 * LANES :]
    w[:] = 0.0
    index[: 4 * LANES] = 0
    last = float(polars.shape[2] - 1)
    angle_scale = last / (2.0 * math.pi)
    farthest = 0.0
    for e in range(n_elements):
        farthest = max(farthest, elements[e, E_RADIUS])
        ln_chord[e] = math.log(elements[e, E_CHORD])
    for p in range(n_points):
        tip = points[p, P_OMEGA] * farthest
        tip_square[p] = points[p, P_AIRSPEED] * points[p, P_AIRSPEED] + tip * tip
        ln_re_per_chord[p] = 0.5 * math.log(tip_square[p]) + math.log(points[p, P_INVERSE_VISCOSITY])
    n = min(LANES, index.shape[0])  # LANES; known only at run time, so that loops are not unrolled to the end
    waiting = 0
    first = 0
    second_pass = False
    while True:
        if first >= n_pairs and not second_pass:
            second_pass = True
            n_pairs = waiting
            first = 0
        if first >= n_pairs:
            break
        count = min(LANES, n_pairs - first)
        if second_pass:
            for i in range(n):
                pair = queue[first + min(i, count - 1)]
                p = pair // n_elements
                index[2 * LANES + i] = p
                index[3 * LANES + i] = pair - p * n_elements
        else:
            p = first // n_elements
            e = first - p * n_elements
            for i in range(n):
                index[2 * LANES + i] = p
                index[3 * LANES + i] = e
                if i < count - 1:
                    e += 1
                    if e == n_elements:
                        e = 0
                        p += 1
        _lanes_load(n, w, index, points, elements, ln_chord, tip_square, ln_re_per_chord, blades)
        _lanes_start(n, w)
        _lanes_guess(n, w, index, polars, bounds, ln_reynolds, angle_scale, last)
        rounds = 1.0
        limit = 3
        if second_pass:
            limit = 3
            rounds = 4.0
            for i in range(n):
                pair = index[2 * LANES + i] * n_elements + index[3 * LANES + i]
                w[_W_PSI + i] = state[S_PSI, pair]
                w[_W_SPEED + i] = state[S_SPEED, pair]
                w[_W_LIFT + i] = state[S_LIFT, pair]
                w[_W_LOW + i] = state[S_LOW, pair]
                w[_W_HIGH + i] = state[S_HIGH, pair]
        for _ in range(limit):
            rounds += 1.0
            _lanes_flow(n, w, loss[0, 4], angle_scale, last)
            _lanes_look_up(n, w, index, polars, ln_reynolds, loss)
            _lanes_residual(n, w, angle_scale)
            if _lanes_step(n, w) == LANES:
                break
        _lanes_finish(n, w, index, bounds)
        _lanes_stalled(n, w, index, polars, bounds, loss)
        _lanes_store(count, w, index, n_elements, rounds, state)
        if not second_pass:
            for i in range(count):
                if w[_W_DONE + i] == 0.0:
                    queue[waiting] = first + i
                    waiting += 1
        first += LANES


@_jit
def _inflow(point, element):
    """Undisturbed inflow of an element: V, Omega r, sin phi0, cos phi0, phi0, alpha0, ln Re and Mach number at W0."""
    airspeed = point[P_AIRSPEED]
    turning = point[P_OMEGA] * element[E_RADIUS]
    speed = math.sqrt(airspeed * airspeed + turning * turning)
    phi_0 = math.atan2(airspeed, turning)
    return (
        airspeed,
        turning,
        airspeed / speed,
        turning / speed,
        phi_0,
        element[E_TWIST] - phi_0,
        math.log(speed * element[E_CHORD] * point[P_INVERSE_VISCOSITY]),
        speed * point[P_INVERSE_SOUND],
    )


@_jit
def _write(state, pair, point, element, bound, ln_reynolds, blades, psi, ratio, lift, drag, x4, induction, status):
    """Put the root of an element in its place, with its forces and where it stands among the data."""
    airspeed, turning, s0, c0, _, alpha_0, ln_re_0, mach_0 = _inflow(point, element)
    mach = mach_0 * ratio
    sine, cosine = math.sin(psi), math.cos(psi)
    s = s0 * cosine + c0 * sine
    c = c0 * cosine - s0 * sine
    square = ratio * ratio * (airspeed * airspeed + turning * turning)
    pressure = 0.5 * square * blades * element[E_CHORD] * element[E_WIDTH]
    if status == 4:
        pressure = math.nan
    alpha = alpha_0 - psi
    ln_re = ln_re_0 + math.log(ratio)
    row, weight = _row(ln_re, ln_reynolds, np.int64(0))
    rest = 1.0 - weight
    stalled = (
        alpha > rest * bound[row, B_STALL_HIGH] + weight * bound[row + 1, B_STALL_HIGH]
        or alpha < rest * bound[row, B_STALL_LOW] + weight * bound[row + 1, B_STALL_LOW]
    )
    outside = (
        alpha > rest * bound[row, B_DATA_HIGH] + weight * bound[row + 1, B_DATA_HIGH]
        or alpha < rest * bound[row, B_DATA_LOW] + weight * bound[row + 1, B_DATA_LOW]
        or ln_re < element[E_LN_RE_LOW]
        or ln_re > element[E_LN_RE_HIGH]
        or mach < element[E_MACH_LOW]
        or mach > element[E_MACH_HIGH]
    )
    state[S_PSI, pair] = psi
    state[S_SPEED, pair] = ratio
    state[S_LIFT, pair] = lift
    state[S_DRAG, pair] = drag
    state[S_X4, pair] = x4
    state[S_INDUCTION, pair] = induction
    state[S_STATUS, pair] = status
    state[S_THRUST, pair] = pressure * (lift * c - drag * s)
    state[S_TORQUE, pair] = pressure * (lift * s + drag * c) * element[E_RADIUS]
    state[S_STALLED, pair] = 1.0 if stalled else 0.0
    state[S_OUTSIDE, pair] = 1.0 if outside else 0.0
    state[S_LOW_RE, pair] = 1.0 if ln_re < _LN_60000 else 0.0
    divergence = max(element[E_DIVERGENCE] - 0.1 * min(abs(lift), 2.0), LOWEST_DIVERGENCE)
    state[S_DIVERGED, pair] = 1.0 if mach > divergence else 0.0


@_jit
def prove_roots(points, elements, polars, bounds, ln_reynolds, loss, blades, state):
    """Prove the roots that `solve_lanes` left without proof, or walk from there to the first one.

    Parameters
    ----------
    points, elements, polars, bounds, ln_reynolds, loss, blades, state
        As for `solve_lanes`; status 1 or 2 where done, 0 where it is left to `search_roots`.
    """
    n_elements = elements.shape[0]
    # Not literals, of which the compiler would make versions of their own.
    side = np.int64(1)
    no = side < 0
    for pair in range(state.shape[1]):
        if state[S_STATUS, pair] > 0.0:
            continue
        p = pair // n_elements
        e = pair - p * n_elements
        element = elements[e]
        at = int(element[E_POLAR])
        polar, bound = polars[at], bounds[at]
        _, _, s0, c0, phi_0, alpha_0, ln_re_0, mach_0 = _inflow(points[p], element)
        psi, speed, lift = state[S_PSI, pair], state[S_SPEED, pair], state[S_LIFT, pair]
        drag, x4 = state[S_DRAG, pair], state[S_X4, pair]
        done = state[S_STATUS, pair] < 0.0
        moved = not done
        state[S_STATUS, pair] = 0.0
        row, weight = _row(ln_re_0 + math.log(speed), ln_reynolds, np.int64(0))
        pg, rise = _compressibility(mach_0 * speed, lift, element)
        inner, outer = state[S_LOW, pair], state[S_HIGH, pair]
        found, clear = True, 0.0
        proof = 0
        for attempt in range(2):
            if not done:
                done, psi, speed, lift, drag, x4, _, row, weight, pg, rise, used = _follow(
                    no,
                    no,
                    psi,
                    inner,
                    outer,
                    speed,
                    lift,
                    mach_0,
                    ln_re_0,
                    row,
                    alpha_0,
                    s0,
                    c0,
                    element,
                    polar,
                    ln_reynolds,
                    loss,
                )
                state[S_EVALUATIONS, pair] += used
                if not done:
                    proof = -1
                    break
            if attempt == 1:
                break
            sine, cosine = _sine_cosine(psi)
            proof, clear = _first_and_alone(
                psi,
                sine / cosine,
                s0 * cosine + c0 * sine,
                c0 * cosine - s0 * sine,
                alpha_0,
                s0,
                c0,
                x4,
                lift,
                drag,
                element,
                polar,
                bound,
                row,
                weight,
                pg,
                rise,
                loss,
            )
            if proof != 0:
                break
            # Free of roots up to `clear`: walk the rest of the way.
            before, behind, found, used = _search(
                side, no, clear, psi, alpha_0, s0, c0, element, polar, bound, row, weight, pg, rise, loss
            )
            state[S_EVALUATIONS, pair] += used
            if not found or abs(behind - psi) <= 1e-9:
                break
            inner, outer, psi = before, behind, 0.5 * (before + behind)
            done = False
            moved = True
        if proof < 0:
            continue
        another = False
        if proof != 1:
            another, used = _another_beyond(
                side, no, psi, alpha_0, phi_0, s0, c0, element, polar, bound, row, weight, pg, rise, loss
            )
            state[S_EVALUATIONS, pair] += used
        status = 2 if another else 1
        if moved:
            _write(
                state,
                pair,
                points[p],
                element,
                bound,
                ln_reynolds,
                blades,
                psi,
                speed,
                lift,
                drag,
                x4,
                math.nan,
                status,
            )
        else:
            state[S_STATUS, pair] = status


@_jit
def search_roots(points, elements, polars, bounds, ln_reynolds, loss, blades, state):
    """Find the roots that are still open by walking outward from the undisturbed inflow.

    Parameters
    ----------
    points, elements, polars, bounds, ln_reynolds, loss, blades, state
        As for `solve_lanes`; status 1 to 4 everywhere afterwards.
    """
    n_elements = elements.shape[0]
    for pair in range(state.shape[1]):
        if state[S_STATUS, pair] > 0.0:
            continue
        p = pair // n_elements
        e = pair - p * n_elements
        element = elements[e]
        at = int(element[E_POLAR])
        psi, speed, lift, drag, x4, induction, status, evaluations = solve_element(
            points[p, P_AIRSPEED],
            points[p, P_OMEGA] * element[E_RADIUS],
            element,
            points[p, P_INVERSE_VISCOSITY],
            points[p, P_INVERSE_SOUND],
            polars[at],
            bounds[at],
            ln_reynolds,
            loss,
        )
        state[S_EVALUATIONS, pair] += evaluations
        _write(
            state,
            pair,
            points[p],
            element,
            bounds[at],
            ln_reynolds,
            blades,
            psi,
            speed,
            lift,
            drag,
            x4,
            induction,
            status,
        )


@_jit
def _blend_mach(share, below, above, first, rows, polar, bounds, into, bounds_into):
    """Blend the rows of two Mach numbers, lift and ln drag linearly; bounds so that they hold for every blend."""
    for row in range(rows):
        low, high = below + first + row, above + first + row
        for cell in range(polar.shape[1]):
            for part in range(2):
                left = polar[low, cell, part]
                into[row, cell, part] = left + share * (polar[high, cell, part] - left)
        for column in range(B_COLUMNS):
            left, right = bounds[low, column], bounds[high, column]
            if B_STALL_LOW <= column <= B_DATA_HIGH or column in (B_PEAK_AT, B_RISE_LIFT):
                value = left + share * (right - left)
            elif column in (B_RISE_HIGH, B_TROUGH_FROM, B_TROUGH_LIFT):
                value = min(left, right)
            else:
                value = max(left, right)
            bounds_into[row, column] = value


@_jit
def search_at_mach(points, elements, polars, bounds, ln_reynolds, mach, loss, blades, state, blend, bounds_blend, bare):
    """Find the roots of a blade whose polars have a Mach axis, each by walking outward at its own Mach number.

    Compressibility is in the polars, so no law of it is applied. The Mach number of the blend follows the local speed
    from pass to pass.

    Parameters
    ----------
    points, elements, loss, blades, state
        As for `solve_lanes`.
    polars : array (n_polars, n_mach n_re, n_alpha, 2)
    bounds : array (n_polars, n_mach n_re, B_COLUMNS)
    ln_reynolds : array (n_re,)
    mach : array (n_mach,)
    blend : array (4, n_alpha, 2)
    bounds_blend : array (4, B_COLUMNS)
    bare : array (E_COLUMNS,)
        Working space, whatever it holds.
    """
    n_elements = elements.shape[0]
    n_re = ln_reynolds.shape[0]
    rows = min(n_re, 4)
    for pair in range(state.shape[1]):
        p = pair // n_elements
        e = pair - p * n_elements
        element = elements[e]
        at = int(element[E_POLAR])
        airspeed, turning, _, _, _, _, ln_re_0, mach_0 = _inflow(points[p], element)
        for column in range(E_COLUMNS):
            bare[column] = element[column]
        bare[E_TABLE_BETA] = 0.0
        bare[E_DIVERGENCE] = 10.0
        state[S_EVALUATIONS, pair] = 0.0
        guess = 1.0
        first = -1
        psi, speed, lift, drag, x4, induction, status = 0.0, 1.0, 0.0, 0.0, 1.0, math.nan, 4
        for _ in range(12):
            row, _ = _row(ln_re_0 + math.log(guess), ln_reynolds, np.int64(0))
            first = max(min(row - 1, n_re - rows), 0)
            cell, share = _row(mach_0 * guess, mach, np.int64(0))
            _blend_mach(share, cell * n_re, (cell + 1) * n_re, first, rows, polars[at], bounds[at], blend, bounds_blend)
            psi, speed, lift, drag, x4, induction, status, evaluations = solve_element(
                airspeed,
                turning,
                bare,
                points[p, P_INVERSE_VISCOSITY],
                points[p, P_INVERSE_SOUND],
                blend[:rows],
                bounds_blend[:rows],
                ln_reynolds[first : first + rows],
                loss,
            )
            state[S_EVALUATIONS, pair] += evaluations
            if status == 4 or abs(speed - guess) <= _SPEED_TOLERANCE * speed:
                break
            guess = speed
        if abs(speed - guess) > 0.02 * speed:  # passes jump between roots
            status = 4
        _write(
            state,
            pair,
            points[p],
            element,
            bounds_blend[:rows],
            ln_reynolds[first : first + rows],
            blades,
            psi,
            speed,
            lift,
            drag,
            x4,
            induction,
            status,
        )


def scratch_size(n_points: int, n_elements: int) -> int:
    """Length of the working space of `solve_lanes`.

    Parameters
    ----------
    n_points, n_elements : int

    Returns
    -------
    int
    """
    return _W_END + n_elements + 2 * n_points


def index_size(n_points: int, n_elements: int) -> int:
    """Length of the working space of `solve_lanes` for integers.

    Parameters
    ----------
    n_points, n_elements : int

    Returns
    -------
    int
    """
    return 4 * LANES + n_points * n_elements


def loss_table(cells: int = LOSS_CELLS, end: float = 5.2) -> np.ndarray:
    """Tabulate Prandtl's end-loss factor P(x) = (2/pi) acos(exp(-x^2)) as cubics.

    Parameters
    ----------
    cells : int
        Uniform cells from 0 to `end`; the solver wants `LOSS_CELLS`.
    end : float
        Where P is taken as 1; exp(-end^2) is below 2e-12.

    Returns
    -------
    numpy.ndarray, shape (cells, 5)
        Four coefficients of each cell in t from 0 to 1, and the number of cells per unit of x. Hermite interpolation;
        absolute error below 2e-10.

    References
    ----------
    L. Prandtl, appendix to A. Betz, "Schraubenpropeller mit geringstem Energieverlust", 1919; H. Glauert in
    W.F. Durand (ed.), Aerodynamic Theory IV, 1935.
    """
    x = np.linspace(0.0, end, cells + 1)
    h = x[1]
    value = 2.0 / np.pi * np.arccos(np.exp(-(x**2)))
    with np.errstate(invalid="ignore", divide="ignore"):
        slope = 2.0 / np.pi * 2.0 * x * np.exp(-(x**2)) / np.sqrt(-np.expm1(-2.0 * x**2))
    slope[0] = 2.0 / np.pi * np.sqrt(2.0)
    table = np.empty((cells, 5))
    left, right = h * slope[:-1], h * slope[1:]
    rise = np.diff(value)
    table[:, 0] = value[:-1]
    table[:, 1] = left
    table[:, 2] = 3.0 * rise - 2.0 * left - right
    table[:, 3] = left + right - 2.0 * rise
    table[:, 4] = 1.0 / h
    return table
