"""Edge streams: lines that a microcontroller or a logger prints, one an edge, read without end.

    feed -> LineSplitter -> decode -> Sequencer -> EdgeWindow -> Capture

``lineformat`` describes the format of our own, ``description`` how any other is told.
"""
