"""The commands of ``acidity``, a module each.

A command module has ``HELP`` (one line), ``add_arguments(parser)`` and ``run(args)``, which returns the exit
status. It imports at its top only what is quick to import; the rest is imported in ``run``.
"""
