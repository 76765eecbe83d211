"""Pages: every text of a file is escaped, and odd sessions have a page."""

from __future__ import annotations

from dataclasses import replace
from html.parser import HTMLParser

import numpy as np

from tests.results import labels_for, session_result, vm_result
from unitclass.io.template_files import read_library
from unitclass.records import Cycles, Exclusion, Finding, Label, Recording, SessionResult
from unitclass.report.document import SessionLine, SessionPage, index_html, session_html
from unitclass.report.saving import Picture
from unitclass.settings import Settings

HOSTILE = '"><script>alert(1)</script><img src=x onerror=alert(2)>\x1b[31m{{ 7 * 7 }}&amp;'
LIBRARY = read_library()


class Tags(HTMLParser):
    """Collects the tags, the attributes and the text of a page."""

    def __init__(self, page: str) -> None:
        super().__init__()
        self.tags: set[str] = set()
        self.attributes: set[str] = set()
        self.text = ""
        self.feed(page)

    def handle_starttag(self, tag, attrs):
        self.tags.add(tag)
        self.attributes |= {name for name, _ in attrs}

    def handle_data(self, data):
        self.text += data


def recording_of(result: SessionResult, **changes: object) -> Recording:
    plain = Recording(result.path, result.session, result.identifier, result.object_id, result.animal, 0.0, 240.0,
                      reference=result.reference)
    return replace(plain, **changes)  # type: ignore[arg-type]


def page_of(result: SessionResult, labels=None, **changes: object) -> str:
    return session_html(SessionPage(recording_of(result, **changes), result, labels or {}, {}), LIBRARY, Settings())


def hostile_result() -> SessionResult:
    result = session_result(units={"3": "early-I"}, conditions=("one",))
    condition = result.conditions[0]
    unit = condition.units[0]
    told = replace(unit.suggestion, type=HOSTILE, reasons=(HOSTILE,), probabilities={HOSTILE: 1.0})
    unit = replace(unit, unit=HOSTILE, condition=HOSTILE, suggestion=told, flags=(HOSTILE,), columns={HOSTILE: HOSTILE})
    condition = replace(condition, condition=replace(condition.condition, name=HOSTILE), nerve=HOSTILE, units=(unit,),
                        regime_reasons=(HOSTILE,), problem=HOSTILE)
    return replace(result, path=HOSTILE, session=HOSTILE, animal=HOSTILE, conditions=(condition,), notes=(HOSTILE,),
                   findings=(Finding(HOSTILE, HOSTILE, HOSTILE, HOSTILE),), exclusions=(Exclusion(0.0, 1.0, HOSTILE),))


def test_no_text_of_a_file_or_a_reviewer_becomes_markup_or_a_control_character():
    result = hostile_result()
    unit = result.conditions[0].units[0]
    label = Label(HOSTILE, HOSTILE, HOSTILE, HOSTILE, note=HOSTILE, flags=(HOSTILE,))
    plain = Tags(page_of(session_result()))
    page = page_of(result, {unit.key: label}, missing=(HOSTILE,), reference=HOSTILE, reference_reason=HOSTILE)
    found = Tags(page)
    assert not {"script", "img"} & found.tags
    assert not {"onerror", "src"} & found.attributes
    assert found.tags - plain.tags <= {"p", "ul", "li", "b", "dd", "dt", "div", "h3", "span"}
    assert "\x1b" not in page
    assert found.text.count("<script>alert(1)</script>") > 15  # shown as text, and not run as a template either
    assert "{{ 7 * 7 }}" in found.text


def test_the_page_over_all_sessions_escapes_as_well():
    line = SessionLine(HOSTILE, HOSTILE, HOSTILE, (HOSTILE,), 1, 1, problem=HOSTILE)
    animals = [{"animal": HOSTILE, f"n_{HOSTILE}": 1}]
    pair = {"condition": HOSTILE, "first": HOSTILE, "second": HOSTILE, "kappa": 0.5, "se": 0.1, "n_units": 3, "n_blind": 0}
    page = index_html([line], pictures=[Picture("<svg></svg>", HOSTILE, ("figures/a.svg",))], animals=animals,
                      agreement=[pair], reviewers=[HOSTILE], methods=HOSTILE, settings=Settings(), library=LIBRARY)
    found = Tags(page)
    assert not {"script", "img"} & found.tags
    assert not {"onerror", "src"} & found.attributes


def test_labels_show_type_reviewer_time_and_note_and_the_suggestion_beside_it():
    result = session_result()
    text = Tags(page_of(result, labels_for(result))).text
    assert "labelled by Ada Fischer, 2031-03-04T10:20:30+00:00" in text
    assert "note: clean" in text
    assert "disagreement" in text
    assert "all types below are suggestions" not in text
    assert "all types below are suggestions" in Tags(page_of(result)).text


def test_a_session_without_units_and_one_without_cycles_have_a_page():
    result = session_result(units={}, conditions=("one",))
    cycles = result.conditions[0].nerve_cycles.cycles
    assert f"{cycles.accepted.sum()} of {cycles.n_cycles} cycles of PNA are used." in Tags(page_of(result)).text
    none = np.zeros(0)
    condition = result.conditions[0]
    empty = replace(condition.nerve_cycles, cycles=Cycles.plain(none, none, none), envelopes=(), summary={})
    bare = replace(result, conditions=(replace(condition, nerve_cycles=empty, nerve_profiles=(),
                                               regime_probabilities={}),))
    assert "No cycles were found on PNA." in Tags(page_of(bare)).text
    assert 'id="methods"' in page_of(replace(result, conditions=()))


def test_the_methods_speak_of_impaled_cells_only_when_there_are_some():
    result = session_result(conditions=("baseline",))
    impaled = replace(result, conditions=(replace(result.conditions[0], units=(vm_result(),)),))
    assert "impaled" not in page_of(result).split('id="methods"')[1]
    assert "impaled cells" in page_of(impaled).split('id="methods"')[1]


def test_the_methods_name_version_digests_and_changed_settings():
    result = session_result()
    changed = Settings()
    changed = replace(changed, modulation=replace(changed.modulation, min_spikes=33))
    page = session_html(SessionPage(recording_of(result), result, {}, {}), LIBRARY, changed)
    told = Tags(page).text
    assert f"digest {LIBRARY.digest()}" in told
    assert "unitclass 0.1.0" in told
    assert "modulation.min_spikes = 33" in told
    assert "fewer than 33 spikes" in told
