"""The sweep: a plan becomes a record. The only place where candidates, references and verdicts meet."""
