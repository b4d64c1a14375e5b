"""Decisions: numbers in, numbers out; no description and no astropy."""
