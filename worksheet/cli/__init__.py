"""The scriptable command line: arguments in, data on stdout, narration on stderr, an exit code.

Commands hold no arithmetic and no wording of results; those come from the layers below.
"""
