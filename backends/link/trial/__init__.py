"""The adapter trial: every requirement of PROTOCOL.md, tried against a live robot."""
