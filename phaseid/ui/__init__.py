"""The terminal screen; it holds no logic."""
