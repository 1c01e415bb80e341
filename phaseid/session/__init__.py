"""The state of one piece of work: images, evidence, decisions; saved, undone, reopened."""
