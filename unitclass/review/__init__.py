"""The review without its screens: queue, decisions, undo, agreement."""
