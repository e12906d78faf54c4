"""A second, slow and simple reading of the same bytes: every point that a reader gives has to stand in them."""

from __future__ import annotations

import csv
import math
import re
from xml.etree import ElementTree

from eosmuster.quantities import to_si
from eosmuster.sources.measured.table import MeasuredSet, Reading

SPACE = "{http://www.iupac.org/namespaces/ThermoML}"
VALUES = f"{SPACE}PureOrMixtureData/{SPACE}NumValues/{SPACE}PropertyValue"
FACTORS = {  # SI value of a printed one, given the molar mass in kg/mol
    "Vapor or sublimation pressure, kPa": lambda v, m: 1e3 * v,
    "Boiling temperature at pressure P, K": lambda v, m: v,
    "Normal boiling temperature, K": lambda v, m: v,
    "Molar enthalpy of vaporization or sublimation, kJ/mol": lambda v, m: 1e3 * v,
    "Mass density, kg/m3": lambda v, m: v / m,
    "Specific volume, m3/kg": lambda v, m: 1.0 / (v * m),
    "Amount density, mol/m3": lambda v, m: v,
    "Molar volume, m3/mol": lambda v, m: 1.0 / v,
}
DIMENSIONS = {
    "saturation_pressure": "pressure",
    "boiling_temperature": "temperature",
    "liquid_density": "density",
    "vapor_density": "density",
    "density": "density",
    "enthalpy_of_vaporization": "energy",
    "temperature": "temperature",
    "pressure": "pressure",
}


def close(a: float, b: float) -> bool:
    return math.isclose(a, b, rel_tol=1e-12) or (math.isnan(a) and math.isnan(b))


def check_account(reading: Reading) -> None:
    """Diagnostics are sentences with a place, and every number that is handed out is one."""
    for one in reading.diagnostics:
        assert one.sentence
        assert len(str(one)) < 2000, str(one)
        assert "\n" not in str(one)
        assert one.lost >= 0
    for one in reading.sets:
        assert len(one) > 0
        assert all(math.isfinite(v) and v > 0.0 for v in one.values)
        assert all(
            math.isnan(u) or 0.0 < u <= 1.001 * v for u, v in zip(one.standard_uncertainty, one.values, strict=True)
        )
        given = [x for x in (*one.temperature, *one.pressure) if not math.isnan(x)]
        assert all(math.isfinite(x) and x > 0.0 for x in given)


def check_thermoml(data: bytes, reading: Reading) -> bool:
    """Hold every point against the document; False if it is not well formed, so that nothing can be held."""
    try:
        root = ElementTree.fromstring(data.lstrip(b" \t\r\n"))
    except (ElementTree.ParseError, LookupError, ValueError):
        return False
    blocks = root.findall(f"{SPACE}PureOrMixtureData")
    for one in reading.sets:
        _check_block(blocks[one.block - 1], one)
    assert accounted(reading) == reading.values
    whole = not any(one.code == "file" for one in reading.diagnostics)
    assert reading.values == len(root.findall(VALUES)) if whole else reading.values <= len(root.findall(VALUES))
    return True


def accounted(reading: Reading) -> int:
    """Count the values that were read, lost with a diagnostic, or counted as nobody's."""
    binary = sum(
        sum(not math.isnan(y) for y in one.vapor_fraction) if name == "vapor_fraction" else len(one)
        for one in reading.binaries
        for name in one.measured
    )
    lost = sum(one.lost for one in reading.diagnostics)
    return sum(map(len, reading.sets)) + binary + lost + sum(reading.unread.values())


def _check_block(block: ElementTree.Element, one: MeasuredSet) -> None:
    assert len(block.findall(f"{SPACE}Component")) == 1
    declared = block.findall(f"{SPACE}Property")[one.series - 1]
    assert _words(declared.find(f"{SPACE}ePresentation")) == "Direct value, X"
    [named] = declared.findall(f"{SPACE}Property-MethodID/{SPACE}PropertyGroup/*/{SPACE}ePropName")
    name = _words(named)
    number = _words(declared.find(f"{SPACE}nPropNumber"))
    rows = block.findall(f"{SPACE}NumValues")
    for i, row in enumerate(one.rows):
        values = [
            value
            for value in rows[row - 1].findall(f"{SPACE}PropertyValue")
            if _words(value.find(f"{SPACE}nPropNumber")) == number
        ]
        assert len(values) == 1
        printed = values[0].findall(f"{SPACE}nPropValue")
        assert len(printed) == 1
        assert close(FACTORS[name](_number(printed[0]), one.component.molar_mass), one.values[i])
        assert close(_coordinate(block, rows[row - 1], "Temperature, K", 1.0), one.temperature[i])
        pressure = _coordinate(block, rows[row - 1], "Pressure, kPa", 1e3)
        known = {"Normal boiling temperature, K"} if name.startswith("Normal") else {"Air at 1 atmosphere"}
        if math.isnan(pressure) and (name in known or _phases(block) & known):
            pressure = 101325.0
        assert close(pressure, one.pressure[i])


def _coordinate(block: ElementTree.Element, row: ElementTree.Element, quantity: str, factor: float) -> float:
    for constraint in block.findall(f"{SPACE}Constraint"):
        if _words(constraint.find(f"{SPACE}ConstraintID/{SPACE}ConstraintType/*")) == quantity:
            return factor * _number(constraint.find(f"{SPACE}nConstraintValue"))
    for variable in block.findall(f"{SPACE}Variable"):
        if _words(variable.find(f"{SPACE}VariableID/{SPACE}VariableType/*")) == quantity:
            number = _words(variable.find(f"{SPACE}nVarNumber"))
            found = [
                value
                for value in row.findall(f"{SPACE}VariableValue")
                if _words(value.find(f"{SPACE}nVarNumber")) == number
            ]
            assert len(found) == 1
            return factor * _number(found[0].find(f"{SPACE}nVarValue"))
    return math.nan


def _phases(block: ElementTree.Element) -> set[str]:
    return {_words(phase.find(f"{SPACE}ePhase")) for phase in block.findall(f"{SPACE}PhaseID")}


def _words(element: ElementTree.Element | None) -> str:
    return "" if element is None else " ".join((element.text or "").split())


def _number(element: ElementTree.Element | None) -> float:
    assert element is not None
    assert len(element) == 0
    text = (element.text or "").strip()
    assert re.fullmatch(r"[+-]?(\d+\.?\d*|\.\d+)([eE][+-]?\d+)?", text), text
    return float(text)


def check_laboratory(data: bytes, reading: Reading) -> None:
    """Hold every point of a UTF-8 file with units in the header against the cells it comes from."""
    assert accounted(reading) == reading.values
    lines = re.split("\r\n|\r|\n", data.decode("utf-8-sig", errors="replace"))
    header = next((line for line in lines if line.strip() and not line.lstrip().startswith("#")), "")
    for one in reading.sets:
        for delimiter in ",;\t|":
            titles = [cell.strip() for cell in next(csv.reader([header], delimiter=delimiter))]
            if len(titles) >= one.series and _title(titles[one.series - 1])[0] == one.property:
                break
        else:
            raise AssertionError(f"no column {one.series} of {one.property} in {header!r}")
        for i, line in enumerate(one.rows):
            cells = [cell.strip() for cell in next(csv.reader([lines[line - 1]], delimiter=delimiter))]
            if len(cells) != len(titles):
                continue  # the end of a cell of several lines
            _check_cells(one, i, titles, cells)


def _check_cells(one: MeasuredSet, i: int, titles: list[str], cells: list[str]) -> None:
    value = _si(titles[one.series - 1], cells[one.series - 1], one.component.molar_mass or math.nan)
    assert close(value, one.values[i])
    for place, title in enumerate(titles):
        if title.startswith("temperature [") and not math.isnan(one.temperature[i]):
            assert close(_si(title, cells[place], 1.0), one.temperature[i])


def _title(title: str) -> tuple[str, str]:
    name, _, unit = title.partition("[")
    return re.sub(r"[\s-]+", "_", name.strip().casefold()).replace("vapour", "vapor").replace(
        "vapor_pressure", "saturation_pressure"
    ), unit.strip("] ")


def _si(title: str, cell: str, molar_mass: float) -> float:
    name, unit = _title(title)
    cell = repr(float(cell))  # the oracle's own reader takes no number of hundreds of digits
    dimension = DIMENSIONS[name]
    if dimension == "density" and re.match(r"k?g/", unit):
        return to_si(f"{cell} {unit}", "mass_density", "oracle") / molar_mass
    return to_si(f"{cell} {unit}", dimension, "oracle")
