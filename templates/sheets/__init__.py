"""The calc sheets."""
