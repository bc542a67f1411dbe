"""The published methods behind a coefficient table."""

from __future__ import annotations

from bemt.rotor.model import Model
from bemt.section import post_stall, reynolds, stall_delay


def references(model: Model) -> str:
    """Return the published methods behind a table, one a line.

    Parameters
    ----------
    model : Model

    Returns
    -------
    str
    """
    used = list(_INFLOW[model.inflow])
    if model.inflow == "momentum" and model.end_loss != "none":
        used.append(_END_LOSS[model.end_loss])
    if model.stall_delay != "none" and model.stall_strength > 0.0:
        used.append(f"Stall delay: {stall_delay.LAWS[model.stall_delay].source}")
    used.append(f"Past the stall: {post_stall.LAWS[model.post_stall].source}")
    rule = reynolds.LAWS[model.reynolds_rule].source
    if rule:
        used.append(f"Drag at Reynolds numbers beyond the section data: {rule}")
    return "\n".join([*used, _DRAG_RISE])


_MOMENTUM = (
    "Blade elements and annular momentum: H. Glauert, Airplane Propellers, in W.F. Durand (ed.), "
    "Aerodynamic Theory IV, 1935"
)
_ONE_UNKNOWN = (
    "In one unknown after S.A. Stahlhut, J.G. Leishman, Aerodynamic Design Optimization of Proprotors for "
    "Convertible-Rotor Concepts, AHS Annual Forum 68, 2012"
)
_WINDMILL = "Heavily loaded windmill: M.L. Buhl, NREL/TP-500-36834, 2005"
_LIFTING_LINE = (
    "Lifting line with helical vortices: H.W. Lerbs, Moderately Loaded Propellers with a Finite Number of Blades and "
    "an Arbitrary Distribution of Circulation, Transactions SNAME 60, 1952"
)
_INDUCTION = (
    "Induction of helical vortices: J.W. Wrench, The Calculation of Propeller Induction Factors, David Taylor Model "
    "Basin Report 1116, 1957"
)
_INFLOW = {"momentum": (_MOMENTUM, _ONE_UNKNOWN, _WINDMILL), "helix": (_LIFTING_LINE, _INDUCTION)}
INCIDENCE = "Disk at incidence: H. Glauert, A General Theory of the Autogyro, ARC R&M 1111, 1926, annulus by annulus"
SKEW = "Skewed wake: D.M. Pitt, D.A. Peters, Theoretical Prediction of Dynamic-Inflow Derivatives, Vertica 5, 1981"
DESCENT = "Descent: J.G. Leishman, Principles of Helicopter Aerodynamics, 2nd ed. 2006 (curve of the mean inflow)"
_DRAG_RISE = "Drag divergence: Korn's relation, in W.H. Mason, Configuration Aerodynamics"
_END_LOSS = {
    "prandtl": "End loss: L. Prandtl, appendix to A. Betz, Schraubenpropeller mit geringstem Energieverlust, 1919",
    "goldstein": "End loss: S. Goldstein, On the Vortex Theory of Screw Propellers, Proceedings of the Royal Society "
    "A 123, 1929",
}
