"""The invented laboratory: its animals, its kinds of session, and which cells each one holds.

Nothing here is a real laboratory, animal, person or recording.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from unitclass.simulate.breathing import Pattern
from unitclass.simulate.nerves import Wire

INSTITUTION = "Institute of Invented Measurements, Northmere"
LAB = "Weathercock Breathing Laboratory (invented)"
EXPERIMENTER = "Hollowbread, Tamsin"

SLICE_LOOK = "transverse medullary slice with hypoglossal rootlets, 27 °C"
PERFUSED_LOOK = "decerebrate, artificially perfused preparation, 31.5 °C"


@dataclass(frozen=True)
class Animal:
    """An invented animal."""

    id: str
    species: str
    age: str
    sex: str
    weight: str
    description: str


@dataclass(frozen=True)
class Stretch:
    """A condition: its label, how long it lasts, how the animal breathes, the rhythm's regime.

    `gap_s` is time before it that belongs to no condition (an operation, say); a session with one
    also has a moment in its first condition when the nerve was moistened.
    """

    label: str
    seconds: float
    pattern: Pattern
    regime: str
    gap_s: float = 0.0


@dataclass(frozen=True)
class Scenario:
    """One kind of session.

    `cells` holds, for each cell, its type in each condition; "late-E/2" is a late-E cell that takes
    part in every second breath. `hurry` is explained in `curves.hurried`. `impaled` is the type of
    an intracellular cell.
    """

    stem: str
    animal: Animal
    title: str
    look: str
    stretches: tuple[Stretch, ...]
    wires: tuple[Wire, ...]
    cells: tuple[tuple[str, ...], ...] = ()
    regions: tuple[str, ...] = ("ventral respiratory column",)
    hurry: float = 1.0
    impaled: str = ""
    is_labelled: bool = True


RAT = "Rattus norvegicus"
_PERFUSED = Pattern(ti_s=0.85, te_s=1.75)
_SLICE = Pattern(ti_s=0.55, te_s=3.6, ti_cv=0.10, te_cv=0.22, drift=0.15, sigh_every=35, doublet_share=0.02)
_COLUMN = ("Bötzinger complex", "preBötzinger complex", "rostral ventral respiratory group",
           "caudal ventral respiratory group")


def _same(types: str) -> tuple[tuple[str, ...], ...]:
    return tuple((name,) for name in types.split())


def _changing(*lines: str) -> tuple[tuple[str, ...], ...]:
    return tuple(tuple(pair.split(">")) for line in lines for pair in line.split())


SCENARIOS: Mapping[str, Scenario] = {
    "three-phase": Scenario(
        stem="quill-baseline",
        animal=Animal("quill", RAT, "P28D", "M", "0.085 kg", "perfused juvenile rat"),
        title="Units of the ventral respiratory column during three-phase breathing", look=PERFUSED_LOOK,
        stretches=(Stretch("baseline", 245.0, _PERFUSED, "three-phase"),),
        wires=(Wire("phrenic", "phrenic", ("augmenting burst",), 2500.0),
               Wire("vagus", "cervical vagus", ("vagal",), 200.0, is_integrated=True, heart=2.0),
               Wire("hypoglossal", "hypoglossal", ("hypoglossal",), 200.0, is_integrated=True, heart=1.0)),
        cells=_same("early-I post-I aug-E tonic ramp-I pre-I con-E NRM late-I post-I I-E ramp-I aug-E con-I "
                    "dec-E tonic early-I bi-E"),
        regions=_COLUMN, is_labelled=False),
    "pons-removed": Scenario(
        stem="bramble-pons-removed",
        animal=Animal("bramble", RAT, "P31D", "F", "0.092 kg", "perfused juvenile rat"),
        title="Units before and after removal of the pons", look=PERFUSED_LOOK,
        stretches=(Stretch("baseline", 190.0, Pattern(ti_s=0.8, te_s=1.6), "three-phase"),
                   Stretch("pons removed", 195.0, Pattern(ti_s=1.15, te_s=1.7, sigh_every=0), "two-phase",
                           gap_s=25.0)),
        wires=(Wire("PNA", "phrenic", ("augmenting burst", "square burst"), 2000.0, heart=4.0),
               Wire("VNA", "cervical vagus", ("vagal", "decrementing burst"), 200.0, is_integrated=True,
                    heart=2.0)),
        cells=_changing("early-I>early-I post-I>silent aug-E>con-E ramp-I>early-I tonic>tonic pre-I>pre-I",
                        "post-I>dec-E con-I>con-I dec-E>dec-E NRM>NRM late-I>silent aug-E>silent",
                        "ramp-I>con-I con-E>dec-E"),
        regions=_COLUMN),
    "slice": Scenario(
        stem="sorrel-slice", animal=Animal("sorrel", RAT, "P2D", "U", "0.007 kg", "newborn rat"),
        title="Units of a rhythmic slice", look=SLICE_LOOK,
        stretches=(Stretch("baseline", 330.0, _SLICE, "one-phase"),),
        wires=(Wire("XII rootlet", "hypoglossal rootlet", ("decrementing burst",), 2500.0, snr=5.0,
                    heart=0.0),),
        cells=_same("pre-I tonic early-I con-I NRM pre-I con-E bi-E tonic early-I"),
        regions=("preBötzinger complex",), hurry=0.35, is_labelled=False),
    "hypercapnia": Scenario(
        stem="teasel-hypercapnia",
        animal=Animal("teasel", RAT, "P30D", "M", "0.088 kg", "perfused juvenile rat"),
        title="Units at 5 and at 9 % carbon dioxide", look=PERFUSED_LOOK,
        stretches=(Stretch("5 % CO2", 180.0, _PERFUSED, "three-phase"),
                   Stretch("9 % CO2", 180.0, Pattern(ti_s=0.8, te_s=1.9), "three-phase", 60.0)),
        wires=(Wire("Phr", "phrenic", ("augmenting burst", "augmenting burst"), 2500.0),
               Wire("AbN", "abdominal", ("quiet", "late-expiratory burst"), 2500.0, every=(1, 2)),
               Wire("cVN", "cervical vagus", ("vagal", "vagal"), 200.0, is_integrated=True)),
        cells=_changing("silent>late-E/2 aug-E>aug-E post-I>post-I ramp-I>ramp-I silent>late-E/2",
                        "early-I>early-I tonic>tonic NRM>NRM late-E>late-E pre-I>pre-I con-E>con-E",
                        "late-I>late-I"),
        regions=(*_COLUMN, "lateral parafacial region")),
    "intracellular": Scenario(
        stem="tansy-cell-a", animal=Animal("tansy", RAT, "P35D", "F", "0.110 kg", "perfused juvenile rat"),
        title="One cell recorded with a sharp electrode", look=PERFUSED_LOOK,
        stretches=(Stretch("baseline", 155.0, Pattern(ti_s=0.75, te_s=1.55), "three-phase"),),
        wires=(Wire("phrenic", "phrenic", ("augmenting burst",), 2000.0, heart=3.0),),
        impaled="post-I", is_labelled=False),
}

KINDS = tuple(SCENARIOS)
