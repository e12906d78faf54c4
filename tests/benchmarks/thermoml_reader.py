"""Reading ThermoML in bulk: MB/s of a core, and memory over the number of files.

    python tests/benchmarks/thermoml_reader.py [--quick]

The files are invented: 200 MB in which every value is judged, and 200 MB like an archive, where one block in ten is
and the others are viscosities. Each is written once and read in a forked process; its processor time and peak memory
are given; beside it stands what expat takes to parse the same bytes and hand on nothing.
"""

from __future__ import annotations

import tempfile
from functools import partial
from pathlib import Path
from xml.parsers import expat

import measuring
import numpy as np
from measuring import figure, forked

from eosmuster.sources.measured.files import read_folder, readings

HEAD = """<?xml version="1.0" encoding="UTF-8"?>
<!-- INVENTED, for a benchmark -->
<DataReport xmlns="http://www.iupac.org/namespaces/ThermoML">
  <Version>
    <nVersionMajor>2</nVersionMajor>
    <nVersionMinor>0</nVersionMinor>
  </Version>
  <Citation>
    <sAuthor>Nobody, N.</sAuthor>
    <sPubName>J. Invented Data</sPubName>
    <yrPubYr>2031</yrPubYr>
  </Citation>
  <Compound>
    <RegNum>
      <nOrgNum>1</nOrgNum>
    </RegNum>
    <sCommonName>propane</sCommonName>
    <sFormulaMolec>C3H8</sFormulaMolec>
  </Compound>
"""
BLOCK = """  <PureOrMixtureData>
    <Component>
      <RegNum>
        <nOrgNum>1</nOrgNum>
      </RegNum>
      <nSampleNm>1</nSampleNm>
    </Component>
    <Property>
      <nPropNumber>1</nPropNumber>
      <Property-MethodID>
        <PropertyGroup>
          <VolumetricProp>
            <ePropName>{name}</ePropName>
            <eMethodName>Other</eMethodName>
          </VolumetricProp>
        </PropertyGroup>
      </Property-MethodID>
      <PropPhaseID>
        <ePropPhase>Liquid</ePropPhase>
      </PropPhaseID>
      <ePresentation>Direct value, X</ePresentation>
      <PropUncertainty>
        <nUncertAssessNum>1</nUncertAssessNum>
        <nUncertLevOfConfid>95</nUncertLevOfConfid>
      </PropUncertainty>
    </Property>
    <PhaseID>
      <ePhase>Liquid</ePhase>
    </PhaseID>
    <Variable>
      <nVarNumber>1</nVarNumber>
      <VariableID>
        <VariableType>
          <eTemperature>Temperature, K</eTemperature>
        </VariableType>
      </VariableID>
    </Variable>
    <Variable>
      <nVarNumber>2</nVarNumber>
      <VariableID>
        <VariableType>
          <ePressure>Pressure, kPa</ePressure>
        </VariableType>
      </VariableID>
    </Variable>
{rows}  </PureOrMixtureData>
"""
ROW = """    <NumValues>
      <VariableValue>
        <nVarNumber>1</nVarNumber>
        <nVarValue>{:.2f}</nVarValue>
        <nVarDigits>5</nVarDigits>
      </VariableValue>
      <VariableValue>
        <nVarNumber>2</nVarNumber>
        <nVarValue>{:.1f}</nVarValue>
        <nVarDigits>5</nVarDigits>
      </VariableValue>
      <PropertyValue>
        <nPropNumber>1</nPropNumber>
        <nPropValue>{:.2f}</nPropValue>
        <nPropDigits>5</nPropDigits>
        <PropUncertainty>
          <nUncertAssessNum>1</nUncertAssessNum>
          <nExpandUncertValue>.15</nExpandUncertValue>
        </PropUncertainty>
      </PropertyValue>
    </NumValues>
"""
JUDGED, OTHER = "Mass density, kg/m3", "Viscosity, Pa*s"
ROWS = 22  # values a block of the archive holds on average


def invented(rng: np.random.Generator, blocks: int, judged_every: int) -> str:
    """One file; one block in `judged_every` is judged."""
    states = rng.uniform([230.0, 500.0, 450.0], [330.0, 9000.0, 600.0], (blocks, ROWS, 3))
    bodies = (
        BLOCK.format(
            name=JUDGED if i % judged_every == 0 else OTHER, rows="".join(ROW.format(*state) for state in block)
        )
        for i, block in enumerate(states)
    )
    return HEAD + "".join(bodies) + "</DataReport>\n"


def written(folder: Path, files: int, blocks: int, judged_every: int) -> float:
    """Write a folder of files, and give its MB."""
    rng = np.random.default_rng(1)
    size = 0
    for i in range(files):
        size += (folder / f"{i:05}.xml").write_text(invented(rng, blocks, judged_every), encoding="utf-8")
    return size / 1e6


def read_on(folder: Path, files: int) -> int:
    """Read files one after the other, and keep nothing."""
    names = sorted(path.name for path in folder.iterdir())[:files]
    return sum(len(one) for reading in readings(names, folder) for one in reading.sets)


def parsed(folder: Path) -> int:
    """Parse the same files with expat, which hands on nothing."""
    for path in folder.iterdir():
        expat.ParserCreate(None, "}").Parse(path.read_bytes(), True)
    return 0


def speed(name: str, files: int, blocks: int, judged_every: int) -> None:
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        megabytes = written(folder, files, blocks, judged_every)
        read_on(folder, 1)  # what is cached is cached
        usage, bare = forked(lambda: read_on(folder, files)), forked(lambda: parsed(folder))
        what = f"{usage.output} points of {files} files, {megabytes:.0f} MB"
        beside = f"expat alone {megabytes / bare.seconds:.0f} MB/s"
        figure(f"ThermoML, {name}", f"{megabytes / usage.seconds:.1f} MB/s a core", f"{what}; {beside}", "20 MB/s")


def memory(counts: tuple[int, ...], blocks: int) -> None:
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        written(folder, counts[-1], blocks, 1)
        read_on(folder, 1)
        peaks = [forked(partial(read_on, folder, count)).megabytes for count in counts]
        for count, peak in zip(counts, peaks, strict=True):
            figure(f"ThermoML, {count} files one after the other", f"{peak:.0f} MB at the peak")
        growth = (peaks[-1] - peaks[0]) / (counts[-1] - counts[0]) * 1e3
        figure("ThermoML, memory over the number of files", f"{growth:.2f} kB a file", target="flat")


def whole_folder(files: int) -> None:
    with tempfile.TemporaryDirectory() as place:
        folder = Path(place)
        written(folder, files, 1, 1)
        read_on(folder, 1)
        usage = forked(lambda: sum(map(len, read_folder(folder).sets)))
        what = f"{usage.output} points kept, {usage.megabytes:.0f} MB at the peak"
        figure(f"ThermoML, a folder of {files} files, read and put together", f"{usage.seconds:.3g} s", what)


def main() -> None:
    quick = measuring.asked_to_be_quick(__doc__)
    speed("every value judged", 2 if quick else 200, 5 if quick else 70, 1)
    speed("one block in ten judged", 2 if quick else 200, 10 if quick else 70, 10)
    memory((2, 4) if quick else (10, 100, 1000), 2 if quick else 5)
    whole_folder(5 if quick else 10_000)


if __name__ == "__main__":
    main()
