"""What is wanted: a target curve from points, from a change, or from rider, frame and feel.

Every way ends in one ``optimiser.wanted.target.Target``. Nothing here reads files or prints.
"""
