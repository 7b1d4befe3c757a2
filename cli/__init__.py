"""The command line of Hubtack: thin faces on the library, one file a command."""
