"""Cycle phase: warping, histograms, circular statistics, modulation, features."""
