"""Makes shapes.csv: what numpy says of a few shapes of current under a sine voltage.

Run in this folder with the requirements beside it: python oracle.py > shapes.csv
Each shape is described by its formula only; the tests build the same samples by
their own. Ten periods of 50 Hz at 10 kS/s, rectangular window, rfft.
"""
import numpy as np

RATE, HERTZ, PERIODS = 10_000, 50.0, 10
N = int(RATE / HERTZ * PERIODS)
t = np.arange(N) / RATE
# A quarter of a step off the grid, so that no sample meets a zero crossing.
turn = (HERTZ * t + 0.25 * HERTZ / RATE) % 1.0
sine = np.sin(2 * np.pi * turn)
volts = 325.0 * sine

shapes = {
    "resistor": 3.0 * sine,
    "half-wave": np.where(sine > 0, 2.0 * sine, 0.0),
    "half-wave negative": np.where(sine < 0, 2.0 * sine, 0.0),
    # Conducts from a third of each half-period on.
    "phase-cut": np.where((turn % 0.5) >= 0.5 / 3, 4.0 * sine, 0.0),
    "square": np.where(turn < 0.5, 1.5, -1.5),
    "offset": 1.0 * sine + 0.25,
    "lagging": 8.0 * np.sqrt(2) * np.sin(2 * np.pi * turn - np.arccos(0.6)),
    "third and second": 2 * sine + 0.5 * np.sin(3 * 2 * np.pi * turn + 0.4)
    + 0.2 * np.cos(2 * 2 * np.pi * turn),
}

print("shape,rms_a,dc_a,crest_factor,power_w,apparent_va,power_factor,"
      + ",".join(f"h{n}_a" for n in range(1, 41)))
for name, amps in shapes.items():
    rms = np.sqrt(np.mean(amps**2))
    spectrum = np.fft.rfft(amps) / N
    harmonics = np.sqrt(2) * np.abs(spectrum[PERIODS * np.arange(1, 41)])
    power = np.mean(volts * amps)
    apparent = np.sqrt(np.mean(volts**2)) * rms
    values = [rms, np.mean(amps), np.max(np.abs(amps)) / rms, power, apparent,
              power / apparent, *harmonics]
    print(name + "," + ",".join(repr(float(v)) for v in values))
