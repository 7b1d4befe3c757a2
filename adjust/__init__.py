"""Hubtack."""
