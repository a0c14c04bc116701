"""The `newel` command: one file a subcommand, each calls one public function and draws."""
