"""The spectrum of a record by SciPy's periodogram.

In: {"volts": [...], "interval": s, "window": "hann" or "boxcar", "length": transform length}
Out: {"hz": [...], "volts": [rms of each line, V]}
"""
import json
import sys

import numpy as np
from scipy.signal import periodogram

q = json.load(sys.stdin)
hz, power = periodogram(np.array(q["volts"]), fs=1 / q["interval"], window=q["window"], nfft=q["length"],
                        detrend="constant", scaling="spectrum")
json.dump({"hz": hz.tolist(), "volts": np.sqrt(power).tolist()}, sys.stdout)
