"""The screen of a run: `watch` is the Textual program, `plain` says the same in lines, the rest draws and words it."""
