"""What the columns of a series are called: by their own names, their electrodes, or the description."""

from __future__ import annotations

import re
from collections.abc import Mapping, Sequence

import h5py
import numpy as np

from unitclass.io.dynamic_tables import text_columns
from unitclass.io.hdf5 import child_of, text
from unitclass.io.roles import role_of
from unitclass.io.series import Series

_LISTED = re.compile(r"(?:columns?|channels?|order|signals?|nerves?)\b[^:=]{0,30}[:=]\s*(.+)", re.I | re.S)
_SEPARATOR = re.compile(r"\s*[,;|]\s*|\s+and\s+")
_NUMBER = re.compile(r"^(?:ch(?:annel)?\s*|column\s*)?\d+\s*(?:[=:)]|is|-)\s*", re.I)
_NAMING_CHILDREN = ("channel_names", "column_names", "channel_labels", "columns", "channels", "labels", "names")
_TELLING = ("nerve", "label", "channel_name", "name", "electrode_label", "electrode_name", "location", "group_name")
_NOTHING = {"", "unknown", "none", "n/a", "nan"}


def column_names(file: h5py.File, series: Series, words: Sequence[Mapping[str, str]]) -> list[str]:
    """Return the columns' names, empty text where the file gives none, distinct otherwise.

    Parameters
    ----------
    words : sequence of Mapping
        Of each column's electrode, from `electrode_words`.
    """
    n = series.n_columns
    if n == 1:
        return [""]
    group = file[series.location]
    names = _stored_names(group, n) or _names_by_electrode(words) or _names_in_words(series.words, n) \
        or _names_in_name(series.name, n) or [""] * n
    return [name if names.count(name) == 1 else "" for name in names]


def electrode_words(file: h5py.File, series: Series) -> list[dict[str, str]]:
    """Return what the electrodes table says of each column's electrode, the most telling column first."""
    region = child_of(file[series.location], "electrodes")
    table = child_of(file, "general/extracellular_ephys/electrodes")
    if not isinstance(region, h5py.Dataset) or not isinstance(table, h5py.Group) or region.shape != (series.n_columns,):
        return [{} for _ in range(series.n_columns)]
    there = text_columns(table)
    columns = {name: values for known in _TELLING for name, values in there.items() if name.lower() == known}
    return [{name: values[row] for name, values in columns.items()
             if 0 <= row < len(values) and values[row].lower() not in _NOTHING} for row in region[()].astype(int)]


def _stored_names(group: h5py.Group, n: int) -> list[str]:
    for name in _NAMING_CHILDREN:
        child = child_of(group, name)
        if isinstance(child, h5py.Dataset) and child.shape == (n,) and child.dtype.kind in "OSU":
            return [text(v) for v in child[()]]
        stored = group["data"].attrs.get(name, group.attrs.get(name))
        if stored is None:
            continue
        if np.size(stored) == n:
            return [text(v) for v in np.asarray(stored).reshape(-1)]
        parts = [p for p in _SEPARATOR.split(text(stored)) if p]
        if len(parts) == n:
            return parts
    return []


def _names_by_electrode(words: Sequence[Mapping[str, str]]) -> list[str]:
    """Return the electrodes' column that tells most nerves, of those that name every electrode differently."""
    fields = [f for f in words[0] if len({w.get(f, "") for w in words} - {""}) == len(words)]
    fields = [f for f in fields if not all(w[f].isdigit() for w in words)]
    if not fields:
        return []
    best = max(fields, key=lambda f: sum(role_of(w[f], {}, "", "").strength > 0 for w in words))
    return [w[best] for w in words]


def _names_in_words(words: str, n: int) -> list[str]:
    """Return the names a description lists ("columns: PNA, VNA, HNA"), when there are as many as columns."""
    listed = _LISTED.search(words)
    for candidate in ([listed.group(1)] if listed else []) + [words]:
        first_sentence = re.split(r"\.(?:\s|$)|\n", candidate.strip())[0]
        parts = [_NUMBER.sub("", p).strip(" ()[]\"'") for p in _SEPARATOR.split(first_sentence)]
        parts = [p for p in parts if p]
        if len(parts) == n and all(len(p) <= 40 for p in parts):
            return parts
    return []


def _names_in_name(name: str, n: int) -> list[str]:
    """Return the nerves a series' name strings together ("PNA_VNA_HNA"), when there are as many as columns."""
    parts = [p for p in re.split(r"[_\-+& ]+", name) if p]
    return parts if len(parts) == n and all(role_of(p, {}, "", "").strength for p in parts) else []
