"""The visibility-buffer rasteriser and its shading.

`see` finds the face that each sample shows, `shade` makes a picture of that, `paint` does both in bands of bounded
memory, `survey` and `measure` answer questions. numba is imported when one of them first draws, not before.
"""

from .areas import measure
from .picture import Progress, Visibility, paint, pick, see, shade
from .survey import survey

__all__ = ["Progress", "Visibility", "measure", "paint", "pick", "see", "shade", "survey"]
