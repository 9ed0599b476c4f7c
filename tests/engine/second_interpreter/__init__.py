"""A second interpreter of the mission language, written from LANGUAGE.md alone, to hold the engine against.

It walks the syntax tree with generators and knows nothing of the machine's table. `comparing` plays the same inputs to
both; `python -m tests.engine.second_interpreter --count N` plays more than the tests do.
"""
