"""Pure drawing: plain arrays to text."""
