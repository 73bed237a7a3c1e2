"""Hypothesis strategies shared by the tests."""
