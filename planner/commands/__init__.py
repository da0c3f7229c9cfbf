"""Commands of the command line, one module per group; each parses, calls a study, renders and exits."""
