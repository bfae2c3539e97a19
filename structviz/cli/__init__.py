"""The command line: one module a command; it reads arguments, calls the analysis and chooses the exit code."""
