"""The contexts that ship, as ordinary plugins."""
