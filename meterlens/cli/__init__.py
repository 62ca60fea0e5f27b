"""The command line: commands, tables and exit codes."""
