"""Studies: one part, many variants of it, and nothing lost.

`plan` turns a plan into variants, `work` evaluates one variant in bounded child processes, `run` drives them and
writes the record (`studies.record`). What passes between them is in `variant` and `outcome`.
"""
