"""The commands of the shell, one a file; nothing heavy is imported before a command runs."""
