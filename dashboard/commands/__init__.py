"""One module a command: HELP, arguments(parser) and run(args) -> status, a few lines over ``hydro``."""
