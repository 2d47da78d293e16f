"""Reads the history and shows it."""
