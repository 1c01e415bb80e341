"""Physics: what a composition does to an electron beam."""
