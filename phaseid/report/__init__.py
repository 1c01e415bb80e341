"""Report: what a person or a program reads."""
