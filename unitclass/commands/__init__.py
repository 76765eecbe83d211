"""One file a subcommand."""
