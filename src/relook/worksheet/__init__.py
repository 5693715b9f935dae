"""Worksheets: planned, written, and read back in whatever state they return."""
