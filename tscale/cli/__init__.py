"""The command `tscale`. Each subcommand is a module with `add_parser(subparsers)` and `run(args) -> int`."""
