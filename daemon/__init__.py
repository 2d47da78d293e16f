"""Files, time, threads, the database and the command line."""
