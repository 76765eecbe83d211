"""The paragraph for a paper's methods section, and what it refers to."""

from __future__ import annotations

from collections.abc import Sequence

from unitclass.classify.templates import TypeLibrary
from unitclass.records import SessionResult
from unitclass.settings import Settings

REFERENCES = (
    "Davison AC, Hinkley DV. Bootstrap Methods and their Application. Cambridge University Press, 1997.",
    "Kass RE, Eden UT, Brown EN. Analysis of Neural Data. Springer, 2014.",
    "Orem J, Dick T. Consistency and signal strength of respiratory neuronal activity. J Neurophysiol 50:1098, 1983.",
    "Benjamini Y, Hochberg Y. Controlling the false discovery rate. J R Stat Soc B 57:289, 1995.",
    "Bishop CM. Pattern Recognition and Machine Learning. Springer, 2006.",
)

_MADE_WITH = """
Respiratory cycles and firing types were determined with unitclass {version} (settings {digest}, {changed};
template set {library}, {n_families} families, digest {library_digest}). Raw nerve activity was band-pass
filtered ({low:g} Hz to {high:g} Hz or 0.45 times the sampling rate, whichever is lower) and rectified; bursts
were detected on a smoothed trace with a threshold taken from the trace itself, and the onset and end of
inspiration were set where the burst passes a tenth of its peak, free of the smoother's delay. For display
activity was integrated ({smoother}, time constant {tau:g} ms). Sighs and the {after_sigh} after each, apnoeas,
doublets and cycles touching an excluded window were left out of histograms. Each cycle was mapped onto {n_bins}
bins, half of them inspiration and half expiration; firing rates are spike counts divided by the seconds
observed in each bin, with 95 % limits from {n_bootstrap} bootstrap resamples of cycles (Davison and Hinkley
1997; Kass et al. 2014).{membrane} Modulation was tested by eta squared (Orem and Dick 1983) against {n_shifts}
circular shifts in time, with the false discovery rate controlled over the units of a condition (Benjamini and
Hochberg 1995). The probability of each firing type is the posterior of template families (each {n_draws}
profiles drawn from stated ranges of onset, peak, end and shape) given the counts, under a multinomial
likelihood tempered by the unit's over-dispersion and saturating at {concentration:g} spikes, in competition
with a family of arbitrary profiles (prior {other:g}; Bishop 2006), with priors averaged over the probabilities
of the rhythm (three-, two- or one-phase). Units with fewer than {min_spikes} spikes or {min_cycles} cycles were
not classified. Labels are those of the reviewers named in the tables.
"""


_OF_MEMBRANE = """ Spikes of impaled cells were detected on the membrane potential by a filter matched to the cell's
own spike in its noise; for the mean potential by phase, spikes were cut out and bridged."""


def methods_paragraph(results: Sequence[SessionResult], library: TypeLibrary, settings: Settings, *,
                      with_membrane: bool = False) -> str:
    """Return how the results were made, in words that can stand in a paper; of impaled cells only when there are some."""
    n, c, p, m, k = settings.nerve, settings.cycles, settings.phase, settings.modulation, settings.classify
    version = ", ".join(sorted({r.program_version for r in results})) or "unknown"
    return " ".join(_MADE_WITH.format(
        version=version, digest=settings.digest(), changed=changed_words(settings), library=library.name,
        n_families=len(library.families), library_digest=library.digest(), low=n.low_cut_hz, high=n.high_cut_hz,
        smoother=n.smoother, tau=n.tau_ms, after_sigh=_plural(c.after_sigh, "cycle"), n_bins=p.n_bins,
        n_bootstrap=p.n_bootstrap, membrane=_OF_MEMBRANE if with_membrane else "",
        n_shifts=m.n_shifts, n_draws=k.n_draws, concentration=k.concentration, other=k.other_prior,
        min_spikes=m.min_spikes, min_cycles=m.min_cycles).split())


def changed_words(settings: Settings) -> str:
    """Return which settings are not at their defaults."""
    usual = {t.name: t.value for t in Settings().tunables()}
    changed = [f"{t.name} = {t.value}" for t in settings.tunables()
               if t.value != usual[t.name] and not t.name.startswith("review.")]
    return ", ".join(changed) if changed else "all at their defaults"


def _plural(n: float, word: str) -> str:
    return f"{n:g} {word}" + ("" if n == 1 else "s")
