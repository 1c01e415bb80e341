"""Inference: from clusters to candidates."""
