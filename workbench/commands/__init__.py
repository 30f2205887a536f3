"""Commands: the command line, one subcommand a file."""
