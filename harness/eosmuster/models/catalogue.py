"""The catalogue of named cubic equations of state: cited data only.

Adding a model is a record here and a published check value in ``tests/published``. "Read in a transcription"
means that the constants were read in a source that cites the paper, not in the paper itself; "from memory" is
said where that is so. Omega_a and Omega_b are the exact values of the form, not the rounded ones.
"""

from __future__ import annotations

from collections.abc import Mapping
from types import MappingProxyType

from eosmuster.models.forms import FORMS
from eosmuster.models.records import (
    CompressibilityPolynomial,
    CovolumeTranslation,
    CriticalTranslation,
    ModelRecord,
    Polynomial,
    Tabulated,
    VolumeTranslation,
    frozen,
    polynomial,
)

_VDW, _RK, _PR = FORMS["van der Waals"], FORMS["Redlich-Kwong"], FORMS["Peng-Robinson"]
_TRANSCRIPTION = "read in a transcription that cites the paper"
_LIBRARY = "read in the source of an open general-purpose library"
_SOAVE_M = frozen(m=polynomial(0.480, 1.574, -0.176))
_PENG_ROBINSON_M = frozen(m=polynomial(0.37464, 1.54226, -0.26992))
_OMEGA = polynomial(0.0, 1.0)


def _twu_pair(L0: float, M0: float, N0: float, L1: float, M1: float, N1: float) -> Mapping[str, Polynomial]:
    constants = {"L0": L0, "M0": M0, "N0": N0, "L1": L1, "M1": M1, "N1": N1}
    return MappingProxyType({"omega": _OMEGA} | {name: polynomial(value) for name, value in constants.items()})


_RECORDS = (
    ModelRecord(
        name="vdW",
        form=_VDW,
        alpha="constant",
        parameters=frozen(),
        source="van der Waals, doctoral thesis, Leiden (1873)",
        status="exact",
    ),
    ModelRecord(
        name="RK",
        form=_RK,
        alpha="power",
        parameters=frozen(n=polynomial(0.5)),
        source="Redlich and Kwong, Chem. Rev. 44 (1949) 233",
        status="from memory, reproduced by printed examples",
    ),
    ModelRecord(
        name="SRK",
        form=_RK,
        alpha="Soave",
        parameters=_SOAVE_M,
        source="Soave, Chem. Eng. Sci. 27 (1972) 1197",
        status=_LIBRARY,
    ),
    ModelRecord(
        name="SRK-GD",
        form=_RK,
        alpha="Soave",
        parameters=frozen(m=polynomial(0.48508, 1.55171, -0.15613)),
        source="Graboski and Daubert, Ind. Eng. Chem. Process Des. Dev. 17 (1978) 443",
        status=_TRANSCRIPTION,
    ),
    ModelRecord(
        name="SRK-Twu95",
        form=_RK,
        alpha="Twu pair",
        parameters=_twu_pair(0.141599, 0.919422, 2.496441, 0.500315, 0.799457, 3.291790),
        source="Twu, Coon and Cunningham, Fluid Phase Equilib. 105 (1995) 61",
        status=_TRANSCRIPTION + "; those above Tc from memory",
        supercritical_parameters=_twu_pair(0.441411, 6.500018, -0.2, 0.032580, 1.289098, -8.0),
    ),
    ModelRecord(
        name="SRK-PM19",
        form=_RK,
        alpha="Soave",
        parameters=frozen(m=polynomial(0.4810, 1.5963, -0.2963, 0.1223)),
        source="Pina-Martinez, Privat, Jaubert and Peng, Fluid Phase Equilib. 485 (2019) 264",
        status=_TRANSCRIPTION,
    ),
    ModelRecord(
        name="PR",
        form=_PR,
        alpha="Soave",
        parameters=_PENG_ROBINSON_M,
        source="Peng and Robinson, Ind. Eng. Chem. Fundam. 15 (1976) 59",
        status=_LIBRARY,
    ),
    ModelRecord(
        name="PR78",
        form=_PR,
        alpha="Soave",
        parameters=frozen(
            m=Polynomial(
                (
                    (0.491, (0.37464, 1.54226, -0.26992)),
                    (float("inf"), (0.379642, 1.48503, -0.164423, 0.016666)),
                )
            )
        ),
        source="Robinson and Peng, Gas Processors Association RR-28 (1978)",
        status=_TRANSCRIPTION,
        note="equals PR up to an acentric factor of 0.491",
    ),
    ModelRecord(
        name="PRSV",
        form=_PR,
        alpha="Stryjek-Vera",
        parameters=frozen(
            kappa0=polynomial(0.378893, 1.4897153, -0.17131848, 0.0196554),
            kappa1=Tabulated("prsv_kappa1.csv", "kappa1"),
        ),
        source="Stryjek and Vera, Can. J. Chem. Eng. 64 (1986) 323, Table 1",
        status=_TRANSCRIPTION,
        note="kappa1 is applied at all temperatures below critical and is 0 above, with the component's own Tc, pc "
        "and omega",
    ),
    ModelRecord(
        name="PR-Twu91",
        form=_PR,
        alpha="Twu",
        parameters=frozen(
            L=Tabulated("twu91_bell2018.csv", "L"),
            M=Tabulated("twu91_bell2018.csv", "M"),
            N=Tabulated("twu91_bell2018.csv", "N"),
        ),
        source="Bell, Satyro and Lemmon, J. Chem. Eng. Data 63 (2018) 2402, supporting information",
        status="transcribed through the chemicals package",
        constants="twu91_bell2018.csv",
        note="parameters are kept with their own Tc and pc",
    ),
    ModelRecord(
        name="PR-Twu95",
        form=_PR,
        alpha="Twu pair",
        parameters=_twu_pair(0.125283, 0.911807, 1.948150, 0.511614, 0.784054, 2.812520),
        source="Twu, Coon and Cunningham, Fluid Phase Equilib. 105 (1995) 49",
        status=_TRANSCRIPTION,
        supercritical_parameters=_twu_pair(0.401219, 4.963070, -0.2, 0.024955, 1.248089, -8.0),
    ),
    ModelRecord(
        name="PR-Gasem",
        form=_PR,
        alpha="Gasem",
        parameters=frozen(A=polynomial(2.00), B=polynomial(0.836), C=polynomial(0.134, 0.508, -0.0467)),
        source="Gasem, Gao, Pan and Robinson, Fluid Phase Equilib. 181 (2001) 113",
        status=_TRANSCRIPTION,
    ),
    ModelRecord(
        name="PR-PM19",
        form=_PR,
        alpha="Soave",
        parameters=frozen(m=polynomial(0.3919, 1.4996, -0.2721, 0.1063)),
        source="Pina-Martinez, Privat, Jaubert and Peng, Fluid Phase Equilib. 485 (2019) 264",
        status=_TRANSCRIPTION,
    ),
    ModelRecord(
        name="tc-PR-2018",
        form=_PR,
        alpha="Twu",
        parameters=frozen(
            L=polynomial(0.0728, 0.6693, 0.0925), M=polynomial(0.8788, -0.2258, 0.1695), N=polynomial(2.0)
        ),
        source="Pina-Martinez, Le Guennec, Privat, Jaubert and Mathias, J. Chem. Eng. Data 63 (2018) 3980",
        status=_TRANSCRIPTION,
        translation=VolumeTranslation(Tabulated("tc_translation.csv", "tc-PR-2018")),
        fitted=("liquid_density",),
        note="generalised alpha parameters; translated to the reference equation's liquid volume at Tr = 0.8, "
        "as the model defines its translation",
    ),
    ModelRecord(
        name="tc-RK-2018",
        form=_RK,
        alpha="Twu",
        parameters=frozen(
            L=polynomial(0.1359, 0.7535, 0.0611), M=polynomial(0.8787, -0.2063, 0.1709), N=polynomial(2.0)
        ),
        source="Pina-Martinez, Le Guennec, Privat, Jaubert and Mathias, J. Chem. Eng. Data 63 (2018) 3980",
        status=_TRANSCRIPTION,
        translation=VolumeTranslation(Tabulated("tc_translation.csv", "tc-RK-2018")),
        fitted=("liquid_density",),
        note="generalised alpha parameters; translated to the reference equation's liquid volume at Tr = 0.8, "
        "as the model defines its translation",
    ),
    ModelRecord(
        name="PT",
        form=FORMS["Patel-Teja"],
        alpha="Soave",
        parameters=frozen(m=polynomial(0.452413, 1.30982, -0.295937)),
        source="Patel and Teja, Chem. Eng. Sci. 37 (1982) 463",
        status=_TRANSCRIPTION + "; the cubic for Omega_b from memory",
        note="generalised F and zeta_c",
    ),
    ModelRecord(
        name="SW",
        form=FORMS["Schmidt-Wenzel"],
        alpha="Schmidt-Wenzel",
        parameters=frozen(omega=_OMEGA),
        source="Schmidt and Wenzel, Chem. Eng. Sci. 35 (1980) 1503",
        status="from memory, consistent with our own calculation",
        note="above Tc m keeps its value at Tc: the paper's own rule could not be read",
    ),
    ModelRecord(
        name="RKPR",
        form=FORMS["Cismondi-Mollerup"],
        alpha="Cismondi-Mollerup",
        parameters=frozen(
            k=CompressibilityPolynomial(((-2.7238, 12.5040), (1.9681, 7.4513), (0.0017, -2.4407)), 1.168)
        ),
        source="Cismondi and Mollerup, Fluid Phase Equilib. 232 (2005) 74",
        status=_TRANSCRIPTION,
    ),
    ModelRecord(
        name="SRK+Peneloux",
        form=_RK,
        alpha="Soave",
        parameters=_SOAVE_M,
        source="Peneloux, Rauzy and Freze, Fluid Phase Equilib. 8 (1982) 7",
        status=_TRANSCRIPTION,
        translation=CriticalTranslation(0.40768, 0.29441),
        note="Rackett factor estimated from the acentric factor",
    ),
    ModelRecord(
        name="PR+Peneloux",
        form=_PR,
        alpha="Soave",
        parameters=_PENG_ROBINSON_M,
        source="Peneloux, Rauzy and Freze, Fluid Phase Equilib. 8 (1982) 7, in its analogue for Peng and Robinson",
        status=_TRANSCRIPTION,
        translation=CriticalTranslation(0.50033, 0.25969),
        note="Rackett factor estimated from the acentric factor",
    ),
    ModelRecord(
        name="PR+Jhaveri-Youngren",
        form=_PR,
        alpha="Soave",
        parameters=_PENG_ROBINSON_M,
        source="Jhaveri and Youngren, SPE Reservoir Eng. 3 (1988) 1033; listed shifts of ten fluids: Whitson and "
        "Brule, Phase Behavior, SPE Monograph 20 (2000)",
        status="from memory, consistent with our own calculation",
        translation=CovolumeTranslation(Tabulated("jhaveri_youngren.csv", "shift")),
    ),
)

CATALOGUE: Mapping[str, ModelRecord] = MappingProxyType({record.name: record for record in _RECORDS})


def model_names() -> tuple[str, ...]:
    """Names of all catalogued models, in the catalogue's order."""
    return tuple(CATALOGUE)
