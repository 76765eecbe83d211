"""Widgets: state and style around the renderables."""
