"""Continuous traces to events: neurograms to bursts and cycles, membrane potential to spikes."""
