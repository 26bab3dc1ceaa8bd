"""What is done, in which order: one file a procedure, a generator of requests and records. Pure."""
