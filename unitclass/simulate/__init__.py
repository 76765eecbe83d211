"""Demo sessions with known answers, in an invented laboratory."""

from unitclass.simulate.scenario import KINDS
from unitclass.simulate.session import SimulatedSession, SimulatedUnit, simulate_session
from unitclass.simulate.write import write_session, write_truth

__all__ = ["KINDS", "SimulatedSession", "SimulatedUnit", "simulate_session", "write_session", "write_truth"]
