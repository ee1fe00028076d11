"""Figures: one function per figure, table in, `Figure` out; nothing here solves anything."""
