"""The default limits, as data: what is asked of a cubic where the plan says nothing.

No public, universal pass limit for cubic equations of state is known to us. So each default says whether it
is common practice of the trade or ours. One number for all temperatures would mislead: a cubic with a
generalised alpha function reaches 1 % in saturation pressure near the normal boiling point and misses by 10 %
and more at half the critical temperature, where little depends on it.
"""

from __future__ import annotations

import math

from eosmuster.plan.schema import Limit, ToleranceRule

ASSOCIATING = "associating"
QUANTUM_GAS = "quantum gas"

_CLASS_FACTORS = {
    ASSOCIATING: (
        2.0,
        "twice that: hydrogen bonds bend the curve in a way three constants cannot follow (ours)",
    ),
    QUANTUM_GAS: (
        3.0,
        "three times that: Tc, pc and omega carry quantum effects that no alpha function knows (ours)",
    ),
}

_PSAT_LOW = "little pressure there, and an error of the acentric factor grows fast towards low temperatures (ours)"
_VAPOR_LOW = "the vapor is nearly ideal there, so its density is as good as the saturation pressure (ours)"
_DENSITY_NEAR_CRITICAL = "the isotherm is flat near the critical point, so small errors become large ones (ours)"

# property -> (from this reduced temperature on, limit in %, rationale), lowest band first
_BANDS: dict[str, tuple[tuple[float, float, str], ...]] = {
    "saturation_pressure": (
        (0.0, 10.0, _PSAT_LOW),
        (0.55, 3.0, "vacuum service to the normal boiling point (ours)"),
        (0.7, 1.0, "the alpha functions are built to hold here (common practice: about 1 %)"),
    ),
    "liquid_density": (
        (0.0, 3.0, "line and vessel sizing live with it (common practice: 2 to 5 %)"),
        (0.9, 6.0, _DENSITY_NEAR_CRITICAL),
    ),
    "vapor_density": (
        (0.0, 10.0, _VAPOR_LOW),
        (0.55, 3.0, _VAPOR_LOW),
        (0.7, 2.0, "the saturation pressure's 1 % and as much again for the compressibility factor (ours)"),
        (0.9, 6.0, _DENSITY_NEAR_CRITICAL),
    ),
    "enthalpy_of_vaporization": (
        (0.0, 3.0, "duties of evaporators and condensers (common practice: 2 to 5 %)"),
        (0.9, 6.0, "it goes to zero at the critical point, so a small error weighs more and more (ours)"),
    ),
    "entropy_of_vaporization": (
        (0.0, 3.0, "the enthalpy of vaporization over the temperature, so its limit (ours)"),
        (0.9, 6.0, "it goes to zero at the critical point, so a small error weighs more and more (ours)"),
    ),
    "liquid_heat_capacity": (
        (0.0, 10.0, "the residual part of a cubic's liquid is its weak side: 5 to 15 % (common practice)"),
        (0.9, 20.0, "it diverges at the critical point (ours)"),
    ),
    "vapor_heat_capacity": (
        (0.0, 5.0, "mostly the ideal gas, which the reference gives to both (ours)"),
        (0.9, 20.0, "it diverges at the critical point (ours)"),
    ),
    "density": ((0.0, 3.0, "line, vessel and compressor sizing (common practice: 2 to 5 %)"),),
    "compressibility_factor": ((0.0, 3.0, "as the density, which it is the other side of (ours)"),),
    "isobaric_heat_capacity": ((0.0, 5.0, "duties of exchangers (common practice: about 5 %)"),),
    "speed_of_sound": ((0.0, 5.0, "surge and relief of gases; in liquids it shows how stiff the model is (ours)"),),
    "fugacity_coefficient": ((0.0, 2.0, "an equilibrium calculation passes it on one to one (ours)"),),
}

_BOILING = "about 2 % in pressure at the normal boiling point of a hydrocarbon; lax for cryogenic gases (ours)"

_STAGE = (
    "2.5 to 7 % of the work of a compressor stage, which is 3 kJ/mol (propane, 2 to 8 bar) to 8 kJ/mol (ammonia, "
    "1.2 to 20 bar) (ours)"
)

# Properties that pass through zero have absolute limits: no percentage of zero says anything.
_ABSOLUTE = (
    ("boiling_temperature", Limit(0.5, "kelvin"), _BOILING),
    ("residual_enthalpy", Limit(200.0, "J/mol"), _STAGE),
    ("residual_internal_energy", Limit(200.0, "J/mol"), "as the residual enthalpy (ours)"),
    ("residual_entropy", Limit(1.0, "J/(mol K)"), "the residual enthalpy's limit at 200 K (ours)"),
    ("joule_thomson_coefficient", Limit(1e-6, "K/Pa"), "0.1 K/bar: 1 K over a valve that takes 10 bar (ours)"),
)


def _default_rules() -> tuple[ToleranceRule, ...]:
    general = [_band_rule(name, bands, i) for name, bands in _BANDS.items() for i in range(len(bands))]
    absolute = [ToleranceRule(name, limit, "default", rationale=why) for name, limit, why in _ABSOLUTE]
    return (*general, *absolute, *(_for_class(r, c) for c in _CLASS_FACTORS for r in general))


def _band_rule(name: str, bands: tuple[tuple[float, float, str], ...], i: int) -> ToleranceRule:
    above, percent, rationale = bands[i]
    below = bands[i + 1][0] if i + 1 < len(bands) else math.inf
    return ToleranceRule(name, Limit(percent, "percent"), "default", "", "", above, below, rationale)


def _for_class(rule: ToleranceRule, family: str) -> ToleranceRule:
    factor, why = _CLASS_FACTORS[family]
    return ToleranceRule(
        rule.property,
        Limit(factor * rule.limit.value, rule.limit.kind),
        rule.level,
        family,
        "",
        rule.above_reduced_temperature,
        rule.below_reduced_temperature,
        f"{rule.rationale}; {why}",
    )


DEFAULT_RULES: tuple[ToleranceRule, ...] = _default_rules()
"""Every property at every reduced temperature, then the classes that get wider limits (later rules win)."""
