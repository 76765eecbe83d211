"""Name the firing types of respiratory neurons, review them, hand labelled NWB on."""

__version__ = "0.1.0"
