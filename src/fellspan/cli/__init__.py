"""The command line: a small file for each command that parses, calls one function, prints and sets the exit code."""
