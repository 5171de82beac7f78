"""The trial file: one SQLite file a trial, whose history is only ever appended to.

trial       create, open, read, act
check       walk the chain and re-hash every stored byte
schema      tables, triggers, ordered migrations
rows        entries and stored bytes, in and out of the tables
creation    a new file takes its name at the end, whole
history     what may follow what; the state that the entries add up to
chain       what ties an entry to the one before it
entries     an entry: its line and its digest
bodies      what an entry says, kind by kind
letters     which arm is A: drawn, committed to, revealed
reading     strict JSON into the dataclasses of entries
database    the one connection, set up for safety
faults      faults of disk and SQLite as sentences
"""
