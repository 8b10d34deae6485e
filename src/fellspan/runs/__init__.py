"""A long run over many pairs: chunks fixed by the input, one SQLite store, threads or a cluster that fill it.

Knows how to stop and go on, not what a pair's result means. Physics stays in `screening`, files of results in `exports`.
"""
