"""What a continuous signal is, guessed from its words: which nerve, muscle or other channel.

Long words may stand inside a name ("phrenicNerveLeft"); abbreviations must be a token of their own,
so that "aux" holds no X and "open" no PN. Names are common practice of the trade.
"""

from __future__ import annotations

import re
from collections.abc import Mapping
from dataclasses import dataclass


@dataclass(frozen=True)
class Vocabulary:
    """The words of one role: regular expressions of long words, and abbreviations as whole tokens."""

    role: str
    label: str
    words: str
    short: str = ""
    is_nerve: bool = True


# In order of precedence within a name: a "cervical vagus" is a vagus, a stimulated nerve a stimulus.
_VOCABULARIES = (
    Vocabulary("stimulus", "stimulation or command", r"stimul|optogen|laser|command|trigger|current[ _]?pulse",
               r"stim|Stim|STIM|stm|ttl|TTL|sync|led|LED|cmd", is_nerve=False),
    Vocabulary("phrenic", "phrenic nerve", r"phrenic",
               r"PN|PNA|PND|Phr|PHR|phr|PhN|PhrN|PHRN|Phren|phren|pna|pn|pnd"),
    Vocabulary("hypoglossal", "hypoglossal nerve", r"hypogl|twelfth",
               r"HN|HNA|HGN|HGNA|XII|XIIn|nXII|CNXII|xii|hna|hn|hgn"),
    Vocabulary("laryngeal", "laryngeal nerve", r"laryng", r"RLN|SLN|RLNA|ILN|rln|sln"),
    Vocabulary("vagus", "vagus nerve", r"vagus|vagal", r"VN|VNA|cVN|cVNA|CVN|CNX|nX|vna|vn|cvn"),
    Vocabulary("unknown", "a nerve that does not define inspiration",
               r"sympath|renal|splanchn|trigem|facial nerve|glossophar|sciatic",
               r"SNA|tSN|tSNA|cSN|sSNA|IX|XI"),
    Vocabulary("abdominal", "abdominal nerve or muscle", r"abdom|iliohypog|ilioing|lumbar|thoracic|obliqu|rectus",
               r"AbN|AbNA|ABN|ABNA|AbdN|Abd|ABD|abd|abn"),
    Vocabulary("muscle", "diaphragm", r"diaphragm", r"DIA|Dia|dia|dEMG|diaEMG|DiaEMG|EMGdia|EMGDia"),
    Vocabulary("muscle", "respiratory muscle", r"genioglos|electromyo|intercostal|scalen",
               r"GG|EMG|emg|GGEMG|ggEMG|EMGgg"),
    Vocabulary("unknown", "a derived or slow measure", r"heart[ _-]?rate|temperature|saturation|humidity",
               r"HR|SpO2|SaO2|temp|Temp|hr", is_nerve=False),
    Vocabulary("ecg", "heart", r"electrocard|cardiac|heart", r"ECG|EKG|ecg|ekg", is_nerve=False),
    Vocabulary("co2", "carbon dioxide", r"capno|carbon diox|end[- _]?tidal",
               r"CO2|co2|ETCO2|EtCO2|etco2|FeCO2|pCO2|PCO2", is_nerve=False),
    Vocabulary("pump", "pump or ventilator", r"ventilat|roller|peristal", r"pump|Pump|PUMP", is_nerve=False),
    Vocabulary("airflow", "airflow or chest movement",
               r"air[ _-]?flow|pneumotach|spiromet|plethysm|thermistor|\bchest\b|respiration",
               r"flow|Flow|resp|Resp|RESP|breath|breathing|Breathing", is_nerve=False),
    Vocabulary("pressure", "airway pressure", r"trache|pleural|esoph|airway|buccal", r"TP|Ptr|PTr|Pes|Paw|Pdi",
               is_nerve=False),
    Vocabulary("pressure", "blood or perfusion pressure", r"pressure|manomet", r"ABP|MAP|BP|PP|press|Press",
               is_nerve=False),
    Vocabulary("cervical", "cervical ventral root", r"cervical|\bC[345] (?:ventral|root|nerve|motor)"),
    Vocabulary("unknown", "population activity",
               r"population|pre[ -]?b(?:ö|o|oe)t|multi[ -]?unit|field potential", r"VRG|VRC|preBotC|MUA|LFP"),
)
POPULATION = "population activity"
DIAPHRAGM = "diaphragm"
OTHER_NERVE = "a nerve that does not define inspiration"

# Abbreviations so short that they only count when nothing but neutral words stands beside them.
_LONE = {"X": ("vagus", "vagus nerve"), "L1": ("abdominal", "lumbar nerve"), "L2": ("abdominal", "lumbar nerve"),
         **{f"T{n}": ("abdominal", "thoracic nerve") for n in range(9, 14)},
         **{f"C{n}": ("cervical", "cervical ventral root") for n in (3, 4, 5)}}
_NEUTRAL = frozenset((
    "nerve", "nerves", "n", "cn", "cranial", "root", "roots", "rootlet", "rootlets", "ventral", "left", "right",
     "l", "r", "int", "integrated", "raw", "rectified", "filtered", "activity", "neurogram", "recording", "signal",
     "discharge", "ch", "chan", "channel", "electrode", "vr", "motor"))

# A single letter for side or form may be glued to an abbreviation where the case still shows the seam.
_BEFORE = r"(?:left|right|Left|Right|int|Int|raw|Raw|[LRI\u222b]|[lrin](?=[A-Z]))?"
_AFTER = r"(?:left|right|Left|Right|int|Int|raw|Raw|rect|filt|[LR]|(?<=[A-Z])[lri])?\d{0,3}"
_MODIFIER = re.compile(r"(?:cervical|thoracic|lumbar|abdominal)\s+(?=vag|sympath)", re.I)

_MEMBRANE_WORDS = re.compile(r"membrane[ _-]?(?:potential|voltage)|intracell|whole[ _-]?cell|current[ _-]?clamp", re.I)
_MEMBRANE_TOKENS = frozenset({"Vm", "vm", "VM", "MP", "Em"})
_TOKEN = re.compile(r"[A-Za-z\u222b]+\d*|\d+")
_CAMEL = re.compile(r"[A-Z]+(?![a-z])|[A-Z][a-z]+|[a-z]+|\d+")


@dataclass(frozen=True)
class Guess:
    """A role and its grounds in words; `strength` 3 name, 2 channel or electrode, 1 description, 0 none."""

    role: str
    reason: str
    strength: int
    label: str = ""


def role_of(name: str, fields: Mapping[str, str], description: str, unit: str) -> Guess:
    """Return the best guess at what a signal is.

    Parameters
    ----------
    name : str
        The series' name, or the column's own name where it has one.
    fields : Mapping
        Words that belong to this very channel (electrode label, location, group), by field name.
    description : str
        Description and comments of the series; the first nerve it mentions counts.
    unit : str
        Physical unit; tells pressures and flows that nothing else names.
    """
    found = _in_name(name)
    if found:
        return Guess(found[0], f"its name {name!r} says {found[1]}", 3, found[1])
    for field, value in fields.items():
        found = _in_name(value)
        if found:
            return Guess(found[0], f"{field} {value!r} says {found[1]}", 2, found[1])
    found = _in_text(description)
    if found:
        return Guess(found[0], f"its description says {found[1]}", 1, found[1])
    return _by_unit(unit)


def is_membrane(name: str, description: str, unit: str) -> str:
    """Return why a plain series is a membrane potential; empty when it is not one.

    Its unit must be a voltage, and its name, or its description when the name says nothing else,
    must say so.
    """
    if voltage_factor_mv(unit) == 0.0:
        return ""
    if _MEMBRANE_WORDS.search(_spaced(name)) or _MEMBRANE_TOKENS & set(tokens(name)):
        return f"its name {name!r} says membrane potential and its unit is {unit}"
    said = _MEMBRANE_WORDS.search(description) or _MEMBRANE_TOKENS & set(tokens(description))
    if said and not _in_name(name):
        return f"its description says membrane potential and its unit is {unit}"
    return ""


def voltage_factor_mv(unit: str) -> float:
    """Return how many mV one `unit` is; 0 when it is not a voltage."""
    plain = unit.strip()
    if plain in ("V", "v") or plain.lower() in ("volt", "volts"):
        return 1e3
    if plain in ("mV", "mv", "MV") or plain.lower() in ("millivolt", "millivolts"):
        return 1.0
    if plain in ("uV", "µV", "μV", "uv") or plain.lower() in ("microvolt", "microvolts"):
        return 1e-3
    return 0.0


def tokens(words: str) -> list[str]:
    """Return the tokens of a name: split at everything but letters and digits, and at camelCase."""
    found: list[str] = []
    for token in _TOKEN.findall(words.replace("_", " ")):
        found.append(token)
        parts = _CAMEL.findall(token)
        if len(parts) > 1:
            found.extend(parts)
    return found


def _spaced(name: str) -> str:
    return re.sub(r"[_\-./]+", " ", re.sub(r"(?<=[a-z])(?=[A-Z])", " ", name))


def _in_name(name: str) -> tuple[str, str] | None:
    """Return (role, what it says) of a name, or None."""
    spaced, parts = _spaced(name), tokens(name)
    for vocabulary in _VOCABULARIES:
        if re.search(vocabulary.words, spaced, re.I) or _has_short(vocabulary, parts):
            return vocabulary.role, vocabulary.label
    return _lone(parts)


def _has_short(vocabulary: Vocabulary, parts: list[str]) -> bool:
    if not vocabulary.short:
        return False
    pattern = re.compile(f"{_BEFORE}(?:{vocabulary.short}){_AFTER}")
    return any(pattern.fullmatch(part) for part in parts)


def _lone(parts: list[str]) -> tuple[str, str] | None:
    hits = [p for p in parts if p in _LONE]
    pieces = {piece for hit in hits for piece in _CAMEL.findall(hit)}
    others = [p for p in parts if p not in _LONE and p not in pieces and p.lower() not in _NEUTRAL
              and not p.isdigit() and len(_CAMEL.findall(p)) == 1]
    return _LONE[hits[0]] if hits and not others else None


def _in_text(words: str) -> tuple[str, str] | None:
    """Return what a description mentions first; any nerve counts before other channels."""
    words = _MODIFIER.sub("", words)
    found = [(not v.is_nerve, place, rank, v) for rank, v in enumerate(_VOCABULARIES)
             if (place := _first_place(v, words)) is not None]
    if not found:
        return None
    best = min(found, key=lambda entry: entry[:3])[3]
    return best.role, best.label


def _first_place(vocabulary: Vocabulary, words: str) -> int | None:
    upper = "|".join(s for s in vocabulary.short.split("|") if len(s) >= 2 and any(c.isupper() for c in s))
    patterns = [re.compile(vocabulary.words, re.I), *([re.compile(rf"\b(?:{upper})\b")] if upper else [])]
    return min((m.start() for p in patterns if (m := p.search(words))), default=None)


def _by_unit(unit: str) -> Guess:
    plain = unit.strip().lower().replace(" ", "")
    if plain in ("mmhg", "cmh2o", "kpa", "pa", "mbar", "torr"):
        return Guess("pressure", f"its unit is {unit}", 1, "pressure")
    if plain in ("ml/s", "l/s", "ml/min", "l/min", "ml"):
        return Guess("airflow", f"its unit is {unit}", 1, "airflow")
    return Guess("unknown", "nothing in its name, electrodes or description says what it is", 0)
