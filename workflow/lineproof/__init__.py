"""Lineproof: test from raw security returns whether beta is priced."""
