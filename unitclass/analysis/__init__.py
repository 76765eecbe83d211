"""Recording + templates + settings -> results. Pure: arrays and records in, records out."""

from unitclass.analysis.session import analyse, cycles_only

__all__ = ["analyse", "cycles_only"]
