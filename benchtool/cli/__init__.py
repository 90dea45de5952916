"""The command line: a table of verbs, one module each. Only this room prints and exits."""
