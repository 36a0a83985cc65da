"""Writes the tables that the room `sensor` is held against.

    python -m venv venv
    venv/bin/pip install -r requirements.txt
    venv/bin/python make.py FOLDER

FOLDER holds `type_k.tab`, `type_j.tab`, `type_t.tab`: the tables of NIST Standard
Reference Database 60 as NIST prints them (public domain). They are also in the
source archive of thermocouple-its90 1.0.2, under tests/data/nist.

thermocouples.csv: per couple and whole degree the voltage as NIST prints it, and the
reference function as the library `thermocouples_reference` evaluates it, with its slope.
pt100.csv: per whole degree the resistance and its slope as the library `rtd_sensor`
evaluates IEC 60751.
"""

import csv
import pathlib
import sys

import rtd_sensor.pt100 as pt100
from thermocouples_reference import thermocouples

HERE = pathlib.Path(__file__).parent


def printed(path):
    """{degree: text of the voltage in mV}; a page's head says which way its columns go."""
    table, way, inside = {}, 1, False
    for line in path.read_text(encoding="latin-1").splitlines():
        words = line.split()
        if len(words) > 2 and words[1] == "0" and words[2] in ("1", "-1"):
            way = int(words[2])
        elif "Thermoelectric Voltage" in line:
            inside = True
        elif line.lstrip().startswith("*"):
            inside = False
        elif inside and len(words) > 1 and words[0].lstrip("-").isdigit():
            for column, text in enumerate(words[1:]):
                degree = int(words[0]) + way * column
                assert table.setdefault(degree, text) == text, (path, degree)
    return table


def rows(folder):
    for letter in "KJT":
        couple = thermocouples[letter]
        table = printed(folder / f"type_{letter.lower()}.tab")
        degrees = sorted(table)
        assert degrees == list(range(degrees[0], degrees[-1] + 1)), letter
        for t in degrees:
            mv = float(couple.emf_mVC(t))
            slope = float(couple.emf_mVC(t, derivative=1))
            yield [letter, t, table[t], f"{mv:.9f}", f"{slope:.9f}"]


def write(name, head, body):
    with open(HERE / name, "w", newline="") as file:
        out = csv.writer(file, lineterminator="\n")
        out.writerow(head)
        out.writerows(body)


if __name__ == "__main__":
    write(
        "thermocouples.csv",
        ["couple", "t_degc", "printed_mv", "function_mv", "slope_mv_per_k"],
        rows(pathlib.Path(sys.argv[1])),
    )
    write(
        "pt100.csv",
        ["t_degc", "resistance_ohm", "slope_ohm_per_k"],
        (
            [
                t,
                f"{pt100.celsius_to_resistance(t):.9f}",
                f"{pt100.resistance_sensitivity_ohms_per_celsius(t):.9f}",
            ]
            for t in range(-200, 851)
        ),
    )
