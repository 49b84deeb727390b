"""The commands of the command line, one a module: each adds its own arguments and runs."""
