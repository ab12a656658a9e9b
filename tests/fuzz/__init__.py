"""Damaged logs of every kind, and what a build owes its user then."""
