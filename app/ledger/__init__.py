"""The trial file: one SQLite file a trial, whose history is only ever appended to.

schema      tables, triggers, ordered migrations
database    the one connection, and the one place where faults of disk and SQLite become sentences
letters     which arm is A: drawn, committed to, revealed
entries     what an entry holds, kind by kind
history     what may follow what; the state that the entries add up to
chain       what ties an entry to the one before it
trial       open, read, act
check       walk the chain and re-hash every stored byte
"""
