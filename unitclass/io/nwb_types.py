"""What kind of series a group is, by its NWB type, extensions resolved through the cached specs."""

from __future__ import annotations

import json
from collections.abc import Mapping

import h5py

from unitclass.io.hdf5 import child_of, text

_CORE = {
    "ElectricalSeries": "TimeSeries", "SpikeEventSeries": "ElectricalSeries", "PatchClampSeries": "TimeSeries",
    "CurrentClampSeries": "PatchClampSeries", "IZeroClampSeries": "CurrentClampSeries",
    "CurrentClampStimulusSeries": "PatchClampSeries", "VoltageClampSeries": "PatchClampSeries",
    "VoltageClampStimulusSeries": "PatchClampSeries", "OptogeneticSeries": "TimeSeries",
    "SpatialSeries": "TimeSeries", "IntervalSeries": "TimeSeries", "AnnotationSeries": "TimeSeries",
    "AbstractFeatureSeries": "TimeSeries", "DecompositionSeries": "TimeSeries", "ImageSeries": "TimeSeries",
    "ImageMaskSeries": "ImageSeries", "OpticalSeries": "ImageSeries", "OnePhotonSeries": "ImageSeries",
    "TwoPhotonSeries": "ImageSeries", "IndexSeries": "TimeSeries", "RoiResponseSeries": "TimeSeries",
}

_KINDS = {
    "CurrentClampSeries": "current clamp", "VoltageClampSeries": "voltage clamp",
    "CurrentClampStimulusSeries": "stimulus", "VoltageClampStimulusSeries": "stimulus",
    "OptogeneticSeries": "stimulus", "SpikeEventSeries": "not a trace", "ElectricalSeries": "electrical",
    "SpatialSeries": "position", "IntervalSeries": "not a trace", "AnnotationSeries": "not a trace",
    "AbstractFeatureSeries": "not a trace", "DecompositionSeries": "not a trace", "ImageSeries": "not a trace",
    "IndexSeries": "not a trace", "RoiResponseSeries": "not a trace",
}


def series_kind(type_name: str, parents: Mapping[str, str]) -> str:
    """Return "electrical", "current clamp", "voltage clamp", "stimulus", "position", "not a trace" or "plain".

    Parameters
    ----------
    type_name : str
        The group's `neurodata_type`; one that is unknown and descends from nothing known is "plain".
    parents : Mapping
        Type to parent type, from `type_parents`.
    """
    seen: set[str] = set()
    while type_name and type_name not in seen:
        if type_name in _KINDS:
            return _KINDS[type_name]
        seen.add(type_name)
        type_name = parents.get(type_name, "")
    return "plain"


def type_parents(file: h5py.File) -> dict[str, str]:
    """Return type to parent type: the core's, and those of the extensions cached in the file."""
    parents = dict(_CORE)
    specs = child_of(file, "specifications")
    if isinstance(specs, h5py.Group):
        for namespace in specs:
            if namespace not in ("core", "hdmf-common", "hdmf-experimental"):
                _add_namespace(child_of(specs, namespace), parents)
    return parents


def _add_namespace(versions: object, parents: dict[str, str]) -> None:
    if not isinstance(versions, h5py.Group):
        return
    for version in versions.values():
        for name, document in (version.items() if isinstance(version, h5py.Group) else ()):
            if name != "namespace" and isinstance(document, h5py.Dataset):
                _add_document(text(document[()]), parents)


def _add_document(document: str, parents: dict[str, str]) -> None:
    try:
        content = json.loads(document)
    except ValueError:
        return
    for entry in (*content.get("groups", ()), *content.get("datasets", ())):
        name = entry.get("neurodata_type_def") or entry.get("data_type_def")
        parent = entry.get("neurodata_type_inc") or entry.get("data_type_inc")
        if name and parent:
            parents.setdefault(name, parent)
