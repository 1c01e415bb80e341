"""The phases that ship: one YAML file per family."""
