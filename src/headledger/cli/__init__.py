"""The command line: each command reads, runs, writes; results on stdout, talk on stderr."""
