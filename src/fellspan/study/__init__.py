"""The study file: TOML schema, reading with messages for people, writing, the commented starter.

Turns text into `planning.inputs.Study` and back. Runs no physics.
"""
