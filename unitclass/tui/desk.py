"""Between the review session and the screens: what they show, and words for what was done.

Holds no decision of its own; the session does. Nothing is computed here, only chosen.
"""

from __future__ import annotations

from collections.abc import Callable, Mapping, Sequence
from dataclasses import replace
from typing import TYPE_CHECKING, Any

from unitclass.records import NOT_ONE_CELL, OTHER, SILENT, UNDETERMINED, UnitResult
from unitclass.review.entry import QueueEntry
from unitclass.review.filters import Filter
from unitclass.review.ordering import INFORMATIVE, SORTS
from unitclass.review.session import ReviewSession
from unitclass.review.unit_facts import mean_durations
from unitclass.tui.choice import Option
from unitclass.tui.renderables.verdict import Verdict
from unitclass.tui.widgets.panels import UnitView
from unitclass.tui.wording import ConditionFacts, decided_words, family_shown, told, verdict_of

if TYPE_CHECKING:
    from unitclass.classify.templates import Family, TypeLibrary


class Desk:
    """What the screens ask for.

    Parameters
    ----------
    session : ReviewSession
    library : callable, optional
        Returns the type library; called when a list of types is first wanted.
    """

    def __init__(self, session: ReviewSession, library: Callable[[], TypeLibrary] | None = None) -> None:
        self.session = session
        self._read_library = library
        self._library: TypeLibrary | None = None
        self._families: Mapping[str, Family] = {}
        self._conditions: dict[tuple[str, str], ConditionFacts] = {}
        self._counted: tuple[Sequence[QueueEntry], int, bool] = ((), 0, False)

    # ------------------------------------------------------------------------- showing

    @property
    def entries(self) -> Sequence[QueueEntry]:
        """Return the rows of the queue in view."""
        return self.session.entries

    @property
    def here(self) -> int:
        """Return the place of the current row."""
        return max(0, self.session.index)

    @property
    def has_conditions(self) -> bool:
        """Return whether the rows in view are of more than one condition."""
        return self._counts()[1]

    def _counts(self) -> tuple[int, bool]:
        """Return how many rows are labelled and whether conditions differ; counted once per change."""
        rows = self.entries
        if rows is not self._counted[0]:
            n_done = sum(1 for row in rows if row.own_type)
            self._counted = rows, n_done, len({row.condition for row in rows}) > 1
        return self._counted[1:]

    def forget(self) -> None:
        """Read conditions anew: results have changed."""
        self._conditions.clear()

    def view(self) -> UnitView | None:
        """Return what the review screen shows of the current unit; None when there is none."""
        entry = self.session.current
        if entry is None:
            return None
        unit, condition = self.session.unit_result(entry), self.condition(entry)
        return UnitView(unit, condition.nerves, condition.ti_s, condition.te_s, family_shown(entry, unit),
                        self.verdict(entry, unit))

    def verdict(self, entry: QueueEntry, unit: UnitResult) -> Verdict:
        """Return the verdict on a unit in words."""
        return verdict_of(entry, unit, self.condition(entry), self._families.get(entry.suggested_type))

    def condition(self, entry: QueueEntry) -> ConditionFacts:
        """Return what is needed of an entry's condition."""
        key = entry.path, entry.condition
        if key not in self._conditions:
            result = self.session.condition_result(entry)
            ti_s, te_s = mean_durations(result.nerve_cycles.cycles)
            share = result.regime_probabilities.get(result.regime)
            regime = result.regime + ("" if share is None else f" {share:.2f}")
            self._conditions[key] = ConditionFacts(result.nerve_profiles, ti_s, te_s, regime)
        return self._conditions[key]

    def head(self) -> tuple[str, str, str]:
        """Return title, file and place in the queue for the line at the top."""
        entry = self.session.current
        if entry is None:
            return "unitclass", "", self.pending_words()
        title = f"unit {entry.unit}" + (f"  {entry.condition}" if entry.condition else "")
        place = f"{self._counts()[0]} labelled, {self.here + 1} of {len(self.entries)}"
        if not self.session.filter.is_empty:
            place += " shown"
        return title, entry.path, "  ".join(filter(None, (self.pending_words(), place)))

    def pending_words(self) -> str:
        """Return how many files are still to come, and how many failed; nothing when all are there."""
        states = [file.state for file in self.session.files]
        words = []
        if waiting := states.count("waiting"):
            words.append(f"{waiting} file{'s' if waiting > 1 else ''} to come")
        if failed := states.count("failed"):
            words.append(f"{failed} failed")
        return ", ".join(words)

    def why_empty(self) -> str:
        """Return what to tell when there is no unit to show."""
        files = self.session.files
        if self.session.all_entries:
            return "No unit fits what is asked for. Choose which units again, or all of them."
        lines = [told(file) for file in files if file.state == "failed"]
        if any(file.state == "waiting" for file in files):
            lines.insert(0, "The first files are being analysed; units appear here as they are ready.")
        elif not lines:
            lines.append("These files hold no units to review.")
        return "\n".join(lines)

    # -------------------------------------------------------------------------- acting

    def go(self, place: int) -> None:
        """Go to a place of the queue."""
        self.session.jump(place)

    def accept(self) -> str:
        """Accept the suggestion; return what was done."""
        return decided_words(self.session.accept())

    def take(self, number: int) -> str:
        """Take the type listed as `number`; return what was done."""
        return decided_words(self.session.take_alternative(number))

    def name(self, type_id: str) -> str:
        """Decide on a type; return what was done."""
        return decided_words(self.session.name_type(type_id))

    def mixed(self) -> str:
        """Decide that this is not one cell; return what was done."""
        return decided_words(self.session.not_one_cell())

    def note(self, text: str) -> str:
        """Keep a note; return what was done."""
        entry = self.session.note(text)
        return f"{entry.unit}: note kept" if text else f"{entry.unit}: note removed"

    def later(self) -> str:
        """Put the unit off or take it back among the open ones; return what was done."""
        entry = self.session.later()
        return f"{entry.unit}: left for later" if entry.is_later else f"{entry.unit}: open again"

    def turn(self, is_undo: bool) -> tuple[str, tuple[str, ...]]:
        """Undo or redo; return what was done and the files to analyse again."""
        turn = self.session.undo() if is_undo else self.session.redo()
        if turn is None:
            return ("nothing to take back" if is_undo else "nothing to give again"), ()
        what = "taken back" if is_undo else "given again"
        units = ", ".join(entry.unit for entry in turn.entries[:3])
        more = f" and {len(turn.entries) - 3} more" if len(turn.entries) > 3 else ""
        return f"{what}: {turn.act.kind} {units}{more}", turn.paths

    # --------------------------------------------------------------------- which units

    def go_to_changed(self) -> bool:
        """Go to the next unit in view whose suggestion has changed; return whether there is one."""
        places = [*range(self.here + 1, len(self.entries)), *range(self.here)]
        found = next((place for place in places if self.entries[place].is_changed), None)
        if found is not None:
            self.session.jump(found)
        return found is not None

    def filter_options(self) -> list[Option]:
        """Return everything by which units can be chosen, each with the number of units."""
        options = [Option("all", "all units", "")]
        options += [Option(f"{name}=", words, "") for name, words in YES_NO.items()]
        for field, noun in FACETS.items():
            values = self.session.choices(field)
            if len(values) > 1 or field in ("flags", "types"):
                options += [Option(f"{field}={value}", f"{noun} {value}", f"{count}") for value, count in values]
        return options

    def show_only(self, wanted: str) -> str:
        """Show only what an option of `filter_options` asks for, in addition to what is asked already."""
        name, _, value = wanted.partition("=")
        if wanted == "all":
            chosen = Filter()
        elif name == "sure":
            chosen = replace(self.session.filter, low=self.session.sure_probability, high=1.0)
        elif name == "unsure":
            chosen = replace(self.session.filter, low=0.0, high=self.session.sure_probability)
        elif name in NAMED_FILTERS:
            chosen = replace(self.session.filter, **NAMED_FILTERS[name])
        else:
            given: dict[str, Any] = {name: (value,)}
            chosen = replace(self.session.filter, **given)
        self.session.show(chosen)
        return f"{len(self.entries)} of {len(self.session.all_entries)} units in view"

    def order_options(self) -> list[Option]:
        """Return the orders of the queue."""
        return [Option(INFORMATIVE, "most informative first", "uncertain, then contradicted, then sure"),
                *(Option(name, f"by {name}") for name in SORTS),
                Option("reverse", "the other way round")]

    def sort(self, by: str) -> str:
        """Put the queue in an order; the current unit stays."""
        if by == "reverse":
            self.session.sort(self.session.sorted_by, is_reversed=not self.session.is_reversed)
        else:
            self.session.sort(by)
        backwards = ", backwards" if self.session.is_reversed else ""
        return f"order: {self.session.sorted_by}{backwards}"

    # -------------------------------------------------------------------------- types

    @property
    def library(self) -> TypeLibrary | None:
        """Return the type library, read when first asked for; None when there is none."""
        if self._library is None and self._read_library is not None:
            self._library = self._read_library()
            self._families = {family.id: family for family in self._library.families}
        return self._library

    def type_ids(self) -> list[str]:
        """Return the types in the order of the library, with the reviewer's own verdicts at the end."""
        known = [family.id for family in self.library.families] if self.library is not None else []
        suggested = [name for entry in self.entries[:200] for name, _ in entry.ranked]
        return list(dict.fromkeys([*known, *suggested, OTHER, NOT_ONE_CELL, SILENT, UNDETERMINED]))

    def type_options(self) -> list[Option]:
        """Return every type that can be named, with its words."""
        names, families = self.type_ids(), self._families
        words = {OTHER: "modulated, but like none of these", NOT_ONE_CELL: "two cells in one train, or an artefact",
                 SILENT: "hardly fires here", UNDETERMINED: "too little data to say"}
        options = []
        for name in names:
            family = families.get(name)
            detail = family.words if family is not None else words.get(name, "")
            options.append(Option(name, name, detail, " ".join(family.also) if family is not None else ""))
        return options


YES_NO: Mapping[str, str] = {"open": "without my label", "labelled": "with my label", "later": "left for later",
                             "changed": "suggestion changed", "sure": "sure suggestions",
                             "unsure": "unsure suggestions"}
NAMED_FILTERS: Mapping[str, Mapping[str, Any]] = {
    "open": {"is_reviewed": False}, "labelled": {"is_reviewed": True}, "later": {"is_later": True},
    "changed": {"is_changed": True}}
FACETS: Mapping[str, str] = {"types": "type", "files": "file", "conditions": "condition", "regions": "region",
                             "flags": "flag", "shape_groups": "shape group", "states": "state"}
